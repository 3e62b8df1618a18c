"""The numbers of this installation against closed forms, to see that this machine gets what it should."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from scipy.special import ellipe, ellipk, ellipkinc

from scanner.bounce.lanes import BUFFER, BUFFER_ROWS, D_PP, D_PS, D_SP, D_SS, LANES, OBSERVABLES
from scanner.bounce.trace import T_PP, T_PS, T_SP, T_SS, follow, trace
from scanner.indicators import measure_orbits
from scanner.indicators.schedule import make_schedule
from scanner.indicators.streams import GROWTH, RUNNING_ROWS, absorb_block, start_running
from scanner.measure import section_points, survey_table
from scanner.tables import Table, build_table

ECCENTRICITY = 0.6
SEMI_MINOR = 0.8


@dataclass(frozen=True)
class Check:
    """One number and what it must be, up to `bound`."""

    name: str
    value: float
    truth: float
    bound: float

    @property
    def difference(self) -> float:
        """Distance from the truth."""
        return abs(self.value - self.truth)

    @property
    def holds(self) -> bool:
        """Whether the distance is within the bound; what is not a number is not."""
        return self.difference <= self.bound


def run_checks() -> Iterator[Check]:
    """Compute every check, one after the other; a few seconds, half a minute where kernels are yet to be compiled."""
    for group in _GROUPS:
        yield from group()


def _curves() -> Iterator[Check]:
    """Check lengths and areas; the limacon is w = z + q z^2 (Robnik, J. Phys. A 16:3971, 1983)."""
    quadratic = 0.15
    limacon = build_table("limacon", quadratic=quadratic)
    length = 4 * (1 + 2 * quadratic) * ellipe(8 * quadratic / (1 + 2 * quadratic) ** 2)
    yield Check("limacon 0.15, perimeter", limacon.perimeter, float(length), 1e-12)
    yield Check("limacon 0.15, area", limacon.area, math.pi * (1 + 2 * quadratic**2), 1e-12)
    radial = build_table("radial_harmonic", amplitude=2 * quadratic, harmonic=1)
    yield Check("radial harmonic 1 is the limacon, perimeter", radial.perimeter, float(length), 1e-12)


def _conserved() -> Iterator[Check]:
    """Check what is conserved: p in a circle, the product of the focal angular momenta in an ellipse."""
    circle = trace(build_table("ellipse", eccentricity=0.0), 0.1, 0.3, 10_000)
    yield Check("circle, p after 10000 bounces", float(circle["p"][0, -1]), 0.3, 1e-12)
    ellipse = trace(build_table("ellipse", eccentricity=ECCENTRICITY), 0.1, 0.3, 10_000)
    x, y = ellipse["x"].values[0], ellipse["y"].values[0]
    step_x, step_y, chord = np.diff(x), np.diff(y), ellipse["chord"].values[0, 1:]
    momentum = (x[:-1] * step_y - y[:-1] * step_x) / chord
    product = momentum**2 - (ECCENTRICITY * step_y / chord) ** 2
    yield Check("ellipse 0.6, product of focal momenta", float(product[-1]), float(product[0]), 1e-11)


def _rotation() -> Iterator[Check]:
    """Check rotation numbers in the ellipse: F(phi0 | m) / 2 K(m), with caustic parameter lam."""
    table = build_table("ellipse", eccentricity=ECCENTRICITY)
    for caustic in (0.2, 0.5):
        momentum = math.sqrt(1 - caustic / SEMI_MINOR**2)
        found = measure_orbits(table, 0.0, momentum, 8192)["rotation_number"].item()
        modulus = ECCENTRICITY**2 / (1 - caustic)
        truth = ellipkinc(math.asin(math.sqrt(caustic) / SEMI_MINOR), modulus) / (2 * ellipk(modulus))
        yield Check(f"ellipse 0.6, rotation number, caustic {caustic}", found, float(truth), 1e-10)
    caustic = 0.7
    librating = measure_orbits(table, 0.25, math.sqrt(1 - caustic), 8192)
    modulus = (1 - caustic) / ECCENTRICITY**2
    rotation = ellipkinc(math.asin(SEMI_MINOR / math.sqrt(caustic)), modulus) / (2 * ellipk(modulus))
    winding = abs(2 * rotation - round(2 * rotation))
    yield Check("ellipse 0.6, rotation number, librating", librating["rotation_number"].item(), 0.5, 1e-10)
    yield Check("ellipse 0.6, winding, caustic 0.7", librating["island_winding"].item(), float(winding), 1e-10)


def _two_bounces() -> Iterator[Check]:
    """Check the trace of the two-bounce map along an axis, 4 (l/R0 - 1) (l/R1 - 1) - 2."""
    for name, amplitude, turns in (("long", 0.05, 0.0), ("short", 0.05, 0.25)):
        table = build_table("radial_harmonic", amplitude=amplitude, harmonic=2)
        sign = 1 if name == "long" else -1
        radius = 1 + sign * amplitude
        curvature = (radius + 4 * sign * amplitude) / radius**2
        truth = 4 * (2 * radius * curvature - 1) ** 2 - 2
        yield Check(f"radial harmonic 2, 0.05, trace on the {name} axis", _trace_twice(table, turns), truth, 1e-11)
    quadratic = 0.1
    truth = 2 - 64 * quadratic**2 / (1 - 4 * quadratic**2) ** 2
    limacon = build_table("limacon", quadratic=quadratic)
    yield Check("limacon 0.1, trace on the axis", _trace_twice(limacon, 0.0), truth, 1e-11)


def _trace_twice(table: Table, turns: float) -> float:
    found = follow(table.harmonics, np.array([turns]), np.array([0.0]), 2)[1:, :, 0]
    first, second = found[:, [T_SS, T_SP, T_PS, T_PP]].reshape(2, 2, 2)
    return float((second * first.T).sum())


def _constant_angle() -> Iterator[Check]:
    """Check that curvature radius 1 + a cos 4 psi keeps an angle d of tan 4 d = 4 tan d (Gutkin, arXiv:1012.2448)."""
    table = build_table("curvature_harmonic", amplitude=0.3, harmonic=4)
    angle = 1.1502619915109315
    orbit = trace(table, 0.1, math.cos(angle), 100)
    yield Check("curvature harmonic 4, constant p", float(orbit["p"][0, -1]), math.cos(angle), 1e-12)


def _cat_map() -> Iterator[Check]:
    """Check the exponent of the map (2 1; 1 1), fed to the same code that follows the tangent of a bounce."""
    steps = 4096
    schedule = make_schedule(steps)
    buffer = np.zeros((BUFFER_ROWS, BUFFER, LANES))
    buffer[[D_SS, D_SP, D_PS, D_PP]] = np.array([2.0, 1.0, 1.0, 1.0])[:, None, None]
    averages = np.zeros((OBSERVABLES * schedule.windows.shape[0], LANES))
    running = np.empty((RUNNING_ROWS, LANES))
    start_running(running)
    for first in range(0, steps, BUFFER):
        absorb_block(buffer, BUFFER, first, schedule.windows, schedule.weights, averages, running)
    exponent = math.log((3 + math.sqrt(5)) / 2)
    # the vector needs a few steps to turn: an error of order 1 in the sum over all of them
    yield Check("cat map, Lyapunov exponent", float(running[GROWTH, 0]) / steps, exponent, 1 / steps)


def _measures() -> Iterator[Check]:
    """Check fractions of the ellipse's section and shell; samples of this size miss them by about 0.001."""
    table = build_table("ellipse", eccentricity=ECCENTRICITY)
    orbits, bounces, replicates, seed = 4096, 8192, 8, 1
    survey = survey_table(table, orbits, bounces, replicates, seed)
    section = ECCENTRICITY / ellipe(ECCENTRICITY**2)
    yield Check("ellipse 0.6, librating section e/E(e)", float(survey["librational_area_fraction"]), section, 5e-3)
    yield Check("ellipse 0.6, regular section", float(survey["regular_area_fraction"]), 1.0, 5e-3)
    yield Check("ellipse 0.6, mean chord pi A/L", float(survey["mean_chord"]), table.mean_chord_exact, 5e-3)
    found = measure_orbits(table, *section_points(table, seed, replicates, orbits), 256)
    librating = (1 - found["p0"] ** 2) * _eccentric_weight(table, found["s0"].values) > SEMI_MINOR**2
    shell = float((found["mean_chord"] * librating).sum() / found["mean_chord"].sum())
    # the truth is the integral of the chord over that region, by quadrature
    yield Check("ellipse 0.6, librating shell", shell, 0.4984046172, 5e-3)


def _eccentric_weight(table: Table, s: np.ndarray) -> np.ndarray:
    """a^2 sin^2 phi + b^2 cos^2 phi at the eccentric angle of a boundary point."""
    x, y = table.point(s)
    weight: np.ndarray = (y / SEMI_MINOR) ** 2 + (SEMI_MINOR * x) ** 2
    return weight


_GROUPS: tuple[Callable[[], Iterator[Check]], ...] = (
    _curves,
    _conserved,
    _rotation,
    _two_bounces,
    _constant_angle,
    _cat_map,
    _measures,
)
