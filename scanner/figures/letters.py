"""Typefaces for titles in any script: what the usual one lacks is taken from others that are installed."""

from __future__ import annotations

import logging
from collections.abc import Sequence

from matplotlib.font_manager import FontProperties, findfont, fontManager
from matplotlib.ft2font import FT2Font

log = logging.getLogger(__name__)


def families_for(text: str, usual: str) -> list[str]:
    """List the usual typeface and as many others as its missing letters need.

    Letters that no installed typeface has are drawn as boxes, and that is said once.
    """
    families = [usual]
    missing = _letters(text) - _charmap(findfont(FontProperties(family=usual)))
    for name, file in _others() if missing else ():
        found = missing & _charmap(file)
        if found:
            families.append(name)
            missing -= found
        if not missing:
            break
    if missing:
        shown = "".join(sorted(map(chr, missing))[:20])
        log.warning("%s", f"no installed typeface has {shown}: boxes stand for them; install one that does")
    return families


def _letters(text: str) -> set[int]:
    return {ord(letter) for letter in text if not letter.isspace()}


def _charmap(file: str) -> set[int]:
    return set(FT2Font(file).get_charmap())


def _others() -> Sequence[tuple[str, str]]:
    """Upright typefaces of usual weight; the one that has a box for every letter is none."""
    usable = {
        entry.name: entry.fname
        for entry in fontManager.ttflist
        if entry.style == "normal" and entry.weight in (400, "normal", "regular") and "Last Resort" not in entry.name
    }
    return sorted(usable.items())
