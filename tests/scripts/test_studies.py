"""Every study on a small store: it runs, prints what it says, and refuses bad requests in one line."""

import importlib
import math
import re
import subprocess
import sys
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest
from sweeps import fill
from trace_outline import BUMPS, NOISE, POINTS, SEMI_AXES, trace_outline

from scanner import open_sweep
from scanner.statistics import draw_spacings
from scanner.study import load_study, parse_study

STUDIES = Path(__file__).parents[2] / "scripts" / "studies"

OUTLINE = Path(__file__).parents[2] / "configs" / "measured_outline.toml"

QUADRUPOLE = """
[study]
title = "Quadrupole"
seed = 5
[table]
family = "radial_harmonic"
harmonic = 2
amplitude = { values = [0.02, 0.1, 0.22] }
[orbits]
per_table = 128
bounces = 2048
replicates = 4
"""
ROUGH = """
[study]
title = "Rough"
seed = 5
[table]
family = "random_harmonic"
eccentricity = 0.4
amplitude = { values = [0.002, 0.01] }
decay = 3.0
harmonic_max = 4
realisation = { values = [1, 2, 3] }
[orbits]
per_table = 64
bounces = 256
replicates = 4
"""


@pytest.fixture(scope="session")
def quadrupole(tmp_path_factory):
    store = tmp_path_factory.mktemp("studies") / "quadrupole.zarr"
    fill(store, parse_study(QUADRUPOLE, "quadrupole"))
    return store


@pytest.fixture(scope="session")
def rough(tmp_path_factory):
    store = tmp_path_factory.mktemp("studies") / "rough.zarr"
    fill(store, parse_study(ROUGH, "rough"))
    return store


@pytest.fixture
def run(monkeypatch, capsys):
    """Run a study here and return the rows it prints, as words."""
    monkeypatch.syspath_prepend(str(STUDIES))

    def call(name, *arguments):
        study = importlib.import_module(name)
        monkeypatch.setattr(sys, "argv", [f"{name}.py"])
        study.answer(study.main, [str(argument) for argument in arguments])
        return [line.split() for line in capsys.readouterr().out.splitlines()]

    return call


def test_regular_fraction_at_infinity(run, quadrupole):
    rows = run("regular_fraction_at_infinity", quadrupole)
    assert [row[0] for row in rows[1:]] == ["0.02", "0.1"]  # 0.22 is not convex
    stored = open_sweep(quadrupole)
    regular = run("regular_fraction_at_infinity", quadrupole, "--regular", "--section", "--select", "amplitude=0.1")
    assert float(regular[1][0]) == pytest.approx(stored["regular_area_fraction"].values[1], abs=1e-5)  # five digits


def test_critical_amplitude(run, quadrupole):
    _, heading, row = run("critical_amplitude", quadrupole, "--resamples", "200")
    found = dict(zip(heading, row, strict=False))
    fractions = open_sweep(quadrupole)["regular_volume_fraction_replicates"].mean("replicate").values
    line = 0.02 + 0.08 * (fractions[0] - 0.5) / (fractions[0] - fractions[1])
    assert float(found["amplitude"]) == pytest.approx(line, rel=1e-4)  # five digits are printed
    assert 0.02 < float(found["low"]) <= float(found["amplitude"]) <= float(found["high"]) < 0.1
    chaotic = run("critical_amplitude", quadrupole, "--quantity", "chaotic_area_fraction", "--level", "0.4")
    assert 0.02 < float(chaotic[2][0]) < 0.1
    assert "does not cross" in " ".join(run("critical_amplitude", quadrupole, "--level", "1.5")[2])


def test_ensemble_average(run, rough, tmp_path):
    target = tmp_path / "rough.png"
    rows = run("ensemble_average", rough, "--to", target)
    means = open_sweep(rough)["regular_area_fraction"].mean("realisation").values
    np.testing.assert_allclose([float(row[1]) for row in rows[2:]], means, rtol=1e-4)  # five digits are printed
    assert [row[-1] for row in rows[2:]] == ["3", "3"]
    assert target.read_bytes().startswith(b"\x89PNG")


def test_spacing_statistics(run, quadrupole, tmp_path):
    rows = run("spacing_statistics", quadrupole, "--count", "400")
    assert len(rows) == 3
    # Drawn at the orbits' own rho_1: the difference is normal; 4 has a probability of 6e-5.
    assert all(abs(float(row[-1])) < 4.0 for row in rows[1:])
    foreign = tmp_path / "spacings.txt"
    regular_spacings = draw_spacings(2000, 1.0, generator=np.random.default_rng(1))
    foreign.write_text("\n".join(map(str, regular_spacings)))
    target = tmp_path / "spacings.svg"
    one = run("spacing_statistics", quadrupole, "--select", "amplitude=0.1", "--spacings", foreign, "--to", target)
    assert float(one[1][-1]) > 4.0  # the spectrum of a regular table is not that of a chaotic one
    assert "<svg" in target.read_text()


