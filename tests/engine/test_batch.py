import sys
import types

import pytest

from scanner.engine.batch import batch_cluster, job_options, walltime_for
from scanner.errors import EngineError
from scanner.study import Resources

SLURM = Resources(
    runner="slurm",
    workers=3,
    account="physics",
    queue="normal",
    walltime="1-02:00:00",
    memory="2GB",
    directives=("--constraint=avx2",),
    setup=("module load python",),
)


class FakeCluster:
    """Notes what it is asked for."""

    def __init__(self, **options):
        self.options = options

    def adapt(self, **bounds):
        self.bounds = bounds


@pytest.fixture
def jobqueue(monkeypatch):
    module = types.ModuleType("dask_jobqueue")
    module.SLURMCluster = module.PBSCluster = FakeCluster
    monkeypatch.setitem(sys.modules, "dask_jobqueue", module)
    return module


def test_a_job_asks_for_what_the_study_says(jobqueue, tmp_path):
    cluster = batch_cluster(SLURM, None, tmp_path / "s.zarr")
    assert cluster.options == {
        "cores": 1,
        "processes": 1,
        "memory": "2GB",
        "death_timeout": 60,
        "log_directory": str(tmp_path / "s.jobs"),
        "scheduler_options": {"dashboard_address": ":0"},
        "job_extra_directives": ["--constraint=avx2"],
        "job_script_prologue": ["module load python"],
        "queue": "normal",
        "account": "physics",
        "walltime": "1-02:00:00",
    }
    assert cluster.bounds == {"minimum_jobs": 3, "maximum_jobs": 3}


def test_what_is_left_open_is_left_to_the_configuration(tmp_path):
    options = job_options(Resources(runner="sge", workers=1), tmp_path)
    assert not options.keys() & {"queue", "account", "project", "walltime", "job_script_prologue"}


def test_the_number_of_jobs_can_be_given_with_the_command(jobqueue, tmp_path):
    assert batch_cluster(SLURM, 7, tmp_path).bounds["minimum_jobs"] == 7
    with pytest.raises(EngineError, match="add workers"):
        batch_cluster(Resources(runner="pbs"), None, tmp_path)


def test_without_the_extra_package_one_line_says_what_to_do(monkeypatch, tmp_path):
    monkeypatch.setitem(sys.modules, "dask_jobqueue", None)
    with pytest.raises(EngineError, match=r"pip install .*--scheduler-file"):
        batch_cluster(SLURM, None, tmp_path)


@pytest.mark.parametrize(
    ("runner", "walltime", "written"),
    [
        ("slurm", "1-02:00:00", "1-02:00:00"),
        ("pbs", "1-02:30:05", "26:30:05"),
        ("sge", "02:00:00", "2:00:00"),
        ("lsf", "1-00:10:30", "24:11"),
        ("lsf", "00:59:30", "0:59"),
    ],
)
def test_walltimes_are_written_as_each_system_wants_them(runner, walltime, written):
    assert walltime_for(runner, walltime) == written
