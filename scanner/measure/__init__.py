"""Measure of the regular and chaotic parts of a table's phase space, with errors."""

from scanner.measure.fractions import table_numbers
from scanner.measure.last_curves import curve_fate, curve_numbers
from scanner.measure.resonances import survey_resonances
from scanner.measure.rounds import ORBITS_AT_ONCE, follow_rounds
from scanner.measure.sampling import section_points
from scanner.measure.survey import root_coordinates, survey_table

__all__ = [
    "ORBITS_AT_ONCE",
    "curve_fate",
    "curve_numbers",
    "follow_rounds",
    "root_coordinates",
    "section_points",
    "survey_resonances",
    "survey_table",
    "table_numbers",
]
