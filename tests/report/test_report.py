"""The report: every number with its error, what the store doubts, nothing that needs a network, nothing unescaped."""

from __future__ import annotations

import base64
import re
from html.parser import HTMLParser
from xml.etree import ElementTree

import numpy as np
import pytest
from synthetic import invented_sweep

from scanner.errors import ScannerError
from scanner.quantities import DONE, FAILED
from scanner.report import write_report
from scanner.report.accuracy import list_doubts
from scanner.report.answer import QUESTION, describe_answer, question_of
from scanner.report.page import make_page
from scanner.report.pictures import choose_figures, draw_pictures
from scanner.store.progress import SweepProgress

TITLE = "</title><script>alert('1')</script> & \"quoted\" $5 Größe \u5f62"
REASON = 'ValueError: <b>"bold"</b> & more'
AMPLITUDES = [0.0, 0.02, 0.04, 0.3]
VOID = {"meta", "img", "link", "br"}

# In one process: every other one would start a browser and draw the pictures of its own.
pytestmark = pytest.mark.xdist_group("browser")


def progress_of(tables, failures=(), finished=None):
    done = tables - len(failures)
    return SweepProgress(
        tables=tables,
        settled=tables,
        done=done,
        not_convex=0,
        failed=len(failures),
        orbits=64 * tables,
        orbits_settled=64 * tables,
        tasks=tables,
        finished=frozenset(range(tables if finished is None else finished)),
        bounces_per_second=None,
        seconds_left=None,
        hosts={"<host>": 1.0},
        failures=dict(failures),
        running=False,
    )


def quadrupoles(**options):
    tree = invented_sweep({"amplitude": AMPLITUDES}, title=TITLE, **options)
    study = tree.attrs["study"].replace("invented", "radial_harmonic").replace("decay = 2.5", "harmonic = 2")
    tree.attrs["study"] = f"# Is <this> the question,\n# or that?\n#\n# An aside.\n{study}"
    return tree


class Page(HTMLParser):
    """What a page is made of: open and closed tags, attributes that load something, texts of cells."""

    def __init__(self, text):
        super().__init__()
        self.open, self.tags, self.loads, self.tables, self.text = [], [], [], [], ""
        self.feed(text)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.tags.append(tag)
        self.loads += [value for name, value in attrs if name in ("src", "href", "srcset", "data", "action", "poster")]
        if tag not in VOID:
            self.open.append(tag)
        if tag == "table":
            self.tables.append([])
        elif tag == "tr":
            self.tables[-1].append([])
        elif tag in ("td", "th"):
            self.tables[-1][-1].append("")

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        if self.open and self.open[-1] in ("td", "th"):
            self.tables[-1][-1][-1] += data
        if self.open and self.open[-1] != "style":
            self.text += " ".join(data.split()) + " "


@pytest.fixture(scope="module")
def tree():
    """One table that failed, one that is done, one that is not convex."""
    found = quadrupoles().isel(amplitude=slice(1, None)).copy(deep=True)
    found["table_status"].values[0] = FAILED
    for variable in found.to_dataset().data_vars:
        if variable != "table_status":
            found[variable].values[0] = np.nan
    return found


@pytest.fixture(scope="module")
def written(tree, tmp_path_factory):
    target = tmp_path_factory.mktemp('a "folder"') / "report.html"
    write_report(tree, progress_of(3, {(0,): REASON}), target)
    return target


@pytest.fixture(scope="module")
def page(written):
    return Page(written.read_text(encoding="utf-8"))


def test_nothing_is_loaded_from_outside(written, page):
    assert page.open == []
    assert "script" not in page.tags
    assert "link" not in page.tags
    assert {address.partition(",")[0] for address in page.loads} == {"data:image/svg+xml;base64", "#accuracy"}
    text = written.read_text(encoding="utf-8")
    assert not re.search(r"@import|url\(", text)
    assert "default-src 'none'" in text


