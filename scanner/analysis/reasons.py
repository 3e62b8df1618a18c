"""Why tables of a sweep are not convex: not stored, but soon found again from the study."""

from __future__ import annotations

import numpy as np
import xarray as xr

from scanner.errors import StudyError
from scanner.quantities import NOT_CONVEX
from scanner.study import make_plan, parse_study
from scanner.study.checking import check_table

MOST_TABLES = 500
"""Tables that are built again; a few milliseconds each."""


def why_not_convex(root: xr.Dataset) -> dict[tuple[int, ...], str]:
    """Build tables that are not convex again and say why they are not, by their index in the grid.

    Only the first few hundred; none where the family is the user's own or its outline is not found from here.
    """
    try:
        plan = make_plan(parse_study(str(root.attrs.get("study", ""))))
    except StudyError:
        return {}
    if root["table_status"].shape != plan.shape:
        return {}
    places = np.argwhere(root["table_status"].values == NOT_CONVEX)[:MOST_TABLES]
    indices = [tuple(map(int, place)) for place in places]
    return {index: check_table(plan, index, plan.parameters_at(index)).reason for index in indices}
