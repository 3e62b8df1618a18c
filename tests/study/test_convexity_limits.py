"""How far families stay convex: closed forms against tables that are built, and limits that are found."""

import math

import pytest

from scanner.errors import TableError
from scanner.study.convexity import CONVEXITY, PRECISION, find_limits
from scanner.tables import FAMILIES, build_table

CLOSED_FORMS = [
    ("radial_harmonic", {"harmonic": 1}),
    ("radial_harmonic", {"harmonic": 5}),
    ("normal_harmonic", {"eccentricity": 0.0, "harmonic": 4, "phase": 0.3}),
    ("confocal_harmonic", {"eccentricity": 0.0, "harmonic": 3, "phase": 1.0}),
    ("support_harmonic", {"eccentricity": 0.0, "harmonic": 3, "phase": 0.0}),
    ("curvature_harmonic", {"harmonic": 3}),
    ("limacon", {}),
]


def build(family, given, value):
    return build_table(family, **given, **{CONVEXITY[family].parameter: value})


def test_every_family_has_its_rule():
    assert CONVEXITY.keys() == FAMILIES.keys()
    for name, convexity in CONVEXITY.items():
        assert convexity.parameter in {"", *(parameter.name for parameter in FAMILIES[name].parameters)}


@pytest.mark.parametrize(("family", "given"), CLOSED_FORMS)
def test_closed_forms_tell_convex_tables_from_others(family, given):
    low, high = find_limits(family, given)
    assert low == -high
    for limit in (low, high):
        # Convexity is judged to a relative 1e-12 of the curvature, which is quadratic in the amplitude at worst.
        assert build(family, given, limit * (1 - 1e-9)).is_convex
        assert not build(family, given, limit * (1 + 1e-9)).is_convex


def test_limits_without_a_closed_form_are_found():
    given = {"eccentricity": 0.6, "harmonic": 4, "phase": 0.0}
    low, high = find_limits("normal_harmonic", given)
    assert -low != pytest.approx(high, rel=0.01)  # a crest and a trough at the tips are not alike
    for limit in (low, high):
        assert build("normal_harmonic", given, limit).is_convex
        assert not build("normal_harmonic", given, limit * (1 + 2 * PRECISION)).is_convex


def test_the_bound_of_the_support_function_is_reached_by_a_crest_at_the_tip():
    eccentricity, harmonic = 0.6, 3
    bound = (1 - eccentricity**2) / (harmonic**2 - 1)
    crest = {"eccentricity": eccentricity, "harmonic": harmonic, "phase": 0.0}
    aside = {**crest, "phase": math.pi / 2}
    # found to PRECISION, and convexity is judged to a relative 1e-12 of the largest radius
    assert find_limits("support_harmonic", crest)[1] == pytest.approx(bound, rel=1e-8)
    assert find_limits("support_harmonic", aside)[1] > 1.05 * bound


def test_a_shift_never_ends_convexity():
    assert find_limits("support_harmonic", {"eccentricity": 0.5, "harmonic": 1, "phase": 0.0}) == (-math.inf, math.inf)


def test_all_other_parameters_are_asked_for():
    with pytest.raises(TableError, match="needs parameter harmonic"):
        find_limits("normal_harmonic", {"eccentricity": 0.6})
