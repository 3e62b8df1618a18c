"""The page: what each of its parts says, put into the template."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import jinja2
import xarray as xr

from scanner.analysis import average_tables, failures, pick_tables, study_of, summarise, swept_parameters
from scanner.analysis.summary import count_statuses
from scanner.analysis.wording import first_and_last, write_parameters, write_summary
from scanner.cards import describe
from scanner.quantities import FAILED, TABLE_STATUS
from scanner.report.accuracy import list_doubts
from scanner.report.answer import describe_answer, question_of
from scanner.report.family import describe_family
from scanner.report.pictures import draw_pictures
from scanner.store.progress import SweepProgress

PROVENANCE = (
    "fingerprint",
    "versions",
    "python",
    "platform",
    "processor",
    "host",
    "cores",
    "started",
    "finished",
)
"""Attributes of a store that say where its numbers come from, in the order in which people look for them."""
MOST_FAULTS = 100


def make_page(
    tree: xr.DataTree,
    progress: SweepProgress,
    select: Mapping[str, float | str],
    average: tuple[str, ...],
    *,
    rows: int,
    allow_code: bool,
) -> tuple[str, str]:
    """Write the page of a sweep; see `scanner.report.write_report`.

    Returns
    -------
    page
        The HTML, which refers to nothing outside it.
    taken
        The stored tables that were selected, in words.
    """
    picked, held = pick_tables(tree, select)
    measured = picked.to_dataset().load()
    root = average_tables(measured, average)
    summary = summarise(root)
    names = swept_parameters(root)
    pictures, left_out = draw_pictures(tree, picked, dict(select), average, allow_code=allow_code)
    faults = failures(tree.to_dataset(), progress.failures)
    faults = faults[faults["table_status"] == TABLE_STATUS[FAILED]].drop(columns="table_status")
    content: dict[str, Any] = {
        "study": study_of(tree),
        "taken": describe(held),
        "average": average,
        "statuses": count_statuses(measured),
        "progress": progress,
        "question": question_of(tree),
        "answer": describe_answer(root),
        "family": describe_family(tree, measured),
        "pictures": pictures,
        "left_out": left_out,
        "table": write_summary(first_and_last(summary, rows), names),
        "rows_left_out": len(summary) - len(first_and_last(summary, rows)),
        "doubts": list_doubts(measured),
        "faults": write_parameters(faults.head(MOST_FAULTS), swept_parameters(tree)),
        "faults_left_out": max(len(faults) - MOST_FAULTS, 0),
        "provenance": {name: tree.attrs[name] for name in PROVENANCE if name in tree.attrs},
        "text": tree.attrs.get("study", ""),
    }
    environment = jinja2.Environment(
        loader=jinja2.PackageLoader("scanner.report", "."),
        autoescape=True,
        trim_blocks=True,
        lstrip_blocks=True,
        undefined=jinja2.StrictUndefined,
    )
    return environment.get_template("page.html").render(content), describe(held)
