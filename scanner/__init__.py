"""Sweeps of near-elliptic billiard tables: how much is regular, how chaotic the rest is, and how far to trust it.

Nothing heavy is loaded until a name is used.
"""

from __future__ import annotations

import importlib

_HOMES = {
    "build_table": "scanner.tables",
    "trace": "scanner.bounce",
    "measure_orbits": "scanner.indicators",
    "survey_table": "scanner.measure",
    "survey_resonances": "scanner.measure",
    "curve_fate": "scanner.measure",
    "open_sweep": "scanner.store",
    "run_study": "scanner.engine",
    "whole_section": "scanner.analysis",
}

__all__ = [
    "build_table",
    "curve_fate",
    "measure_orbits",
    "open_sweep",
    "run_study",
    "survey_resonances",
    "survey_table",
    "trace",
    "whole_section",
]

__version__ = "0.1.0"


def __getattr__(name: str) -> object:
    if name in _HOMES:
        return getattr(importlib.import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'scanner' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted([*globals(), *_HOMES])
