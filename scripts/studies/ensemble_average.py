# %% [markdown]
"""A quantity on average over an ensemble of tables, and how much its members differ.

The scatter over the members is told apart into what the ensemble does (``between``, with an interval of 95 %) and what
the finite number of orbits of each table adds (``within``).  With ``--to`` the averages are drawn: the dark band is
the error of the mean, the light one the scatter between members.

    python scripts/studies/ensemble_average.py random_ensemble.zarr --to rough.pdf
"""

# %%
from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import xarray as xr
from study_tools import answer, check_figure, open_selected, print_rows, store_parser

from scanner.analysis import swept_parameters
from scanner.errors import ScannerError
from scanner.statistics import ensemble_average


# %%
def draw(averages: xr.Dataset, quantity: xr.DataArray, target: Path) -> None:
    """Draw the mean against the one parameter that is left."""
    import matplotlib

    from scanner.figures.colours import BLUE
    from scanner.figures.drawing import save_figure
    from scanner.figures.labels import parameter_label, quantity_label
    from scanner.figures.style import STYLE, add_legend, figure_of, new_axes

    (along,) = averages["mean"].dims
    places, mean = averages[along].values, averages["mean"].values
    with matplotlib.rc_context(STYLE):
        axes = new_axes("single", 1.0)
        line = axes.plot(places, mean, color=BLUE, marker=".", label="mean over members")
        bands = [
            axes.fill_between(places, mean - width, mean + width, color=BLUE, alpha=shade, linewidth=0, label=text)
            for width, shade, text in (
                (averages["stderr"].values, 0.5, "error of the mean"),
                (averages["between"].values, 0.15, "between members"),
            )
        ]
        axes.set_xlabel(parameter_label(str(along)))
        axes.set_ylabel(quantity_label(quantity))
        add_legend(axes, [*line, *bands])
    save_figure(figure_of(axes), target)


# %%
def main(arguments: Sequence[str] | None = None) -> None:
    """Print one row for each combination of the parameters that are left, and draw them if asked to."""
    parser = store_parser(__doc__)
    parser.add_argument("--quantity", default="regular_area_fraction", metavar="VARIABLE",
                        help="a variable of tables with a standard error (default: %(default)s)")  # fmt: skip
    parser.add_argument("--over", default="realisation", help="the ensemble's parameter (default: %(default)s)")
    parser.add_argument("--to", type=Path, metavar="FILE", help="draw into a new .png, .pdf or .svg")
    options = parser.parse_args(arguments)
    if options.to:
        check_figure(options.to)
    root = open_selected(options.store, options.select).to_dataset()
    names = swept_parameters(root)
    if options.over not in names:
        raise ScannerError(f"--over {options.over}: not one of the swept parameters {', '.join(names) or '(none)'}")
    known = [str(name) for name in root.data_vars if f"{name}_stderr" in root and set(root[name].dims) == set(names)]
    if options.quantity not in known:
        raise ScannerError(f"{options.quantity} has no standard error of its own: choose from {', '.join(known)}")
    quantity = root[options.quantity].load()
    averages = ensemble_average(quantity, root[f"{options.quantity}_stderr"].load(), [options.over])
    left = [name for name in names if name != options.over]
    if options.to and len(left) != 1:
        raise ScannerError(f"a figure needs one parameter besides {options.over}, there are {len(left)}: use --select")
    held = averages.reset_coords(drop=True)
    table = held.to_dataframe(dim_order=left).reset_index() if left else held.to_pandas().to_frame().T
    print(f"{options.quantity}, average over {options.over}")
    print_rows(table.to_dict("records"))
    if options.to:
        draw(averages, quantity, options.to)


# %%
if __name__ == "__main__":
    answer(main, example=["../../out/random_ensemble.zarr"])
