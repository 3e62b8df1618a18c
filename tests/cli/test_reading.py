"""Summary, export and figure of a small real sweep."""

from __future__ import annotations

import contextlib
import csv
import io
import json
import os
import shutil
import subprocess
import sys
from types import SimpleNamespace

import click
import numpy as np
import pandas as pd
import pytest

from scanner.cli import listing
from scanner.store import open_sweep


def test_summary_prints_aligned_columns(call, store):
    status, output, _ = call("summary", store)
    assert status == 0
    assert output.startswith('A "small" sweep of Größe: radial_harmonic, 64 orbits of 256 bounces a table\n')
    heading, *rows = output.split("\n\n")[1].splitlines()
    assert heading.split()[:2] == ["amplitude", "status"]
    assert len(rows) == 3
    assert {len(row) for row in rows} == {len(heading)}
    assert rows[0].split()[:5] == ["0", "done", "1.0000", "±", "0.0156"]
    assert rows[2].split() == ["0.3", "not", "convex", *["-"] * 6]
    assert "3 tables: 2 done, 1 not convex" in output


def test_summary_in_csv_and_json_is_exact(call, store):
    with open_sweep(store) as tree:
        exact = tree["regular_area_fraction"].values
        error = tree["lyapunov_per_bounce_stderr"].values[1]
    rows = list(csv.DictReader(io.StringIO(call("summary", store, "--format", "csv")[1])))
    assert [row["table_status"] for row in rows] == ["done", "done", "not_convex"]
    assert float(rows[1]["regular_area_fraction"]) == exact[1]
    assert rows[2]["regular_area_fraction"] == ""
    entries = json.loads(call("summary", store, "--format", "json")[1])
    assert entries[1]["regular_area_fraction"] == exact[1]
    assert entries[1]["lyapunov_per_bounce_stderr"] == (None if np.isnan(error) else error)
    assert entries[2]["regular_area_fraction"] is None


def test_summary_of_selected_tables_says_which(call, store):
    status, output, said = call("summary", store, "--select", "amplitude=0.04", "--format", "csv")
    assert status == 0
    assert said == "tables at amplitude = 0.05\n"
    assert len(output.splitlines()) == 2


def test_summary_averages(call, store):
    rows = json.loads(call("summary", store, "--average", "amplitude", "--format", "json")[1])
    assert len(rows) == 1
    assert rows[0]["tables_averaged"] == 2


def test_summary_lists_what_failed_with_reasons(call, moody_store, store):
    _, output, _ = call("summary", moody_store, "--failed")
    assert output.splitlines()[1].split()[:2] == ["2", "failed"]
    assert "not in the mood" in output
    entries = json.loads(call("summary", moody_store, "--failed", "--format", "json")[1])
    assert [entry["size"] for entry in entries] == [2.0]
    _, output, _ = call("summary", store, "--failed")
    assert output.splitlines()[1].split()[:4] == ["0.3", "not", "convex", "curvature"]


def test_that_nothing_failed_is_said(capsys):
    listing.list_failures(pd.DataFrame({"size": [], "table_status": [], "reason": []}))
    assert capsys.readouterr().out == "no table failed, and all that are done are convex\n"


@pytest.fixture
def terminal(monkeypatch):
    def make(width):
        monkeypatch.setattr(listing, "on_terminal", lambda: True)
        monkeypatch.setattr(listing.shutil, "get_terminal_size", lambda: SimpleNamespace(columns=width))

    return make


def test_long_tables_show_both_ends_on_a_terminal(call, store, terminal):
    terminal(200)
    _, output, _ = call("summary", store, "--rows", "2")
    _, *rows = output.split("\n\n")[1].splitlines()
    assert [row.split()[0] for row in rows] == ["0", "...", "0.3"]
    assert "1 rows are not shown: --rows 0 shows all" in output
    assert "..." not in call("summary", store, "--rows", "0")[1]


@pytest.mark.parametrize("width", [60, 80])
def test_narrow_terminals_lose_columns_not_digits(call, store, terminal, width):
    terminal(width)
    _, output, _ = call("summary", store)
    table = output.split("\n\n")[1].splitlines()
    assert len(table[0]) <= width
    assert table[1].split()[:5] == ["0", "done", "1.0000", "±", "0.0156"]
    assert "no room for diffusion" in output


