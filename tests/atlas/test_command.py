"""`scanner atlas` says in one line what it cannot do."""

from __future__ import annotations

import importlib.util
import socket

import pytest

from scanner.cli.program import run


@pytest.fixture
def call(capsys):
    def call(*arguments):
        status = run(["atlas", *map(str, arguments)])
        return status, capsys.readouterr().err

    return call


def test_a_port_in_use(call, store):
    with socket.socket() as busy:
        busy.bind(("127.0.0.1", 0))
        busy.listen()
        port = busy.getsockname()[1]
        status, complaint = call(store, "--port", port)
    assert status == 2
    assert complaint == f"scanner: port {port} is in use: give another one with --port, 0 for any that is free\n"


def test_an_address_of_another_machine(call, store):
    status, complaint = call(store, "--address", "192.0.2.1", "--port", "0")
    assert status == 2
    assert "cannot listen at 192.0.2.1" in complaint
    assert complaint.count("\n") == 1


def test_no_store(call, tmp_path):
    status, complaint = call(tmp_path / "nothing.zarr")
    assert status == 2
    assert "there is no such store" in complaint


def test_bokeh_that_is_not_installed(call, store, monkeypatch):
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    status, complaint = call(store)
    assert status == 2
    assert complaint == "scanner: the atlas needs bokeh, install it with: pip install 'scanner[atlas]'\n"
