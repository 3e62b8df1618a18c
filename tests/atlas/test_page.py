"""The atlas in a real browser: what a page shows is what the store and the kernels say."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from serving import served
from sweeps import everything, fill, grid, order_for

import scanner
from scanner.engine.work import run_task
from scanner.study import parse_study

OWN_FAMILY = """
import math

def squashed(size):
    turns = [2 * math.pi * n / 64 for n in range(64)]
    return [[size * math.cos(t) for t in turns], [math.sin(t) for t in turns]]
"""
OWN_STUDY = """
[study]
title = "Ellipses"
seed = 1
[table]
family = "squashed_tables:squashed"
size = { values = [1.0, 1.1, 1.2] }
[orbits]
per_table = 64
bounces = 256
replicates = 4
"""
HARMONIC_3 = {"amplitude": 0.06, "harmonic": 3}

# In one process: every other one would start a browser and a server of its own.
pytestmark = pytest.mark.xdist_group("browser")


@pytest.fixture(scope="module")
def tree(store):
    with scanner.open_sweep(store) as opened:
        yield opened


def one_table(tree, **parameters):
    return tree.sel(parameters, method="nearest")


def test_a_page_opens_with_the_whole_family(read, address, tree):
    reader = read(address)
    assert reader.page.locator("h1").inner_text() == "Grid <b>of</b> Größe"
    assert reader.text("activity") == "6 of 10 tables done, 4 not convex"
    (values,) = reader.points("family", 0, "value")
    np.testing.assert_array_equal(values, tree["regular_area_fraction"].values.ravel())
    assert reader.title("family") == "regular fraction of the section area ds dp"
    assert "not convex" in reader.text("family_legend")


def test_a_click_on_a_table_shows_its_numbers_portrait_and_outline(read, address, tree):
    reader = read(address)
    reader.click("family", HARMONIC_3["amplitude"], 3)
    reader.wait_for(lambda: reader.text("table_title") == "amplitude = 0.06, harmonic = 3")
    reader.settle()
    picked = one_table(tree, **HARMONIC_3)
    s, p = reader.points("portrait", 0, "s", "p")
    whole = scanner.whole_section(picked)
    np.testing.assert_array_equal(s, whole["s0"].values)
    np.testing.assert_array_equal(p, whole["p0"].values)
    value, error = (float(part) for part in reader.facts("table")["regular area fraction"].split(" ± "))
    truth, spread = (picked[f"regular_area_fraction{suffix}"].item() for suffix in ("", "_stderr"))
    # written to two digits of the error
    assert value == pytest.approx(truth, abs=0.05 * spread)
    assert error == pytest.approx(spread, rel=0.05)
    assert float(reader.facts("table")["perimeter (length)"]) == pytest.approx(picked["perimeter"].item(), rel=1e-5)
    x, y = reader.points("outline", 1, "x", "y")
    table = scanner.build_table("radial_harmonic", amplitude=picked["amplitude"].item(), harmonic=3)
    np.testing.assert_array_equal((x, y), table.point(np.linspace(0.0, 1.0, len(x))))


def test_a_click_in_the_portrait_traces_an_orbit(read, address, tree):
    reader = read(address)
    picked = one_table(tree, amplitude=0.06, harmonic=2)
    reader.click("family", 0.06, 2)
    reader.wait_for(lambda: "harmonic = 2" in reader.text("table_title"))
    reader.settle()
    start = picked["orbits"].isel(orbit=int(np.abs(picked["orbits/p0"].values).argmin()))
    s, p = round(start["s0"].item(), 6), round(start["p0"].item(), 6)
    reader.click("portrait", s, p)
    reader.wait_for(lambda: len(reader.points("portrait", 1, "s")[0]) == 201)
    table = scanner.build_table("radial_harmonic", amplitude=picked["amplitude"].item(), harmonic=2)
    orbit = scanner.trace(table, s, p, 200).isel(orbit=0)
    np.testing.assert_array_equal(reader.points("portrait", 1, "s", "p"), (orbit["s"], orbit["p"]))
    np.testing.assert_array_equal(reader.points("outline", 0, "x", "y"), (orbit["x"], orbit["y"]))
    measured = scanner.measure_orbits(table, s, p, 1024).isel(orbit=0)
    facts = reader.facts("orbit")
    assert facts["verdict"] in ("regular, rotational", "regular, librational", "chaotic", "undecided")
    # written to six digits
    assert float(facts["rotation number"]) == pytest.approx(measured["rotation_number"].item(), rel=1e-5)
    assert float(facts["lyapunov per bounce"]) == pytest.approx(measured["lyapunov_per_bounce"].item(), rel=1e-5)


def test_a_table_that_is_not_convex_says_so(read, address):
    reader = read(f"{address}?at.amplitude=0.24&at.harmonic=3&s=0.2&p=0.1")
    assert "This table is not convex: curvature -" in reader.text("table_facts")
    assert "cannot be traced" in reader.text("orbit_facts")
    assert len(reader.points("portrait", 0, "s")[0]) == 0
    assert len(reader.points("outline", 1, "x")[0]) > 100
    assert reader.facts("table") == {}


def test_one_parameter_makes_a_curve_with_errors(read, address, tree):
    reader = read(address)
    reader.page.get_by_label("Up").select_option(label="none, a curve")
    reader.wait_for(lambda: "up=" not in reader.link())
    x, y, low, high = reader.points("family", 2, "x", "y", "low", "high")
    line = tree.to_dataset().sel(harmonic=2)
    np.testing.assert_array_equal(x, tree["amplitude"].values)
    np.testing.assert_array_equal(y, line["regular_area_fraction"])
    done = line["table_status"].values == 1
    np.testing.assert_allclose((high - low)[done] / 2, line["regular_area_fraction_stderr"].values[done], atol=1e-15)


def test_a_quantity_over_a_further_dimension_can_be_drawn_along_it(read, address, tree):
    reader = read(f"{address}?at.amplitude=0.06&at.harmonic=2")
    reader.page.get_by_label("Quantity").select_option(label="regular fraction of the section area in a bin of p")
    reader.page.get_by_label("Across").select_option(label="p bin")
    reader.page.get_by_label("Up").select_option(label="none, a curve")
    reader.wait_for(lambda: "across=p_bin" in reader.link() and "up=" not in reader.link())
    picked = one_table(tree, amplitude=0.06, harmonic=2)
    reader.wait_for(lambda: len(reader.points("family", 2, "y")[0]) == 20)
    np.testing.assert_array_equal(reader.points("family", 2, "y")[0], picked["regular_area_fraction_by_p"])


def test_sliders_and_arrow_keys_move_the_selected_table(read, address):
    reader = read(f"{address}?at.amplitude=0.06&at.harmonic=2&s=0.2&p=0.1")
    reader.page.locator(".noUi-handle").first.press("ArrowRight")
    reader.wait_for(lambda: reader.text("table_title") == "amplitude = 0.12, harmonic = 2")
    family = reader.page.get_by_role("group", name="Plot of the family").locator(".bk-events")
    family.press("ArrowUp")
    reader.wait_for(lambda: reader.text("table_title") == "amplitude = 0.12, harmonic = 3")
    family.press("ArrowLeft")
    reader.wait_for(lambda: reader.text("table_title") == "amplitude = 0.06, harmonic = 3")
    family.press("ArrowUp")  # there is nothing beyond
    reader.page.get_by_role("group", name="Phase portrait").locator(".bk-events").press("ArrowRight")
    reader.wait_for(lambda: "s=0.21&p=0.1" in reader.link())
    assert reader.text("table_title") == "amplitude = 0.06, harmonic = 3"
    assert "at.amplitude=0.06&at.harmonic=3" in reader.link()


def test_everything_is_reached_by_the_tab_key_and_shows_it(read, address):
    reader = read(address)
    seen = []
    for _ in range(40):
        reader.page.keyboard.press("Tab")
        found = reader.page.evaluate(
            """() => {
              let at = document.activeElement, place = at.closest("[role=group]")
              while (at.shadowRoot?.activeElement) {
                at = at.shadowRoot.activeElement
              }
              const name = at.labels?.[0]?.textContent || at.textContent.trim() || at.className
              const label = at.matches(".bk-events") ? place.ariaLabel : name
              return [`${label} ${at.className}`, getComputedStyle(at).outlineStyle, at === document.body]
            }"""
        )
        if found[2]:
            break
        seen.append(found[:2])
    labels = " | ".join(label for label, _ in seen)
    parts = (
        "Link to this view",
        "Copy",
        "Quantity",
        "Across",
        "Up",
        "Plot of the family",
        "CSV",
        "netCDF",
        "PNG",
        "SVG",
    )
    parts += ("Colours", "Phase portrait", "Bounces drawn", "Start s/L", "Start p", "Outline")
    for part in parts:
        assert part in labels
    assert sum("noUi-handle" in label for label, _ in seen) == 2
    assert [label for label, outline in seen if outline == "none"] == []


def test_a_link_reproduces_the_view(read, address):
    reader = read(address)
    exponent = "mean Lyapunov exponent of the chaotic orbits, per unit length"
    reader.page.get_by_label("Quantity").select_option(label=exponent)
    reader.page.get_by_label("Up").select_option(label="amplitude")
    reader.page.get_by_label("Colours").select_option(label="frequency diffusion (log10)")
    reader.page.get_by_label("Bounces drawn").select_option(label="50")
    reader.page.get_by_label("Start s/L").fill("0.3")
    reader.page.get_by_label("Start s/L").press("Enter")
    reader.page.get_by_label("Start p").fill("-0.2")
    reader.page.get_by_label("Start p").press("Enter")
    reader.wait_for(lambda: "s=0.3&p=-0.2&bounces=50" in reader.link())
    reader.wait_for(lambda: len(reader.points("portrait", 1, "s")[0]) == 51)
    reader.settle()
    again = read(reader.link())
    assert again.link() == reader.link() == reader.page.url
    for plot in ("family", "portrait"):
        assert again.title(plot) == reader.title(plot)
    assert "per unit length (1/length)" in again.title("family")
    np.testing.assert_array_equal(again.points("portrait", 1, "s", "p"), reader.points("portrait", 1, "s", "p"))
    assert again.facts("orbit") == reader.facts("orbit")
    assert again.facts("table") == reader.facts("table")


def test_the_slice_the_orbits_and_the_pictures_can_be_downloaded(read, address, tree, tmp_path):
    reader = read(f"{address}?across=amplitude&at.amplitude=0.06&at.harmonic=3")
    rows = pd.read_csv(reader.download('[data-file="slice.csv"]', tmp_path))
    assert rows["harmonic"].tolist() == [3] * 5
    line = tree.to_dataset().sel(harmonic=[3]).isel(harmonic=0)
    np.testing.assert_array_equal(rows["regular_volume_fraction"], line["regular_volume_fraction"])
    target = reader.download('[data-file="slice.nc"]', tmp_path)
    assert target.name == "small grid-slice.nc"
    with xr.open_dataset(target) as found:
        xr.testing.assert_equal(found["lyapunov_per_bounce"].isel(harmonic=0), line["lyapunov_per_bounce"])
    orbits = pd.read_csv(reader.download('[data-file="orbits.csv"]', tmp_path))
    np.testing.assert_array_equal(orbits["s0"], one_table(tree, **HARMONIC_3)["orbits/s0"])
    for plot, kind, start in (("family", "png", b"\x89PNG"), ("portrait", "svg", b"<svg"), ("outline", "svg", b"<svg")):
        selector = f'[data-picture="{plot}"][data-format="{kind}"]'
        content = reader.download(selector, tmp_path).read_bytes()
        assert content.startswith(start)
        assert len(content) > 5000


@pytest.mark.parametrize("width", [1280, 390])
@pytest.mark.parametrize("query", ["", "?across=amplitude&colour=exponent&quantity=entropy_per_bounce"])
def test_nothing_is_wider_than_the_screen(read, address, width, query):
    reader = read(address + query, width)
    assert reader.page.evaluate("document.documentElement.scrollWidth") <= width
    reader.page.set_viewport_size({"width": width, "height": 3500})
    for element in reader.page.locator(".plot, table, select, input, .noUi-target, p, h1, h2, a, button").all():
        box = element.bounding_box()
        if box and box["width"]:
            assert box["x"] >= 0
            assert box["x"] + box["width"] <= width
    for plot in ("family", "portrait", "outline"):
        room, needed = reader.page.evaluate(
            """name => {
              const place = Bokeh.documents[0].get_model_by_name(name)
              const view = Bokeh.index.find_one(place.children[0])
              const pen = document.createElement("canvas").getContext("2d")
              pen.font = "bold 13px system-ui, 'DejaVu Sans', sans-serif"
              const lines = place.children[0].title.text.split("\\n")
              const widths = lines.map(line => pen.measureText(line).width)
              return [view.bbox.width - view.frame.bbox.left, Math.max(...widths)]
            }""",
            plot,
        )
        assert needed <= room


def test_a_store_that_is_being_written_is_followed_and_left_alone(read, tmp_path):
    path = tmp_path / "growing.zarr"
    study = grid()
    plan = fill(path, study, [0])
    with served(path) as url:
        reader = read(url)
        assert "not finished and nobody is writing it" in reader.text("activity")
        assert "pending" in reader.text("family_legend")
        for number in range(1, len(plan.tasks)):
            run_task(order_for(path, study), number)
        after = everything(path)
        reader.wait_for(lambda: reader.text("activity") == "6 of 10 tables done, 4 not convex")
        (values,) = reader.points("family", 0, "value")
        assert np.isfinite(values).sum() == 6
        assert everything(path) == after
        reader.close()


def test_a_family_of_ones_own_runs_only_where_that_is_allowed(read, tmp_path, monkeypatch):
    (tmp_path / "squashed_tables.py").write_text(OWN_FAMILY)
    monkeypatch.syspath_prepend(tmp_path)
    path = tmp_path / "own.zarr"
    fill(path, parse_study(OWN_STUDY, allow_code=True))
    with served(path) as url:
        reader = read(url)
        assert "--allow-code" in reader.text("table_facts")
        assert len(reader.facts("table")) > 10
        assert len(reader.points("portrait", 0, "s")[0]) == 8 * 64  # an ellipse: with all images of its orbits
        assert reader.title("outline") == "no outline"
        reader.close()
    with served(path, "--allow-code") as url:
        reader = read(f"{url}?s=0.1&p=0.3")
        assert reader.points("outline", 1, "x")[0].max() == pytest.approx(1.1, abs=1e-12)  # size of the middle table
        assert len(reader.points("outline", 0, "x")[0]) == 201
        reader.close()
