"""Averages over an ensemble: closed forms, recovery of both kinds of scatter, agreement with averaged tables."""

import math

import numpy as np
import pytest
import xarray as xr
from scipy.stats import binom
from synthetic import invented_sweep

from scanner.analysis import average_tables
from scanner.errors import ScannerError
from scanner.statistics import ensemble_average

DIMS = ("amplitude", "realisation")


def arrays(values, errors):
    return [xr.DataArray(np.atleast_2d(array), dims=DIMS) for array in (values, errors)]


def test_a_small_ensemble_by_hand():
    """Values 1, 2, 3, 6: mean 3, variance 14/3; errors 1 within: 11/3 between, 11/14 of the variance."""
    found = ensemble_average(*arrays([1.0, 2.0, 3.0, 6.0], [1.0, 1.0, 1.0, 1.0]), ["realisation"]).isel(amplitude=0)
    expected = {
        "mean": 3.0,
        "stderr": math.sqrt(14.0 / 12.0),
        "between": math.sqrt(11.0 / 3.0),
        "within": 1.0,
        "share": 11.0 / 14.0,
        "tables": 4,
    }
    assert {name: found[name].item() for name in expected} == pytest.approx(expected, rel=1e-14)
    # Quantiles 9.348404 and 0.2157953 of chi-squared with 3 degrees of freedom, as printed in tables.
    ends = math.sqrt(14.0 / 9.348404 - 1.0), math.sqrt(14.0 / 0.2157953 - 1.0)
    assert (found["between_low"].item(), found["between_high"].item()) == pytest.approx(ends, rel=1e-5)


def test_both_kinds_of_scatter_are_recovered():
    """Over 400 ensembles of 20: variances to 1 / sqrt(400 19 / 2) = 1.6 %, times total over part, three times."""
    generator = np.random.default_rng(1)
    between, within = 0.3, 0.2
    truths = 1.0 + between * generator.standard_normal((400, 20))
    found = ensemble_average(
        *arrays(truths + within * generator.standard_normal((400, 20)), np.full((400, 20), within)), ["realisation"]
    )
    assert (found["between"] ** 2).mean().item() == pytest.approx(between**2, rel=0.075)
    covered = int(((found["between_low"] <= between) & (between <= found["between_high"])).sum())
    assert binom.ppf(1e-3, 400, 0.95) <= covered <= binom.ppf(1.0 - 1e-3, 400, 0.95)
    # The error of the mean is right: |z| has unit variance up to a t distribution's 19 / 17, known to 7 %.
    z = (found["mean"] - 1.0) / found["stderr"]
    assert z.std().item() == pytest.approx(math.sqrt(19.0 / 17.0), rel=0.15)


def test_no_scatter_between_is_seen_as_none():
    """Negative control: only sampling noise; the interval reaches 0 in all but 2.5 % of the ensembles."""
    generator = np.random.default_rng(2)
    noise = generator.standard_normal((400, 20))
    found = ensemble_average(*arrays(noise, np.ones((400, 20))), ["realisation"])
    detections = int((found["between_low"] > 0.0).sum())
    assert detections <= binom.ppf(1.0 - 1e-3, 400, 0.025)
    assert 100 < int((found["between"] == 0.0).sum()) < 300


def test_tables_without_numbers_do_not_count():
    values, errors = arrays([[1.0, math.nan, 3.0], [math.nan, math.nan, 5.0], [math.nan] * 3], np.zeros((3, 3)))
    found = ensemble_average(values, errors, ["realisation"])
    np.testing.assert_array_equal(found["tables"], [2, 1, 0])
    np.testing.assert_array_equal(found["mean"], [2.0, 5.0, math.nan])
    np.testing.assert_array_equal(found["stderr"], [1.0, math.nan, math.nan])
    np.testing.assert_array_equal(found["share"], [1.0, math.nan, math.nan])


def test_mean_and_error_are_those_of_averaged_tables():
    root = invented_sweep({"amplitude": [0.0, 0.1, 0.2], "realisation": [1, 2, 3, 4, 5]}).to_dataset()
    name = "regular_area_fraction"
    found = ensemble_average(root[name], root[f"{name}_stderr"], ["realisation"])
    averaged = average_tables(root, ["realisation"])
    np.testing.assert_allclose(found["mean"], averaged[name], rtol=1e-13)
    np.testing.assert_allclose(found["stderr"], averaged[f"{name}_stderr"], rtol=1e-12)
    np.testing.assert_array_equal(found["amplitude"], root["amplitude"])


def test_over_several_dimensions_and_any_order():
    generator = np.random.default_rng(3)
    values = xr.DataArray(generator.random((4, 3, 2)), dims=("realisation", "amplitude", "decay"))
    errors = (0.1 * values).transpose("decay", "amplitude", "realisation")
    found = ensemble_average(values, errors, ["realisation", "decay"])
    assert found["mean"].dims == ("amplitude",)
    np.testing.assert_allclose(found["mean"], values.mean(["realisation", "decay"]), rtol=1e-14)
    assert (found["tables"] == 8).all()


@pytest.mark.parametrize(
    ("over", "confidence", "message"),
    [(["phase"], 0.95, "phase"), ([], 0.95, "no dimension"), (["realisation"], 1.0, "confidence = 1")],
)
def test_bad_requests_are_refused_in_one_line(over, confidence, message):
    with pytest.raises(ScannerError, match=message) as caught:
        ensemble_average(*arrays([1.0, 2.0], [0.1, 0.1]), over, confidence=confidence)
    assert "\n" not in str(caught.value)


def test_arrays_of_two_shapes_are_refused():
    values, errors = arrays([1.0, 2.0], [0.1, 0.1])
    with pytest.raises(ScannerError, match="same dimensions"):
        ensemble_average(values, errors.isel(realisation=slice(1)), ["realisation"])
