"""Estimate, sweep, progress, verify and selfcheck."""

from __future__ import annotations

import json
import os
import shutil
import socket
import subprocess
import sys

import pytest
from sweeps import everything

from scanner.cli import running
from scanner.selfcheck import Check, run_checks
from scanner.store import Ledger, Pulse, StoreLock, write_pulse


def test_estimate_prints_what_will_be_run_and_what_cannot(call, study):
    status, output, _ = call("estimate", study)
    assert status == 0
    lines = dict(line.strip().split("  ", 1) for line in output.splitlines()[1:] if "  " in line.strip())
    assert lines["tables"].strip() == "3"
    assert lines["not convex"].strip() == "1"
    assert lines["orbits"].strip() == "128"
    assert lines["bounces"].strip() == f"{128 * 256:,}"
    assert "not convex: harmonic = 2, amplitude = 0.3: curvature -1.02" in output


def test_sweep_on_a_finished_store_has_nothing_to_do(call, study, store):
    status, output, _ = call("sweep", study, "--store", store)
    assert status == 0
    assert "2 of 3 tables done, 1 not convex" in output


def test_tables_that_failed_are_listed_and_the_status_is_1(call, moody_study, moody_store):
    status, _, complaint = call("sweep", moody_study, "--store", moody_store, "--allow-code")
    assert status == 1
    assert complaint.startswith("failed: size = 2.0: ")
    assert "not in the mood" in complaint


def test_a_queue_is_not_filled_without_a_word(call, monkeypatch, study, tmp_path):
    def cheap(asked, store):
        from scanner.study.estimate import Estimate

        return Estimate(3, 1, 0, (), 128, 32768, 4096, 3, 50.0, 12.0, 128, 32768, 12.0)

    monkeypatch.setattr(running, "_estimate", cheap)
    queued = tmp_path / "queued.toml"
    queued.write_text(study.read_text(encoding="utf-8") + '[resources]\nrunner = "slurm"\nworkers = 9\n', "utf-8")
    status, _, complaint = call("sweep", queued, "--store", tmp_path / "s.zarr")
    assert status == 2
    estimate, refusal = complaint.splitlines()
    assert "3 tasks, 12 core-hours" in estimate
    assert "9 workers from slurm" in estimate
    assert refusal.endswith("confirm it with --yes")
    assert not (tmp_path / "s.zarr").exists()


def test_progress_of_a_finished_store(call, store):
    status, output, _ = call("progress", store)
    assert status == 0
    assert "complete" in output
    assert "3 of 3: 2 done, 1 not convex, 0 failed" in output
    assert "100 %" in output
    assert "core-hours" in output
    assert "s a table: amplitude = 0 to 0.3" in output


@pytest.fixture
def begun(store, tmp_path):
    """A copy of the store of which one task is still to be done."""
    copy = shutil.copytree(store, tmp_path / "begun.zarr")
    Ledger(copy).receipt_path(0).unlink()
    return copy


def test_progress_of_a_running_sweep_tells_what_only_the_client_knows(call, begun):
    with StoreLock(begun):
        write_pulse(begun, Pulse(workers=3, handed_out=9, losses="1 workers lost"))
        _, output, _ = call("progress", begun)
    assert f"running (process {os.getpid()} on {socket.gethostname()}, last sign of life 0 s ago)" in output
    assert "now     3 workers, 9 tasks handed out to them; 1 workers lost" in output
    assert "now" not in call("progress", begun)[1]


def test_progress_says_that_the_client_is_dead(call, begun):
    ended = subprocess.Popen([sys.executable, "-c", ""])
    ended.wait()
    lock = {"host": socket.gethostname(), "pid": ended.pid, "born": 0.0}
    (Ledger(begun).folder / "lock").write_text(json.dumps(lock))
    before = everything(begun)
    _, output, _ = call("progress", begun)
    assert f"its client is dead (process {ended.pid} on {socket.gethostname()}" in output
    assert "`scanner sweep` carries on" in output
    assert everything(begun) == before


def test_verify_lists_damage_and_repair_clears_it(call, store, tmp_path):
    status, output, _ = call("verify", store)
    assert (status, output) == (0, "all finished blocks are as they were written\n")
    damaged = tmp_path / "damaged.zarr"
    shutil.copytree(store, damaged)
    chunk = next(file for file in (damaged / "area").iterdir() if file.name.startswith("c"))
    chunk.write_bytes(b"")
    status, output, complaint = call("verify", damaged)
    assert status == 1
    assert output.startswith("area/")
    assert "--repair" in complaint
    status, output, _ = call("verify", damaged, "--repair")
    assert status == 0
    assert "run the same `scanner sweep`" in output
    assert "not running" in call("progress", damaged)[1]
    assert call("verify", damaged)[0] == 0


def test_every_check_of_this_installation_holds():
    checks = list(run_checks())
    assert len(checks) >= 15
    assert [check for check in checks if not check.holds] == []


@pytest.mark.parametrize("value", [1.2, float("nan")])
def test_a_check_that_does_not_hold_is_shown_and_the_status_is_1(call, monkeypatch, value):
    wrong = [Check("right", 1.0, 1.0, 0.1), Check("wrong", value, 1.0, 0.1)]
    monkeypatch.setattr("scanner.selfcheck.run_checks", lambda: iter(wrong))
    status, output, _ = call("selfcheck")
    assert status == 1
    assert output.splitlines()[2].split()[-1] == "FAILED"
    assert output.endswith("1 of 2 checks hold\n")
