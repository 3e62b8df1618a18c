# %% [markdown]
"""The amplitude at which a quantity crosses a level, and how well it is known.

By default where half of the energy shell has turned chaotic.  The interval is a bootstrap over the replicates of each
table; the mean is a straight line between neighbouring tables, and the column ``interpolation`` says how far a
smoother line would move the value.

    python scripts/studies/critical_amplitude.py first_sweep.zarr --level 0.5
"""

# %%
from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr
from study_tools import answer, done_tables, open_selected, print_rows, store_parser

from scanner.analysis import swept_parameters
from scanner.errors import ScannerError
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED
from scanner.statistics import Crossing, find_crossing, verdict_fractions

STORED = ("regular_volume_fraction", "regular_area_fraction")
COUNTED = {
    "chaotic_area_fraction": CHAOTIC,
    "undecided_area_fraction": UNDECIDED,
    "rotational_area_fraction": REGULAR_ROTATIONAL,
    "librational_area_fraction": REGULAR_LIBRATIONAL,
}
"""Fractions whose replicates are not stored but follow from the verdicts of the orbits."""


# %%
def replicates_of(tree: xr.DataTree, quantity: str) -> xr.DataArray:
    """Read or count a quantity by replicate; NaN for tables that are not done."""
    root = tree.to_dataset()
    if quantity in STORED:
        return root[f"{quantity}_replicates"]
    found = xr.full_like(root["regular_area_fraction_replicates"], np.nan)
    for table in done_tables(tree):
        counted = verdict_fractions(table.orbits["verdict"].values, {COUNTED[quantity]}, table.replicates)
        found.loc[table.parameters] = counted
    return found


def describe(crossing: Crossing) -> str:
    """Say what stands in the way of a single value."""
    if len(crossing.crossings) > 1:
        return "crosses at " + ", ".join(f"{place:.5g}" for place in crossing.crossings)
    return "" if crossing.crossings else "does not cross"


# %%
def main(arguments: Sequence[str] | None = None) -> None:
    """Print one row for each combination of the other swept parameters."""
    parser = store_parser(__doc__)
    parser.add_argument("--quantity", default=STORED[0], choices=[*STORED, *COUNTED], metavar="VARIABLE",
                        help=f"one of {', '.join([*STORED, *COUNTED])} (default: %(default)s)")  # fmt: skip
    parser.add_argument("--level", type=float, default=0.5, help="level to cross (default: %(default)s)")
    parser.add_argument("--along", default="amplitude", help="swept parameter (default: %(default)s)")
    parser.add_argument("--resamples", type=int, default=2000, help="of the bootstrap (default: %(default)s)")
    parser.add_argument("--seed", type=int, default=1, help="of the bootstrap (default: %(default)s)")
    options = parser.parse_args(arguments)
    tree = open_selected(options.store, options.select)
    names = swept_parameters(tree)
    if options.along not in names:
        raise ScannerError(f"--along {options.along}: not one of the swept parameters {', '.join(names) or '(none)'}")
    values = replicates_of(tree, options.quantity).sortby(options.along)
    others = [name for name in names if name != options.along]
    generator = np.random.default_rng(options.seed)
    rows: list[dict[str, object]] = []
    for index in np.ndindex(*(values.sizes[name] for name in others)):
        line = values.isel(dict(zip(others, index, strict=True))).transpose(options.along, "replicate")
        held = {name: line[name].item() for name in others}
        if np.isfinite(line.values).all(axis=1).sum() < 2:
            rows.append({**held, "note": "fewer than two tables are done"})
            continue
        crossing = find_crossing(
            line[options.along].values, line.values, options.level, generator=generator, resamples=options.resamples
        )
        rows.append(
            {
                **held,
                options.along: crossing.value,
                "stderr": crossing.stderr,
                "low": crossing.low,
                "high": crossing.high,
                "interpolation": crossing.interpolation,
                "unique": crossing.unique,
                "note": describe(crossing),
            }
        )
    print(f"{options.quantity} = {options.level:g} (interval of 95 %)")
    print_rows(rows)


# %%
if __name__ == "__main__":
    answer(main, example=["../../out/first_sweep.zarr"])
