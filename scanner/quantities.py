"""Register of every stored variable: dimensions, type, units, meaning and where it is defined.

A variable that is not listed here cannot be stored; the store, the summary, the exports and the documentation
read this list and nothing else.  Dimensions named here come after those of the swept parameters.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

TABLE_STATUS = ("pending", "done", "not_convex", "failed")
VERDICTS = ("pending", "regular_rotational", "regular_librational", "chaotic", "undecided")
CURVE_FATES = ("pending", "survives", "broken", "undecided")
PENDING, DONE, NOT_CONVEX, FAILED = range(4)
REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL, CHAOTIC, UNDECIDED = range(1, 5)

LARGEST_SEED = 2**63 - 1
P_BINS = 20
PERIODS = tuple(range(2, 65))
DIRECTIONS = ("forward", "backward")
"""Along the boundary, p > 0, and against it."""
CURVES = tuple(1.0 / (whole + 0.5 * (math.sqrt(5.0) - 1.0)) for whole in (2, 3, 4))
"""Rotation numbers of curves that are the last to break nearby: they lie between 1/2, 1/3, 1/4 and 1/5."""

ROOT = "root"
ORBITS = "orbits"
RESONANCES = "resonances"


COORDINATES = {
    "replicate": "independent scrambling of the initial conditions",
    "horizon": "bounces after which the verdict is given",
    "p_bin": "centre of the bin of p",
    "period": "period q of the island",
    "direction": "along the boundary, p > 0, or against it",
    "orbit": "number of the orbit",
    "bounce": "number of the bounce, 0 the start",
    "rotation": "rounds p of the orbits with rotation p/q",
    "resonance_period": "bounces q of the orbits with rotation p/q",
    "curve": "rotation number of the curve",
}
"""What the values along dimensions mean; those of swept parameters come from the family."""


def rotations_up_to(period_max: int) -> list[tuple[int, int]]:
    """All rotations p/q in lowest terms, 0 < p/q <= 1/2 and q up to ``period_max``, as pairs (p, q) by q, then p.

    Those above 1/2 are the same orbits run backwards.
    """
    return [(p, q) for q in range(2, period_max + 1) for p in range(1, q // 2 + 1) if math.gcd(p, q) == 1]


@dataclass(frozen=True)
class Quantity:
    """One stored variable.

    ``flags`` lists the meanings of the codes 0, 1, 2, ... of a variable that is a code; code 0 is "pending".
    ``units`` is "1" where dimensionless, "length" for the family's own unit of length.
    """

    name: str
    group: str
    dims: tuple[str, ...]
    dtype: str
    units: str
    long_name: str
    reference: str = ""
    flags: tuple[str, ...] = ()

    @property
    def fill_value(self) -> float | int:
        """What a table that is not done holds: NaN, or 0 for whole numbers and codes."""
        return float("nan") if self.dtype.startswith("float") else 0

    def attributes(self) -> dict[str, object]:
        """CF attributes of the variable."""
        found: dict[str, object] = {"long_name": self.long_name, "units": self.units}
        if self.flags:
            found["flag_values"] = list(range(len(self.flags)))
            found["flag_meanings"] = " ".join(self.flags)
        if self.reference:
            found["references"] = self.reference
        return found


def _root(name: str, long_name: str, *dims: str, units: str = "1", reference: str = "") -> Quantity:
    return Quantity(name, ROOT, dims, "float64", units, long_name, reference)


def _orbit(name: str, long_name: str, *dims: str, units: str = "1", reference: str = "") -> Quantity:
    return Quantity(name, ORBITS, ("orbit", *dims), "float64", units, long_name, reference)


def _resonance(name: str, long_name: str, units: str = "1", reference: str = "") -> Quantity:
    return Quantity(name, RESONANCES, ("resonance",), "float64", units, long_name, reference)


def _curve(name: str, long_name: str) -> Quantity:
    return Quantity(name, RESONANCES, ("curve",), "float64", "1", long_name, _GREENE)


_SANTALO = "Santalo, Integral Geometry and Geometric Probability, 1976; Chernov, J. Stat. Phys. 88:1, 1997"
_WEIGHTED = "Das, Saiki, Sander and Yorke, Nonlinearity 30:4111, 2017"
_LASKAR = "Laskar, Icarus 88:266, 1990"
_HANN = "Laskar, Frequency map analysis and quasiperiodic decompositions, 2003"
_BERRY_ROBNIK = "Berry and Robnik, J. Phys. A 17:2413, 1984"

_BIRKHOFF = "Birkhoff, Acta Math. 50:359, 1927"
_GREENE = "Greene, J. Math. Phys. 20:1183, 1979"

_QUANTITIES = (
    Quantity("table_status", ROOT, (), "int8", "1", "state of the table", flags=TABLE_STATUS),
    _root("regular_area_fraction", "regular fraction of the section area ds dp"),
    _root("regular_area_fraction_stderr", "standard error of the regular fraction of the section area"),
    _root("regular_area_fraction_replicates", "regular fraction of the section area by replicate", "replicate"),
    _root("regular_volume_fraction", "regular fraction of the energy shell", reference=_BERRY_ROBNIK),
    _root("regular_volume_fraction_stderr", "standard error of the regular fraction of the energy shell"),
    _root("regular_volume_fraction_replicates", "regular fraction of the energy shell by replicate", "replicate"),
    _root(
        "regular_area_fraction_by_horizon",
        "regular fraction of the section area as judged after fewer bounces",
        "horizon",
    ),
    _root(
        "regular_volume_fraction_by_horizon",
        "regular fraction of the energy shell as judged after fewer bounces",
        "horizon",
    ),
    _root("chaotic_area_fraction", "chaotic fraction of the section area"),
    _root("undecided_area_fraction", "fraction of the section area without a verdict"),
    _root("rotational_area_fraction", "fraction of the section area on rotational invariant curves"),
    _root("librational_area_fraction", "fraction of the section area inside islands"),
    _root("regular_area_fraction_by_p", "regular fraction of the section area in a bin of p", "p_bin"),
    _root("rotational_band_p", "|p| beyond which the sampled orbits are on rotational curves", "direction"),
    _root("rotational_band_p_error", "error of that |p| from the sampling and from undecided orbits", "direction"),
    _root("rotation_range_min", "smallest rotation number of the sampled rotational curves, folded to [0, 1/2]"),
    _root("rotation_range_max", "largest rotation number of the sampled rotational curves, folded to [0, 1/2]"),
    _root("island_area_fraction", "fraction of the section area in islands of period q", "period"),
    _root("island_area_fraction_stderr", "standard error of the section area in islands of period q", "period"),
    _root("island_volume_fraction", "fraction of the energy shell in islands of period q", "period"),
    _root("island_volume_fraction_stderr", "standard error of the energy shell in islands of period q", "period"),
    _root("lyapunov_per_bounce", "mean Lyapunov exponent of the chaotic orbits, per bounce"),
    _root("lyapunov_per_bounce_stderr", "standard error of the mean Lyapunov exponent per bounce"),
    _root(
        "lyapunov_per_length",
        "mean Lyapunov exponent of the chaotic orbits, per unit length",
        units="length-1",
        reference="Abramov's formula: exponent per bounce over the mean chord of the chaotic orbits",
    ),
    _root("lyapunov_per_length_stderr", "standard error of the mean Lyapunov exponent per length", units="length-1"),
    _root(
        "entropy_per_bounce",
        "integral of the Lyapunov exponent of the chaotic orbits over the section measure",
        reference="Pesin's formula",
    ),
    _root("diffusion_median", "median log10 of the frequency diffusion of the chaotic orbits", reference=_LASKAR),
    _root("bounces_used", "bounces of all orbits of the table together"),
    _root("perimeter", "perimeter of the table", units="length"),
    _root("area", "area of the table", units="length2"),
    _root("curvature_min", "smallest curvature of the boundary", units="length-1"),
    _root("curvature_max", "largest curvature of the boundary", units="length-1"),
    _root("mean_chord", "mean chord over the sampled orbits", units="length"),
    _root("mean_chord_exact", "mean chord over the section, pi A / L", units="length", reference=_SANTALO),
    _root("boundary_error", "distance of the stored boundary from the family's curve, over its size"),
    _root("orbits_used", "orbits that were followed"),
    _root("symmetry_order", "n of the rotations by 1/n turn that map the table onto itself"),
    _root("mirror_s", "arc length of a point on a mirror line as a fraction of the perimeter, NaN without mirrors"),
    _orbit("s0", "arc length at the start as a fraction of the perimeter"),
    _orbit("p0", "sine of the angle from the inward normal at the start"),
    Quantity("bounces_used", ORBITS, ("orbit",), "int64", "1", "bounces after which it was clear what the orbit is"),
    _orbit(
        "lyapunov_per_bounce", "finite-time Lyapunov exponent per bounce, of all chaotic orbits over as many bounces"
    ),
    _orbit("rotation_number", "mean advance along the boundary per bounce, in perimeters", reference=_HANN),
    _orbit(
        "frequency_diffusion",
        "log10 of the change of the leading frequency between two halves: rotation number, or winding in an island",
        reference=_LASKAR,
    ),
    _orbit(
        "agreement_digits",
        "digits to which the weighted averages of advance, p and chord agree between the two halves",
        reference=_WEIGHTED,
    ),
    _orbit("mean_chord", "mean chord of the orbit", units="length"),
    Quantity("verdict", ORBITS, ("orbit",), "int8", "1", "what the orbit is", flags=VERDICTS),
    Quantity(
        "verdict_by_horizon",
        ORBITS,
        ("orbit", "horizon"),
        "int8",
        "1",
        "what the orbit is as judged after fewer bounces",
        flags=VERDICTS,
    ),
    Quantity("island_period", ORBITS, ("orbit",), "int16", "1", "q of the island p/q the orbit is in, 0 outside"),
    Quantity("island_rotation", ORBITS, ("orbit",), "int16", "1", "p of the island p/q the orbit is in, 0 outside"),
    _orbit("island_winding", "turns of the q-fold map about the island's centre, folded to [0, 1/2]", reference=_HANN),
    _orbit("island_centre_s", "arc length of the island's centre, in its part where the orbit starts"),
    _orbit("island_centre_p", "p of the island's centre, in its part where the orbit starts"),
    _resonance("length_maximal", "length of the longest polygon with q vertices and p rounds", "length", _BIRKHOFF),
    _resonance("length_minimax", "length of the minimax polygon with q vertices and p rounds", "length", _BIRKHOFF),
    _resonance("length_gap", "length of the longest polygon less that of the minimax one", "length"),
    _resonance("length_gap_floor", "what the gap may be wrong by, from rounding and the stored boundary", "length"),
    _resonance("trace_maximal", "trace of the q-fold tangent map on the longest polygon"),
    _resonance("trace_minimax", "trace of the q-fold tangent map on the minimax polygon"),
    _resonance("residue_maximal", "residue (2 - trace) / 4 of the longest polygon", reference=_GREENE),
    _resonance("residue_minimax", "residue (2 - trace) / 4 of the minimax polygon", reference=_GREENE),
    _resonance("s_first", "arc length of the first vertex of the longest polygon as a fraction of the perimeter"),
    _resonance("p_first", "p at the first vertex of the longest polygon"),
    _resonance("s_first_minimax", "arc length of the first vertex of the minimax polygon as such a fraction"),
    _resonance("p_first_minimax", "p at the first vertex of the minimax polygon"),
    Quantity(
        "curve_fate",
        RESONANCES,
        ("curve",),
        "int8",
        "1",
        "what has become of the rotational curve of this rotation number",
        reference=_GREENE,
        flags=CURVE_FATES,
    ),
    _curve("curve_growth", "growth of log residue with the period q of the orbits closing in on the curve"),
    _curve("curve_growth_error", "standard error of that growth"),
    _curve("curve_residue", "residue of the longest periodic orbit that the fate of the curve was judged by"),
)

REGISTER: dict[tuple[str, str], Quantity] = {(entry.group, entry.name): entry for entry in _QUANTITIES}


def in_group(group: str) -> tuple[Quantity, ...]:
    """Quantities of one group of the store, in the order they are listed."""
    return tuple(entry for entry in _QUANTITIES if entry.group == group)
