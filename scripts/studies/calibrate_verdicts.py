# %%
"""What the thresholds of the verdicts rest on: ellipses, all regular, and mixed tables followed longer.

For ellipses it prints the tails of what the thresholds are laid on: the growth of a tangent vector beyond ln(bounces),
and the digits to which the averages of two halves agree.  For tables with islands and chaos it prints how the verdicts
after few bounces compare with those of the same orbits after many: fractions of the section, in percent.

    python scripts/studies/calibrate_verdicts.py --orbits 1024
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from study_tools import OneLineParser, answer, print_rows

from scanner.errors import ScannerError
from scanner.indicators import MINIMUM_BOUNCES
from scanner.indicators.blocks import stream_orbits
from scanner.indicators.readings import Readings, read_streams
from scanner.indicators.schedule import make_schedule
from scanner.indicators.verdicts import CHAOTIC_GROWTH, REGULAR_DIGITS, SHEAR_GROWTH, judge
from scanner.measure import section_points
from scanner.quantities import VERDICTS
from scanner.tables import Table, build_table

ECCENTRICITIES = (0.3, 0.5, 0.7, 0.8, 0.9, 0.95, 0.98, 0.99)
MIXED: tuple[tuple[str, dict[str, Any]], ...] = (
    ("limacon", {"quadratic": 0.15}),
    ("limacon", {"quadratic": 0.1}),
    ("radial_harmonic", {"harmonic": 2, "amplitude": 0.05}),
    ("radial_harmonic", {"harmonic": 2, "amplitude": 0.12}),
    ("radial_harmonic", {"harmonic": 3, "amplitude": 0.05}),
    ("radial_harmonic", {"harmonic": 5, "amplitude": 0.01}),
)
SEED = 1


# %%
def read_table(table: Table, orbits: int, bounces: int) -> tuple[Readings, np.ndarray]:
    """Readings and verdicts of orbits spread over the section, after all the bounces."""
    s, p = section_points(table, SEED, 1, orbits)
    schedule = make_schedule(bounces)
    streams = stream_orbits(table.harmonics, table.turns_from_arc(s), p, schedule)
    readings = read_streams(streams, schedule, len(schedule.horizons) - 1, table.mean_chord_exact)
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
    row["percent_undecided"] = 100.0 * float((verdict == VERDICTS.index("undecided")).mean())
    row["percent_chaotic"] = 100.0 * float((verdict == VERDICTS.index("chaotic")).mean())
    return row


def confusion_of(table: Table, orbits: int, bounces: int, reference: int) -> list[dict[str, object]]:
    """Verdicts after ``bounces`` in rows, after ``reference`` in columns: percent of the section."""
    _, early = read_table(table, orbits, bounces)
    _, late = read_table(table, orbits, reference)
    return [
        {f"after {bounces}": name}
        | {late_name: 100.0 * float(((early == code) & (late == late_code)).mean())
           for late_code, late_name in enumerate(VERDICTS) if late_code}
        for code, name in enumerate(VERDICTS)
        if code
    ]  # fmt: skip


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
    for family, parameters in MIXED:
        words = ", ".join(f"{name} = {value}" for name, value in parameters.items())
        print(f"\n{family}, {words}: percent of the section, columns after {options.reference} bounces", flush=True)
        table = build_table(family, **parameters)
        print_rows(confusion_of(table, options.orbits, options.bounces, options.reference))


# %%
if __name__ == "__main__":
    answer(main)
