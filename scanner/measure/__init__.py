"""Measure of the regular and chaotic parts of a table's phase space, with errors."""

from scanner.measure.fractions import table_numbers
from scanner.measure.sampling import section_points
from scanner.measure.survey import root_coordinates, survey_table

__all__ = ["root_coordinates", "section_points", "survey_table", "table_numbers"]
