import sys

import dask
import dask_jobqueue
import pytest

from scanner.engine.batch import CLUSTERS, batch_cluster, job_options, lifetime_options, walltime_for
from scanner.errors import EngineError
from scanner.study import Resources

ASKED = {
    "workers": 3,
    "interface": "lo",
    "account": "physics",
    "queue": "normal",
    "walltime": "1-02:00:00",
    "memory": "2GB",
    "directives": ("--wanted",),
    "setup": ("module load python",),
}


def script(tmp_path, **asked):
    """Write the script of a job, as the package that submits it does."""
    resources = Resources(**asked)
    options = job_options(resources, tmp_path / "s.jobs")
    with getattr(dask_jobqueue, CLUSTERS[resources.runner])(**options) as cluster:
        return cluster.job_script()


@pytest.mark.parametrize(
    ("runner", "header"),
    [
        ("slurm", ["-A physics", "-p normal", "-t 1-02:00:00", "-n 1", "--cpus-per-task=1", "--mem=2G", "--wanted"]),
        ("pbs", ["-A physics", "-q normal", "-l walltime=26:00:00", "--wanted"]),
        ("lsf", ['-P "physics"', "-q normal", "-W 26:00", "-n 1", "--wanted"]),
        ("sge", ["-P physics", "-q normal", "-l h_rt=26:00:00", "--wanted"]),
    ],
)
def test_a_job_asks_for_what_the_study_says(runner, header, tmp_path):
    lines = script(tmp_path, runner=runner, **ASKED).splitlines()
    asked = [line.partition(" ")[2] for line in lines if line.startswith("#") and not line.startswith("#!")]
    assert set(header) <= set(asked)
    assert "module load python" in lines
    command = lines[-1]
    for wanted in (
        sys.executable,
        "--nthreads 1",
        "--nanny",
        "--death-timeout 60",
        "--interface lo",
        "--lifetime 93420s",
    ):
        assert wanted in command
    assert (tmp_path / "s.jobs").is_dir()


def test_what_is_left_open_is_left_to_the_configuration(tmp_path):
    options = job_options(Resources(runner="sge", workers=1), tmp_path)
    assert not options.keys() & {"queue", "account", "project", "walltime", "security"}


def test_the_interpreter_may_lie_in_a_folder_with_a_space_and_be_another_one(tmp_path, monkeypatch):
    monkeypatch.setattr("sys.executable", "/a folder/bin/python")
    with dask_jobqueue.SLURMCluster(**job_options(Resources(runner="slurm", workers=1), tmp_path)) as cluster:
        assert "\n'/a folder/bin/python' -m distributed" in cluster.job_script()
    with dask.config.set({"jobqueue.slurm.python": "/opt/python"}):
        assert job_options(Resources(runner="slurm"), tmp_path)["python"] == "/opt/python"


def test_everything_stays_on_the_loopback_address_unless_told_otherwise(tmp_path):
    assert job_options(Resources(runner="pbs"), tmp_path)["interface"] == "lo"
    assert job_options(Resources(runner="pbs", interface="ib0"), tmp_path)["interface"] == "ib0"
    named = job_options(Resources(runner="pbs", host="login1"), tmp_path)
    assert "interface" not in named
    assert named["scheduler_options"]["host"] == "login1"


def test_a_job_needs_the_number_of_its_like(tmp_path):
    with pytest.raises(EngineError, match="add workers"):
        batch_cluster(Resources(runner="pbs"), None, tmp_path, print)


def test_without_the_extra_package_one_line_says_what_to_do(monkeypatch, tmp_path):
    monkeypatch.setitem(sys.modules, "dask_jobqueue", None)
    with pytest.raises(EngineError, match=r"pip install .*scanner jobscript"):
        batch_cluster(Resources(runner="slurm", workers=1), None, tmp_path, print)


def test_a_batch_system_that_is_not_there_is_one_line(monkeypatch, tmp_path):
    monkeypatch.setenv("PATH", str(tmp_path))
    said = []
    with pytest.raises(EngineError, match=r"no jobs can be submitted to pbs \(.*qsub.*\); check") as caught:
        batch_cluster(Resources(runner="pbs", workers=2), None, tmp_path / "s.zarr", said.append)
    assert "\n" not in str(caught.value)
    assert "loopback" in said[0]


def test_an_interface_that_is_not_there_is_one_line(tmp_path):
    with pytest.raises(EngineError, match="ib77"):
        batch_cluster(Resources(runner="pbs", workers=2, interface="ib77"), None, tmp_path / "s.zarr", print)


@pytest.mark.parametrize(
    ("walltime", "options"),
    [
        (None, []),
        ("12:00:00", ["--lifetime", "43020s", "--lifetime-stagger", "60s"]),
        ("00:04:00", ["--lifetime", "180s", "--lifetime-stagger", "20s"]),
    ],
)
def test_workers_leave_before_their_job_is_ended(walltime, options):
    assert lifetime_options(Resources(runner="slurm", walltime=walltime)) == options


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
    assert walltime_for(Resources(runner=runner, walltime=walltime)) == written
