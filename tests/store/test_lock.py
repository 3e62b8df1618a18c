import json
import os
import socket
import subprocess
import sys
import time
from pathlib import Path

import psutil
import pytest

from scanner.errors import StoreError
from scanner.store import Charter, Ledger, StoreLock
from scanner.store.lock import SILENCE_SECONDS, is_running


@pytest.fixture
def store(tmp_path):
    Ledger(tmp_path).found(Charter("ab", "", 1, 1, 1, 1, {}))
    return tmp_path


def put_lock(store, host, pid, silent=0.0):
    path = Ledger(store).folder / "lock"
    path.write_text(json.dumps({"host": host, "pid": pid, "born": 0.0}))
    os.utime(path, (time.time() - silent,) * 2)
    return path


def test_held_then_free(store):
    with StoreLock(store):
        assert is_running(store)
        with pytest.raises(StoreError, match=f"process {os.getpid()} on {socket.gethostname()}"), StoreLock(store):
            pass
        assert is_running(store)
    assert not is_running(store)
    with StoreLock(store):
        pass
    assert [file.name for file in Ledger(store).folder.glob("*lock*")] == []


def test_the_lock_of_a_killed_process_is_stale_at_once(store):
    script = (
        "import os, pathlib, signal, sys; from scanner.store import StoreLock\n"
        "StoreLock(pathlib.Path(sys.argv[1])).__enter__(); os.kill(os.getpid(), signal.SIGKILL)"
    )
    subprocess.run([sys.executable, "-c", script, str(store)], check=False)
    assert (Ledger(store).folder / "lock").exists()
    assert not is_running(store)
    with StoreLock(store):
        assert is_running(store)


def test_a_process_number_used_again_is_not_taken_for_the_holder(store):
    put_lock(store, socket.gethostname(), os.getpid())
    with StoreLock(store):
        pass


def test_another_host_is_believed_until_it_has_been_silent_for_long(store):
    put_lock(store, "elsewhere", 7, silent=SILENCE_SECONDS - 30)
    with pytest.raises(StoreError, match="process 7 on elsewhere"), StoreLock(store):
        pass
    put_lock(store, "elsewhere", 7, silent=SILENCE_SECONDS + 1)
    with StoreLock(store):
        pass


def test_a_clock_that_is_ahead_of_the_disk_takes_no_store_away(store, monkeypatch):
    put_lock(store, "elsewhere", 7)
    ahead = time.time() + 3600
    monkeypatch.setattr(time, "time", lambda: ahead)
    with pytest.raises(StoreError, match="process 7 on elsewhere"), StoreLock(store):
        pass


def test_a_holder_is_known_again_when_the_clock_was_set_back(store, tmp_path_factory, monkeypatch):
    """Setting the clock moves the time at which the machine is said to have started, and with it all its processes."""
    with StoreLock(store):
        processes = tmp_path_factory.mktemp("proc")
        (processes / str(os.getpid())).symlink_to(f"/proc/{os.getpid()}")
        told = [line.split() for line in Path("/proc/stat").read_text().splitlines()]
        moved = [[key, str(int(values[0]) - 7200)] if key == "btime" else [key, *values] for key, *values in told]
        (processes / "stat").write_text("\n".join(map(" ".join, moved)) + "\n")
        monkeypatch.setattr(psutil, "PROCFS_PATH", str(processes))
        assert time.time() - psutil.boot_time() > 7200
        assert is_running(store)


def test_a_holder_that_lost_the_store_is_told_and_leaves_the_lock_alone(store, monkeypatch):
    monkeypatch.setattr("scanner.store.lock.BEAT_SECONDS", 0.0)
    lock = StoreLock(store)
    with lock:
        lock.beat()
        path = put_lock(store, "elsewhere", 7)
        with pytest.raises(StoreError, match="taken over"):
            lock.beat()
    assert path.exists()


def test_a_beat_is_a_sign_of_life(store, monkeypatch):
    monkeypatch.setattr("scanner.store.lock.BEAT_SECONDS", 0.0)
    with StoreLock(store) as lock:
        path = Ledger(store).folder / "lock"
        os.utime(path, (0, 0))
        lock.beat()
        assert time.time() - path.stat().st_mtime < 60


def test_a_lock_taken_by_a_quicker_one_is_given_back(store):
    from scanner.store.lock import Holder

    path = put_lock(store, "quick", 8)
    StoreLock(store)._evict(Holder("slow and dead", 7, 0.0))
    assert json.loads(path.read_text())["host"] == "quick"


@pytest.mark.parametrize("torn", ["", "{", "[]", '{"host": "here"}'])
def test_a_lock_that_does_not_say_whose_it_is_falls_free_by_its_silence(store, torn):
    path = put_lock(store, "elsewhere", 7)
    path.write_text(torn)
    assert is_running(store)
    with pytest.raises(StoreError, match="on an unknown host"), StoreLock(store):
        pass
    os.utime(path, (time.time() - SILENCE_SECONDS - 1,) * 2)
    with StoreLock(store):
        assert is_running(store)
    assert not path.exists()
