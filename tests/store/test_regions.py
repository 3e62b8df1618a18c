from collections import Counter

import pytest
from sweeps import grid

from scanner.store.regions import chunk_name
from scanner.study import Plan, make_plan, parse_study


@pytest.mark.parametrize(
    "plan",
    [
        make_plan(grid()),
        Plan(grid(), (1, 1), 64),
        Plan(grid(), (2, 2), 256),
        make_plan(grid(amplitude="0.05", harmonic="2")),
        Plan(parse_study(grid().text + "\n[resonances]\nperiod_max = 4"), (1, 2), 256),
        Plan(parse_study(grid().text + "\n[resonances]\nperiod_max = 4"), (1, 1), 64),
    ],
)
def test_every_chunk_of_every_array_belongs_to_exactly_one_task(plan):
    for quantity in plan.quantities:
        shape, chunks = plan.array_shape(quantity), plan.chunk_shape(quantity)
        owners = Counter(
            chunk_name(task.region(quantity), chunks, shape) for task in plan.tasks if quantity.group in task.groups
        )
        wanted = 1
        for size, chunk in zip(shape, chunks, strict=True):
            wanted *= -(-size // chunk)
        assert len(owners) == wanted
        assert set(owners.values()) == {1}


@pytest.mark.parametrize("region", [(slice(0, 3),), (slice(1, 3),), (slice(0, 4),)])
def test_a_region_that_is_not_one_chunk_is_refused(region):
    with pytest.raises(ValueError, match="is not one chunk"):
        chunk_name(region, (2,), (5,))


@pytest.mark.parametrize(("region", "name"), [((), "c"), ((slice(2, 4),), "c.1"), ((slice(4, 5),), "c.2")])
def test_names_are_those_of_the_zarr_specification(region, name):
    # Zarr v3 core specification, default chunk key encoding with separator "."; quoted from memory.
    assert chunk_name(region, (2,) * len(region), (5,) * len(region)) == name
