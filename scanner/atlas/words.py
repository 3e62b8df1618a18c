"""Numbers and facts as people read them, in HTML; whatever comes from a study is escaped."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterable
from html import escape

import xarray as xr

from scanner.figures.colours import MISSING

TITLE_LETTERS = 36
TITLE_LINES = 2

_UNITS = {"length": "length", "length2": "length²", "length-1": "1/length"}


def name_of(variable: xr.DataArray) -> str:
    """What a variable is, as the register says."""
    return str(variable.attrs.get("long_name") or plain(str(variable.name)))


def plain(name: str) -> str:
    """Write the name of a parameter or a status as words."""
    return name.replace("_", " ")


def with_units(variable: xr.DataArray) -> str:
    """Write the short name of a variable as words, with its units where it has any."""
    return plain(str(variable.name)) + _in_brackets(variable)


def title_of(variable: xr.DataArray) -> str:
    """Title of a plot: the variable's meaning and units, laid out as `lay_title` does."""
    return lay_title(name_of(variable) + _in_brackets(variable))


def lay_title(text: str) -> str:
    """Break a title into lines that fit a narrow screen, two at least, so that plots side by side stay level."""
    lines = textwrap.wrap(text, TITLE_LETTERS)
    return "\n".join([""] * (TITLE_LINES - len(lines)) + lines)


def _in_brackets(variable: xr.DataArray) -> str:
    units = str(variable.attrs.get("units", "1"))
    return f" ({_UNITS.get(units, units)})" if units != "1" else ""


def write_value(value: object) -> str:
    """Write a coordinate's value: six digits say which one it is."""
    return f"{value:.6g}" if isinstance(value, float) else str(value)


def write_number(value: float, error: float = math.nan) -> str:
    """Write a number with its standard error to two digits of that, else to six digits; a dash where there is none."""
    if not math.isfinite(value):
        return "-"
    if not math.isfinite(error) or error <= 0.0:
        return _with_minus(f"{value:.6g}")
    decimals = 1 - math.floor(math.log10(error))
    if not 0 <= decimals <= 8:
        return _with_minus(f"{value:.3g} ± {error:.2g}")
    return _with_minus(f"{value:.{decimals}f} ± {error:.{decimals}f}")


def _with_minus(text: str) -> str:
    """Write the sign of a number as wide as a plus."""
    return text.replace("-", "\N{MINUS SIGN}")


def list_facts(rows: Iterable[tuple[str, str, str]]) -> str:
    """Make a table of facts.

    Parameters
    ----------
    rows
        Name of the variable, what it is, and its value, as plain text.
    """
    body = "".join(
        f'<tr><th scope="row">{escape(name)}<small>{escape(meaning)}</small></th><td>{escape(value)}</td></tr>'
        for name, meaning, value in rows
    )
    return f"<table>{body}</table>"


def list_marks(statuses: Iterable[str]) -> str:
    """Make a legend of how tables without numbers are marked."""
    found = ""
    for status in statuses:
        face, edge, _ = MISSING[status]
        swatch = f'<i class="mark {status}" style="--face:{face};--edge:{edge}"></i>'
        found += f"<li>{swatch}{plain(status)}</li>"
    return f"<ul>{found}</ul>" if found else ""


def list_colours(entries: Iterable[tuple[str, str]]) -> str:
    """Make a legend of coloured dots and words."""
    found = "".join(f'<li><i style="background:{colour}"></i>{escape(text)}</li>' for colour, text in entries)
    return f"<ul>{found}</ul>" if found else ""
