"""Reading a finished or half-finished sweep: picking tables, averaging, summary, whole sections, other formats.

Works on labelled data alone, so also on a store of last year.
"""

from __future__ import annotations

from scanner.analysis.export import export_sweep
from scanner.analysis.files import check_target, replace_whole
from scanner.analysis.reasons import why_not_convex
from scanner.analysis.summary import failures, summarise
from scanner.analysis.sweep import (
    StudyFacts,
    average_tables,
    pick_tables,
    require_resonances,
    study_of,
    swept_parameters,
)
from scanner.analysis.whole_section import orbit_images, whole_section

__all__ = [
    "StudyFacts",
    "average_tables",
    "check_target",
    "export_sweep",
    "failures",
    "orbit_images",
    "pick_tables",
    "replace_whole",
    "require_resonances",
    "study_of",
    "summarise",
    "swept_parameters",
    "whole_section",
    "why_not_convex",
]
