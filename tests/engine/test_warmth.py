import os
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


def test_what_is_compiled_is_all_that_a_study_needs(tmp_path):
    """Both processes have a folder of their own: other tests fill the usual one meanwhile."""
    folder = {**os.environ, "SCANNER_CACHE": str(tmp_path)}
    for part in COMPILE.values():
        subprocess.run([sys.executable, "-c", part], check=True, env=folder)
    script = (
        "import sys\n"
        "import scanner\n"
        "from numba.core.dispatcher import Dispatcher\n"
        "table = scanner.build_table('radial_harmonic', amplitude=0.1, harmonic=2)\n"
        "survey = scanner.survey_table(table, orbits=128, bounces=1024, replicates=2)\n"
        "assert survey['librational_area_fraction'] > 0, 'the kernels of islands have not been used'\n"
        "resonances = scanner.survey_resonances(table)\n"
        "assert (resonances['curve_fate'] == 2).all(), 'the kernels of resonances have not been used'\n"
        "rooms = [module for name, module in sys.modules.items() if name.startswith('scanner')]\n"
        "kernels = {item for room in rooms for item in vars(room).values() if isinstance(item, Dispatcher)}\n"
        "assert any(kernel.stats.cache_hits for kernel in kernels)\n"
        "missed = [kernel.__name__ for kernel in kernels if kernel.stats.cache_misses]\n"
        "assert not missed, missed"
    )
    subprocess.run([sys.executable, "-c", script], check=True, env=folder)
