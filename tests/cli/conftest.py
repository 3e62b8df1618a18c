"""A small real sweep, with tables that are done, not convex and failed, in a folder with an awkward name."""

from __future__ import annotations

import sys

import pytest

from scanner.cli.program import run

TITLE = 'A "small" sweep of Größe'

STUDY = """
[study]
title = 'A "small" sweep of Größe'
seed = 7
[table]
family = "radial_harmonic"
harmonic = 2
amplitude = { values = [0.0, 0.05, 0.3] }
[orbits]
per_table = 64
bounces = 256
replicates = 4
"""

CODE = """
import math

def moody(size):
    if size == 2.0:
        raise ValueError("not in the mood")
    turns = [number / 256 for number in range(256)]
    return ([size * math.cos(2 * math.pi * t) for t in turns], [size * math.sin(2 * math.pi * t) for t in turns])
"""


@pytest.fixture(scope="session")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("a 'folder' of Größe")


@pytest.fixture(scope="session")
def study(folder):
    path = folder / "my study.toml"
    path.write_text(STUDY, encoding="utf-8")
    return path


@pytest.fixture(scope="session")
def small_crew():
    from distributed import Client

    with Client(processes=False, n_workers=1, threads_per_worker=1, dashboard_address=":0") as client:
        yield client


@pytest.fixture(scope="session")
def store(folder, study, small_crew):
    from scanner.engine import run_study

    path = folder / "my store.zarr"
    assert run_study(study, path, small_crew, progress=False).exit_status == 0
    return path


@pytest.fixture(scope="session")
def moody_study(folder):
    (folder / "moody_tables.py").write_text(CODE)
    sys.path.insert(0, str(folder))
    path = folder / "moody.toml"
    text = STUDY.replace("radial_harmonic", "moody_tables:moody").replace("harmonic = 2\n", "")
    path.write_text(text.replace("amplitude = { values = [0.0, 0.05, 0.3] }", "size = { values = [1.0, 2.0] }"))
    yield path
    sys.path.remove(str(folder))


@pytest.fixture(scope="session")
def moody_store(folder, moody_study, small_crew):
    from scanner.engine import run_study

    path = folder / "moody.zarr"
    assert run_study(moody_study, path, small_crew, allow_code=True, progress=False).exit_status == 1
    return path


@pytest.fixture
def call(capsys):
    """Run a command line: its exit status, what it printed and what it complained."""

    def call(*arguments):
        status = run([str(argument) for argument in arguments])
        output = capsys.readouterr()
        return status, output.out, output.err

    return call