def test_pictures_are_whole_and_refer_to_themselves(page):
    pictures = [address.partition(",")[2] for address in page.loads if address.startswith("data:")]
    assert len(pictures) == 8  # five against the amplitude, three of the table that is done
    for picture in pictures:
        root = ElementTree.fromstring(base64.b64decode(picture))
        assert root.tag == "{http://www.w3.org/2000/svg}svg"
        for element in root.iter():
            reference = element.get("{http://www.w3.org/1999/xlink}href", "#")
            assert reference.startswith(("#", "data:image/png"))


def test_text_of_others_is_shown_as_it_is(page):
    assert page.tags.count("title") == 1
    assert TITLE in page.text
    assert REASON in page.text
    assert "<host> (100 % of the time)" in page.text
    assert "Is <this> the question, or that?" in page.text


def test_every_number_stands_with_its_error(page, tree):
    heading, *rows = page.tables[1]
    assert heading == [
        *("amplitude", "status", "regular area", "regular volume"),
        *("undecided", "Lyapunov/bounce", "diffusion", "drift"),
    ]
    root = tree.to_dataset()
    assert [row[:2] for row in rows] == [["0.02", "failed"], ["0.04", "done"], ["0.3", "not convex"]]
    for place, row in enumerate(rows):
        if root["table_status"].values[place] != DONE:
            assert set(row[2:]) == {"-"}
            continue
        for column, name in ((2, "regular_area_fraction"), (3, "regular_volume_fraction"), (5, "lyapunov_per_bounce")):
            number, error = (float(part) for part in row[column].split(" ± "))
            # written to four decimals
            assert number == pytest.approx(root[name].values[place], abs=5.1e-5)
            assert error == pytest.approx(root[f"{name}_stderr"].values[place], abs=5.1e-5)


def test_page_says_where_the_numbers_come_from(page, tree):
    assert "0" * 64 in page.text
    assert 'family = "radial_harmonic"' in page.text
    assert "r(phi) = 1 + amplitude cos(harmonic phi)" in page.text
    assert "1 done, 1 not convex, 1 failed." in page.text
    assert "not finished" not in page.text


@pytest.fixture
def bare():
    """A sweep of which nothing is done, so that there is nothing to draw."""
    tree = invented_sweep({"amplitude": np.linspace(0.0, 0.1, 11).tolist()})
    tree["table_status"].values[:] = 0
    return tree


def test_files_are_whole_and_kept(tmp_path, bare):
    for name in ("one.html", "two.html"):
        write_report(bare, progress_of(4, finished=3), tmp_path / name)
    assert (tmp_path / "one.html").read_bytes() == (tmp_path / "two.html").read_bytes()
    assert "3 of 4 tasks are" in Page((tmp_path / "one.html").read_text(encoding="utf-8")).text
    assert len(list(tmp_path.iterdir())) == 2
    with pytest.raises(ScannerError, match="exists: choose another name, or replace it with --force"):
        write_report(bare, progress_of(4), tmp_path / "one.html")
    with pytest.raises(ScannerError, match=r"unknown suffix '.pdf', it must be .html"):
        write_report(bare, progress_of(4), tmp_path / "one.pdf")


def test_long_tables_keep_their_ends(bare):
    text, _ = make_page(bare, progress_of(11, finished=0), {}, (), rows=4, allow_code=False)
    page = Page(text)
    assert [row[0] for row in page.tables[1][1:]] == ["0", "0.01", "0.09", "0.1"]
    assert "7 rows in the middle are left out here." in page.text
    assert "No table here is done yet." in page.text
    assert "img" not in page.tags


