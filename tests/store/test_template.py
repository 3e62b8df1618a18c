import numpy as np
import pytest
import xarray as xr
from sweeps import everything, grid

import scanner
from scanner.errors import StoreError
from scanner.quantities import TABLE_STATUS
from scanner.store import prepare_store, sweep_progress, verify
from scanner.study import make_plan


@pytest.fixture(scope="module")
def empty(tmp_path_factory):
    path = tmp_path_factory.mktemp("template") / "grid.zarr"
    prepare_store(path, make_plan(grid()))
    return path


def test_plain_xarray_opens_it_without_a_warning(empty):
    with xr.open_datatree(empty, engine="zarr") as tree:
        assert tree["regular_area_fraction"].dims == ("amplitude", "harmonic")
        assert tree["orbits/verdict_by_horizon"].dims == ("amplitude", "harmonic", "orbit", "horizon")
    with xr.open_datatree(empty, engine="zarr", consolidated=False) as tree:
        assert tree["orbits"].ds.sizes["orbit"] == 256


def test_every_registered_variable_is_there_with_its_attributes(empty):
    with scanner.open_sweep(empty) as tree:
        for quantity in make_plan(grid()).quantities:
            array = tree[quantity.name if quantity.group == "root" else f"{quantity.group}/{quantity.name}"]
            assert array.attrs == quantity.attributes()
            assert array.dtype == quantity.dtype


def test_nothing_is_done_yet(empty):
    with scanner.open_sweep(empty) as tree:
        assert np.isnan(tree["regular_area_fraction"]).all()
        assert (tree["table_status"] == TABLE_STATUS.index("pending")).all()
    assert sweep_progress(empty).tasks_finished == 0


def test_coordinates_are_those_of_the_study(empty):
    with scanner.open_sweep(empty) as tree:
        assert tree["amplitude"].values.tolist() == pytest.approx([0, 0.06, 0.12, 0.18, 0.24], abs=1e-15)
        assert tree["harmonic"].values.tolist() == [2, 3]
        assert tree["horizon"].values.tolist() == [512 << doubling for doubling in range(7)]
        assert tree["p_bin"].values[[0, -1]].tolist() == pytest.approx([-0.95, 0.95], abs=1e-15)
        assert tree["period"].values[[0, -1]].tolist() == [2, 64]
        assert tree["direction"].values.tolist() == ["forward", "backward"]
        assert tree["rotational_band_p"].sel(direction="backward").dims == ("amplitude", "harmonic")
        assert tree["orbits/orbit"].values[[0, -1]].tolist() == [0, 255]
        assert tree["regular_area_fraction"].sel(amplitude=0.1, method="nearest")["amplitude"] == pytest.approx(0.12)
        assert tree["amplitude"].attrs["long_name"]


def test_root_attributes_tell_where_it_comes_from(empty):
    study = grid()
    with scanner.open_sweep(empty) as tree:
        assert tree.attrs["study"] == study.text
        assert tree.attrs["fingerprint"] == study.fingerprint
        assert tree.attrs["Conventions"] == "CF-1.11"
        assert {"versions", "platform", "host", "started"} <= tree.attrs.keys()
        assert "finished" not in tree.attrs
        assert all(isinstance(value, str) for value in tree.attrs.values())


def test_preparing_again_changes_nothing(empty):
    before = everything(empty)
    prepare_store(empty, make_plan(grid(title='"Another title"')))
    assert everything(empty) == before


@pytest.mark.parametrize(("key", "value"), [("seed", "6"), ("bounces", "4096"), ("harmonic", "{ values = [2, 4] }")])
def test_another_study_is_refused_and_changes_nothing(empty, key, value):
    before = everything(empty)
    with pytest.raises(StoreError, match=r"holds another study .* give another --store"):
        prepare_store(empty, make_plan(grid(**{key: value})))
    assert everything(empty) == before


def test_a_folder_of_something_else_is_refused(tmp_path):
    (tmp_path / "notes.txt").write_text("mine")
    with pytest.raises(StoreError, match="not a store of this tool"):
        prepare_store(tmp_path, make_plan(grid()))
    with pytest.raises(StoreError, match="not a store of this tool"):
        scanner.open_sweep(tmp_path)
    assert [file.name for file in tmp_path.iterdir()] == ["notes.txt"]


def test_a_missing_store_is_one_line(tmp_path):
    with pytest.raises(StoreError, match="there is no such store") as caught:
        scanner.open_sweep(tmp_path / "none.zarr")
    assert "\n" not in str(caught.value)


def test_a_place_that_cannot_be_written_is_one_line_and_leaves_nothing(tmp_path):
    blocked = tmp_path / "file"
    blocked.write_text("")
    with pytest.raises(StoreError, match="cannot be made"):
        prepare_store(blocked / "grid.zarr", make_plan(grid()))
    assert [file.name for file in tmp_path.iterdir()] == ["file"]


def test_a_study_without_a_swept_parameter_has_scalars(tmp_path):
    path = tmp_path / "one.zarr"
    prepare_store(path, make_plan(grid(amplitude="0.05", harmonic="2")))
    with xr.open_datatree(path, engine="zarr") as tree:
        assert tree["regular_area_fraction"].dims == ()
        assert tree["orbits/s0"].dims == ("orbit",)


def test_lost_metadata_and_coordinates_are_seen_and_written_again(tmp_path):
    path = tmp_path / "grid.zarr"
    prepare_store(path, make_plan(grid()))
    before = everything(path)
    for name in ("zarr.json", "amplitude/c.0", "orbits/s0/zarr.json"):
        (path / name).unlink()
    assert {(damage.file, damage.kind) for damage in verify(path)} == {
        ("zarr.json", "missing"),
        ("amplitude/c.0", "missing"),
        ("orbits/s0/zarr.json", "missing"),
    }
    prepare_store(path, make_plan(grid()))
    assert verify(path) == []
    after = everything(path)
    del before["zarr.json"], after["zarr.json"]
    assert {name: content for name, (content, _) in after.items()} == {
        name: content for name, (content, _) in before.items()
    }
