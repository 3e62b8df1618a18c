import subprocess
import sys

import pytest

from scanner.engine import warmth
from scanner.engine.warmth import COMPILE, kernels_are_warm, warm_kernels


@pytest.fixture
def calls(tmp_path, monkeypatch):
    """Commands that would have been run, with a cache folder of their own; the first one fails."""
    made = []

    def run(command, **_):
        made.append(command)
        return subprocess.CompletedProcess(command, returncode=1 if len(made) == 1 else 0)

    monkeypatch.setattr(warmth, "cache_folder", lambda: tmp_path / "kernels")
    monkeypatch.setattr(subprocess, "run", run)
    return made


def test_kernels_are_compiled_once_by_a_process_of_its_own(calls):
    warm_kernels()
    assert not kernels_are_warm()  # It failed, so the next one tries again.
    warm_kernels()
    warm_kernels()
    assert kernels_are_warm()
    assert calls == [[sys.executable, "-c", COMPILE["orbits"]]] * 2


def test_resonances_are_compiled_where_they_are_asked_for(calls):
    warm_kernels()
    warm_kernels()
    assert kernels_are_warm()
    assert not kernels_are_warm(resonances=True)
    warm_kernels(resonances=True)
    warm_kernels(resonances=True)
    assert kernels_are_warm(resonances=True)
    assert [command[-1] for command in calls] == [COMPILE["orbits"], COMPILE["orbits"], COMPILE["resonances"]]
