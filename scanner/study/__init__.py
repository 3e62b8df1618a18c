"""What is asked: the study file, its parameters, its tasks and what they will cost."""

from scanner.study.checking import TableCheck, check_table
from scanner.study.estimate import Estimate, estimate_cost
from scanner.study.limits import check_limits
from scanner.study.model import Orbits, Resources, Study
from scanner.study.numerics import numerics_version
from scanner.study.plan import Plan, Task, make_plan
from scanner.study.reading import load_study, parse_study

__all__ = [
    "Estimate",
    "Orbits",
    "Plan",
    "Resources",
    "Study",
    "TableCheck",
    "Task",
    "check_limits",
    "check_table",
    "estimate_cost",
    "load_study",
    "make_plan",
    "numerics_version",
    "parse_study",
]
