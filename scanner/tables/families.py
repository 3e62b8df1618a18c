"""The built-in families: what they are called, what they take and where their curves come from."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal

from scanner.tables import formulas
from scanner.tables.curve import MOST_HARMONICS, Curve
from scanner.tables.lame import lame
from scanner.tables.outline import outline_file
from scanner.tables.random_shapes import random_harmonic


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


_ECCENTRICITY = Parameter("eccentricity", "float", 0.0, 1.0, high_open=True, meaning="eccentricity of the ellipse")
_PHASE = Parameter("phase", "float", -1000.0, 1000.0, meaning="phase of the deformation in radians")


def _amplitude(meaning: str) -> Parameter:
    return Parameter("amplitude", "float", -10.0, 10.0, meaning=meaning)


def _harmonic(low: int) -> Parameter:
    # The highest harmonic of the boundary is one more than that of the deformation.
    return Parameter("harmonic", "int", low, MOST_HARMONICS - 1, meaning="waves of the deformation in one round")


_ALL = (
    Family("ellipse", "semi-axes 1 and sqrt(1 - eccentricity^2)", (_ECCENTRICITY,), formulas.ellipse),
    Family(
        "radial_harmonic",
        "r(phi) = 1 + amplitude cos(harmonic phi)",
        (_amplitude("relative change of the radius"), _harmonic(1)),
        formulas.radial_harmonic,
    ),
    Family(
        "normal_harmonic",
        "ellipse of semi-major axis 1 displaced along its outward normal by amplitude cos(harmonic tau + phase), "
        "tau the eccentric angle",
        (_ECCENTRICITY, _amplitude("displacement"), _harmonic(1), _PHASE),
        formulas.normal_harmonic,
    ),
    Family(
        "confocal_harmonic",
        "mu = mu0 + amplitude cos(harmonic f + phase) in the elliptic coordinates of the ellipse's own foci, "
        "semi-major axis 1; r = exp(amplitude cos(harmonic f + phase)) at eccentricity 0",
        (_ECCENTRICITY, _amplitude("change of the elliptic coordinate"), _harmonic(1), _PHASE),
        formulas.confocal_harmonic,
    ),
    Family(
        "support_harmonic",
        "support function sqrt(cos^2 psi + (1 - eccentricity^2) sin^2 psi) + amplitude cos(harmonic psi + phase), "
        "psi the angle of the normal",
        (_ECCENTRICITY, _amplitude("change of the support function"), _harmonic(1), _PHASE),
        formulas.support_harmonic,
    ),
    Family(
        "curvature_harmonic",
        "radius of curvature 1 + amplitude cos(harmonic psi), psi the tangent angle",
        (_amplitude("change of the radius of curvature"), _harmonic(2)),
        formulas.curvature_harmonic,
    ),
    Family(
        "limacon",
        "image of the unit disc under w = z + quadratic z^2",
        (Parameter("quadratic", "float", -10.0, 10.0, meaning="weight of the square"),),
        formulas.limacon,
    ),
    Family(
        "lame",
        "abs(x)^exponent + abs(y / aspect)^exponent = 1",
        (
            # Beyond these bounds 512 harmonics cannot follow the corners and stay convex.
            Parameter("exponent", "float", 1.4, 32.0, meaning="2 is the ellipse; smooth if even"),
            Parameter("aspect", "float", 0.02, 50.0, meaning="semi-axis along y; the one along x is 1"),
        ),
        lame,
    ),
    Family(
        "random_harmonic",
        "ellipse of semi-major axis 1 displaced along its outward normal by a random sum of waves 2 to harmonic_max of "
        "the eccentric angle, Gaussian coefficients falling as k^-decay, scaled to root mean square amplitude",
        (
            _ECCENTRICITY,
            _amplitude("root mean square of the displacement over the eccentric angle"),
            Parameter("decay", "float", 0.0, 20.0, meaning="power of the fall of the coefficients"),
            Parameter("harmonic_max", "int", 2, MOST_HARMONICS // 2, meaning="highest wave"),
            Parameter("realisation", "int", 0, 2**63 - 1, meaning="number of the random shape"),
        ),
        random_harmonic,
    ),
    Family(
        "outline_file",
        "best-fit ellipse of measured points + amplitude times the rest of the smooth outline fitted to them",
        (
            Parameter("file", "text", meaning="text file of points, x and y on each line, once round the outline"),
            _amplitude("0 is the best-fit ellipse, 1 the outline"),
        ),
        outline_file,
    ),
)

FAMILIES: Mapping[str, Family] = MappingProxyType({family.name: family for family in _ALL})
