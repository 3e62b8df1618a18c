# %% [markdown]
"""The fraction that is still regular after infinitely many bounces.

Verdicts after an eighth, a quarter, a half and all of the bounces show how chaotic orbits that stick to islands are
found out one by one.  What is extrapolated, as a power of the number of bounces, is by default all that has not been
found chaotic yet; with ``--regular`` it is what has been found regular, which tends to the same limit but can rise at
first, while orbits are still undecided.

    python scripts/studies/regular_fraction_at_infinity.py first_sweep.zarr --select harmonic=2
"""

# %%
from __future__ import annotations

from collections.abc import Sequence

from study_tools import DoneTable, answer, done_tables, open_selected, print_rows, store_parser

from scanner.quantities import REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED
from scanner.statistics import EXPONENT_RANGE, extrapolate_fraction, verdict_fractions

LATE = 4
"""Horizons that count, from an eighth of the bounces on: before, orbits are found out that do not stick at all."""


# %%
def row_of(table: DoneTable, codes: set[int], section: bool, exponents: tuple[float, float]) -> dict[str, object]:
    """Extrapolate one table."""
    verdicts = table.orbits["verdict_by_horizon"].values[:, -LATE:]
    fractions = verdict_fractions(verdicts, codes, table.replicates, None if section else table.chords)
    found = extrapolate_fraction(table.root["horizon"].values[-LATE:], fractions, exponents=exponents)
    return {
        **table.parameters,
        "last": found.last,
        "last_stderr": found.last_stderr,
        "at_infinity": found.value,
        "stderr": found.stderr,
        "low": found.low,
        "high": found.high,
        "exponent": found.exponent,
        "undecided": found.reason,
    }


# %%
def main(arguments: Sequence[str] | None = None) -> None:
    """Print one row a table."""
    parser = store_parser(__doc__)
    parser.add_argument("--section", action="store_true", help="fraction of the section instead of the energy shell")
    parser.add_argument("--regular", action="store_true", help="only what has been found regular")
    parser.add_argument(
        "--exponents",
        nargs=2,
        type=float,
        default=EXPONENT_RANGE,
        metavar=("LOW", "HIGH"),
        help="range of the exponent of stickiness, equally probable in it (default: %(default)s)",
    )
    options = parser.parse_args(arguments)
    codes = {REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL} | (set() if options.regular else {UNDECIDED})
    tree = open_selected(options.store, options.select)
    low, high = options.exponents
    print_rows([row_of(table, codes, options.section, (low, high)) for table in done_tables(tree)])


# %%
if __name__ == "__main__":
    answer(main, example=["../../out/first_sweep.zarr", "--select", "harmonic=2"])
