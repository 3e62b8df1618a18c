"""Stores of other versions of this package: opened, or refused in one line that names the version."""

import json
from dataclasses import asdict, replace

import pytest
import xarray as xr
from sweeps import everything, fill, grid

import scanner
from scanner.errors import StoreError
from scanner.store import Ledger, check_numerics, prepare_store, repair, sweep_progress, verify
from scanner.store.durable import write_durably
from scanner.store.ledger import LAYOUT, _seal_lines
from scanner.study import make_plan, numerics_version

STUDY = grid(amplitude="0.05", bounces="64", per_table="16", replicates="2")


@pytest.fixture
def store(tmp_path):
    path = tmp_path / "grid.zarr"
    fill(path, STUDY)
    return path


def make_older(store):
    """Turn a store into one of layout 1, whose charter and receipts held less."""
    ledger = Ledger(store)
    charter = asdict(replace(ledger.charter(), layout=1))
    for name in ("root", "version", "numerics", "compacted"):
        del charter[name]
    receipt = asdict(ledger.read(0))
    del receipt["tables"]
    write_durably(ledger.receipt_path(0), _seal_lines(receipt, ledger.seals(0)))
    write_durably(ledger.folder / "charter.json", _seal_lines(charter))


def test_a_store_of_the_first_layout_opens_and_is_sound(store):
    with scanner.open_sweep(store) as tree:
        before = tree.to_dataset().load()
    make_older(store)
    with scanner.open_sweep(store) as tree:
        xr.testing.assert_identical(tree.to_dataset().load(), before)
    assert verify(store) == []
    assert sweep_progress(store).complete
    prepare_store(store, make_plan(STUDY))  # as a sweep that finds it finished


def test_a_store_of_a_later_layout_is_refused_with_the_version_that_made_it(store):
    ledger = Ledger(store)
    later = {**asdict(ledger.charter()), "layout": LAYOUT + 1, "version": "7.3.1", "something": "new"}
    write_durably(ledger.folder / "charter.json", _seal_lines(later))
    for attempt in (scanner.open_sweep, sweep_progress, verify, lambda path: prepare_store(path, make_plan(STUDY))):
        with pytest.raises(
            StoreError, match=r"made by scanner 7\.3\.1 in layout 3, .* install scanner 7\.3\.1"
        ) as caught:
            attempt(store)
        assert "\n" not in str(caught.value)


@pytest.mark.parametrize("age", ["another version", "first layout"])
def test_an_unfinished_store_of_other_numerics_is_not_carried_on(store, age):
    if age == "first layout":
        make_older(store)
    else:
        charter = Ledger(store).charter()
        Ledger(store).found(replace(charter, version="0.0.9", numerics="0123456789ab"))
    Ledger(store).receipt_path(0).unlink()
    before = everything(store)
    with pytest.raises(StoreError, match=r"begun by scanner .* must not mix .* or give another --store"):
        check_numerics(store)
    with pytest.raises(StoreError, match="must not mix"):
        scanner.run_study(STUDY, store, progress=False)
    assert everything(store) == before


def test_results_of_other_numerics_are_not_cleared_for_a_recomputation(store):
    """What only another version can compute again stays; metadata and what was left half-written is mended by any."""
    ledger = Ledger(store)
    ledger.found(replace(ledger.charter(), version="0.0.9", numerics="0123456789ab"))
    victim = store / next(iter(ledger.seals(0)))
    victim.write_bytes(b"")
    before = everything(store)
    with pytest.raises(StoreError, match=r"begun by scanner 0\.0\.9 .* finish it with that version"):
        repair(store)
    assert everything(store) == before


def test_a_store_says_which_code_its_numbers_come_from(store):
    check_numerics(store)
    with scanner.open_sweep(store) as tree:
        assert tree.attrs["numerics"] == numerics_version()
        assert tree.attrs["version"] == scanner.__version__
        assert tree.attrs["layout"] == str(LAYOUT)
    root = json.loads((store / "zarr.json").read_bytes())
    assert json.loads(Ledger(store).charter().root)["attributes"] == root["attributes"]
