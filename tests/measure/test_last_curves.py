import math

import numpy as np
import pytest

from scanner.bounce import trace
from scanner.errors import TableError
from scanner.measure import survey_table
from scanner.measure.last_curves import curve_fate, find_band, last_curves
from scanner.quantities import CHAOTIC, CURVES, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED
from scanner.tables import build_table

CODES = {"r": REGULAR_ROTATIONAL, "l": REGULAR_LIBRATIONAL, "c": CHAOTIC, "u": UNDECIDED}


def reach(p, rotation, codes):
    return last_curves(np.array(p), np.array(rotation), np.array([CODES[code] for code in codes], dtype=np.int8))


def test_the_band_begins_above_the_last_orbit_of_another_kind():
    found = reach([0.1, 0.5, 0.7, 0.9, -0.2, -0.6, -0.8], [0.45, 0.3, 0.2, 0.1, 0.6, 0.7, 0.8], "rcrrrlr")
    assert found["rotational_band_p"].tolist() == [0.7, 0.7]
    assert found["rotational_band_p_error"] == pytest.approx([0.1, 0.1], abs=1e-15)
    assert found["rotation_range_min"] == 0.1
    assert found["rotation_range_max"] == 0.45


@pytest.mark.parametrize(
    ("codes", "band", "error"),
    [
        ("crrrr", 0.3, 0.2),
        # Doubt below the last chaotic orbit is none.
        ("ucrrr", 0.5, 0.2),
        # From 0.1 up to 0.9 the band may begin anywhere, wherever the doubt is in between.
        ("crrur", 0.3, 0.6),
        ("cruur", 0.3, 0.6),
        ("cuuur", 0.9, 0.8),
        # If the doubtful orbit at the top is not rotational there is no band at all.
        ("crrru", 0.3, 0.7),
        ("cuuuu", 1.0, 0.9),
        ("urrrr", 0.3, 0.3),
    ],
)
def test_undecided_orbits_enlarge_the_error_and_do_not_move_the_band(codes, band, error):
    height = np.array([0.1, 0.3, 0.5, 0.7, 0.9])
    verdict = np.array([CODES[code] for code in codes], dtype=np.int8)
    assert find_band(height, verdict) == pytest.approx((band, error), abs=1e-15)


@pytest.mark.parametrize("truth", ["r", "c"])
def test_the_error_covers_whatever_the_undecided_orbits_turn_out_to_be(truth):
    """Where all beyond the edge is rotational and all below chaotic, but many verdicts are missing."""
    draw = np.random.default_rng(3)
    for _ in range(200):
        height, edge = draw.random(40), draw.random()
        verdict = np.where(height > edge, REGULAR_ROTATIONAL, CHAOTIC).astype(np.int8)
        doubtful = draw.random(40) < 0.3
        band, error = find_band(height, np.where(doubtful, np.int8(UNDECIDED), verdict))
        told = find_band(height, np.where(doubtful, np.int8(CODES[truth]), verdict))[0]
        for answer in (edge, told):
            assert band - error - 1e-15 <= answer <= band + error + 1e-15


def test_orbits_count_for_both_directions():
    """The highest orbit of one direction is chaotic: there is no band, as it also runs backwards."""
    found = reach([0.7, -0.8], [0.2, 0.8], "rc")
    assert found["rotational_band_p"].tolist() == [1.0, 1.0]
    assert found["rotational_band_p_error"] == pytest.approx([0.2, 0.2], abs=1e-15)


def test_all_curves_and_none():
    everything = reach([0.1, -0.3], [0.4, 0.7], "rr")
    assert everything["rotational_band_p"].tolist() == everything["rotational_band_p_error"].tolist() == [0.1, 0.1]
    assert everything["rotation_range_min"] == pytest.approx(0.3, abs=1e-15)
    nothing = reach([0.1, -0.3], [0.4, 0.7], "lc")
    assert nothing["rotational_band_p"].tolist() == [1.0, 1.0]
    assert math.isnan(nothing["rotation_range_max"])


def test_band_of_an_ellipse_ends_at_the_separatrix():
    """On the separatrix (1 - p^2)(sin^2 phi + b^2 cos^2 phi) = b^2, so that |p| is at most e, at the ends of b."""
    survey = survey_table(build_table("ellipse", eccentricity=0.6), orbits=256, bounces=8192, replicates=2)
    for direction in ("forward", "backward"):
        band = float(survey["rotational_band_p"].sel(direction=direction))
        error = float(survey["rotational_band_p_error"].sel(direction=direction))
        assert band - error < 0.6 < band + 0.05
        assert 0.0 < error < 0.05
    # Rotation numbers of the ellipse's rotational curves fill (0, 1/2); those of 256 orbits come near both ends.
    assert survey["rotation_range_min"] < 0.05
    assert 0.4 < survey["rotation_range_max"] < 0.5


