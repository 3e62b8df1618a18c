# %% [markdown]
"""A measured outline: how well it is known, and what its unevenness does to the regular orbits.

Prints the best-fit ellipse of the points, how far the outline departs from it, and how well the points fix the outline:
``residual`` is the r.m.s. distance of the points from it, ``known to`` that of the outline itself from the true one if
the points scatter independently.  With a store of the same study, the regular fraction follows, against the amplitude
of the departure: 0 is the ellipse, 1 the outline.

    python scripts/studies/measured_outline.py configs/measured_outline.toml out/measured_outline.zarr
"""

# %%
from __future__ import annotations

import math
from collections.abc import Sequence
from pathlib import Path

import numpy as np
from study_tools import OneLineParser, answer, done_tables, print_rows

from scanner import build_table, open_sweep
from scanner.errors import ScannerError
from scanner.study import Study, load_study
from scanner.tables import Table
from scanner.tables.points import parse_points, read_content

PLACES = 1024
"""Points along the outline to measure its departure at."""


# %%
def describe_fit(study: Study) -> dict[str, str]:
    """Numbers of the fit, lengths in the unit of the points."""
    file = str(study.fixed["file"])
    ellipse, outline = (build_table(study.family, file=file, amplitude=amplitude) for amplitude in (0.0, 1.0))
    points = parse_points(read_content(file)).shape[1]
    waves = outline.harmonics.shape[1] - 2  # the wave of the radius times the circle has one harmonic more
    long, short = semi_axes(ellipse)
    return {
        "points": f"{points}",
        "semi-axes": f"{long:.3f}, {short:.3f}",
        "eccentricity": f"{math.sqrt(1.0 - (short / long) ** 2):.4f}",
        "departure": f"{departure(ellipse, outline):.4f} (r.m.s.), waves up to {waves}",
        "residual": f"{outline.residual:.4f}",
        "known to": f"{outline.residual * math.sqrt((2 * waves + 1) / points):.4f}",
    }


def semi_axes(ellipse: Table) -> tuple[float, float]:
    """Singular values of the matrix that takes the unit circle to the ellipse."""
    long, short = np.linalg.svd(ellipse.harmonics[:, 1].reshape(2, 2), compute_uv=False)
    return float(long), float(short)


def departure(ellipse: Table, outline: Table) -> float:
    """R.m.s. distance of the outline from the ellipse, along the radius."""
    turns = np.arange(PLACES) / PLACES
    (x, y), (u, v) = (table.point(table.arc_from_turns(turns)) for table in (ellipse, outline))
    return float(np.sqrt(np.mean((u - x) ** 2 + (v - y) ** 2)))


# %%
def print_fractions(store: Path, study: Study) -> None:
    """Print the regular fraction against the amplitude."""
    tree = open_sweep(store)
    if tree.attrs["fingerprint"] != study.fingerprint:
        raise ScannerError(f"{store} is the store of another study: sweep this one, or name its own store")
    print("\nregular fraction against the amplitude: 0 is the ellipse, 1 the outline")
    print_rows([
        {
            **table.parameters,
            "regular area": table.root["regular_area_fraction"].item(),
            "stderr": table.root["regular_area_fraction_stderr"].item(),
            "regular volume": table.root["regular_volume_fraction"].item(),
            "undecided": table.root["undecided_area_fraction"].item(),
            "Lyapunov/bounce": table.root["lyapunov_per_bounce"].item(),
        }
        for table in done_tables(tree)
    ])  # fmt: skip


def main(arguments: Sequence[str] | None = None) -> None:
    """Print the fit, and the fractions if there is a store."""
    parser = OneLineParser(description="A measured outline: its fit, and its regular fraction against the amplitude.")
    parser.add_argument("study", type=Path, help="a study of family outline_file")
    parser.add_argument("store", type=Path, nargs="?", help="its store, made by scanner sweep")
    options = parser.parse_args(arguments)
    study = load_study(options.study)
    if study.family != "outline_file":
        raise ScannerError(f"{options.study}: family {study.family} has no measured outline; use one of outline_file")
    for name, value in describe_fit(study).items():
        print(f"{name:>13}  {value}")
    if options.store is not None:
        print_fractions(options.store, study)


# %%
if __name__ == "__main__":
    answer(main, example=["../../configs/measured_outline.toml"])
