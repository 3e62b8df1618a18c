"""Titles in any script: no warning, no exception, and no box where some typeface has the letter."""

import logging

import pytest
from matplotlib.font_manager import FontProperties, findfont
from matplotlib.ft2font import FT2Font
from synthetic import invented_sweep

from scanner.figures import write_figure
from scanner.figures.letters import families_for
from scanner.figures.style import STYLE

USUAL = str(STYLE["font.family"])
NOWHERE = "\U000f1234"
"""A letter of private use that no typeface of the usual ones has."""


def letters_of(family):
    return set(FT2Font(findfont(FontProperties(family=family))).get_charmap())


def test_usual_letters_need_no_other_typeface(caplog):
    assert families_for("Größe Ω ż λ ≤ 'one' \"two\"", USUAL) == [USUAL]
    assert caplog.text == ""


def test_a_letter_of_another_typeface_is_taken_from_it():
    letter = chr(min(letters_of("STIXGeneral") - letters_of(USUAL)))
    families = families_for(f"a{letter}b", USUAL)
    assert families[0] == USUAL
    assert any(ord(letter) in letters_of(family) for family in families[1:])


def test_a_letter_that_nobody_has_is_said_once(caplog):
    assert families_for(NOWHERE * 3, USUAL) == [USUAL]
    assert [record.levelno for record in caplog.records] == [logging.WARNING]
    assert "boxes stand for them" in caplog.text


@pytest.mark.parametrize(
    "title", ["量子ビリヤード", "'one' \"two\" $x_1$ \\alpha", f"Größe {NOWHERE}", "a" * 200, "🎱 שלום"]
)
def test_any_title_is_drawn_without_a_warning(title, tmp_path):
    tree = invented_sweep({"amplitude": [0.0, 0.1, 0.2]}, title=title)
    for suffix in (".png", ".svg"):
        write_figure(tree, tmp_path / f"{title[:5]}{suffix}")
        assert (tmp_path / f"{title[:5]}{suffix}").stat().st_size > 1000
