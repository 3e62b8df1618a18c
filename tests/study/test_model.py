"""The fingerprint: everything that decides a result, and nothing else."""

import pickle

import pytest

from scanner.study import make_plan, parse_study

TEXT = """\
[study]
title = "A title"
seed = 1
[table]
family = "radial_harmonic"
amplitude = { start = 0.0, stop = 0.1, count = 3 }
harmonic = { values = [2, 3] }
[orbits]
per_table = 128
bounces = 1024
replicates = 4
[resources]
runner = "local"
workers = 2
"""


def fingerprint(*change: str) -> str:
    text = TEXT.replace(*change) if change else TEXT
    assert not change or text != TEXT
    return parse_study(text).fingerprint


@pytest.mark.parametrize(
    "change",
    [
        ("A title", "Another title"),
        ("workers = 2", "workers = 64"),
        ('runner = "local"', 'runner = "slurm"\nqueue = "long"\nsetup = ["module load python"]'),
        ("[table]", "# a comment\n[table]"),
        ("start = 0.0, stop = 0.1", "stop = 0.1, start = 0"),
        ("{ start = 0.0, stop = 0.1, count = 3 }", "{ values = [0, 0.05, 0.1] }"),
        ("seed = 1", "seed = 0x1"),
    ],
)
def test_what_decides_no_result_leaves_the_fingerprint(change):
    assert fingerprint(*change) == fingerprint()


@pytest.mark.parametrize(
    "change",
    [
        ("seed = 1", "seed = 2"),
        ("count = 3", "count = 4"),
        ("stop = 0.1", "stop = 0.10000000000000002"),
        ("[2, 3]", "[2, 4]"),
        ("{ values = [2, 3] }", "2"),
        ("{ values = [2, 3] }", "{ values = [2] }"),
        ("per_table = 128", "per_table = 256"),
        ("replicates = 4", "replicates = 4\nadaptive = false"),
        ("replicates = 4", "replicates = 4\nexponent_bounces = 512"),
        ("bounces = 1024", "bounces = 1025"),
        ("replicates = 4", "replicates = 2"),
        ("replicates = 4", "replicates = 4\ntarget_error = 0.01\nmost_per_table = 1024"),
        (
            "amplitude = { start = 0.0, stop = 0.1, count = 3 }\nharmonic = { values = [2, 3] }",
            "harmonic = { values = [2, 3] }\namplitude = { start = 0.0, stop = 0.1, count = 3 }",
        ),
    ],
)
def test_what_decides_a_result_changes_the_fingerprint(change):
    assert fingerprint(*change) != fingerprint()


@pytest.mark.parametrize(
    "change", [("target_error = 0.01", "target_error = 0.02"), ("most_per_table = 1024", "most_per_table = 2048")]
)
def test_the_target_and_its_bound_decide_results(change):
    rounds = TEXT.replace("replicates = 4", "replicates = 4\ntarget_error = 0.01\nmost_per_table = 1024")
    assert parse_study(rounds.replace(*change)).fingerprint != parse_study(rounds).fingerprint


def test_a_study_and_its_plan_travel_to_workers():
    plan = make_plan(parse_study(TEXT))
    copy = pickle.loads(pickle.dumps(plan))
    assert copy == plan
    assert copy.study.fingerprint == plan.study.fingerprint
    assert list(copy.tasks) == list(plan.tasks)
