"""Exports, read back by other readers than the ones that wrote them."""

from __future__ import annotations

import csv
import importlib.util
import json
import subprocess
import sys

import numpy as np
import pytest
import xarray as xr
from synthetic import HORIZONS, TITLE, invented_sweep

from scanner.analysis import export_sweep
from scanner.errors import ScannerError

SWEPT = {"amplitude": [0.0, 0.05, 0.1], "harmonic": [2, 3]}
ORBITS = 16

READ_WITH_NETCDF4 = """
import json, sys, netCDF4
with netCDF4.Dataset(sys.argv[1]) as file:
    verdict = file["orbits"]["verdict"]
    print(json.dumps({
        "format": file.data_model,
        "groups": list(file.groups),
        "dims": list(verdict.dimensions),
        "dtype": str(verdict.dtype),
        "flag_dtype": str(verdict.flag_values.dtype),
        "flag_meanings": verdict.flag_meanings,
        "coordinates": {name: file[name][:].tolist() for name in file.variables if name in file.dimensions},
        "fraction": file["regular_area_fraction"][:].filled(-1.0).tolist(),
        "verdict": verdict[:].tolist(),
        "attributes": {name: str(file.getncattr(name)) for name in file.ncattrs()},
    }))
"""


def read_with_netcdf4(path):
    done = subprocess.run(
        [sys.executable, "-c", READ_WITH_NETCDF4, str(path)], capture_output=True, text=True, check=True
    )
    return json.loads(done.stdout)


def test_netcdf_holds_both_groups_for_an_independent_reader(tmp_path):
    tree = invented_sweep(SWEPT, orbits=ORBITS)
    tree.attrs |= {"resumed": True, "note": None, "hosts": ["north", "south"], "threads": 2}
    target = tmp_path / 'Größe "one" and two.nc'
    export_sweep(tree, target)
    found = read_with_netcdf4(target)
    assert found["format"] == "NETCDF4"
    assert found["groups"] == ["orbits"]
    assert found["dims"] == ["amplitude", "harmonic", "orbit"]
    assert found["dtype"] == found["flag_dtype"] == "int8"
    assert found["flag_meanings"].split()[3] == "chaotic"
    assert found["coordinates"]["amplitude"] == SWEPT["amplitude"]
    fraction = np.nan_to_num(tree["regular_area_fraction"].values, nan=-1.0)
    np.testing.assert_array_equal(found["fraction"], fraction)
    np.testing.assert_array_equal(found["verdict"], tree["orbits/verdict"].values)
    assert TITLE in found["attributes"]["study"]
    assert found["attributes"]["hosts"] == "['north', 'south']"
    assert "note" not in found["attributes"]


def test_netcdf_of_one_table_has_no_parameters(tmp_path):
    export_sweep(invented_sweep({}), tmp_path / "single.nc")
    assert read_with_netcdf4(tmp_path / "single.nc")["dims"] == ["orbit"]


def test_netcdf_reads_back_equal_in_xarray(tmp_path):
    tree = invented_sweep(SWEPT, orbits=ORBITS)
    export_sweep(tree, tmp_path / "sweep.nc")
    with xr.open_datatree(tmp_path / "sweep.nc", engine="h5netcdf") as again:
        xr.testing.assert_equal(again.load(), tree)


