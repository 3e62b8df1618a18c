"""A sweep of invented numbers, built from the register alone: for tests of what people see, never of physics."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import xarray as xr

from scanner.quantities import (
    DIRECTIONS,
    DONE,
    NOT_CONVEX,
    P_BINS,
    PERIODS,
    Quantity,
    in_group,
)

BOUNCES = 8192
HORIZONS = (1024, 2048, 4096, 8192)
REPLICATES = 8
SYMMETRY_ORDER = 2
IMAGES = 4 * SYMMETRY_ORDER
"""Images of each orbit, as there is a mirror line through s = 0."""
TITLE = "Invented numbers"


def invented_sweep(
    swept: Mapping[str, Sequence[float]],
    *,
    orbits: int = 64,
    title: str = TITLE,
    convex_below: float = 0.9,
) -> xr.DataTree:
    """Build a finished sweep whose regular fraction falls along the first parameter and wobbles along the others.

    Tables past the fraction `convex_below` of the first parameter's range are marked not convex and hold NaN.
    """
    shape = tuple(len(values) for values in swept.values())
    random = np.random.default_rng(1)
    depth = np.zeros(shape)
    for axis, length in enumerate(shape):
        ramp = np.arange(length) / max(length - 1, 1)
        wave = ramp if axis == 0 else 0.1 * np.sin(5.0 * ramp)
        depth = depth + wave.reshape([-1 if axis == other else 1 for other in range(len(shape))])
    convex = np.asarray(depth <= convex_below)
    sizes = {
        "orbit": orbits,
        "horizon": len(HORIZONS),
        "replicate": REPLICATES,
        "p_bin": P_BINS,
        "period": len(PERIODS),
        "direction": len(DIRECTIONS),
    }
    coords = {
        **{name: list(values) for name, values in swept.items()},
        "horizon": list(HORIZONS),
        "replicate": np.arange(REPLICATES),
        "p_bin": -1.0 + (np.arange(P_BINS) + 0.5) * 2.0 / P_BINS,
        "period": list(PERIODS),
        "direction": list(DIRECTIONS),
    }

    def label(quantity: Quantity, values: np.ndarray) -> xr.Variable:
        return xr.Variable((*swept, *quantity.dims), values.astype(quantity.dtype), quantity.attributes())

    def shape_of(quantity: Quantity) -> tuple[int, ...]:
        return shape + tuple(sizes[name] for name in quantity.dims)

    root: dict[str, xr.Variable] = {}
    for quantity in in_group("root"):
        extra = len(quantity.dims)
        level = np.clip(1.0 - depth, 0.0, 1.0).reshape(shape + (1,) * extra)
        if quantity.name == "table_status":
            values = np.where(convex, DONE, NOT_CONVEX)
        else:
            values = _invent_root(quantity, level, shape_of(quantity), random)
            values = np.where(convex.reshape(shape + (1,) * extra), values, quantity.fill_value)
        root[quantity.name] = label(quantity, values)

    starts = {"s0": random.random((*shape, orbits)) / (2 * SYMMETRY_ORDER), "p0": random.random((*shape, orbits))}
    orbit: dict[str, xr.Variable] = {}
    chaotic = np.abs(starts["p0"]) < np.clip(depth, 0.0, 1.0)[..., None]
    island = ~chaotic & (np.abs(starts["p0"]) < 0.3)
    verdict = np.where(chaotic, 3, np.where(island, 2, 1))
    for quantity in in_group("orbits"):
        values = _invent_orbits(quantity, starts, verdict, shape_of(quantity), random)
        mask = convex.reshape(shape + (1,) * len(quantity.dims))
        orbit[quantity.name] = label(quantity, np.where(mask, values, quantity.fill_value))

    attributes = {"study": study_text(swept, orbits, title), "fingerprint": "0" * 64, "Conventions": "CF-1.11"}
    return xr.DataTree.from_dict(
        {"/": xr.Dataset(root, coords=coords, attrs=attributes), "/orbits": xr.Dataset(orbit)}, name="invented"
    )


def _invent_root(
    quantity: Quantity, level: np.ndarray, shape: tuple[int, ...], random: np.random.Generator
) -> np.ndarray:
    name = quantity.name
    if name == "symmetry_order":
        return np.full(shape, SYMMETRY_ORDER)
    if name == "mirror_s":
        return np.zeros(shape)
    if name.endswith("_stderr"):
        return np.full(shape, 0.0123)
    if name.endswith("_by_horizon"):
        final = level**0.7 if "volume" in name else level
        return np.minimum(final + 0.12 * (1.0 - final) * np.array([1.0, 0.5, 0.2, 0.0]), 1.0)
    if name.endswith("_replicates"):
        return np.clip(level + 0.03 * random.standard_normal(shape), 0.0, 1.0)
    if name == "regular_area_fraction_by_p":
        return np.clip(level * 0.6 + 0.4 * np.linspace(-1, 1, P_BINS) ** 2, 0.0, 1.0)
    if name == "island_area_fraction":
        return 0.1 * level / np.array(PERIODS)
    if name.startswith("undecided"):
        return 0.02 * level * (1.0 - level)
    if name.startswith("chaotic"):
        return 1.0 - level
    if name.startswith(("lyapunov", "entropy")):
        return 0.1 + 0.5 * (1.0 - level)
    if name.startswith("regular_volume"):
        return np.broadcast_to(level**0.7, shape).copy()
    if name == "diffusion_median":
        return -4.0 + 2.0 * (1.0 - level)
    return np.broadcast_to(level, shape).copy()


def _invent_orbits(
    quantity: Quantity,
    starts: Mapping[str, np.ndarray],
    verdict: np.ndarray,
    shape: tuple[int, ...],
    random: np.random.Generator,
) -> np.ndarray:
    if quantity.name in starts:
        return starts[quantity.name]
    if quantity.name == "verdict":
        return verdict
    if quantity.name == "verdict_by_horizon":
        return np.broadcast_to(verdict[..., None], shape)
    if quantity.name == "lyapunov_per_bounce":
        return np.where(verdict == 3, 0.4, 0.002) * (1.0 + 0.2 * random.random(shape))
    if quantity.name == "frequency_diffusion":
        return np.where(verdict == 3, -3.0, -11.0) + random.standard_normal(shape)
    if quantity.name == "island_period":
        return np.where(verdict == 2, 2, 0)
    if quantity.name == "island_rotation":
        return np.where(verdict == 2, 1, 0)
    return random.random(shape)


def study_text(swept: Mapping[str, Sequence[float]], orbits: int, title: str) -> str:
    """Write the study such a sweep would come from."""
    quoted = title.replace("\\", "\\\\").replace('"', '\\"')
    lines = ["[study]", f'title = "{quoted}"', "seed = 1", "", "[table]", 'family = "invented"', "decay = 2.5"]
    lines += [f"{name} = {{ values = {list(values)!r} }}" for name, values in swept.items()]
    lines += ["", "[orbits]", f"per_table = {orbits}", f"bounces = {BOUNCES}", f"replicates = {REPLICATES}", ""]
    return "\n".join(lines)
