import csv

import numpy as np
import pytest
import xarray as xr
from sweeps import fill, grid, results

from scanner.analysis import export_sweep, pick_tables
from scanner.cells import compute
from scanner.errors import ScannerError, StudyError
from scanner.measure import survey_resonances
from scanner.quantities import CURVE_FATES, RESONANCES, in_group
from scanner.store import verify
from scanner.study import Plan, make_plan, parse_study
from scanner.tables import build_table

ASKED = "\n[resonances]\nperiod_max = 5\n"


@pytest.fixture(scope="module")
def study():
    """Four tables, the last one not convex."""
    small = grid(amplitude="{ values = [0.05, 0.15] }", per_table="64", bounces="64")
    return parse_study(small.text + ASKED)


@pytest.fixture(scope="module")
def store(study, tmp_path_factory):
    path = tmp_path_factory.mktemp("resonances") / "grid.zarr"
    fill(path, study)
    return path


def test_the_group_holds_what_each_table_gives_alone(store):
    alone = survey_resonances(build_table("radial_harmonic", amplitude=0.05, harmonic=3), period_max=5)
    with xr.open_datatree(store, engine="zarr") as tree:
        assert {entry.name for entry in in_group(RESONANCES)} == set(tree[RESONANCES].data_vars) == set(alone)
        for entry in in_group(RESONANCES):
            array = tree[RESONANCES][entry.name]
            assert array.dims == ("amplitude", "harmonic", *entry.dims)
            assert array.attrs == entry.attributes()
            np.testing.assert_array_equal(array[0, 1], alone[entry.name])
        for name in ("rotation", "resonance_period", "curve"):
            np.testing.assert_array_equal(tree[RESONANCES][name], alone[name])
        assert [CURVE_FATES[code] for code in alone["curve_fate"].values] == ["broken"] * 3
        assert tree["resonances/curve_fate"][1, 1].values.tolist() == [0, 0, 0]
        assert np.isnan(tree["resonances/length_gap"][1, 1]).all()
    assert verify(store) == []


@pytest.mark.parametrize("consolidated", [None, False])
def test_rotations_are_coordinates_in_plain_xarray(store, consolidated):
    """Neither gets in the way of the dimension ``period`` of the root."""
    with xr.open_datatree(store, engine="zarr", consolidated=consolidated) as tree:
        gaps = tree["resonances/length_gap"]
        assert gaps["rotation"].values.tolist() == [1, 1, 1, 1, 2]
        assert gaps["resonance_period"].values.tolist() == [2, 3, 4, 5, 5]
        third = gaps.where(gaps["resonance_period"] == 3, drop=True).sel(amplitude=0.05, harmonic=3)
        # Exact for a harmonic that the period divides: 4 eps q sin(pi p / q).
        assert third.item() == pytest.approx(4.0 * 0.05 * 3.0 * np.sin(np.pi / 3.0), abs=1e-14)
        assert tree["island_area_fraction"].sel(period=3).dims == ("amplitude", "harmonic")
        picked, _ = pick_tables(tree, {"harmonic": 2})
        assert picked["resonances/length_gap"].dims == ("amplitude", "resonance")


def test_the_group_is_exported(store, tmp_path):
    with xr.open_datatree(store, engine="zarr") as tree:
        export_sweep(tree, tmp_path / "sweep.nc")
        with xr.open_datatree(tmp_path / "sweep.nc", engine="h5netcdf") as copy:
            xr.testing.assert_equal(copy[RESONANCES].to_dataset(), tree[RESONANCES].to_dataset())


def test_one_row_a_resonance_is_exported(store, tmp_path):
    with xr.open_datatree(store, engine="zarr") as tree:
        export_sweep(tree, tmp_path / "rows.csv", rows=RESONANCES)
        with (tmp_path / "rows.csv").open(newline="") as file:
            rows = list(csv.DictReader(file))
        assert list(rows[0])[:5] == ["amplitude", "harmonic", "rotation", "resonance_period", "length_maximal"]
        assert not any(name.startswith(("curve", "table_status")) or name == "resonance" for name in rows[0])
        # Three of the four tables are convex; five rotations each.
        assert len(rows) == 3 * 5
        assert (rows[9]["harmonic"], rows[9]["rotation"], rows[9]["resonance_period"]) == ("3", "2", "5")
        assert float(rows[9]["length_gap"]) == tree["resonances/length_gap"].values[0, 1, 4]


def test_rows_of_tables_hold_the_fate_of_their_curves(store, tmp_path):
    with xr.open_datatree(store, engine="zarr") as tree:
        export_sweep(tree, tmp_path / "sweep.csv")
    with (tmp_path / "sweep.csv").open(newline="") as file:
        rows = list(csv.DictReader(file))
    assert [row["curve_fate_0.381966"] for row in rows] == ["undecided", "broken", "broken", "pending"]
    assert "length_gap" not in rows[0]


def test_resonances_that_were_not_asked_for_cannot_be_exported(tmp_path):
    fill(tmp_path / "grid.zarr", grid(), tasks=())
    with xr.open_datatree(tmp_path / "grid.zarr", engine="zarr") as tree:
        with pytest.raises(ScannerError, match="this store has no resonances"):
            export_sweep(tree, tmp_path / "rows.csv", rows=RESONANCES)
    assert not (tmp_path / "rows.csv").exists()


def test_a_split_table_gets_them_once(study, store):
    split = Plan(study, (1, 1), 32)
    assert [RESONANCES in task.groups for task in split.tasks[:3]] == [False, False, True]
    whole = compute(Plan(study, (1, 1), 64), Plan(study, (1, 1), 64).tasks[0])
    with xr.open_datatree(store, engine="zarr") as tree:
        np.testing.assert_array_equal(whole.groups[RESONANCES]["length_gap"][0, 0], tree["resonances/length_gap"][0, 0])


def test_they_are_part_of_what_is_asked(study):
    without = parse_study(study.text.replace(ASKED, ""))
    assert len({study.fingerprint, without.fingerprint, parse_study(study.text.replace("= 5", "= 6")).fingerprint}) == 3
    assert make_plan(without).rotations == []


def test_without_them_the_store_has_no_such_group(tmp_path):
    fill(tmp_path / "grid.zarr", grid(), tasks=())
    assert not any(name.startswith(RESONANCES) for name in results(tmp_path / "grid.zarr"))


@pytest.mark.parametrize(
    ("written", "message"),
    [
        ("period_max = 1", r"resonances\.period_max = 1 must be a whole number from 2 to 32"),
        ("period_max = 33", r"resonances\.period_max = 33 must be a whole number from 2 to 32"),
        ("period_max = 8.0", r"resonances\.period_max = 8\.0 must be a whole number"),
        ("periods = 8", r"resonances\.periods"),
        ("", r"resonances\.period_max is missing"),
    ],
)
def test_wrong_requests_are_one_line(written, message):
    with pytest.raises(StudyError, match=message) as caught:
        parse_study(f"{grid().text}\n[resonances]\n{written}\n")
    assert "\n" not in str(caught.value)
