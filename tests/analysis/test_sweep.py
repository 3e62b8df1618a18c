"""Picking and averaging tables, on invented numbers."""

from __future__ import annotations

import numpy as np
import pytest
from synthetic import BOUNCES, invented_sweep

from scanner.analysis import average_tables, pick_tables, study_of, swept_parameters
from scanner.cards import describe
from scanner.errors import ScannerError

SWEPT = {"amplitude": [0.0, 0.05, 0.1], "harmonic": [2, 3], "phase": [0.0, 0.25]}


def test_parameters_come_in_the_order_of_the_study():
    assert swept_parameters(invented_sweep(SWEPT)) == ("amplitude", "harmonic", "phase")
    assert swept_parameters(invented_sweep({})) == ()


def test_study_is_read_from_the_attributes():
    study = study_of(invented_sweep(SWEPT, orbits=32, title='A "quoted" \\ Größe'))
    assert (study.title, study.bounces, study.orbits) == ('A "quoted" \\ Größe', BOUNCES, "32")
    tree = invented_sweep(SWEPT, orbits=32)
    tree.attrs["study"] = tree.attrs["study"].replace("per_table = 32", "per_table = 32\nmost_per_table = 512")
    assert study_of(tree).orbits == "32 to 512"


def test_study_that_cannot_be_read_is_empty():
    tree = invented_sweep(SWEPT)
    tree.attrs["study"] = "not = = toml"
    assert study_of(tree).title == ""


def test_nearest_table_is_picked_and_named():
    tree = invented_sweep(SWEPT)
    held, taken = pick_tables(tree, {"amplitude": "0.06", "harmonic": 3, "phase": -3.0})
    assert taken == {"amplitude": 0.05, "harmonic": 3, "phase": 0.0}
    expected = tree["regular_area_fraction"].values[1, 1, 0]
    assert held["regular_area_fraction"].item() == expected
    assert held["orbits/verdict"].dims == ("orbit",)
    assert describe(taken) == "amplitude = 0.05, harmonic = 3, phase = 0"


@pytest.mark.parametrize(
    ("wanted", "said"),
    [
        ({"decay": "0"}, "'decay' is not a swept parameter"),
        ({"amplitude": "big"}, "amplitude = 'big' is not a number"),
        ({"amplitude": "nan"}, "amplitude = 'nan' is not a number"),
    ],
)
def test_what_cannot_be_picked_is_named(wanted, said):
    with pytest.raises(ScannerError, match=said):
        pick_tables(invented_sweep(SWEPT), wanted)


def test_average_takes_tables_that_are_done_alone():
    root = invented_sweep({"realisation": list(range(10)), "amplitude": [0.0, 0.1]}).to_dataset()
    averaged = average_tables(root, ["realisation"])
    done = root["table_status"].values == 1
    values = root["regular_area_fraction"].values
    for column in range(2):
        kept = values[done[:, column], column]
        assert 2 < len(kept) < 10
        assert averaged["tables_averaged"].values[column] == len(kept)
        # numpy's own mean and standard deviation of the same numbers: equal but for the order of summation
        assert averaged["regular_area_fraction"].values[column] == pytest.approx(kept.mean(), rel=1e-14)
        error = kept.std(ddof=1) / np.sqrt(len(kept))
        assert averaged["regular_area_fraction_stderr"].values[column] == pytest.approx(error, rel=1e-13)
    assert averaged["table_status"].values.tolist() == [1, 1]
    assert not {"symmetry_order", "mirror_s"} & set(averaged.data_vars)
    assert averaged["regular_area_fraction_by_horizon"].dims == ("amplitude", "horizon")
    assert swept_parameters(averaged) == ("amplitude",)


def test_average_of_one_table_has_no_error_bar():
    root = invented_sweep({"realisation": [4], "amplitude": [0.0, 0.1]}, convex_below=2.0).to_dataset()
    averaged = average_tables(root, ["realisation"])
    assert np.isnan(averaged["regular_area_fraction_stderr"].values).all()
    assert np.isfinite(averaged["regular_area_fraction"].values).all()


def test_average_over_nothing_done_keeps_the_reason():
    root = invented_sweep({"realisation": [1, 2], "amplitude": [0.0, 0.1]}, convex_below=-1.0).to_dataset()
    averaged = average_tables(root, ["realisation"])
    assert averaged["table_status"].values.tolist() == [2, 2]
    assert np.isnan(averaged["regular_area_fraction"].values).all()


def test_average_over_what_is_not_swept_is_refused():
    with pytest.raises(ScannerError, match="'phase' is not a swept parameter of this study: it sweeps amplitude"):
        average_tables(invented_sweep({"amplitude": [0.0, 0.1]}).to_dataset(), ["phase"])
