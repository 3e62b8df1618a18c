"""Sweeps on disks that are full or cannot be written."""

import os
import shutil
import subprocess
import sys
from contextlib import contextmanager, suppress
from pathlib import Path

import pytest
from slow_sweep import TASKS, Sweep
from sweeps import everything, fill, results

from scanner.store import sweep_progress
from scanner.study import load_study


def why_no_disk() -> str | None:
    """Say what is missing here for a disk of one's own; None where nothing is."""
    return None if os.geteuid() == 0 and shutil.which("mount") else "only root can mount a small disk"


pytestmark = pytest.mark.skipif(why_no_disk() is not None, reason=f"no disk to fill: {why_no_disk()}")


@pytest.fixture
def disk(tmp_path):
    """A disk of 16 MB."""
    folder = tmp_path / "disk"
    folder.mkdir()
    subprocess.run(["mount", "-t", "tmpfs", "-o", "size=16m", "none", str(folder)], check=True)
    yield folder
    subprocess.run(["umount", "--lazy", str(folder)], check=True)


@contextmanager
def full(disk: Path):
    """Have the disk full meanwhile."""
    ballast = disk / "ballast"
    with ballast.open("wb", buffering=0) as file, suppress(OSError):
        while True:
            file.write(bytes(4096))
    assert shutil.disk_usage(disk).free == 0
    yield
    ballast.unlink()


def test_a_full_disk_ends_the_run_in_one_line(study, undisturbed, carry_on, disk):
    sweep = Sweep(study, disk / "slow.zarr", "--workers", "2")
    sweep.await_receipts(1)
    with full(disk):
        status, printed = sweep.wait()
        kept = sweep.receipts()
    assert status == 2, printed
    assert "No space left on device" in printed
    assert "to carry on" in printed
    assert "Traceback" not in printed
    assert "Logging error" not in printed
    assert 1 <= len(kept) < TASKS
    before = sweep.receipt_files()
    assert len(before) == len(kept)
    carry_on(sweep.store)
    after = sweep.receipt_files()
    assert {name: after[name] for name in before} == before
    assert results(sweep.store) == undisturbed


def test_a_store_that_cannot_be_written_is_refused_and_can_be_read(study, undisturbed, carry_on, disk, monkeypatch):
    store = disk / "slow.zarr"
    monkeypatch.chdir(study.parent)
    fill(store, load_study(study, allow_code=True), tasks=[0, 1])
    before = everything(disk)
    subprocess.run(["mount", "-o", "remount,ro", str(disk)], check=True)
    status, printed = Sweep(study, store, "--workers", "2").wait()
    look = subprocess.run(
        [sys.executable, "-m", "scanner", "progress", str(store)], capture_output=True, text=True, check=True
    )
    subprocess.run(["mount", "-o", "remount,rw", str(disk)], check=True)
    assert status == 2
    assert printed.count("\n") == 1
    assert f"{store}: cannot be written (Read-only file system)" in printed
    assert "2 of 6" in look.stdout
    assert everything(disk) == before
    carry_on(store)
    assert sweep_progress(store).complete
    assert results(store) == undisturbed
