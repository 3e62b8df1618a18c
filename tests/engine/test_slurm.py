"""Sweeps whose workers are jobs of a real Slurm, started for these tests."""

import subprocess
import sys

import pytest
from own_slurm import ask, own_slurm, why_no_slurm
from slow_sweep import Sweep, wait_until, write_study
from sweeps import results

pytestmark = pytest.mark.skipif(why_no_slurm() is not None, reason=f"no real Slurm: {why_no_slurm()}")

RESOURCES = """
[resources]
runner = "slurm"
workers = 2
interface = "lo"
memory = "600MB"
walltime = "00:10:00"
setup = ["export PREPARED=yes"]
"""


@pytest.fixture(scope="module")
def slurm():
    with own_slurm() as environment:
        yield environment


def jobs(slurm):
    """Numbers of the jobs that run."""
    return ask(slurm, "squeue", "-h", "-r", "-t", "running", "-o", "%i").split()


def test_a_job_that_is_cancelled_is_replaced(slurm, undisturbed, tmp_path):
    study = write_study(tmp_path, RESOURCES)
    impatient = {"DASK_DISTRIBUTED__DEPLOY__LOST_WORKER_TIMEOUT": "1s"}
    sweep = Sweep(study, tmp_path / "slow.zarr", "--yes", seconds_a_table=0.2, **slurm, **impatient)
    sweep.await_receipts(1)
    wait_until(lambda: sweep.log().count("has joined") == 2)
    first = jobs(slurm)
    assert len(first) == 2
    ask(slurm, "scancel", first[0])
    wait_until(lambda: len(set(jobs(slurm)) - {*first}) == 1)
    status, printed = sweep.wait()
    assert status == 0, printed
    assert ", 1 workers lost" in printed
    assert "is gone" in sweep.log()
    assert results(sweep.store) == undisturbed
    wait_until(lambda: not jobs(slurm))


def test_a_job_that_ends_before_its_worker_joins_is_replaced(slurm, undisturbed, tmp_path):
    first_one_ends = f"mkdir {tmp_path / 'ended'} 2> /dev/null && exit 1"
    study = write_study(tmp_path, RESOURCES.replace("export PREPARED=yes", first_one_ends))
    impatient = {"DASK_DISTRIBUTED__DEPLOY__LOST_WORKER_TIMEOUT": "1s"}
    sweep = Sweep(study, tmp_path / "slow.zarr", "--yes", seconds_a_table=0.1, **slurm, **impatient)
    wait_until(lambda: sweep.log().count("has joined") == 2)
    status, printed = sweep.wait()
    assert status == 0, printed
    assert sweep.log().count("ended before its worker joined") == 1
    assert results(sweep.store) == undisturbed


def test_a_queue_that_takes_no_job_is_one_line(slurm, tmp_path):
    study = write_study(tmp_path, RESOURCES + 'queue = "closed"\n')
    sweep = Sweep(study, tmp_path / "slow.zarr", "--yes", **slurm)
    status, printed = sweep.wait()
    assert status == 2
    assert "scanner: no jobs can be submitted to slurm (sbatch: error: invalid partition specified: closed" in printed
    assert "Traceback" not in printed


def test_the_printed_script_sweeps_as_an_array_of_jobs(slurm, undisturbed, tmp_path):
    study = write_study(tmp_path, RESOURCES)
    store = tmp_path / "array.zarr"
    command = [sys.executable, "-m", "scanner", "jobscript", str(study), "--store", str(store), "--for", "slurm"]
    script = subprocess.run([*command, "--allow-code"], cwd=tmp_path, check=True, capture_output=True, text=True)
    submitted = subprocess.run(
        ["sbatch", "--parsable"], input=script.stdout, env=slurm, check=True, capture_output=True, text=True
    )
    wait_until(lambda: not ask(slurm, "squeue", "-h"))
    printed = (tmp_path / "array.jobs" / f"{submitted.stdout.strip()}-0.log").read_text()
    assert "138 of 138 tables done" in printed
    assert "Traceback" not in printed
    assert results(store) == undisturbed
