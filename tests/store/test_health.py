import shutil

import pytest
from sweeps import fill, grid

import scanner
from scanner.errors import StoreError
from scanner.store import Damage, Ledger, StoreLock, note_finish, repair, verify

VICTIM = "orbits/s0/c.1.0.0"


@pytest.fixture(scope="module")
def sound(tmp_path_factory):
    path = tmp_path_factory.mktemp("health") / "grid.zarr"
    fill(path, grid())
    return path


@pytest.fixture
def store(sound, tmp_path):
    copy = tmp_path / "grid.zarr"
    shutil.copytree(sound, copy)
    return copy


def flip_byte(path):
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)


def empty_file(path):
    path.write_bytes(b"")


def cut_file(path):
    path.write_bytes(path.read_bytes()[:-5])


HARMS = {"missing": lambda path: path.unlink(), "empty": empty_file, "truncated": cut_file, "altered": flip_byte}


def test_a_sound_store_has_no_damage(sound):
    assert verify(sound) == []


@pytest.mark.parametrize("kind", HARMS)
def test_each_kind_of_damage_is_named_with_its_task(store, kind):
    HARMS[kind](store / VICTIM)
    (damage,) = verify(store)
    assert damage == Damage(VICTIM, damage.task, kind)
    assert VICTIM in Ledger(store).seals(damage.task)
    assert verify(store) == [damage]


def test_a_cleared_block_reads_as_not_done(store):
    flip_byte(store / VICTIM)
    note_finish(store, finished=True)
    repair(store)
    with scanner.open_sweep(store) as tree:
        assert int((tree["table_status"] == 0).sum()) > 0
        assert "finished" not in tree.attrs


def test_repair_waits_for_no_running_sweep(store):
    empty_file(store / VICTIM)
    with StoreLock(store), pytest.raises(StoreError, match="in use"):
        repair(store)
    assert len(verify(store)) == 1


def test_a_damaged_chunk_is_not_read_back_silently(store):
    flip_byte(store / VICTIM)
    # The message is the library's own; whatever it is, no number may come back.
    with scanner.open_sweep(store) as tree, pytest.raises(Exception, match=r"(?i)decompression|checksum|corrupt"):
        tree["orbits/s0"].load()
