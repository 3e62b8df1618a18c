"""Images of orbits against the same orbits followed from the image of their start."""

import numpy as np
import pytest
import xarray as xr
from synthetic import IMAGES, invented_sweep

import scanner
from scanner.analysis import orbit_images
from scanner.errors import ScannerError
from scanner.measure import section_points
from scanner.quantities import CHAOTIC

CASES = {
    "time alone": ("support_harmonic", {"eccentricity": 0.5, "amplitude": 0.01, "harmonic": 3, "phase": 0.5}, 2),
    "a mirror": ("limacon", {"quadratic": 0.08}, 4),
    "half a turn": ("normal_harmonic", {"eccentricity": 0.5, "amplitude": 0.02, "harmonic": 2, "phase": 0.6}, 4),
    "turns and mirrors off the axis": (
        "normal_harmonic",
        {"eccentricity": 0.0, "amplitude": 0.02, "harmonic": 3, "phase": 0.7},
        12,
    ),
}


@pytest.fixture(scope="module", params=CASES.values(), ids=CASES)
def sampled(request):
    """Table, a few orbits of its fundamental part, all their images, and how many of each there must be."""
    family, parameters, images = request.param
    table = scanner.build_table(family, **parameters)
    orbits = scanner.measure_orbits(table, *section_points(table, 3, 2, 64), bounces=1024)
    mirror = np.nan if table.symmetry.mirror_s is None else table.symmetry.mirror_s
    return table, orbits, orbit_images(orbits, table.symmetry.order, mirror), images


def test_images_are_as_many_as_the_symmetry_says_and_fill_the_section(sampled):
    _, orbits, whole, images = sampled
    assert whole.sizes["orbit"] == images * orbits.sizes["orbit"]
    np.testing.assert_array_equal(whole["image_of"].values, np.tile(orbits["orbit"].values, images))
    assert ((whole["s0"] >= 0.0) & (whole["s0"] < 1.0)).all()
    # Evenly: a quarter of the section misses its share by no more than the low discrepancy of 64 points, a few percent.
    counts = np.histogram2d(whole["s0"], whole["p0"], 2, ((0.0, 1.0), (-1.0, 1.0)))[0]
    np.testing.assert_allclose(counts / counts.sum(), 0.25, atol=0.03)
    points = set(zip(whole["s0"].values.round(12), whole["p0"].values.round(12), strict=True))
    assert len(points) == whole.sizes["orbit"]


def test_an_image_is_the_orbit_from_there(sampled):
    """Regular orbits: verdict, rotation, island and its centre agree whichever image is followed."""
    table, _, whole, _ = sampled
    again = scanner.measure_orbits(table, whole["s0"].values, whole["p0"].values, bounces=1024)
    same = whole["verdict"].values == again["verdict"].values
    # Time reversal turns the bounces of an orbit into others of the same curve: a few at the threshold change sides.
    assert same.mean() > 0.97
    chosen = same & (whole["verdict"].values < CHAOTIC)
    assert chosen.sum() > 0.3 * chosen.size
    expected, found = whole.isel(orbit=chosen), again.isel(orbit=chosen)
    np.testing.assert_array_equal(expected["island_period"], found["island_period"])
    np.testing.assert_array_equal(expected["island_rotation"], found["island_rotation"])
    # Verdicts of regular take four digits of agreement.
    np.testing.assert_allclose(expected["rotation_number"], found["rotation_number"], atol=2e-4)
    np.testing.assert_allclose(expected["mean_chord"], found["mean_chord"], atol=5e-3)
    known = np.isfinite(expected["island_centre_s"].values) & np.isfinite(found["island_centre_s"].values)
    apart = (expected["island_centre_s"] - found["island_centre_s"] + 0.5).values[known] % 1.0 - 0.5
    np.testing.assert_allclose(apart, 0.0, atol=1e-9)
    np.testing.assert_allclose(
        expected["island_centre_p"].values[known], found["island_centre_p"].values[known], atol=1e-9
    )


def test_orbits_without_a_verdict_have_no_images(sampled):
    _, orbits, _, images = sampled
    partly = orbits.copy(deep=True)
    partly["verdict"][5:] = 0
    assert orbit_images(partly, 1).sizes["orbit"] == 2 * 5
    assert images >= 2


def test_attributes_and_types_stay(sampled):
    _, orbits, whole, _ = sampled
    for name, variable in orbits.data_vars.items():
        assert whole[name].attrs == variable.attrs
        assert whole[name].dtype == variable.dtype
        assert whole[name].dims == variable.dims


def test_the_section_of_one_table_of_a_sweep():
    tree = invented_sweep({"amplitude": [0.0, 0.02, 0.04]}, orbits=16)
    whole = scanner.whole_section(tree.sel(amplitude=0.019, method="nearest"))
    assert whole.sizes["orbit"] == IMAGES * 16
    assert set(whole["s0"].values[:16]) == set(tree["orbits/s0"].values[1])
    with pytest.raises(ScannerError, match="select a value of amplitude first"):
        scanner.whole_section(tree)


def test_a_sweep_that_sampled_the_whole_section_stays_as_it_is():
    tree = invented_sweep({}, orbits=16)
    root = tree.to_dataset().drop_vars(["symmetry_order", "mirror_s"])
    earlier = xr.DataTree.from_dict({"/": root, "/orbits": tree["orbits"].to_dataset(inherit=False)})
    assert scanner.whole_section(earlier)["s0"].equals(tree["orbits/s0"])
