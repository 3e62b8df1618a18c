"""Stores to look at, the command that serves them, and a browser without a window."""

from __future__ import annotations

import shutil

import pytest
from reader import Reader
from serving import served
from sweeps import fill, grid

BROWSERS = ("chromium", "chromium-browser", "google-chrome")
FLAGS = (
    "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
    "--disable-component-update", "--disable-sync",
)  # fmt: skip


@pytest.fixture(scope="session")
def study():
    return grid(title='"Grid <b>of</b> Größe"', per_table="128", bounces="1024")


@pytest.fixture(scope="session")
def store(tmp_path_factory, study):
    path = tmp_path_factory.mktemp("atlas") / "small grid.zarr"
    fill(path, study)
    return path


@pytest.fixture(scope="session")
def address(store):
    with served(store) as url:
        yield url


@pytest.fixture(scope="session")
def browser():
    found = next(filter(None, map(shutil.which, BROWSERS)), None)
    if found is None:
        pytest.skip("no browser to test with: install one, on Debian apt-get install chromium")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        chromium = playwright.chromium.launch(executable_path=found, args=list(FLAGS))
        yield chromium.new_context(accept_downloads=True)


@pytest.fixture
def read(browser):
    """Open pages; none of them may complain on its console or in its place for notices."""
    readers = []

    def read(url, width=1280):
        readers.append(Reader(browser, url, width))
        return readers[-1]

    yield read
    for reader in readers:
        if not reader.page.is_closed():
            reader.close()
