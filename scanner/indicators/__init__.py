"""Chaos indicators: streaming averages and tangent growth, their readings at several horizons, and verdicts."""

from scanner.indicators.orbits import measure_orbits, orbit_numbers
from scanner.indicators.schedule import MINIMUM_BOUNCES, horizons

__all__ = ["MINIMUM_BOUNCES", "horizons", "measure_orbits", "orbit_numbers"]
