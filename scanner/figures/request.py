"""What a user can ask of a figure; light, so that the command line can list the choices."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields

from scanner.errors import ScannerError

KINDS = ("fractions", "curve", "map", "portrait", "table", "exponents", "frequency", "gaps")
COLOURS = ("verdict", "exponent", "diffusion", "rotation")
WIDTHS = ("single", "double")
FREQUENCY_BOUNCES = 1024
CHORDS = 120
LINE_ORBITS = 1000
SUFFIXES = (".png", ".pdf", ".svg")
HEEDED_BY = {
    "average": ("fractions", "curve", "map"),
    "quantity": ("curve", "map"),
    "along": ("fractions", "curve", "gaps"),
    "colour": ("portrait",),
    "bounces": ("portrait", "table", "frequency"),
    "s": ("table", "frequency"),
    "p": ("table",),
    "orbits": ("frequency",),
}
"""Kinds on which an option has an effect; those that are not here have one on all."""


@dataclass(frozen=True)
class Request:
    """What to draw of a sweep.

    Parameters
    ----------
    kind
        ``fractions``: the regular fractions against one parameter, with error bands and earlier horizons.
        ``curve``: one variable against one parameter, a line for each value of a second one.
        ``map``: one variable as colours over two dimensions.
        ``portrait``: the orbits of one table, p against s.
        ``table``: one table with chosen orbits in it, their chords and caustics.
        ``exponents``: how many orbits have which Lyapunov exponent, in one table or along one parameter.
        ``frequency``: rotation number of one table along a line of the section, and its diffusion over all of it.
        ``gaps``: length gaps of stored resonances against the amplitude, with fitted powers.
        Empty: the kind that suits how many parameters are left.
    select
        Values at which to hold swept parameters, the nearest stored one is taken.
    average
        Swept parameters to average over.
    quantity
        Variable of a curve or a map; empty for the regular area fraction.
    along
        Parameter of the horizontal axis of a curve or of gaps; empty for the one of most values, or the amplitude.
    colour
        What the colours of a portrait mean, one of `COLOURS`.
    bounces
        Bounces for which a portrait follows each orbit anew; 0 shows the starting points alone.
        Bounces of each orbit that a frequency figure measures; 0 stands for `FREQUENCY_BOUNCES`.
        Chords drawn of each orbit in a table; 0 stands for `CHORDS`.
    s
        Arc length, as a fraction of the perimeter, of the line of a frequency figure and of the starts of `p`.
    p
        Starts of the orbits drawn in a table; empty for some stored ones of each sort.
    orbits
        Orbits measured along the line of a frequency figure.
    width
        ``single`` or ``double`` column.
    allow_code
        Whether the user's own function may run where orbits are followed anew.
    """

    kind: str = ""
    select: Mapping[str, float | str] = field(default_factory=dict)
    average: tuple[str, ...] = ()
    quantity: str = ""
    along: str = ""
    colour: str = "verdict"
    bounces: int = 0
    s: float = 0.0
    p: tuple[float, ...] = ()
    orbits: int = LINE_ORBITS
    width: str = "single"
    allow_code: bool = False


def refuse_idle_options(request: Request, kind: str) -> None:
    """Refuse what was asked for and would have no effect on a figure of this kind.

    Raises
    ------
    ScannerError
        One line, with the kinds on which it has one.
    """
    for entry in fields(request):
        kinds = HEEDED_BY.get(entry.name, (kind,))
        if kind not in kinds and getattr(request, entry.name) != entry.default:
            raise ScannerError(
                f"--{entry.name} has no effect on a figure of kind {kind}: leave it out, or draw {' or '.join(kinds)}"
            )
