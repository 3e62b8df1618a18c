import numpy as np
import pytest
from sweeps import grid

from scanner import cells
from scanner.cells import compute, reduce
from scanner.measure import section_points, table_numbers
from scanner.quantities import DONE, FAILED, NOT_CONVEX, ORBITS, PENDING, ROOT, in_group
from scanner.study import Plan, make_plan, parse_study
from scanner.tables import build_table

SHAPES = """
import numpy as np

def ellipse(flat):
    if flat > 0.8:
        raise RuntimeError("too flat")
    return np.array([[0, 1.0], [0, 0], [0, 0], [0, 1.0 - flat]])
"""


@pytest.fixture(scope="module")
def plan():
    """Two by two tables, the last not convex, in one task each; a split of the same is made by the tests."""
    return Plan(grid(amplitude="{ values = [0.05, 0.15] }", per_table="128", bounces="128"), (1, 2), 128)


@pytest.fixture(scope="module")
def surveyed(plan):
    return [compute(plan, task) for task in plan.tasks]


def test_one_table_of_a_task_equals_the_same_table_measured_alone(plan, surveyed):
    table = build_table("radial_harmonic", amplitude=0.05, harmonic=2)
    orbits = cells.orbit_numbers(table, *section_points(table, 5, 4, 128), 128)
    for name, values in orbits.items():
        np.testing.assert_array_equal(surveyed[0].groups[ORBITS][name][0, 0], values)
    for name, value in table_numbers(table, orbits, 4).items():
        np.testing.assert_array_equal(surveyed[0].groups[ROOT][name][0, 0], value)


def test_every_registered_variable_has_its_shape_and_type(plan, surveyed):
    for group in (ROOT, ORBITS):
        for quantity in in_group(group):
            array = surveyed[0].groups[group][quantity.name]
            assert array.dtype == quantity.dtype
            assert array.shape == plan.chunk_shape(quantity)


def test_a_table_that_is_not_convex_is_recorded_and_holds_nothing(surveyed):
    assert surveyed[0].groups[ROOT]["table_status"].tolist() == [[DONE, DONE]]
    assert surveyed[1].groups[ROOT]["table_status"].tolist() == [[DONE, NOT_CONVEX]]
    assert surveyed[1].count(NOT_CONVEX) == 1
    assert surveyed[1].failures == []
    assert np.isnan(surveyed[1].groups[ROOT]["perimeter"][0, 1])
    assert np.isnan(surveyed[1].groups[ORBITS]["s0"][0, 1]).all()
    assert (surveyed[1].groups[ORBITS]["verdict"][0, 1] == PENDING).all()


def test_bounces_count_what_was_computed(surveyed):
    assert [result.bounces for result in surveyed] == [2 * 128 * 128, 128 * 128]


@pytest.fixture(scope="module")
def in_rounds():
    """The same tables with few orbits at first, and room for 512."""
    orbits = "4\ntarget_error = 0.03\nmost_per_table = 512"
    return make_plan(grid(amplitude="{ values = [0.05, 0.15] }", per_table="32", bounces="128", replicates=orbits))


def test_tables_get_as_many_rounds_as_their_error_takes(in_rounds):
    whole = Plan(in_rounds.study, (2, 2), 512)
    result = compute(whole, whole.tasks[0])
    used = result.groups[ROOT]["orbits_used"]
    stderr = result.groups[ROOT]["regular_area_fraction_stderr"]
    verdict = result.groups[ORBITS]["verdict"].reshape(2, 2, 4, 128)
    assert np.isnan(used[1, 1])  # not convex
    convex = [(0, 0), (0, 1), (1, 0)]
    assert len({used[place] for place in convex}) > 1
    for place in convex:
        assert used[place] == 512 or stderr[place] <= 0.03
        share = int(used[place]) // 4
        assert (verdict[place][:, :share] != PENDING).all()
        assert (verdict[place][:, share:] == PENDING).all()
    assert (
        result.bounces
        == result.groups[ORBITS]["bounces_used"].sum()
        == result.groups[ROOT]["bounces_used"][[0, 0, 1], [0, 1, 0]].sum()
    )
    unused = verdict.reshape(2, 2, 512) == PENDING
    np.testing.assert_array_equal(np.isnan(result.groups[ORBITS]["s0"]), unused)
    for task in Plan(in_rounds.study, (1, 1), 512).tasks:
        place = tuple(part.start for part in task.box)
        for group, arrays in compute(in_rounds, task).groups.items():
            for name, values in arrays.items():
                np.testing.assert_array_equal(values[0, 0], result.groups[group][name][place])


