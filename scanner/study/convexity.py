"""How far each family stays convex: in closed form where that is known, else found by building tables."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

from scanner.errors import TableError
from scanner.study.model import Value
from scanner.tables import build_table

PRECISION = 1e-9
"""To which a limit is found, relative to itself."""
SMALLEST, LARGEST = 1e-6, 10.0
"""Where a limit is sought."""
GROWTH = 1.5


@dataclass(frozen=True)
class Convexity:
    """Which tables of a family are convex.

    Attributes
    ----------
    rule
        In words, to be read after "convex".
    parameter
        The parameter that carries a table beyond convexity; empty where none does within the bounds of the family.
    limit
        Its largest absolute value, given the others; None for those for which no closed form is known.
    """

    rule: str
    parameter: str = ""
    limit: Callable[[Mapping[str, Value]], float | None] = lambda given: None


def _round(limit: Callable[[int], float]) -> Callable[[Mapping[str, Value]], float | None]:
    """Limit of a family whose closed form holds for the circle alone, as a function of the harmonic."""
    return lambda given: limit(int(given["harmonic"])) if given.get("eccentricity", 0.0) == 0.0 else None


def _support_limit(harmonic: int) -> float:
    return math.inf if harmonic == 1 else 1.0 / (harmonic * harmonic - 1)


CONVEXITY: Mapping[str, Convexity] = MappingProxyType(
    {
        "ellipse": Convexity("always"),
        # r^2 + 2 r'^2 - r r'' is a concave quadratic of cos(harmonic phi), lowest at its ends.
        "radial_harmonic": Convexity(
            "for abs(amplitude) <= 1 / (harmonic^2 + 1)", "amplitude", _round(lambda harmonic: 1.0 / (harmonic**2 + 1))
        ),
        "normal_harmonic": Convexity(
            "at eccentricity 0 for abs(amplitude) <= 1 / (harmonic^2 + 1); else no closed form",
            "amplitude",
            _round(lambda harmonic: 1.0 / (harmonic**2 + 1)),
        ),
        # 1 + u'^2 - u'' with u = ln r, again a concave quadratic.
        "confocal_harmonic": Convexity(
            "at eccentricity 0 for abs(amplitude) <= 1 / harmonic^2; else no closed form",
            "amplitude",
            _round(lambda harmonic: 1.0 / harmonic**2),
        ),
        # Radius of curvature of the ellipse, 1 - eccentricity^2 or more, plus (1 - harmonic^2) times the wave.
        "support_harmonic": Convexity(
            "at least for abs(amplitude) <= (1 - eccentricity^2) / (harmonic^2 - 1), no further at eccentricity 0; "
            "harmonic 1 only shifts it",
            "amplitude",
            _round(_support_limit),
        ),
        "curvature_harmonic": Convexity("for abs(amplitude) <= 1", "amplitude", lambda given: 1.0),
        # The real part of 1 + z w'' / w' is lowest at z = -1 for a positive weight.
        "limacon": Convexity("for abs(quadratic) <= 1/4", "quadratic", lambda given: 0.25),
        "lame": Convexity("always, as the exponent is above 1"),
        "random_harmonic": Convexity("up to an amplitude that each realisation has of its own", "amplitude"),
        "outline_file": Convexity("up to an amplitude that each outline has of its own", "amplitude"),
    }
)
"""By family; derived here, and compared with tables built on either side of the limit."""


def find_limits(family: str, given: Mapping[str, Value]) -> tuple[float, float]:
    """Find between which values of its limiting parameter tables of a family are convex.

    Parameters
    ----------
    family
        A built-in family that has such a parameter.
    given
        All its other parameters.

    Returns
    -------
    low, high
        The last convex tables on either side of the undeformed one; infinite where none was found that is not.

    Raises
    ------
    TableError
        One line: a parameter is missing, unknown or out of its bounds.
    """
    convexity = CONVEXITY[family]
    build_table(family, allow_code=False, **{**given, convexity.parameter: 0.0})
    limit = convexity.limit(given)
    if limit is not None:
        return -limit, limit
    return -_search(family, given, -1.0), _search(family, given, 1.0)


def _search(family: str, given: Mapping[str, Value], sign: float) -> float:
    """Go out from the undeformed table until one is not convex, then halve the last step again and again."""
    convex, beyond = 0.0, SMALLEST
    while _is_convex(family, given, sign * beyond):
        convex, beyond = beyond, beyond * GROWTH
        if beyond > LARGEST:
            return math.inf
    while beyond - convex > PRECISION * beyond:
        middle = 0.5 * (convex + beyond)
        if _is_convex(family, given, sign * middle):
            convex = middle
        else:
            beyond = middle
    return convex


def _is_convex(family: str, given: Mapping[str, Value], value: float) -> bool:
    """Whether a table is convex; one that cannot even be built is not."""
    try:
        return build_table(family, allow_code=False, **{**given, CONVEXITY[family].parameter: value}).is_convex
    except TableError:
        return False
