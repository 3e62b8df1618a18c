"""One open page: what its reader sees of the sweep, kept in step with what he asks for."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor, Future
from dataclasses import replace
from functools import partial
from html import escape
from pathlib import Path
from typing import Any

import numpy as np
from bokeh.core.properties import Int, List, String
from bokeh.document import Document
from bokeh.model import DataModel
from bokeh.models import Column, CustomJS, Div, UIElement

from scanner.atlas.controls import WIDGETS, Controls
from scanner.atlas.facts import say_activity, say_study, table_facts
from scanner.atlas.family import FamilyPlot
from scanner.atlas.orbit import TracedOrbit, find_table, trace_orbit
from scanner.atlas.outline import OutlinePlot
from scanner.atlas.portrait import Portrait, stored_orbits
from scanner.atlas.view import View, read_query, values_of, write_query
from scanner.atlas.watch import Watch
from scanner.atlas.words import list_facts, list_marks, plain
from scanner.cards import describe
from scanner.errors import ScannerError
from scanner.quantities import DONE, TABLE_STATUS
from scanner.tables import Table

HERE = Path(__file__).parent
POLL_MILLISECONDS = 1000
TEXTS = (
    "notice", "activity", "family_legend", "family_value", "table_title", "table_facts", "table_legend", "orbit_title",
    "orbit_facts",
)  # fmt: skip
"""Places of the page that hold words."""


class Wire(DataModel):  # type: ignore[misc]
    """What the page's own script and this program tell each other."""

    query = String(default="")
    press = List(Int, default=[0, 0, 0, 0])
    """A count, then 0 for the family and 1 for the portrait, then steps across and up."""