def test_csv_has_one_row_a_table_and_nothing_left_out(tmp_path):
    tree = invented_sweep(SWEPT, orbits=ORBITS)
    export_sweep(tree, tmp_path / "tables.csv")
    with (tmp_path / "tables.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 6
    last = rows[3]
    assert (last["amplitude"], last["harmonic"], last["table_status"]) == ("0.05", "3", "done")
    assert float(last["regular_area_fraction"]) == tree["regular_area_fraction"].values[1, 1]
    by_horizon = tree["regular_area_fraction_by_horizon"].values[1, 1]
    found = [float(last[f"regular_area_fraction_by_horizon_{horizon}"]) for horizon in HORIZONS]
    np.testing.assert_array_equal(found, by_horizon)
    assert float(last["island_area_fraction_3"]) == tree["island_area_fraction"].values[1, 1, 1]
    assert "regular_area_fraction_by_p_-0.95" in last
    assert float(last["rotational_band_p_backward"]) == tree["rotational_band_p"].values[1, 1, 1]
    assert rows[5]["table_status"] == "not_convex"
    assert rows[5]["regular_area_fraction"] == ""


@pytest.mark.parametrize("suffix", [".csv", ".parquet"])
def test_rows_of_orbits_are_those_of_the_tables_that_are_done(tmp_path, suffix):
    import pandas as pd

    tree = invented_sweep(SWEPT, orbits=ORBITS)
    target = tmp_path / f"orbits{suffix}"
    export_sweep(tree, target, rows="orbits")
    rows = pd.read_csv(target, dtype={"p0": str}) if suffix == ".csv" else pd.read_parquet(target)
    done = tree["table_status"].values == 1
    assert len(rows) == done.sum() * ORBITS
    assert rows.columns[:3].tolist() == ["amplitude", "harmonic", "orbit"]
    one = rows[(rows["amplitude"] == 0.05) & (rows["harmonic"] == 2)]
    # Python reads decimals exactly, whatever the version of pandas.
    np.testing.assert_array_equal(one["p0"].map(float), tree["orbits/p0"].values[1, 0])
    meanings = np.array(tree["orbits/verdict"].attrs["flag_meanings"].split())
    np.testing.assert_array_equal(one["verdict"], meanings[tree["orbits/verdict"].values[1, 0]])


def test_orbits_that_were_not_followed_are_no_rows(tmp_path):
    tree = invented_sweep({"amplitude": [0.0, 0.05]}, orbits=ORBITS, convex_below=9.0)
    tree["orbits/verdict"].values[1, 5:] = 0
    export_sweep(tree, tmp_path / "orbits.csv", rows="orbits")
    rows = (tmp_path / "orbits.csv").read_text().splitlines()[1:]
    assert len(rows) == ORBITS + 5
    assert not any("pending" in row for row in rows)


@pytest.mark.parametrize("rows", ["root", "orbits"])
def test_columns_come_in_the_order_of_the_register_however_a_disk_lists_them(tmp_path, rows):
    tree = invented_sweep(SWEPT, orbits=ORBITS)
    turned = {}
    for node in tree.subtree:
        data = node.to_dataset(inherit=False)
        turned[node.path] = data[sorted(data.data_vars, reverse=True)].assign(
            a_later_variable=data[next(iter(data.data_vars))].drop_attrs()
        )
        turned[node.path].attrs = data.attrs
    export_sweep(xr.DataTree.from_dict(turned), tmp_path / "rows.csv", rows=rows)
    columns = (tmp_path / "rows.csv").read_text(encoding="utf-8").splitlines()[0].split(",")
    assert columns[2:4] == (["orbit", "s0"] if rows == "orbits" else ["table_status", "regular_area_fraction"])
    assert columns[-1] == "a_later_variable"


def test_blocks_of_a_stored_sweep_come_out_in_the_order_of_the_grid(tmp_path):
    import pandas as pd

    swept = {"amplitude": [0.0, 0.05, 0.1], "harmonic": [2, 3, 4, 5, 6]}
    tree = invented_sweep(swept, orbits=ORBITS, convex_below=9.0)
    export_sweep(tree, tmp_path / "whole.csv", rows="orbits")
    for variable in tree["orbits"].data_vars.values():
        variable.encoding["preferred_chunks"] = {"amplitude": 1, "harmonic": 2, "orbit": ORBITS}
    export_sweep(tree, tmp_path / "blocks.csv", rows="orbits")
    assert (tmp_path / "whole.csv").read_bytes() == (tmp_path / "blocks.csv").read_bytes()
    export_sweep(tree, tmp_path / "blocks.parquet", rows="orbits")
    pd.testing.assert_frame_equal(
        pd.read_parquet(tmp_path / "blocks.parquet"), pd.read_csv(tmp_path / "blocks.csv"), check_dtype=False
    )


def test_parquet_without_its_library_says_what_to_install(tmp_path, monkeypatch):
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    with pytest.raises(ScannerError, match=r"pip install 'scanner\[parquet\]'"):
        export_sweep(invented_sweep(SWEPT), tmp_path / "tables.parquet")
    assert list(tmp_path.iterdir()) == []


def test_an_existing_file_is_replaced_only_by_force(tmp_path):
    target = tmp_path / "tables.csv"
    target.write_text("precious")
    with pytest.raises(ScannerError, match="--force"):
        export_sweep(invented_sweep(SWEPT), target)
    assert target.read_text() == "precious"
    export_sweep(invented_sweep(SWEPT), target, force=True)
    assert target.read_text().startswith("amplitude,harmonic,table_status")


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("tables.xls", r"unknown suffix '\.xls', it must be \.nc, \.csv or \.parquet"),
        ("tables", "unknown suffix ''"),
        ("nowhere/tables.csv", "there is no folder .*nowhere, make it first"),
        ("", "is a folder"),
    ],
)
def test_a_target_that_cannot_be_written_is_refused_before_any_work(tmp_path, name, said):
    with pytest.raises(ScannerError, match=said) as caught:
        export_sweep(invented_sweep(SWEPT), tmp_path / name)
    assert "\n" not in str(caught.value)
    assert list(tmp_path.iterdir()) == []


def test_nothing_is_left_when_writing_fails_half_way(tmp_path, monkeypatch):
    def fill_up(self, *arguments, **options):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("pandas.DataFrame.to_csv", fill_up)
    with pytest.raises(ScannerError, match="cannot be written: No space left on device"):
        export_sweep(invented_sweep(SWEPT), tmp_path / "tables.csv")
    assert list(tmp_path.iterdir()) == []
