"""Links, downloads' slices and numbers in words, without a browser."""

from __future__ import annotations

from dataclasses import replace
from urllib.parse import parse_qsl

import pytest
from synthetic import invented_sweep

from scanner.atlas.view import (
    default_view,
    list_quantities,
    possible_axes,
    read_query,
    show_axes,
    show_quantity,
    write_query,
)
from scanner.atlas.words import list_facts, write_number

TWO = {"amplitude": [0.0, 0.01, 0.1 / 3.0, 0.2], "harmonic": [2, 3, 4]}
ROOT = invented_sweep(TWO).to_dataset()


@pytest.mark.parametrize("quantity", [name for names in list_quantities(ROOT).values() for name in names])
def test_every_quantity_has_a_link_that_says_it(quantity):
    view = show_quantity(default_view(ROOT), quantity, ROOT)
    last = {name: ROOT.sizes[name] - 1 for name in ROOT[quantity].dims}
    view = replace(view, at={**view.at, **last}, colour="rotation", start=(0.25, -0.5), bounces=1000)
    assert read_query(dict(parse_qsl(write_query(view, ROOT))), ROOT) == view


def test_the_axes_of_a_quantity_are_its_dimensions():
    view = default_view(ROOT)
    assert (view.across, view.up) == ("amplitude", "harmonic")
    assert possible_axes(ROOT, "island_area_fraction") == ["amplitude", "harmonic", "period"]
    swapped = show_axes(view, "harmonic", "harmonic", ROOT)
    assert (swapped.across, swapped.up) == ("harmonic", "amplitude")
    along_p = show_axes(show_quantity(view, "regular_area_fraction_by_p", ROOT), "p_bin", "", ROOT)
    assert (along_p.across, along_p.up) == ("p_bin", "")
    assert show_quantity(along_p, "area", ROOT).across == "amplitude"


def test_a_page_without_a_query_selects_a_table_that_is_done():
    root = invented_sweep({"amplitude": list(range(9))}, convex_below=0.3).to_dataset()
    assert root["table_status"].values.tolist() == [1, 1, 1, 2, 2, 2, 2, 2, 2]
    assert default_view(root).at["amplitude"] == 2


def test_a_single_table_has_no_axes():
    root = invented_sweep({}).to_dataset()
    view = default_view(root)
    assert (view.across, view.up) == ("", "")
    assert read_query(dict(parse_qsl(write_query(view, root))), root) == view


@pytest.mark.parametrize(
    "query",
    [
        {"quantity": "no_such"},
        {"across": "no_such", "up": "harmonic"},
        {"at.amplitude": "x", "at.harmonic": "nan", "at.other": "1"},
        {"s": "0.1"},
        {"s": "0.1", "p": "1.5"},
        {"colour": "pink", "bounces": "1e9"},
    ],
)
def test_what_a_link_gets_wrong_is_as_without_it(query):
    assert read_query(query, ROOT) == default_view(ROOT)


def test_a_link_from_a_coarser_sweep_finds_the_nearest_table():
    assert read_query({"at.amplitude": "0.03", "at.harmonic": "7"}, ROOT).at["amplitude"] == 2
    assert read_query({"at.amplitude": "0.03", "at.harmonic": "7"}, ROOT).at["harmonic"] == 2


@pytest.mark.parametrize(
    ("value", "error", "text"),
    [
        (0.859375, 0.00302, "0.8594 ± 0.0030"),
        (-1.88, float("nan"), "\N{MINUS SIGN}1.88"),
        (float("nan"), 0.1, "-"),
        (123.456, 12.0, "123 ± 12"),
        (1e-12, 3.21e-13, "1e\N{MINUS SIGN}12 ± 3.2e\N{MINUS SIGN}13"),
        (0.25, 0.0, "0.25"),
    ],
)
def test_numbers_are_written_to_two_digits_of_their_error(value, error, text):
    assert write_number(value, error) == text


def test_what_comes_from_a_study_is_escaped():
    assert "<script>" not in list_facts([("<script>", "<script>", "<script>")])