class Page:
    """The session of one reader.

    Parameters
    ----------
    document
        Its bokeh document.
    watch
        The store.
    query
        The query of the link that was opened.
    allow_code
        Whether the study's own function may run.
    tracer
        Runs the kernels beside the server's loop.
    """

    def __init__(
        self, document: Document, watch: Watch, query: dict[str, str], allow_code: bool, tracer: Executor
    ) -> None:
        self._document, self._watch, self._allow_code, self._tracer = document, watch, allow_code, tracer
        self._snapshot = watch.look()
        self._view = read_query(query, self._snapshot.root)
        self._table: Table | str = ""
        self._building, self._tracing = Future[Table | str](), Future[TracedOrbit]()
        self._wire = Wire()
        self._texts = {name: _make_text(name) for name in TEXTS}
        self._controls = Controls(self._snapshot.root, self._view, self._change)
        self._portrait = Portrait(self._start_at)
        self._outline = OutlinePlot()
        self._family: FamilyPlot | None = None
        # a tag, as only what a plot refers to is kept in step with the browser
        self._family_place = Column(sizing_mode="stretch_width", tags=[self._wire])
        self._fill_document()
        for show in (self._show_activity, self._show_family, self._show_table):
            self._guard(show)()
        self._wire.query = write_query(self._view, self._snapshot.root)
        self._wire.on_change("press", self._pressed)
        document.add_periodic_callback(self._guard(self._refresh), POLL_MILLISECONDS)

    def _fill_document(self) -> None:
        controls = self._controls
        places: dict[str, UIElement] = {
            "family": self._family_place,
            "portrait": Column(self._portrait.figure, sizing_mode="stretch_width"),
            "outline": Column(self._outline.figure, sizing_mode="stretch_width"),
            "sliders": controls.sliders,
            **{name: getattr(controls, name) for name in ("quantity", "across", "up", "colour", "bounces", "s", "p")},
        }
        for name, place in places.items():
            place.name = name
        for model in (*places.values(), *self._texts.values()):
            self._document.add_root(model)
        plots = {name: places[name] for name in ("family", "portrait", "outline")}
        script = CustomJS.from_file(HERE / "page.mjs", wire=self._wire, plots=plots)
        self._document.js_on_event("document_ready", script)
        self._document.title = f"{self._snapshot.study.title or self._watch.path.name}: atlas"
        self._document.template = (HERE / "page.html").read_text(encoding="utf-8")
        self._document.template_variables.update(
            heading=escape(self._snapshot.study.title or self._watch.path.name),
            study=escape(say_study(self._snapshot)),
            style=(HERE / "page.css").read_text(encoding="utf-8"),
        )

    def _change(self, asked: Callable[[View], View]) -> None:
        """Go from the view to another one and show what is different in it."""
        self._texts["notice"].text = ""
        self._guard(partial(self._go_to, asked))()

    def _go_to(self, asked: Callable[[View], View]) -> None:
        root, before = self._snapshot.root, self._view
        after = self._view = asked(before)
        if after == before:
            return
        self._controls.show(after)
        if (after.quantity, after.across, after.up) != (before.quantity, before.across, before.up):
            self._show_family()
        elif after.at != before.at:
            self._fill_family()
        if after.table(root) != before.table(root):
            self._show_table()
        elif after.colour != before.colour:
            self._show_portrait()
        elif (after.start, after.bounces) != (before.start, before.bounces):
            self._trace()
        self._wire.query = write_query(after, root)

    def _refresh(self) -> None:
        """Show what was finished since the last look, where anything was."""
        snapshot, before = self._watch.look(), self._snapshot
        if snapshot is before:
            return
        self._snapshot = snapshot
        self._show_activity()
        self._fill_family()
        place = self._view.table(snapshot.root)
        if before.root["table_status"].isel(place).item() != snapshot.root["table_status"].isel(place).item():
            self._show_table()

    def _pressed(self, _attribute: str, _old: list[int], press: list[int]) -> None:
        _, plot, across, up = press
        if plot == 0:
            self._change(lambda view: self._moved(view, across, up))
        else:
            s, p = self._view.start or (0.5, 0.0)
            self._start_at((s + 0.01 * across) % 1.0, min(max(p + 0.01 * up, -0.99), 0.99))

    def _moved(self, view: View, across: int, up: int) -> View:
        """Move the selected table by arrow keys; up and down go along the same axis on a curve."""
        for name, steps in ((view.across, across), (view.up or view.across, up)):
            if name and steps:
                view = view.moved(name, steps, self._snapshot.root)
        return view

    def _start_at(self, s: float, p: float) -> None:
        if abs(p) < 1.0:
            self._change(lambda view: replace(view, start=(round(s % 1.0, 6), round(p, 6))))

    def _select(self, places: dict[str, int]) -> None:
        self._change(lambda view: replace(view, at={**view.at, **places}))

    def _show_family(self) -> None:
        """Make the plot anew; it is filled before the browser hears of it."""
        self._family = FamilyPlot(self._snapshot.root, self._view, self._select) if self._view.across else None
        self._fill_family()
        alone = "<p>A single number: there is nothing to draw.</p>"
        self._family_place.children = [self._family.figure if self._family else _make_text("alone", alone)]

    def _fill_family(self) -> None:
        family = self._family
        missing = family.fill(self._snapshot.root, self._view) if family else []
        self._texts["family_legend"].text = list_marks(missing)
        self._texts["family_value"].text = escape(family.selected) if family else ""

    def _show_activity(self) -> None:
        self._texts["activity"].text = escape(say_activity(self._snapshot))

    def _show_table(self) -> None:
        root, place = self._snapshot.root, self._view.table(self._snapshot.root)
        values = {plain(name): values_of(root, name)[position] for name, position in place.items()}
        self._texts["table_title"].text = escape(describe(values) or "the only one")
        self._table = ""
        self._say_table()
        self._show_portrait()
        self._trace()
        self._building.cancel()
        self._building = self._tracer.submit(find_table, self._snapshot.tree.isel(place), self._allow_code)
        self._when_done(self._building, self._show_outline)

    def _show_outline(self, job: Future[Table | str]) -> None:
        if job is not self._building:
            return
        self._table = job.result()
        self._outline.fill(self._table if isinstance(self._table, Table) else None)
        self._say_table()
        self._trace()

    def _say_table(self) -> None:
        """Give the numbers of the table; where it has none, or no outline, say why."""
        place = self._view.table(self._snapshot.root)
        picked = self._snapshot.root.isel(place)
        status = int(picked["table_status"].item())
        said = [self._table] if isinstance(self._table, str) else []
        if status != DONE:
            reason = self._snapshot.progress.failures.get(tuple(place.values()), "")
            if isinstance(self._table, Table):
                reason = reason or self._table.convexity
            name = {"pending": "still to be computed"}.get(TABLE_STATUS[status], plain(TABLE_STATUS[status]))
            said.insert(0, f"This table is {name}{': ' + reason if reason else ''}.")
        sentences = "".join(f"<p>{escape(sentence)}</p>" for sentence in said if sentence)
        self._texts["table_facts"].text = sentences + (list_facts(table_facts(picked)) if status == DONE else "")

    def _show_portrait(self) -> None:
        root, place = self._snapshot.root, self._view.table(self._snapshot.root)
        done = int(root["table_status"].isel(place).item()) == DONE
        orbits = stored_orbits(self._snapshot.tree.isel(place)) if done else None
        self._texts["table_legend"].text = self._portrait.fill(orbits, self._view.colour)

    def _trace(self) -> None:
        """Follow the orbit of the view in the table that is shown, beside the server's loop."""
        self._tracing.cancel()
        self._tracing = Future()
        start, table = self._view.start, self._table
        if not isinstance(table, Table) or not table.is_convex or start is None:
            self._say_orbit(*_why_no_orbit(table))
            self._draw_orbit(None)
            return
        self._texts["orbit_title"].text = "tracing ..."
        bounces = self._snapshot.study.bounces
        self._tracing = self._tracer.submit(trace_orbit, table, start, self._view.bounces, bounces)
        self._when_done(self._tracing, self._show_orbit)

    def _show_orbit(self, job: Future[TracedOrbit]) -> None:
        if job is not self._tracing:
            return
        self._say_orbit("none", "")
        orbit = job.result()
        self._draw_orbit(orbit)
        self._texts["orbit_title"].text = escape(orbit.verdict)
        note = f"<p>Measured just now over {orbit.bounces} bounces.</p>"
        self._texts["orbit_facts"].text = list_facts(orbit.facts()) + note

    def _say_orbit(self, title: str, sentence: str) -> None:
        self._texts["orbit_title"].text = escape(title)
        self._texts["orbit_facts"].text = f"<p>{escape(sentence)}</p>"

    def _draw_orbit(self, orbit: TracedOrbit | None) -> None:
        found = {name: np.empty(0) if orbit is None else orbit.points[name].values for name in ("s", "p", "x", "y")}
        self._portrait.show_trace(found["s"], found["p"])
        self._outline.show_trace(found["x"], found["y"])

    def _when_done(self, job: Future[Any], show: Callable[[Future[Any]], None]) -> None:
        """Show what a job found, in the turn of the server's loop."""
        shown = self._guard(partial(show, job))
        job.add_done_callback(lambda _: self._document.add_next_tick_callback(shown))

    def _guard(self, work: Callable[[], None]) -> Callable[[], None]:
        """Whatever goes wrong is said on the page, and the page goes on."""

        def guarded() -> None:
            try:
                work()
            except ScannerError as error:
                self._texts["notice"].text = escape(str(error))
            except Exception as error:
                told = " ".join(str(error).split()) or type(error).__name__
                remedy = f"see with `scanner verify {self._watch.path}` if the store is damaged"
                self._texts["notice"].text = escape(f"This cannot be shown ({told}): {remedy}.")

        return guarded


def _make_text(name: str, text: str = "") -> Div:
    return Div(name=name, text=text, sizing_mode="stretch_width", margin=0, stylesheets=[WIDGETS])


def _why_no_orbit(table: Table | str) -> tuple[str, str]:
    """Say what stands in the place of an orbit that is not traced: a title and a sentence."""
    if table == "":
        return "getting ready ...", ""
    if isinstance(table, Table) and table.is_convex:
        return "none yet", "Click in the portrait, or give s/L and p, to trace an orbit."
    return "none", "Orbits cannot be traced in this table."
