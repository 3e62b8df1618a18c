# %% [markdown]
"""What the thresholds of the verdicts rest on: ellipses, all regular, and mixed tables followed longer.

For ellipses it prints the tails of what the thresholds are laid on: the growth of a tangent vector beyond ln(bounces),
and the digits to which the averages of two halves agree.  For tables with islands and chaos it compares verdicts with
those of the same orbits followed longer: how many are wrong when all orbits get all the bounces, how many when those
that are clear are left early, and what that saves.

    python scripts/studies/calibrate_verdicts.py --orbits 1024
"""

# %%
from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from study_tools import OneLineParser, answer, print_rows

from scanner.errors import ScannerError
from scanner.indicators import MINIMUM_BOUNCES, orbit_numbers
from scanner.indicators.blocks import Batch
from scanner.indicators.readings import Readings, read_streams
from scanner.indicators.schedule import make_schedule
from scanner.indicators.verdicts import CHAOTIC_GROWTH, REGULAR_DIGITS, SHEAR_GROWTH, judge
from scanner.measure import section_points
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED
from scanner.tables import Table, build_table
from scanner.tables.curve import bring_to_unit_size

ECCENTRICITIES = (0.3, 0.5, 0.7, 0.8, 0.9, 0.95, 0.98, 0.99)
MIXED: tuple[tuple[str, dict[str, Any]], ...] = (
    ("limacon", {"quadratic": 0.15}),
    ("limacon", {"quadratic": 0.1}),
    ("radial_harmonic", {"harmonic": 2, "amplitude": 0.05}),
    ("radial_harmonic", {"harmonic": 2, "amplitude": 0.08}),
    ("radial_harmonic", {"harmonic": 2, "amplitude": 0.12}),
    ("radial_harmonic", {"harmonic": 3, "amplitude": 0.05}),
    ("radial_harmonic", {"harmonic": 4, "amplitude": 0.02}),
    ("radial_harmonic", {"harmonic": 5, "amplitude": 0.01}),
)
SEED = 1


# %%
def read_table(table: Table, orbits: int, bounces: int) -> tuple[Readings, np.ndarray]:
    """Readings and verdicts of orbits spread over the section, after all the bounces."""
    s, p = section_points(table, SEED, 1, orbits)
    schedule = make_schedule(bounces)
    harmonics, unit = bring_to_unit_size(table.harmonics)
    batch = Batch(harmonics, table.turns_from_arc(s), p, schedule)
    last = len(schedule.horizons) - 1
    *_, streams = (batch.advance(number) for number in range(last + 1))
    readings = read_streams(streams, schedule, last, table.mean_chord_exact / unit)
    return readings, judge(readings, streams.failed).code


def tails_of(eccentricity: float, orbits: int, bounces: int) -> dict[str, object]:
    """Tails of growth and of digits on an ellipse, and how often the verdict is not regular."""
    readings, verdict = read_table(build_table("ellipse", eccentricity=eccentricity), orbits, bounces)
    excess = readings.growth - math.log(bounces)
    row: dict[str, object] = {"eccentricity": eccentricity}
    row |= {f"growth_{share:g}": np.quantile(excess, share) for share in (0.5, 0.99, 0.999)}
    row["growth_max"] = excess.max()
    row |= {f"digits_{share:g}": np.quantile(readings.digits, share) for share in (0.5, 0.01, 0.001)}
    row["digits_min"] = readings.digits.min()
    row["percent_undecided"] = 100.0 * float((verdict == UNDECIDED).mean())
    row["percent_chaotic"] = 100.0 * float((verdict == CHAOTIC).mean())
    return row


def compare_on(table: Table, orbits: int, bounces: int, reference: int) -> dict[str, object]:
    """Count wrong verdicts with all the bounces and of orbits left early, against ``reference`` bounces."""
    s, p = section_points(table, SEED, 1, orbits)
    full = orbit_numbers(table, s, p, bounces, adaptive=False)
    early = orbit_numbers(table, s, p, bounces)
    # Exponential growth cannot be taken back: what is chaotic need not be followed longer.
    truth = full["verdict"].copy()
    open_ones = np.flatnonzero(truth != CHAOTIC)
    if open_ones.size:
        truth[open_ones] = orbit_numbers(table, s[open_ones], p[open_ones], reference, adaptive=False)["verdict"]
    left = early["bounces_used"] < bounces
    row: dict[str, object] = {"chaotic": np.count_nonzero(truth == CHAOTIC)}
    for name, found in (("all", full), ("early", early)):
        regular = np.isin(found["verdict"], (REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL))
        row[f"{name}_regular_wrong"] = np.count_nonzero(regular & (truth == CHAOTIC))
        row[f"{name}_undecided"] = np.count_nonzero(found["verdict"] == UNDECIDED)
        if name == "early":
            row["left_as_regular_wrong"] = np.count_nonzero(left & regular & (truth == CHAOTIC))
    row["chaotic_wrong"] = np.count_nonzero((early["verdict"] == CHAOTIC) & (full["verdict"] != CHAOTIC))
    row["bounces"] = float(early["bounces_used"].mean())
    row["percent"] = 100.0 * float(early["bounces_used"].mean()) / bounces
    return row


# %%
def main(arguments: Sequence[str] | None = None) -> None:
    """Print the tails on ellipses, then a table of verdicts for each mixed table."""
    parser = OneLineParser(description=__doc__.splitlines()[0])
    parser.add_argument("--orbits", type=int, default=512, help="orbits a table (default: %(default)s)")
    parser.add_argument("--bounces", type=int, default=8192, help="bounces judged (default: %(default)s)")
    parser.add_argument("--reference", type=int, default=131072, help="bounces of reference (default: %(default)s)")
    options = parser.parse_args(arguments)
    if not MINIMUM_BOUNCES <= options.bounces < options.reference:
        raise ScannerError(
            f"--bounces {options.bounces} must be at least {MINIMUM_BOUNCES} and below --reference {options.reference}"
        )
    print(
        f"ellipses, {options.orbits} orbits of {options.bounces} bounces: growth beyond ln(bounces), digits that agree"
    )
    print(f"thresholds: growth {SHEAR_GROWTH:g} and {CHAOTIC_GROWTH:g}, digits {REGULAR_DIGITS:g}")
    print_rows([tails_of(eccentricity, options.orbits, options.bounces) for eccentricity in ECCENTRICITIES])
    print(f"\nmixed tables, {options.orbits} orbits each: verdicts after all {options.bounces} bounces, and of orbits")
    print(f"left early, that are wrong by {options.reference} bounces")
    rows = []
    for family, parameters in MIXED:
        words = " ".join([family, *(str(value) for value in parameters.values())])
        table = build_table(family, **parameters)
        rows.append({"table": words} | compare_on(table, options.orbits, options.bounces, options.reference))
    print_rows(rows)


# %%
if __name__ == "__main__":
    answer(main, example=["--orbits", "256", "--bounces", "2048", "--reference", "16384"])
