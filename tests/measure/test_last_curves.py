import math

import numpy as np
import pytest

from scanner.errors import TableError
from scanner.measure import survey_table
from scanner.measure.last_curves import curve_fate, last_curves
from scanner.quantities import CHAOTIC, CURVES, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED
from scanner.tables import build_table

CODES = {"r": REGULAR_ROTATIONAL, "l": REGULAR_LIBRATIONAL, "c": CHAOTIC, "u": UNDECIDED}


def reach(p, rotation, codes):
    return last_curves(np.array(p), np.array(rotation), np.array([CODES[code] for code in codes], dtype=np.int8))


def test_the_band_begins_above_the_last_orbit_of_another_kind():
    found = reach([0.1, 0.5, 0.7, 0.9, -0.2, -0.6, -0.8], [0.45, 0.3, 0.2, 0.1, 0.6, 0.7, 0.8], "rcrrruc")
    assert found["rotational_band_p_forward"] == 0.7
    assert found["rotational_band_p_forward_error"] == pytest.approx(0.2, abs=1e-15)
    # The highest orbit of this direction is chaotic: there is no band.
    assert found["rotational_band_p_backward"] == 1.0
    assert found["rotational_band_p_backward_error"] == pytest.approx(0.2, abs=1e-15)
    assert found["rotation_range_min"] == 0.1
    assert found["rotation_range_max"] == 0.45


def test_all_curves_and_none():
    everything = reach([0.1, -0.3], [0.4, 0.7], "rr")
    assert everything["rotational_band_p_forward"] == everything["rotational_band_p_forward_error"] == 0.1
    assert everything["rotation_range_min"] == pytest.approx(0.3, abs=1e-15)
    nothing = reach([0.1, -0.3], [0.4, 0.7], "lc")
    assert nothing["rotational_band_p_backward"] == 1.0
    assert math.isnan(nothing["rotation_range_max"])


def test_band_of_an_ellipse_ends_at_the_separatrix():
    """On the separatrix (1 - p^2)(sin^2 phi + b^2 cos^2 phi) = b^2, so that |p| is at most e, at the ends of b."""
    survey = survey_table(build_table("ellipse", eccentricity=0.6), orbits=256, bounces=8192, replicates=2)
    for direction in ("forward", "backward"):
        band = float(survey[f"rotational_band_p_{direction}"])
        error = float(survey[f"rotational_band_p_{direction}_error"])
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


@pytest.mark.parametrize("harmonic", [2, 3, 4])
@pytest.mark.parametrize("share", [0.99, 1.0])
def test_no_curve_survives_near_zero_curvature(harmonic, share):
    """Mather 1982: a boundary point of zero curvature destroys them all; just below, those that are not glancing."""
    table = build_table("radial_harmonic", amplitude=share / (1 + harmonic**2), harmonic=harmonic)
    assert table.curvature_min < 0.05
    for rotation in (*CURVES, 1.0 / (6.0 + CURVES[0])):
        assert curve_fate(table, rotation).fate == "broken"


def test_zero_curvature_leaves_no_band():
    flat = survey_table(
        build_table("radial_harmonic", amplitude=0.2, harmonic=2), orbits=256, bounces=4096, replicates=2
    )
    assert (flat["rotational_band_p_forward"], flat["rotational_band_p_backward"]) == (1.0, 1.0)


def test_residues_come_with_their_orbits():
    found = curve_fate(build_table("radial_harmonic", amplitude=0.12, harmonic=2))
    assert found.fate == "broken"
    assert found.orbits[:3] == ((1, 2), (1, 3), (2, 5))
    assert len(found.residues) == len(found.orbits)
    assert found.residues[-1] > 10.0


@pytest.mark.parametrize("rotation", [0.0, -0.2, 1.0, 1.3])
def test_a_rotation_out_of_range_is_refused(rotation):
    with pytest.raises(TableError, match="must be between 0 and 1"):
        curve_fate(build_table("ellipse", eccentricity=0.5), rotation)
