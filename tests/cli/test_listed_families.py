"""The list of families, studies to start from, and what completion offers."""

from __future__ import annotations

import itertools
import os
import subprocess
import sys
from pathlib import Path

import pytest

from scanner.cli.starting import STARTS, starting_study
from scanner.errors import ScannerError
from scanner.study import estimate_cost, load_study, make_plan, parse_study
from scanner.study.convexity import CONVEXITY, find_limits
from scanner.tables import FAMILIES

CONFIGS = Path(__file__).parents[2] / "configs"
BUILT_IN = [name for name in FAMILIES if name != "outline_file"]


def test_every_family_can_be_started_with_all_its_parameters():
    assert STARTS.keys() == FAMILIES.keys()
    for name, entries in STARTS.items():
        assert entries.keys() == {parameter.name for parameter in FAMILIES[name].parameters}


def test_families_are_listed_with_parameters_and_limits(call):
    status, output, _ = call("families")
    assert status == 0
    blocks = {block.partition(":")[0]: block for block in output.split("\n\n")}
    for name, family in FAMILIES.items():
        assert family.formula in blocks[name]
        assert CONVEXITY[name].rule in blocks[name]
        assert all(parameter.name in blocks[name] for parameter in family.parameters)
    assert "a whole number at least 2 and at most 511" in blocks["curvature_harmonic"]


def test_a_limit_is_told_for_given_parameters(call):
    status, output, _ = call("families", "radial_harmonic", "--at", "harmonic=3")
    assert status == 0
    assert "convex for amplitude from -0.1 to 0.1" in output


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["radial_harmonik"], "did you mean radial_harmonic?"),
        (["circle"], "known: ellipse, radial_harmonic"),
        (["radial_harmonic", "--at", "harmonic=2.5"], "harmonic must be a whole number; correct it"),
        (["radial_harmonic", "--at", "amplitude=0.1"], "leave out --at amplitude=0.1"),
        (["radial_harmonic", "--at", "harmonic"], "'harmonic' is not NAME=VALUE, for example --at"),
        (["radial_harmonic", "--at", "waves=3"], "has no parameter waves"),
        (["normal_harmonic", "--at", "harmonic=3"], "needs parameter eccentricity"),
        (["ellipse", "--at", "eccentricity=0.5"], "is convex for all its parameters"),
        (["--at", "harmonic=3"], "name it, as in scanner families limacon"),
    ],
)
def test_bad_questions_about_families_are_one_line(call, arguments, said):
    status, output, complaint = call("families", *arguments)
    assert (status, output, complaint.count("\n")) == (2, "", 1)
    assert said in complaint


@pytest.mark.parametrize("family", BUILT_IN)
def test_a_starting_study_is_estimated_as_it_is(family, tmp_path, call):
    status, text, said = call("new", family)
    assert (status, said) == (0, "")
    study = parse_study(text)
    assert study.family == family
    estimate = estimate_cost(make_plan(study), seconds=0.02)
    assert (estimate.failed, estimate.not_convex) == (0, 0)
    assert 10 <= estimate.tables <= 50


@pytest.mark.parametrize("family", [name for name in BUILT_IN if CONVEXITY[name].parameter])
def test_starting_studies_go_most_of_the_way_to_the_limit(family):
    study = parse_study(starting_study(family))
    limited = CONVEXITY[family].parameter
    others = {name: values for name, values in study.swept.items() if name != limited}
    limit = min(
        find_limits(family, {**study.fixed, **dict(zip(others, values, strict=True))})[1]
        for values in itertools.product(*others.values())
    )
    assert 0.7 * limit < study.swept[limited][-1] < limit


def test_an_outline_is_asked_for_and_then_taken(call, tmp_path):
    _, text, said = call("new", "outline_file")
    assert said.startswith("before you run it: put your outline beside the study")
    path = tmp_path / "study.toml"
    path.write_text(text)
    status, _, complaint = call("estimate", path)
    assert status == 2
    assert "outline.txt" in complaint
    assert "give a text file of points" in complaint
    (tmp_path / "outline.txt").write_text((CONFIGS / "measured_outline.txt").read_text())
    estimate = estimate_cost(make_plan(load_study(path)), seconds=0.02)
    assert (estimate.failed, estimate.not_convex) == (0, 0)


def test_the_function_in_the_comments_works(call, tmp_path, monkeypatch):
    status, text, said = call("new", "my_ovals:oval")
    assert status == 0
    assert "write your function" in said
    comment = text.partition("to my_ovals.py")[2].partition("[study]")[0]
    lines = [line[6:] for line in comment.splitlines()[1:] if line.startswith("#")]
    (tmp_path / "my_ovals.py").write_text("\n".join(lines))
    (tmp_path / "study.toml").write_text(text)
    monkeypatch.chdir(tmp_path)
    study = load_study("study.toml", allow_code=True)
    estimate = estimate_cost(make_plan(study), seconds=0.02)
    assert (estimate.tables, estimate.not_convex, estimate.failed) == (11, 0, 0)


def test_no_study_of_what_is_no_family():
    with pytest.raises(ScannerError, match="did you mean limacon"):
        starting_study("limaçon")
    with pytest.raises(ScannerError, match="must be module:function"):
        starting_study("my tables:oval")


def complete(*words):
    """What the shell is offered for the last word; and which heavy libraries that took."""
    environment = {
        **os.environ,
        "COMP_WORDS": " ".join(("scanner", *words)),
        "COMP_CWORD": str(len(words)),
        "_SCANNER_COMPLETE": "bash_complete",
    }
    code = (
        "import sys, scanner.cli\ntry: scanner.cli.main()\n"
        "finally: print(*sorted({'numpy', 'numba', 'xarray', 'pandas', 'pydantic', 'jinja2'} & set(sys.modules)), "
        "file=sys.stderr)"
    )
    found = subprocess.run([sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=True)
    assert found.stderr.strip() == ""
    return found.stdout.split()


def test_completion_offers_commands_families_choices_and_files_quickly():
    assert complete("fam") == ["plain,families"]
    assert complete("new", "li") == ["plain,limacon"]
    assert complete("summary", "s.zarr", "--format", "") == ["plain,text", "plain,csv", "plain,json"]
    assert complete("estimate", "st") == ["file,st"]
