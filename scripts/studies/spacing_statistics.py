# %% [markdown]
"""The regular part of the energy shell as a spectrum sees it and as the orbits do.

The regular part rho_1 is fitted to unfolded level spacings and set against ``regular_volume_fraction`` of each table:
``z`` is their difference in standard deviations.  Without a file of spacings (``--spacings``, one number a line, for
one selected table) they are drawn from the Berry-Robnik density at the orbits' rho_1, which shows how many levels a
comparison takes.  With ``--to`` the distribution of one table's spacings is drawn beside both densities.

    python scripts/studies/spacing_statistics.py first_sweep.zarr --select harmonic=2 --count 2000
"""

# %%
from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from study_tools import DoneTable, answer, check_figure, done_tables, open_selected, print_rows, store_parser

from scanner.errors import ScannerError
from scanner.statistics import RegularPart, compare_regular_parts, draw_spacings, fit_regular_part, spacing_density


# %%
def read_spacings(path: Path) -> np.ndarray:
    """Read one number a line."""
    try:
        return np.array([float(word) for word in path.read_text(encoding="utf-8").split()])
    except OSError as error:
        raise ScannerError(f"{path} cannot be read: {error.strerror}") from error
    except ValueError as error:
        raise ScannerError(f"{path} must hold one number a line: {error}") from error


def row_of(table: DoneTable, spacings: np.ndarray) -> tuple[dict[str, object], RegularPart]:
    """Fit the spacings of one table and compare."""
    value, stderr = (table.root[f"regular_volume_fraction{suffix}"].item() for suffix in ("", "_stderr"))
    fit = fit_regular_part(spacings)
    row = {
        **table.parameters,
        "orbits": value,
        "orbits_stderr": stderr,
        "spectrum": fit.value,
        "stderr": fit.stderr,
        "low": fit.low,
        "high": fit.high,
        "z": compare_regular_parts(spacings, value, stderr),
    }
    return row, fit


def draw(spacings: np.ndarray, dynamical: float, fit: RegularPart, target: Path) -> None:
    """Draw the spacings as a histogram beside the densities of the orbits and of the fit."""
    import matplotlib

    from scanner.figures.colours import BLUE, GREY, VERMILION
    from scanner.figures.drawing import save_figure
    from scanner.figures.style import STYLE, add_legend, figure_of, new_axes

    places = np.linspace(0.0, 4.0, 401)
    with matplotlib.rc_context(STYLE):
        axes = new_axes("single", 1.0)
        bins = np.linspace(0.0, 4.0, 41)
        # Over all spacings, so that those beyond the plot do not raise the bars.
        weights = np.full(spacings.size, 1.0 / (spacings.size * (bins[1] - bins[0])))
        axes.hist(spacings, bins, weights=weights, color=GREY, alpha=0.4)
        lines = []
        for part, who, style, colour in ((dynamical, "orbits", "-", BLUE), (fit.value, "spectrum", "--", VERMILION)):
            label = rf"{who} $\rho_1 = {part:.3f}$"
            lines += axes.plot(places, spacing_density(places, part), style, color=colour, label=label)
        axes.set_xlabel(r"spacing $S$ (mean spacings)")
        axes.set_ylabel("density")
        add_legend(axes, lines)
    save_figure(figure_of(axes), target)


# %%
def main(arguments: Sequence[str] | None = None) -> None:
    """Print one row a table, and draw one table if asked to."""
    parser = store_parser(__doc__)
    parser.add_argument("--spacings", type=Path, metavar="FILE", help="measured, unfolded spacings, one a line")
    parser.add_argument("--count", type=int, default=1000, help="spacings drawn a table (default: %(default)s)")
    parser.add_argument("--seed", type=int, default=1, help="of the drawing (default: %(default)s)")
    parser.add_argument("--to", type=Path, metavar="FILE", help="draw one table into a new .png, .pdf or .svg")
    options = parser.parse_args(arguments)
    if options.to:
        check_figure(options.to)
    tables = list(done_tables(open_selected(options.store, options.select)))
    if (options.spacings or options.to) and len(tables) != 1:
        raise ScannerError(f"--spacings and --to are for one table, {len(tables)} are selected and done: use --select")
    generator = np.random.default_rng(options.seed)
    rows = []
    for table in tables:
        dynamical = table.root["regular_volume_fraction"].item()
        if options.spacings:
            spacings = read_spacings(options.spacings)
        else:
            spacings = draw_spacings(options.count, dynamical, generator=generator)
        row, fit = row_of(table, spacings)
        rows.append(row)
    print_rows(rows)
    if options.to:
        draw(spacings, dynamical, fit, options.to)


# %%
if __name__ == "__main__":
    answer(main, example=["../../out/first_sweep.zarr", "--select", "harmonic=2"])
