"""The summary in words and digits, under the headings that people see."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import pandas as pd

from scanner.analysis.summary import DRIFT


def number(value: float, digits: int = 4, sign: str = "") -> str:
    """Write a number with a fixed count of decimals, a dash where there is none."""
    return f"{value:{sign}.{digits}f}" if math.isfinite(value) else "-"


def uncertain(value: float, error: float) -> str:
    """Write a number with its standard error."""
    return f"{number(value)} ± {number(error)}" if math.isfinite(value) else "-"


def write_parameters(rows: pd.DataFrame, names: Sequence[str]) -> pd.DataFrame:
    """Write the columns of these swept parameters as people do."""
    return rows.assign(**{name: [f"{value:.6g}" for value in rows[name]] for name in names})


def write_summary(rows: pd.DataFrame, names: Sequence[str]) -> pd.DataFrame:
    """Write the rows of a summary, with these swept parameters, as texts under short headings."""

    def column(write: Callable[..., str], *keys: str) -> list[str]:
        return [write(*values) for values in zip(*(rows[key] for key in keys), strict=True)]

    texts = write_parameters(rows, names)[list(names)]
    texts["status"] = column(lambda status: status.replace("_", " "), "table_status")
    if "tables_averaged" in rows:
        texts["tables"] = column(str, "tables_averaged")
    texts["regular area"] = column(uncertain, "regular_area_fraction", "regular_area_fraction_stderr")
    texts["regular volume"] = column(uncertain, "regular_volume_fraction", "regular_volume_fraction_stderr")
    texts["undecided"] = column(number, "undecided_area_fraction")
    texts["Lyapunov/bounce"] = column(uncertain, "lyapunov_per_bounce", "lyapunov_per_bounce_stderr")
    texts["diffusion"] = column(lambda value: number(value, 2), "diffusion_median")
    texts["drift"] = column(lambda value: number(value, 4, "+"), DRIFT)
    return texts


def first_and_last(rows: pd.DataFrame, most: int) -> pd.DataFrame:
    """Return the first and the last rows where there are more than `most`; 0 stands for all."""
    if not most or len(rows) <= most:
        return rows
    return pd.concat([rows.head((most + 1) // 2), rows.tail(most // 2)])
