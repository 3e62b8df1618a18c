"""The table of results: one row a table of the sweep, the numbers a researcher looks at first."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
import xarray as xr

from scanner.analysis.rows import to_rows
from scanner.analysis.sweep import swept_parameters
from scanner.quantities import DONE, FAILED, NOT_CONVEX, TABLE_STATUS

MEASURED = (
    "regular_area_fraction",
    "regular_area_fraction_stderr",
    "regular_volume_fraction",
    "regular_volume_fraction_stderr",
    "undecided_area_fraction",
    "lyapunov_per_bounce",
    "lyapunov_per_bounce_stderr",
    "diffusion_median",
)
DRIFT = "horizon_drift"


def summarise(root: xr.Dataset) -> pd.DataFrame:
    """Make the summary of a sweep.

    Parameters
    ----------
    root
        Root variables of a sweep, as stored or averaged over some parameters.

    Returns
    -------
    DataFrame
        One row a table: the swept parameters, ``table_status`` as a word, the main fractions and exponents with their
        standard errors, and ``horizon_drift``: how much of the section a verdict after a quarter of the bounces calls
        regular beyond what one after all of them does.  Numbers of a table that is not done are NaN.
    """
    columns = ["table_status", *MEASURED]
    if "tables_averaged" in root:
        columns.append("tables_averaged")
    return to_rows(root[columns].assign({DRIFT: horizon_drift(root)}), swept_parameters(root))


def horizon_drift(root: xr.Dataset) -> xr.DataArray:
    """Regular area fraction after a quarter of the bounces less that after all of them."""
    by_horizon = root["regular_area_fraction_by_horizon"]
    horizons = by_horizon["horizon"].values
    quarter = int(abs(horizons - horizons.max() / 4).argmin())
    drift = by_horizon.isel(horizon=quarter, drop=True) - by_horizon.isel(horizon=int(horizons.argmax()), drop=True)
    drift.attrs = {
        "long_name": f"regular area fraction after {horizons[quarter]} bounces less the final one",
        "units": "1",
    }
    return drift


def failures(root: xr.Dataset, reasons: Mapping[tuple[int, ...], str]) -> pd.DataFrame:
    """List the tables that failed or are not convex.

    Parameters
    ----------
    root
        Root variables of a sweep.
    reasons
        Why a table failed or is not convex, by its index in the grid.

    Returns
    -------
    DataFrame
        Their parameters, ``table_status`` and ``reason``, empty where none is known.
    """
    rows = to_rows(root[["table_status"]], swept_parameters(root)).assign(reason="")
    shape = root["table_status"].shape
    for index, reason in reasons.items():
        rows.loc[int(np.ravel_multi_index(index, shape)) if shape else 0, "reason"] = reason
    return rows[rows["table_status"].isin([TABLE_STATUS[NOT_CONVEX], TABLE_STATUS[FAILED]])].reset_index(drop=True)


def count_statuses(root: xr.Dataset) -> dict[str, int]:
    """Count the tables by status, leaving out what does not occur."""
    codes = root["table_status"].values
    counts = {name: int((codes == code).sum()) for code, name in enumerate(TABLE_STATUS)}
    return {name: count for name, count in counts.items() if count}


def largest_drift(root: xr.Dataset) -> float:
    """Largest drift with the horizon over the tables that are done, NaN when there is none."""
    return float(abs(horizon_drift(root).where(root["table_status"] == DONE)).max())