@pytest.mark.parametrize("rotation", CURVES)
def test_all_curves_of_an_ellipse_survive_and_those_of_a_gentle_deformation(rotation):
    assert curve_fate(build_table("ellipse", eccentricity=0.6), rotation).fate == "survives"
    assert curve_fate(build_table("radial_harmonic", amplitude=0.01, harmonic=2), rotation).fate == "survives"
    assert curve_fate(build_table("limacon", quadratic=0.05), 1.0 - rotation).fate == "survives"


def flat_tables():
    """Tables just below and at the limit of convexity, their least curvature being 0 there (closed forms)."""
    for share in (0.99, 1.0):
        for harmonic in (2, 3, 4):
            yield "radial_harmonic", {"amplitude": share / (1 + harmonic**2), "harmonic": harmonic}
        yield "limacon", {"quadratic": 0.25 * share}
    yield "lame", {"exponent": 4.0, "aspect": 0.8}


@pytest.mark.parametrize(("family", "parameters"), list(flat_tables()), ids=str)
def test_no_curve_survives_near_zero_curvature(family, parameters):
    """Mather 1982: a boundary point of zero curvature destroys them all; just below, those that are not glancing."""
    table = build_table(family, **parameters)
    assert table.curvature_min < 0.05
    for rotation in CURVES:
        assert curve_fate(table, rotation).fate == "broken"
    # Their residues grow the slower the closer to glancing, and still there is none that would survive.
    for whole in (7, 15):
        assert curve_fate(table, 1.0 / (whole + CURVES[0])).fate != "survives"


def test_zero_curvature_leaves_no_band():
    flat = survey_table(
        build_table("radial_harmonic", amplitude=0.2, harmonic=2), orbits=256, bounces=4096, replicates=2
    )
    assert flat["rotational_band_p"].values.tolist() == [1.0, 1.0]


def test_orbits_cross_a_broken_curve_and_none_that_survives():
    """The advance of an orbit over 500 bounces at a time tells on which side of the curve it is; computed here."""
    curve = CURVES[0]
    s, p = (grid.ravel() for grid in np.meshgrid(np.arange(4) / 8.0, np.linspace(0.2, 0.5, 8)))
    for amplitude, fate, crossed in ((0.045, "survives", False), (0.06, "broken", True)):
        table = build_table("radial_harmonic", amplitude=amplitude, harmonic=2)
        assert curve_fate(table, curve).fate == fate
        advance = np.diff(trace(table, s, p, bounces=40_000)["s"].values) % 1.0
        means = advance.reshape(s.size, -1, 500).mean(axis=-1)
        # Orbits on the curve itself have means within 1/500 of it.
        crossing = (means.min(axis=1) < curve - 0.004) & (means.max(axis=1) > curve + 0.004)
        assert crossing.any() == crossed


def test_growth_of_the_residues_passes_zero_once():
    """Computed here: the first of the curves of the limacon breaks near 0.111, as its residues tend to 1/4 there."""
    growth = [curve_fate(build_table("limacon", quadratic=value)).growth for value in (0.08, 0.1, 0.11, 0.12, 0.15)]
    assert growth == sorted(growth)
    assert growth[2] < 0.0 < growth[3]


def test_residues_come_with_their_orbits():
    found = curve_fate(build_table("radial_harmonic", amplitude=0.12, harmonic=2))
    assert found.fate == "broken"
    assert found.orbits[:3] == ((1, 2), (1, 3), (2, 5))
    assert len(found.residues) == len(found.orbits)
    assert found.residues[-1] > 10.0
    assert found.growth > 3.0 * found.growth_error > 0.0


def test_a_curve_with_too_few_orbits_is_undecided():
    found = curve_fate(build_table("radial_harmonic", amplitude=0.12, harmonic=2), longest_orbit=1)
    assert (found.fate, found.orbits) == ("undecided", ())


@pytest.mark.parametrize("rotation", [0.0, -0.2, 1.0, 1.3])
def test_a_rotation_out_of_range_is_refused(rotation):
    with pytest.raises(TableError, match=f"rotation = {rotation} must be between 0 and 1"):
        curve_fate(build_table("ellipse", eccentricity=0.5), rotation)
