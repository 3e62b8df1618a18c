"""Makes the helpers beside this file importable from every test, and says at the end what could not be tested here."""

from __future__ import annotations

from collections import Counter

import pytest

from scanner.engine.warmth import warm_kernels


def pytest_sessionstart(session: pytest.Session) -> None:
    """Compile the kernels once, before several processes of tests would each do it."""
    if not hasattr(session.config, "workerinput"):
        warm_kernels(resonances=True)


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