@pytest.mark.parametrize("name", ["tables.nc", "tables.csv", "tables.parquet", "Größe 'one'.CSV"])
def test_export_writes_and_protects_its_file(call, store, tmp_path, name):
    target = tmp_path / name
    status, _, said = call("export", store, "--to", target)
    assert (status, said) == (0, f"wrote {target}\n")
    first = target.stat().st_size
    assert first > 0
    status, _, complaint = call("export", store, "--to", target)
    assert status == 2
    assert "--force" in complaint
    assert call("export", store, "--to", target, "--force")[0] == 0
    assert [entry.name for entry in tmp_path.iterdir()] == [name]


def test_export_of_orbits_has_a_row_an_orbit(call, store, tmp_path):
    assert call("export", store, "--to", tmp_path / "orbits.csv", "--orbits")[0] == 0
    rows = list(csv.DictReader(io.StringIO((tmp_path / "orbits.csv").read_text(encoding="utf-8"))))
    assert len(rows) == 2 * 64
    assert {row["verdict"] for row in rows if row["amplitude"] == "0.0"} <= {
        "regular_rotational",
        "regular_librational",
    }


def test_figure_says_which_table_it_took(call, store, tmp_path):
    target = tmp_path / "figure.png"
    status, _, said = call("figure", store, "--to", target, "--select", "amplitude=0.04")
    assert (status, said) == (0, f"wrote {target}, tables at amplitude = 0.05\n")
    assert target.read_bytes().startswith(b"\x89PNG")


def test_figure_measures_frequencies_along_a_line(call, store, tmp_path):
    target = tmp_path / "figure.svg"
    arguments = [
        "--select",
        "amplitude=0.05",
        "--kind",
        "frequency",
        "--s",
        "0.25",
        "--orbits",
        "40",
        "--bounces",
        "64",
    ]
    status, _, said = call("figure", store, "--to", target, *arguments)
    assert (status, said) == (0, f"wrote {target}, tables at amplitude = 0.05\n")
    assert target.stat().st_size > 0


def test_figure_follows_orbits_anew(call, store, tmp_path):
    target = tmp_path / "figure.pdf"
    arguments = ["figure", store, "--to", target, "--select", "amplitude=0.05", "--bounces"]
    status, _, complaint = call(*arguments, 100_000)
    assert status == 2
    # 64 orbits and their images: eight of each on a table with two mirror lines.
    assert f"ask for {2_000_000 // (64 * 8)} bounces or fewer" in complaint
    assert call(*arguments, 20)[0] == 0


def test_a_damaged_store_is_one_line(call, store, tmp_path):
    damaged = tmp_path / "damaged.zarr"
    shutil.copytree(store, damaged)
    chunk = next(file for file in (damaged / "regular_area_fraction").iterdir() if file.name.startswith("c"))
    chunk.write_bytes(chunk.read_bytes()[:-3])
    status, output, complaint = call("summary", damaged)
    assert (status, output) == (2, "")
    assert complaint.count("\n") == 1
    assert "1 files are damaged" in complaint
    assert "--repair" in complaint


def test_report_is_one_page_with_the_reasons_of_failures(call, moody_store, tmp_path):
    target = tmp_path / "a report.html"
    status, _, said = call("report", moody_store, "--to", target, "--select", "size=1.0")
    assert status == 0
    assert said == f"wrote {target}, tables at size = 1\n"
    text = target.read_text(encoding="utf-8")
    assert "ValueError: not in the mood" in text
    assert "allow it with --allow-code" in text  # for the figure that follows orbits anew
    assert text.count("data:image/svg+xml") == 3
    status, _, said = call("report", moody_store, "--to", target)
    assert (status, said.count("\n")) == (2, 1)


def on_a_terminal(*arguments, **environment):
    """What a command prints to a terminal of 200 columns."""
    ours, theirs = os.openpty()
    wanted = {**os.environ, "TERM": "xterm", "COLUMNS": "200", **environment}
    command = [sys.executable, "-m", "scanner", *map(str, arguments)]
    with subprocess.Popen(command, stdin=theirs, stdout=theirs, env=wanted):
        os.close(theirs)
        text = b""
        with contextlib.suppress(OSError):  # Linux says so when the last writer is gone
            while part := os.read(ours, 4096):
                text += part
    os.close(ours)
    return text.decode().replace("\r\n", "\n")


def test_colours_are_for_terminals_that_want_them(call, store):
    plain = call("summary", store)[1]
    assert "\x1b" not in plain
    coloured = on_a_terminal("summary", store)
    assert click.style("not convex", fg="yellow") in coloured
    assert click.style("done".rjust(10), fg="green") in coloured
    assert click.unstyle(coloured) == plain
    assert on_a_terminal("summary", store, NO_COLOR="1") == plain
