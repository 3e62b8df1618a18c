"""For all tests: kernels compiled once, a browser without a window, and at the end what could not be tested here.

It also makes the helpers beside it importable from every test.
"""

from __future__ import annotations

import shutil
from collections import Counter

import pytest

from scanner.engine.warmth import warm_kernels


def pytest_sessionstart(session: pytest.Session) -> None:
    """Compile the kernels once, before several processes of tests would each do it."""
    if not hasattr(session.config, "workerinput"):
        warm_kernels(resonances=True)


BROWSERS = ("chromium", "chromium-browser", "google-chrome")
FLAGS = (
    "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
    "--disable-component-update", "--disable-sync",
)  # fmt: skip


@pytest.fixture(scope="session")
def browser():
    """One for all, as a process can drive no second one while the first is open."""
    found = next(filter(None, map(shutil.which, BROWSERS)), None)
    if found is None:
        pytest.skip("no browser to test with: install one, on Debian apt-get install chromium")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        chromium = playwright.chromium.launch(executable_path=found, args=list(FLAGS))
        yield chromium.new_context(accept_downloads=True)


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter) -> None:
    """List why tests were skipped, each reason once."""
    reasons = Counter(
        report.longrepr[2].removeprefix("Skipped: ") for report in terminalreporter.stats.get("skipped", [])
    )
    terminalreporter.section("not tested on this machine")
    for reason, tests in sorted(reasons.items()):
        terminalreporter.write_line(f"{tests} tests: {reason}")
    if not reasons:
        terminalreporter.write_line("nothing: every test that was chosen has run")
