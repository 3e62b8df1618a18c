"""The studies that come with the project: each loads, is planned and is estimated."""

from pathlib import Path

import pytest

from scanner.study import estimate_cost, load_study, make_plan

CONFIGS = sorted((Path(__file__).parents[2] / "configs").glob("*.toml"))


def load(name: str):
    return load_study(next(path for path in CONFIGS if path.stem == name))


@pytest.mark.parametrize("path", CONFIGS, ids=lambda path: path.stem)
def test_config_is_estimated(path):
    plan = make_plan(load_study(path))
    estimate = estimate_cost(plan, seconds=0.1)
    assert estimate.failed == 0
    assert estimate.most_bounces > 1e8
    # Orbits are left early: a quarter of the bounces on average, and less where there are more of them.
    assert estimate.bounces < 0.35 * estimate.orbits * plan.study.orbits.bounces
    assert estimate.not_convex < estimate.tables / 2
    assert len(plan.tasks) >= min(64, plan.table_count)
    assert path.read_text().startswith("# ")


def test_first_sweep_is_short_and_has_two_dimensions():
    plan = make_plan(load("first_sweep"))
    orbits = plan.study.orbits
    assert len(plan.shape) == 2
    # 2.5e9 bounces are two minutes on two cores at 100 ns each.
    assert plan.table_count * orbits.per_table * orbits.bounces < 3e9


def test_the_ensemble_is_averaged_over_its_realisations():
    plan = make_plan(load("random_ensemble"))
    assert "realisation" in plan.dims
    assert plan.sizes["realisation"] >= 20


def test_the_cluster_gives_the_same_answer():
    laptop, cluster = load("quadrupole"), load("quadrupole_slurm")
    assert laptop.fingerprint == cluster.fingerprint
    assert (laptop.resources.runner, cluster.resources.runner) == ("local", "slurm")
    assert all([cluster.resources.account, cluster.resources.queue, cluster.resources.walltime])
    assert all([cluster.resources.memory_bytes, cluster.resources.directives, cluster.resources.setup])
