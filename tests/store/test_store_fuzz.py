"""Stores that anything may have happened to: every command ends with a status and at most one line of complaint."""

import random
import shutil
from contextlib import redirect_stderr, redirect_stdout, suppress
from io import StringIO
from pathlib import Path

import pytest
from sweeps import fill, grid

from scanner.cli.program import run
from scanner.errors import StoreError
from scanner.store import check_numerics, note_finish, prepare_store, refuse_losses
from scanner.study import make_plan

STUDY = grid(amplitude="0.05", bounces="64", per_table="16", replicates="2")


@pytest.fixture(scope="module", params=["finished", "half"])
def original(request, tmp_path_factory):
    """A store of few files, and what they hold."""
    store = tmp_path_factory.mktemp("fuzz") / "grid.zarr"
    fill(store, STUDY)
    if request.param == "finished":
        note_finish(store, finished=True)
    else:
        (store / "table_status/ledger/receipts/000000.json").unlink()
    return store, {file: file.read_bytes() for file in sorted(store.rglob("*")) if file.is_file()}


def harm(store, files, chance):
    """Change a few files as disks, crashes and people do."""
    for _ in range(chance.randint(1, 4)):
        # Half of the time a file that all depends on.
        leading = [file for file in files if file.suffix == ".json"]
        file = chance.choice(leading if chance.random() < 0.5 else files)
        if not file.is_file():
            continue
        content = file.read_bytes()
        place = chance.randint(0, len(content))
        kind = chance.choice(["cut", "flip", "noise", "gone", "swap", "folder", "zeros", "brace"])
        if kind == "cut":
            file.write_bytes(content[:place])
        elif kind == "flip" and content:
            place = place % len(content)
            file.write_bytes(
                content[:place] + bytes([content[place] ^ 1 << chance.randrange(8)]) + content[place + 1 :]
            )
        elif kind == "noise":
            file.write_bytes(content[:place] + chance.randbytes(20) + content[place + 20 :])
        elif kind == "gone":
            file.unlink()
        elif kind == "swap":
            shutil.copy(chance.choice([other for other in files if other.is_file()]), file.with_name("swapped"))
            file.with_name("swapped").replace(file)
        elif kind == "folder":
            file.unlink()
            file.mkdir()
        elif kind == "zeros":
            file.write_bytes(bytes(len(content)))
        elif kind == "brace":
            file.write_bytes(chance.choice([b"{}", b"[]", b"null", b'"x"', b"{", b"\xff\xfe"]))


def restore(store, files):
    shutil.rmtree(store)
    for file, content in files.items():
        file.parent.mkdir(parents=True, exist_ok=True)
        file.write_bytes(content)


@pytest.mark.parametrize("seed", range(15))
def test_every_command_ends_in_one_line(original, seed):
    store, files = original
    target = store.parent / "tables.csv"
    harm(store, list(files), random.Random(seed))
    try:
        for command in (
            ["progress", store],
            ["export", store, "--to", target],
            ["verify", store],
            ["verify", store, "--repair"],
            ["summary", store],
        ):
            with redirect_stdout(StringIO()), redirect_stderr(StringIO()) as complaints:
                status = run([str(part) for part in command])
            complaint = complaints.getvalue()
            assert status in (0, 1, 2), command
            assert complaint.count("\n") <= 1, complaint
            if status == 2:
                assert complaint.startswith(f"scanner: {store}"), complaint
            assert status == 0 or command[0] != "export" or not target.exists()
        with suppress(StoreError):  # what a sweep does first
            prepare_store(store, make_plan(STUDY))
            refuse_losses(store)
            check_numerics(store)
    finally:
        target.unlink(missing_ok=True)
        restore(store, files)


def test_the_original_is_sound(original):
    assert run(["verify", str(original[0])]) == 0
    assert Path(original[0], "zarr.json").exists()
