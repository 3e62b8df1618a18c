import io

import pytest
from rich.console import Console
from test_tally import BEFORE

from scanner.engine import display
from scanner.engine.display import LINE_SECONDS, Bar, Display, Lines, choose_display
from scanner.engine.tally import Tally


@pytest.fixture
def tally():
    return Tally(BEFORE)


def test_lines_come_from_time_to_time(tally, capsys, monkeypatch):
    time = [0.0]
    monkeypatch.setattr(display.time, "monotonic", lambda: time[0])
    lines = Lines()
    for seconds in (1.0, LINE_SECONDS, LINE_SECONDS + 1, 2 * LINE_SECONDS):
        time[0] = seconds
        lines.show(tally, 2)
    printed = capsys.readouterr()
    assert printed.out == ""
    assert [line.split(",")[0] for line in printed.err.splitlines()] == ["2/10 tables"] * 2


def test_what_is_said_comes_at_once(capsys):
    Lines().say("something [happened]")
    assert capsys.readouterr().err == "something [happened]\n"


def test_a_bar_shows_the_tally_and_what_is_said(tally):
    screen = io.StringIO()
    with Bar(Console(file=screen, force_terminal=True, width=120)) as bar:
        bar.show(tally, 2)
        bar.say("something [happened]")
    assert "2/10 tables" in screen.getvalue()
    assert "something [happened]" in screen.getvalue()


def test_lines_without_a_terminal_and_silence_on_request(capsys):
    assert isinstance(choose_display(None), Lines)
    silent = choose_display(False)
    assert type(silent) is Display
    silent.say("nothing")
    assert capsys.readouterr().err == ""
