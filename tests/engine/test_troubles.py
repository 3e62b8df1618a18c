"""Sweeps on a clock that jumps, with a table that raises, and between processes that check each other's papers."""

import os
import subprocess
import sys
import time

import pytest
from own_cluster import own_cluster
from slow_sweep import Sweep, write_study
from sweeps import fill, results

from scanner.store import Ledger
from scanner.study import load_study

JUMPING_CLOCK = """
import os
import time

right = time.time
time.time = lambda: right() - (7200 if os.path.exists(os.environ["CLOCK_IS_WRONG"]) else 0)
"""


def test_a_clock_that_is_set_back_disturbs_nothing(study, undisturbed, tmp_path):
    (tmp_path / "sitecustomize.py").write_text(JUMPING_CLOCK)
    wrong = tmp_path / "wrong"
    paths = os.pathsep.join([str(tmp_path), *filter(None, [os.environ.get("PYTHONPATH")])])
    sweep = Sweep(
        study,
        tmp_path / "slow.zarr",
        "--workers",
        "2",
        seconds_a_table=0.04,
        PYTHONPATH=paths,
        CLOCK_IS_WRONG=str(wrong),
    )
    sweep.await_receipts(1)
    # Not within 2 ms of a message: dask would hold the next one back until the clock is where it was.
    time.sleep(0.5)
    wrong.touch()
    status, printed = sweep.wait()
    assert status == 0, printed
    finished = [receipt.finished for receipt in Ledger(sweep.store).receipts()]
    assert max(finished) - min(finished) > 7000  # The workers' clocks did jump.
    assert results(sweep.store) == undisturbed
    command = [sys.executable, "-m", "scanner", "progress", str(sweep.store)]
    shown = subprocess.run(command, capture_output=True, text=True, check=True).stdout
    assert "complete" in shown
    assert "-" not in shown.replace("core-hours", "")  # no negative rate or time


def test_a_table_that_raises_fails_alone(study, monkeypatch, tmp_path):
    sweep = Sweep(study, tmp_path / "slow.zarr", "--workers", "2", RAISE="")
    status, printed = sweep.wait()
    assert status == 1, printed
    assert "failed: number = 7: " in printed
    assert "seven is not my number" in printed
    assert "137 of 138 tables done" in printed
    monkeypatch.setenv("RAISE", "")
    monkeypatch.chdir(study.parent)
    fill(tmp_path / "here.zarr", load_study(study, allow_code=True))
    sys.modules.pop("slow_shapes", None)
    assert results(sweep.store) == results(tmp_path / "here.zarr")
    assert Sweep(study, sweep.store, "--workers", "2").wait()[0] == 1  # It has failed for good.


@pytest.fixture(scope="module")
def papers(tmp_path_factory):
    """A certificate that vouches for itself, and its key."""
    folder = tmp_path_factory.mktemp("papers")
    subject = [
        "-subj",
        "/CN=cluster",
        "-days",
        "2",
        "-keyout",
        str(folder / "key.pem"),
        "-out",
        str(folder / "cert.pem"),
    ]
    kind = ["-newkey", "ec", "-pkeyopt", "ec_paramgen_curve:prime256v1", "-nodes"]
    try:
        subprocess.run(["openssl", "req", "-x509", *kind, *subject], check=True, capture_output=True)
    except FileNotFoundError:
        pytest.skip("no certificates: openssl not installed")
    return folder


def resources(papers, runner):
    """Name the certificates in a study."""
    keys = f'tls_ca = "{papers}/cert.pem"\ntls_cert = "{papers}/cert.pem"\ntls_key = "{papers}/key.pem"\n'
    return f'[resources]\nrunner = "{runner}"\n{keys}'


def test_only_who_has_a_certificate_is_let_in(study, undisturbed, papers, tmp_path):
    files = [
        f"--tls-{what}={papers}/{name}.pem" for what, name in (("ca-file", "cert"), ("cert", "cert"), ("key", "key"))
    ]
    trusted = write_study(tmp_path, resources(papers, "scheduler"))
    with own_cluster(tmp_path, study, options=["--protocol", "tls", *files]) as cluster:
        stranger = Sweep(study, tmp_path / "no.zarr", "--scheduler-file", str(cluster.file))
        friend = Sweep(trusted, tmp_path / "slow.zarr", "--scheduler-file", str(cluster.file))
        status, printed = stranger.wait()
        assert (status, printed.count("\n")) == (2, 1), printed
        assert "no scheduler answers there" in printed
        assert not stranger.store.exists()
        status, printed = friend.wait()
        assert status == 0, printed
    assert "scheduler tls://127.0.0.1:" in friend.log()
    assert results(friend.store) == undisturbed


def test_a_script_for_pbs_runs_by_hand_and_with_certificates(undisturbed, papers, tmp_path):
    asked = (
        'workers = 1\nwalltime = "1-00:00:30"\nqueue = "long"\nmemory = "600MB"\nsetup = ["export SECONDS_A_TABLE=0"]\n'
    )
    study = write_study(tmp_path, resources(papers, "pbs") + asked)
    command = [
        sys.executable,
        "-m",
        "scanner",
        "jobscript",
        str(study),
        "--store",
        str(tmp_path / "it's.zarr"),
        "--for",
        "pbs",
    ]
    written = subprocess.run([*command, "--allow-code"], cwd=tmp_path, capture_output=True, text=True, check=True)
    assert written.stderr.startswith("all elements must run on one host")
    script = tmp_path / "job.sh"
    script.write_text(written.stdout)
    assert [line for line in written.stdout.splitlines() if line.startswith("#PBS")] == [
        "#PBS -N scanner",
        "#PBS -S /bin/bash",
        "#PBS -J 0-1",
        "#PBS -l select=1:ncpus=1:mem=811mb",
        "#PBS -l walltime=24:00:30",
        "#PBS -q long",
        "#PBS -j oe",
        "#PBS -o /dev/null",
    ]
    elements = [
        subprocess.Popen(
            ["bash", str(script)],
            cwd="/",
            env={**os.environ, "PBS_JOBID": f"12[{number}].host", "PBS_ARRAY_INDEX": str(number)},
        )
        for number in (1, 0)
    ]
    statuses = [element.wait(120) for element in elements]
    printed = (tmp_path / "it's.jobs" / "12-0.log").read_text()
    assert statuses == [0, 0], printed
    assert "138 of 138 tables done" in printed
    assert "Scheduler at:     tls://127.0.0.1" in printed
    assert results(tmp_path / "it's.zarr") == undisturbed
    # An element whose turn comes when all is done has nothing to do.
    late = {**os.environ, "PBS_JOBID": "12[1].host", "PBS_ARRAY_INDEX": "1"}
    assert subprocess.run(["bash", str(script)], env=late, timeout=20, check=False).returncode == 0
