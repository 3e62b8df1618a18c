"""What a notebook shows of a study: what is asked, and the first and the last of its tables."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from scanner.cards import Line, draw, lay_card
from scanner.errors import ScannerError
from scanner.tables import build_table
from scanner.tables.card import outline

if TYPE_CHECKING:
    from scanner.study.model import Number, Study


def describe_study(study: Study) -> str:
    """Say in one line what a study asks for."""
    parameters = [f"{name}={value!r}" for name, value in study.fixed.items()]
    parameters += [f"{name}: {_describe_values(values)}" for name, values in study.swept.items()]
    orbits = study.orbits
    return (
        f"<Study {study.title!r}: {', '.join([study.family, *parameters])}; {orbits.per_table} orbits of "
        f"{orbits.bounces} bounces, {orbits.replicates} replicates, seed {study.seed}>"
    )


def study_card(study: Study) -> str:
    """HTML of a study; the outlines are those of the first table, faint, and of the last one."""
    facts = {"family": study.family}
    facts |= {name: str(value) for name, value in study.fixed.items()}
    facts |= {name: _describe_values(values) for name, values in study.swept.items()}
    orbits = study.orbits
    facts["orbits"] = f"{orbits.per_table} a table, of {orbits.bounces} bounces, in {orbits.replicates} replicates"
    if study.resonances is not None:
        facts["resonances"] = f"periods up to {study.resonances.period_max}"
    facts["seed"] = str(study.seed)
    facts["runs on"] = study.resources.runner
    return lay_card(study.title, facts, draw(_ends(study)))


def _describe_values(values: Sequence[Number]) -> str:
    """Write few values one by one, many as their ends and count."""
    if len(values) <= 6:
        return ", ".join(f"{value:.6g}" for value in values)
    return f"{values[0]:.6g} to {values[-1]:.6g}, {len(values)} values"


def _ends(study: Study) -> list[Line]:
    """Outlines of the first and the last table, as far as they can be built."""
    lines = []
    for end in (0, -1) if study.swept else (-1,):
        parameters = {**study.fixed, **{name: values[end] for name, values in study.swept.items()}}
        try:
            table = build_table(study.family, allow_code=study.allow_code, **parameters)
        except ScannerError:  # a drawing must not stand in the way of the facts
            continue
        lines.append(outline(table, faint=end == 0))
    return lines