IN_ISLANDS = {"frequency_diffusion", "island_winding", "island_centre_s", "island_centre_p"}
"""Found by following the orbits inside islands once more, in blocks of those alone: a block goes on until its slowest
orbit has converged, so that the last digits depend on the others of the block."""


def test_a_split_table_gives_the_same_numbers_as_a_whole_one(plan, surveyed):
    split = Plan(plan.study, (1, 1), 64)
    parts = {ORBITS: {}, ROOT: {}}
    for task in split.tasks[:3]:
        if task.kind == "orbits":
            for name, values in compute(split, task).groups[ORBITS].items():
                parts[ORBITS].setdefault(name, []).append(values)
        else:
            stored = {name: np.concatenate(pieces, axis=2) for name, pieces in parts[ORBITS].items()}
            summed_up = reduce(split, task, stored, {})
    assert [task.kind for task in split.tasks[:3]] == ["orbits", "orbits", "reduce"]
    for name, values in stored.items():
        whole = surveyed[0].groups[ORBITS][name][0, 0]
        # A change of winding near 1e-7 with errors near 1e-16 is good to nine digits; centres are near 1, or 0.
        rtol, atol = (1e-8, 1e-14) if name in IN_ISLANDS else (0.0, 0.0)
        np.testing.assert_allclose(values[0, 0], whole, rtol=rtol, atol=atol)
    for name, values in summed_up.groups[ROOT].items():
        np.testing.assert_array_equal(values[0, 0], surveyed[0].groups[ROOT][name][0, 0])


def test_a_table_whose_orbits_failed_fails_for_the_same_reason(plan):
    split = Plan(plan.study, (1, 1), 64)
    task = split.tasks[2]
    stored = {quantity.name: np.zeros((1, 1, 128)) for quantity in in_group(ORBITS)}
    result = reduce(split, task, stored, {(0, 0): "it broke"})
    assert result.groups[ROOT]["table_status"].tolist() == [[FAILED]]
    assert result.failures == [((0, 0), "it broke")]
    assert np.isnan(result.groups[ROOT]["regular_area_fraction"]).all()


@pytest.fixture
def own_shapes(tmp_path, monkeypatch):
    (tmp_path / "own_shapes.py").write_text(SHAPES)
    monkeypatch.syspath_prepend(tmp_path)
    text = (
        grid().text.replace('"radial_harmonic"', '"own_shapes:ellipse"').replace("harmonic = { values = [2, 3] }", "")
    )
    text = text.replace("{ start = 0.0, stop = 0.24, count = 5 }", "{ values = [0.5, 0.9] }").replace(
        "amplitude", "flat"
    )
    text = text.replace("256", "64").replace("8192", "64")
    return Plan(parse_study(text, allow_code=True), (2,), 64)


def test_a_table_whose_code_raises_fails_alone_with_one_line(own_shapes):
    result = compute(own_shapes, own_shapes.tasks[0])
    assert result.groups[ROOT]["table_status"].tolist() == [DONE, FAILED]
    ((index, reason),) = result.failures
    assert index == (1,)
    assert "too flat" in reason
    assert "\n" not in reason
    assert np.isfinite(result.groups[ROOT]["perimeter"]).tolist() == [True, False]


def test_a_table_whose_code_ends_the_program_fails_alone(own_shapes, monkeypatch):
    def leave(*_, **__):
        raise SystemExit(3)

    monkeypatch.setattr(cells, "build_table", leave)
    result = compute(own_shapes, own_shapes.tasks[0])
    assert result.groups[ROOT]["table_status"].tolist() == [FAILED, FAILED]
    assert result.failures == [((0,), "SystemExit: 3"), ((1,), "SystemExit: 3")]


def test_a_failure_after_the_orbits_leaves_no_half_result(plan, monkeypatch):
    def fail(*_):
        raise ZeroDivisionError("nothing to divide by")

    monkeypatch.setattr(cells, "table_numbers", fail)
    result = compute(plan, plan.tasks[0])
    assert result.count(FAILED) == 2
    assert result.failures[0] == ((0, 0), "ZeroDivisionError: nothing to divide by")
    assert np.isnan(result.groups[ORBITS]["s0"]).all()
    assert (result.groups[ORBITS]["verdict"] == PENDING).all()


def test_running_out_of_memory_is_not_the_table_s_fault(plan, monkeypatch):
    def fail(*_):
        raise MemoryError

    monkeypatch.setattr(cells, "follow_rounds", fail)
    with pytest.raises(MemoryError):
        compute(plan, plan.tasks[0])