def test_doubts_are_counted_from_the_store():
    root = quadrupoles().to_dataset()
    final = root["regular_area_fraction"].values
    drift = root["regular_area_fraction_by_horizon"].values[:, 1] - final
    beyond = int((np.abs(drift[:3]) > 0.0123).sum())  # the error of all invented fractions
    worst = int(np.abs(drift[:3]).argmax())
    found = {doubt.subject: doubt for doubt in list_doubts(root)}
    assert f"In {beyond} of 3 tables" in found["Horizon"].finding
    assert f"drift is {drift[worst]:+.4f} at amplitude = {AMPLITUDES[worst]}" in found["Horizon"].finding
    assert found["Horizon"].minded
    assert f"{np.nanmax(root['undecided_area_fraction']):.4f} of the section" in found["Undecided"].finding
    assert not found["Undecided"].minded
    assert found["Boundary"].minded  # the invented ones are of the order of 1
    # (9 + ln 8192) / 8192, the growth that tells chaos from shear
    assert "below about 0.002 per bounce" in found["Weak chaos"].finding


def test_settled_numbers_raise_no_doubt():
    root = quadrupoles().to_dataset()
    final = root["regular_area_fraction"]
    root["regular_area_fraction_by_horizon"] = final.expand_dims(horizon=root["horizon"], axis=-1)
    root["boundary_error"] = final * 0.0 + 1e-16
    found = {doubt.subject: doubt for doubt in list_doubts(root)}
    assert found["Horizon"].finding.startswith("Nowhere")
    assert not found["Horizon"].minded
    assert not found["Boundary"].minded


def test_answer_names_the_extremes_and_where_half_is_regular():
    root = invented_sweep({"amplitude": [0.0, 0.1, 0.2, 0.3]}, convex_below=9.0).to_dataset()
    first, second = describe_answer(root)
    assert "between 0.0000 ± 0.0123 at amplitude = 0.3 and 1.0000 ± 0.0123 at amplitude = 0" in first
    assert second == "Half of the section is regular between amplitude = 0.1 and 0.2."


def test_question_is_the_studys_own_where_it_has_one():
    assert question_of(invented_sweep({})) == QUESTION
    assert question_of(quadrupoles()) == "Is <this> the question, or that?"


@pytest.mark.parametrize(
    ("swept", "average", "kinds"),
    [
        ({}, (), ["portrait", "portrait", "table", "exponents"]),
        ({"a": [0.0, 0.1]}, (), ["fractions", "map", "curve", "exponents", "map"]),
        ({"a": [0.0, 0.1], "realisation": [1, 2, 3]}, ("realisation",), ["fractions", "map", "curve"]),
        ({"a": list(range(9)), "b": list(range(9))}, (), ["map", "map", "map", "map"]),
        ({"a": [0.0, 0.1], "b": [2, 3], "c": [0.0, 1.0, 2.0]}, (), ["map", "curve", "map", "map", "map"]),
    ],
)
def test_figures_suit_the_parameters(swept, average, kinds):
    found = list(choose_figures(invented_sweep(swept), {}, average))
    assert [request.kind for _, request in found][: len(kinds)] == kinds
    assert {request.kind for _, request in found[len(kinds) :]} <= {"portrait", "table"}
    for _, request in found:
        left = set(swept) - set(request.select) - set(request.average)
        if request.kind in ("portrait", "table"):
            assert not left
        else:
            assert len(left) <= 2


def test_what_cannot_be_drawn_is_told_once():
    tree = invented_sweep({})
    pictures, left_out = draw_pictures(tree, tree, {}, (), allow_code=False)
    assert len(pictures) == 3
    (line,) = left_out
    assert re.fullmatch(r"Orbits in the table: family 'invented' is not known: .*", line)


def test_page_fits_narrow_screens(written, browser):
    """In a browser: no part is wider than 390 pixels, every picture loads, and nothing is complained of."""
    complaints: list[str] = []
    screen = browser.new_page()
    screen.set_viewport_size({"width": 390, "height": 800})
    screen.on("console", lambda message: complaints.append(message.text))
    screen.goto(written.as_uri())
    width = screen.evaluate("document.documentElement.scrollWidth")
    broken = screen.evaluate("[...document.images].filter(image => !image.naturalWidth).length")
    screen.close()
    assert (width, broken, complaints) == (390, 0, [])
