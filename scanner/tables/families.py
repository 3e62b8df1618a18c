"""The built-in families: what they are called, what they take and how their curves come about."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any, Literal

import numpy as np

from scanner.tables.boundary import FloatArray
from scanner.tables.curve import MOST_HARMONICS, Curve, ellipse_harmonics, minor_axis


@dataclass(frozen=True)
class Parameter:
    """A parameter of a family with its bounds; an open bound is not allowed itself."""

    name: str
    kind: Literal["float", "int", "text"]
    low: float = -math.inf
    high: float = math.inf
    low_open: bool = False
    high_open: bool = False
    meaning: str = ""


@dataclass(frozen=True)
class Family:
    """A family of tables: its name, its formula, its parameters and the function from these to a curve."""

    name: str
    formula: str
    parameters: tuple[Parameter, ...]
    curve: Callable[..., Curve] = field(repr=False)


def _ellipse(eccentricity: float) -> Curve:
    return Curve(ellipse_harmonics(1.0, minor_axis(eccentricity)))


def _radial_harmonic(amplitude: float, harmonic: int) -> Curve:
    harmonics = _blank(harmonic + 1)
    harmonics[0, 1] = harmonics[3, 1] = 1.0
    for order, sign in ((harmonic + 1, 1.0), (harmonic - 1, -1.0)):
        harmonics[0, order] += 0.5 * amplitude
        harmonics[3, order] += 0.5 * sign * amplitude if order else 0.0
    return Curve(harmonics)


def _limacon(quadratic: float) -> Curve:
    harmonics = _blank(2)
    harmonics[0, 1:] = harmonics[3, 1:] = (1.0, quadratic)
    return Curve(harmonics)


def _blank(highest: int) -> FloatArray:
    return np.zeros((4, highest + 1))


_ECCENTRICITY = Parameter("eccentricity", "float", 0.0, 1.0, high_open=True, meaning="eccentricity of the ellipse")
_AMPLITUDE = Parameter("amplitude", "float", -10.0, 10.0, meaning="size of the deformation")


def _harmonic(low: int) -> Parameter:
    return Parameter("harmonic", "int", low, MOST_HARMONICS - 1, meaning="waves of the deformation in one round")


_ALL = (
    Family("ellipse", "semi-axes 1 and sqrt(1 - eccentricity^2)", (_ECCENTRICITY,), _ellipse),
    Family(
        "radial_harmonic",
        "r(phi) = 1 + amplitude cos(harmonic phi)",
        (_AMPLITUDE, _harmonic(1)),
        _radial_harmonic,
    ),
    Family(
        "limacon",
        "image of the unit circle under w = z + quadratic z^2",
        (Parameter("quadratic", "float", -10.0, 10.0, meaning="weight of the square"),),
        _limacon,
    ),
)

FAMILIES: Mapping[str, Family] = MappingProxyType({family.name: family for family in _ALL})


def curve_of(family: Family, parameters: Mapping[str, Any]) -> Curve:
    """Curve of a family at checked parameters."""
    return family.curve(**parameters)