def test_calibrate_verdicts(run):
    rows = run("calibrate_verdicts", "--orbits", "64", "--bounces", "512", "--reference", "1024")
    assert ["0.99"] == [row[0] for row in rows if row[:1] == ["0.99"]]
    mixed = [row for row in rows if row[:1] in (["limacon"], ["radial_harmonic"]) and len(row) > 9]
    assert len(mixed) == 8
    for *_, chaotic, wrong, undecided, _, _, left_wrong, chaotic_wrong, bounces, percent in mixed:
        assert 0 <= int(left_wrong) <= int(wrong) <= int(chaotic)
        assert 0 <= int(undecided) <= 64
        assert int(chaotic_wrong) == 0
        assert float(percent) == pytest.approx(100 * float(bounces) / 512, rel=1e-3)


def test_measured_outline(run, tmp_path):
    rows = dict(line.split(maxsplit=1) for line in map(" ".join, run("measured_outline", OUTLINE)))
    # Computed here: 11 coefficients fitted to 400 points shrink the residual by 1.4 %, their scatter by 3.6 %.
    assert float(rows["residual"]) == pytest.approx(NOISE * math.sqrt(1 - 11 / POINTS), rel=0.1)
    # An axis rests on waves 0 and 2 of the radius, fitted with an error of NOISE sqrt(3 / POINTS): four of them.
    axes = [float(axis.strip(",")) for axis in rows["semi-axes"].split()]
    assert axes == pytest.approx(SEMI_AXES, abs=4 * NOISE * math.sqrt(3 / POINTS))
    drawn = math.sqrt(sum(height**2 for height, _ in BUMPS.values()) / 2)
    assert float(rows["departure"].split()[0]) == pytest.approx(drawn, abs=3 * float(rows["known"].split()[-1]))
    small = OUTLINE.read_text().replace("count = 41", "count = 2").replace("2048", "128").replace("16384", "2048")
    study = tmp_path / "small.toml"
    study.write_text(small.replace("measured_outline.txt", str(OUTLINE.with_suffix(".txt"))))
    fill(tmp_path / "small.zarr", load_study(study))
    ellipse, beyond = run("measured_outline", study, tmp_path / "small.zarr")[-2:]
    assert [ellipse[0], beyond[0]] == ["0", "2"]
    assert float(ellipse[1]) > 0.98  # all of an ellipse is regular; some is undecided after so few bounces
    assert float(beyond[1]) < 0.5


def test_the_outline_is_what_its_script_draws():
    points = np.loadtxt(OUTLINE.with_suffix(".txt"))
    np.testing.assert_allclose(points, trace_outline().T, rtol=0.0, atol=0.0101)  # the last digit may round either way


@pytest.mark.parametrize("name", [path.stem for path in sorted(STUDIES.glob("*.py")) if path.stem != "study_tools"])
def test_each_study_starts_as_a_notebook(name, monkeypatch):
    """Its cells run one by one, a text first; the last one takes its example for the command line of the kernel."""
    monkeypatch.syspath_prepend(str(STUDIES))
    first, *cells = re.split(r"^# %%", (STUDIES / f"{name}.py").read_text(), flags=re.MULTILINE)[1:]
    assert first.startswith(' [markdown]\n"""')
    assert first.rstrip().endswith('"""')
    space: dict[str, object] = {"__name__": "notebook", "__doc__": "what the kernel says of itself"}
    for cell in cells:
        exec(compile("\n" + cell, name, "exec"), space)
    assert callable(space["main"])
    monkeypatch.setitem(sys.modules, "ipykernel", ModuleType("ipykernel"))
    taken: list[object] = []
    monkeypatch.setitem(space, "main", taken.append)
    space["__name__"] = "__main__"
    exec(compile("\n" + cells[-1], name, "exec"), space)
    assert isinstance(taken[0], list)


@pytest.mark.parametrize(
    ("name", "arguments", "message"),
    [
        ("critical_amplitude", ["--along", "phase"], "--along phase"),
        ("critical_amplitude", ["--quantity", "area"], "invalid choice: 'area'"),
        ("ensemble_average", [], "--over realisation"),
        ("ensemble_average", ["--over", "amplitude", "--quantity", "area"], "area has no standard error"),
        ("spacing_statistics", ["--to", "here.png"], "one table, 2 are selected"),
        ("spacing_statistics", ["--select", "amplitude"], "NAME=VALUE"),
        (
            "spacing_statistics",
            ["--select", "amplitude=0.1", "--spacings", "nowhere.txt"],
            "nowhere.txt cannot be read",
        ),
        ("regular_fraction_at_infinity", ["--select", "amplitude=0.22"], "no table of this store is done"),
        ("regular_fraction_at_infinity", ["--exponents", "0.5", "1.5"], "range above 1"),
    ],
)
def test_bad_requests_are_refused_in_one_line(run, quadrupole, capsys, name, arguments, message):
    with pytest.raises(SystemExit) as caught:
        run(name, quadrupole, *arguments)
    assert caught.value.code == 2
    said = capsys.readouterr().err
    assert message in said
    assert said.count("\n") == 1


def test_from_the_command_line(quadrupole, tmp_path):
    """As a user starts it: from any folder, by its path."""
    command = [sys.executable, STUDIES / "critical_amplitude.py", tmp_path / "none.zarr"]
    answer = subprocess.run(command, capture_output=True, text=True, cwd=tmp_path, check=False)
    assert answer.returncode == 2
    assert answer.stderr.startswith("critical_amplitude.py: ")
    assert answer.stderr.count("\n") == 1
