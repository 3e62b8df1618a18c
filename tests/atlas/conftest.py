"""Stores to look at, the command that serves them, and pages in a browser."""

from __future__ import annotations

import pytest
from reader import Reader
from serving import served
from sweeps import fill, grid


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
