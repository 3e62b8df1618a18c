"""Families that depend on a file outside the study: a measured outline, a function of the user's own."""

import math

import pytest
from sweeps import check_all

from scanner.errors import StudyError
from scanner.study import load_study, make_plan, parse_study

TEXT = """\
[study]
title = "Sources"
seed = 1
[table]
family = "outline_file"
file = "outline.txt"
amplitude = { values = [0, 1] }
[orbits]
per_table = 64
bounces = 256
replicates = 4
"""
OWN = TEXT.replace("outline_file", "MODULE:make").replace('file = "outline.txt"', "waves = 3")
CODE = """\
import numpy as np

def make(amplitude, waves):
    harmonics = np.zeros((4, waves + 2))
    harmonics[0, 1] = harmonics[3, 1] = 1
    harmonics[0, waves] = 0.01 * amplitude
    if amplitude == 2:
        raise KeyError("two\\nis too much")
    return harmonics
"""


def write_outline(path, size=1.0):
    angles = [2 * math.pi * i / 200 for i in range(200)]
    path.write_text("".join(f"{size * math.cos(t)!r} {0.8 * math.sin(t)!r}\n" for t in angles))


def test_an_outline_counts_by_its_content(tmp_path):
    prints = []
    for place, size in (("a", 1.0), ("b", 1.0), ("c", 1.1)):
        folder = tmp_path / place
        folder.mkdir()
        write_outline(folder / "outline.txt", size)
        (folder / "study.toml").write_text(TEXT)
        study = load_study(folder / "study.toml")
        assert study.fixed["file"] == str(folder / "outline.txt")
        assert [check.state for check in check_all(make_plan(study))] == ["convex", "convex"]
        prints.append(study.fingerprint)
    assert prints[0] == prints[1] != prints[2]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (
            None,
            r'table\.file = "outline\.txt": .* cannot be read: No such file or directory; give a text file of points',
        ),
        ("1 2\nx y\n", r'table\.file = "outline\.txt": line 2 must be two finite numbers'),
    ],
)
def test_a_bad_outline_is_refused(tmp_path, content, message):
    if content:
        (tmp_path / "outline.txt").write_text(content)
    with pytest.raises(StudyError, match=message):
        parse_study(TEXT, folder=tmp_path)


def test_a_path_cannot_be_swept(tmp_path):
    text = TEXT.replace('"outline.txt"', '{ values = ["a.txt"] }')
    with pytest.raises(StudyError, match=r"table\.file = .* must be one line of text, which cannot be swept"):
        parse_study(text, folder=tmp_path)


def test_own_code_counts_by_its_content(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    prints = []
    for module, code in (("own_one", CODE), ("own_two", CODE.replace("0.01", "0.02"))):
        (tmp_path / f"{module}.py").write_text(code)
        study = parse_study(OWN.replace("MODULE", module), allow_code=True)
        assert study.fixed == {"waves": 3}
        assert study.swept == {"amplitude": (0, 1)}
        prints.append(study.sources["family"])
    assert prints[0] != prints[1]


def test_own_code_that_raises_is_a_failed_table(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "own_raising.py").write_text(CODE)
    study = parse_study(OWN.replace("MODULE", "own_raising").replace("[0, 1]", "[1, 2]"), allow_code=True)
    checks = check_all(make_plan(study))
    assert [check.state for check in checks] == ["convex", "failed"]
    assert "KeyError" in checks[1].reason
    assert "\n" not in checks[1].reason


def test_own_code_that_ends_the_program_is_told(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "own_ending.py").write_text("raise SystemExit(3)")
    with pytest.raises(StudyError, match=r"its module ends the program when imported \(3\)"):
        parse_study(OWN.replace("MODULE", "own_ending"), allow_code=True)
    (tmp_path / "own_leaving.py").write_text("def make(**_):\n    raise SystemExit(3)")
    study = parse_study(OWN.replace("MODULE", "own_leaving"), allow_code=True)
    assert {(check.state, check.reason) for check in check_all(make_plan(study))} == {("failed", "SystemExit: 3")}


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("MODULE:make", "no_such_module:make", r"table\.family = .* module no_such_module cannot be imported"),
        ("MODULE:make", "math:make", r"table\.family = .* module math has no function make; correct the name"),
        ("waves = 3", "class = 3", r"table\.class must be the name of a parameter of math:cos; rename it"),
        ("waves = 3", '"my key" = 3', r'table\."my key" must be the name of a parameter'),
        ("waves = 3", 'waves = "3"', r'table\.waves = "3" must be a finite number'),
        ("waves = 3", "area = { values = [1] }", r"table\.area cannot be swept: the store has a variable .* rename"),
        ("waves = 3", "orbits = { values = [1] }", r"table\.orbits cannot be swept: the store has a variable or group"),
        ("waves = 3", "rotation = { values = [1] }", r"table\.rotation cannot be swept: the store has"),
        ("waves = 3", "orbit = { values = [1] }", r"table\.orbit cannot be swept: the store has a variable .* rename"),
    ],
)
def test_bad_studies_of_own_code(old, new, message):
    text = OWN.replace(old, new).replace("MODULE:make", "math:cos")
    with pytest.raises(StudyError, match=message):
        parse_study(text, allow_code=True)


def test_numbers_of_own_code_are_whole_if_all_are_written_so(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "own_numbers.py").write_text(CODE)
    text = OWN.replace("MODULE", "own_numbers").replace("waves = 3", "waves = { start = 1, stop = 3, count = 3 }")
    swept = parse_study(text.replace("[0, 1]", "[0, 1.5]"), allow_code=True).swept
    assert swept == {"waves": (1, 2, 3), "amplitude": (0.0, 1.5)}
    assert [type(values[0]) for values in swept.values()] == [int, float]
