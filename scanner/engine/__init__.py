"""Tasks and their fate: a study is given to workers piece by piece until its store is finished."""

from scanner.engine.sweep import SweepReport, run_study

__all__ = ["SweepReport", "run_study"]
