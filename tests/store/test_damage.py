"""Every kind of file of a store, every kind of damage: found, mended, and nothing healthy computed again."""

import os
import shutil

import pytest
from sweeps import everything, fill, grid, order_for, results

from scanner.engine.work import run_task
from scanner.errors import StoreError
from scanner.store import (
    Ledger,
    Seal,
    StoreLock,
    check_numerics,
    note_finish,
    open_sweep,
    prepare_store,
    refuse_losses,
    repair,
    sweep_progress,
    verify,
)
from scanner.study import make_plan

LEDGER = "table_status/ledger"
STUDY = grid()


def put_folder(path):
    path.unlink()
    path.mkdir()
    (path / "inside").write_text("x")


def put_broken_link(path):
    path.unlink()
    path.symlink_to(path.with_name("nowhere"))


def flip_byte(path):
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)


HARMS = {
    "missing": lambda path: path.unlink(),
    "empty": lambda path: path.write_bytes(b""),
    "truncated": lambda path: path.write_bytes(path.read_bytes()[:-1]),
    "altered": flip_byte,
    "longer": lambda path: path.write_bytes(path.read_bytes() + b"\0"),
    "a folder": put_folder,
    "a broken link": put_broken_link,
}
CHARTER = f"{LEDGER}/charter.json"
METADATA = ("amplitude/c.0", "orbits/s0/zarr.json", "orbits/zarr.json", "zarr.json")
FILES = ["table_status/c.1.0", "area/c.0.0", "orbits/s0/c.2.0.0", f"{LEDGER}/receipts/000003.json", *METADATA, CHARTER]
TASKS = 5


@pytest.fixture(scope="module")
def sound(tmp_path_factory):
    path = tmp_path_factory.mktemp("damage") / "grid.zarr"
    fill(path, STUDY)
    note_finish(path, finished=True)
    return path


@pytest.fixture
def store(sound, tmp_path):
    return shutil.copytree(sound, tmp_path / "grid.zarr")


def sweep(store):
    """What `scanner sweep` does, without workers: which tasks it computed."""
    prepare_store(store, make_plan(STUDY))
    refuse_losses(store)
    check_numerics(store)
    state = sweep_progress(store)
    computed = sorted(set(range(state.tasks)) - state.finished)
    for task in computed:
        run_task(order_for(store, STUDY), task)
    note_finish(store, finished=True)
    return computed


def owner(store, file):
    """The task that wrote a file, if any."""
    ledger = Ledger(store)
    return next((task for task in ledger.listed() if file in {*ledger.seals(task), name_of(ledger, task)}), None)


def name_of(ledger, task):
    return str(ledger.receipt_path(task).relative_to(ledger.store))


def receipts(store):
    return everything(Ledger(store).folder / "receipts")


@pytest.mark.parametrize("harm", HARMS)
@pytest.mark.parametrize("file", [file for file in FILES if file != CHARTER])
def test_each_kind_of_damage_to_each_kind_of_file_is_found(store, file, harm):
    HARMS[harm](store / file)
    (damage,) = verify(store)
    assert damage.file == file
    assert (damage.task is None) == (file in METADATA)


@pytest.mark.parametrize("harm", ["missing", "altered", "a folder", "a broken link"])
def test_damage_is_mended_and_what_is_healthy_is_not_computed_again(store, sound, harm):
    before = receipts(store)
    for file in FILES:
        if file != CHARTER:
            HARMS[harm](store / file)
    broken = {owner(sound, file) for file in FILES} - {None}
    assert 0 < len(broken) < TASKS
    # A lost receipt cannot be told from a task not begun where the time of completion is lost as well.
    assert broken - {3} <= {damage.task for damage in repair(store)} - {None} <= broken
    assert {damage.file for damage in verify(store)} <= set(METADATA)
    assert set(sweep(store)) == broken
    assert verify(store) == []
    assert results(store) == results(sound)
    healthy = {f"{task:06d}.json" for task in set(range(TASKS)) - broken}
    after = receipts(store)
    assert {name: after[name] for name in healthy} == {name: before[name] for name in healthy}


