"""Tables: closed curves of a family, measured and ready for the kernels."""

from scanner.tables.building import build_table, check_parameters
from scanner.tables.families import FAMILIES, Family, Parameter
from scanner.tables.symmetry import Symmetry
from scanner.tables.table import Table

__all__ = ["FAMILIES", "Family", "Parameter", "Symmetry", "Table", "build_table", "check_parameters"]
