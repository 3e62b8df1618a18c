"""A study that is swept under every disturbance, and what an undisturbed run makes of it."""

from __future__ import annotations

import os
import sys

import pytest
from distributed import Client, LocalCluster
from slow_sweep import STARTED, write_study
from sweeps import fill, results

from scanner.engine import run_study
from scanner.study import load_study


@pytest.fixture(scope="session")
def study(tmp_path_factory):
    return write_study(tmp_path_factory.mktemp("study"))


@pytest.fixture(scope="session")
def undisturbed(study, tmp_path_factory):
    """The same study, computed here one task after the other."""
    path = tmp_path_factory.mktemp("undisturbed") / "slow.zarr"
    here = os.getcwd()
    os.chdir(study.parent)
    try:
        fill(path, load_study(study, allow_code=True))
    finally:
        os.chdir(here)
        sys.modules.pop("slow_shapes", None)
    return results(path)


@pytest.fixture
def carry_on(study, monkeypatch):
    """Run the study again on the same store, with a worker in this process."""
    monkeypatch.chdir(study.parent)

    def run(store):
        with (
            LocalCluster(n_workers=1, threads_per_worker=1, processes=False, dashboard_address=":0") as cluster,
            Client(cluster) as client,
        ):
            assert run_study(study, store, client, allow_code=True, progress=False).exit_status == 0

    yield run
    sys.modules.pop("slow_shapes", None)


@pytest.fixture(autouse=True)
def nothing_left_running():
    """End what a test that failed has left behind."""
    yield
    while STARTED:
        STARTED.pop().end()