@pytest.mark.parametrize("harm", ["missing", "altered", "a folder"])
def test_a_sweep_alone_mends_metadata_and_the_charter(store, sound, harm):
    before = receipts(store)
    HARMS[harm](store / CHARTER)
    with pytest.raises(StoreError, match="the same `scanner sweep` writes it again"):
        verify(store)
    assert sweep(store) == []
    for file in METADATA:
        HARMS[harm](store / file)
    assert sweep(store) == []
    assert verify(store) == []
    assert results(store) == results(sound)
    assert receipts(store) == before
    with open_sweep(sound) as one, open_sweep(store) as other:
        assert {**one.attrs, "finished": ""} == {**other.attrs, "finished": ""}


@pytest.mark.parametrize("folder", ["orbits/s0", "amplitude", f"{LEDGER}/receipts"])
def test_a_file_in_the_place_of_a_folder_is_mended(store, sound, folder):
    shutil.rmtree(store / folder)
    (store / folder).write_text("x")
    if folder == "orbits/s0":
        with pytest.raises(StoreError, match="scanner verify --repair"):
            refuse_losses(store)
    assert verify(store)
    repair(store)
    sweep(store)
    assert verify(store) == []
    assert results(store) == results(sound)


def test_a_sweep_on_lost_chunks_says_so_and_computes_nothing(store):
    for chunk in (store / "table_status").glob("c.*"):
        chunk.unlink()
    before = everything(store)
    with pytest.raises(StoreError, match=r"5 files .* missing, the first is table_status/c\.0\.0; .* --repair"):
        sweep(store)
    assert everything(store) == before


def test_a_receipt_of_another_study_or_another_task_is_damage(store, tmp_path):
    other = tmp_path / "other.zarr"
    fill(other, grid(seed="6"), tasks=[1])
    receipts = store / LEDGER / "receipts"
    shutil.copy(other / LEDGER / "receipts" / "000001.json", receipts / "000001.json")
    shutil.copy(receipts / "000002.json", receipts / "000004.json")
    shutil.copy(receipts / "000002.json", receipts / "000123.json")
    assert [(damage.task, damage.kind) for damage in verify(store)] == [
        (1, "unreadable"),
        (4, "unreadable"),
        (123, "unreadable"),
    ]
    assert sweep_progress(store).finished == {0, 2, 3}
    repair(store)
    assert sweep(store) == [1, 4]
    assert verify(store) == []


def test_leftovers_of_killed_writers_are_found_and_removed(store):
    left = store / "orbits" / "s0" / "c.0.0.0.0123.partial"
    left.write_bytes(b"half")
    assert [(damage.kind, damage.task) for damage in verify(store)] == [("leftover", None)]
    with StoreLock(store):
        assert verify(store) == []  # Somebody may be writing it.
    repair(store)
    assert not left.exists()
    assert sweep(store) == []


def test_a_forged_receipt_cannot_reach_files_outside_the_store(store, tmp_path):
    outside = tmp_path / "precious.txt"
    outside.write_text("mine")
    ledger = Ledger(store)
    ledger.write(ledger.read(0), {"../precious.txt": Seal(1, ""), str(outside): Seal(1, ""), "area/c.0.0": Seal(1, "")})
    assert [damage.file for damage in verify(store)] == ["area/c.0.0"]
    shutil.rmtree(store / "area")
    (store / "area").symlink_to(tmp_path)
    ledger.write(ledger.read(0), {"area/precious.txt": Seal(1, "")})
    with pytest.raises(StoreError, match="leads out of the store"):
        repair(store)
    assert outside.read_text() == "mine"


def test_a_device_in_the_place_of_a_chunk_is_not_read(store):
    (store / "area" / "c.0.0").unlink()
    os.mkfifo(store / "area" / "c.0.0")
    assert [damage.kind for damage in verify(store)] == ["misplaced"]
