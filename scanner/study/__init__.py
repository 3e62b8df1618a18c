"""What is asked: the study file, its parameters, its tasks and what they will cost."""

from scanner.study.model import Orbits, Resources, Study
from scanner.study.plan import Plan, Task, make_plan
from scanner.study.reading import load_study, parse_study

__all__ = ["Orbits", "Plan", "Resources", "Study", "Task", "load_study", "make_plan", "parse_study"]
