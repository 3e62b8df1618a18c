"""What holds for all commands: quick help, one line for whatever is wrong, the exit status."""

from __future__ import annotations

import resource
import subprocess
import sys

import pytest

from scanner.cli import program
from scanner.cli.program import run, scanner

COMMANDS = [
    "families",
    "new",
    "estimate",
    "sweep",
    "jobscript",
    "progress",
    "summary",
    "export",
    "figure",
    "report",
    "atlas",
    "verify",
    "compact",
    "selfcheck",
]
HEAVY = ["numpy", "numba", "xarray", "dask", "distributed", "zarr", "pandas", "scipy", "matplotlib", "pydantic"]


def test_help_loads_nothing_heavy():
    code = f"import sys, scanner.cli; print([name for name in {HEAVY} if name in sys.modules])"
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert found.stdout.strip() == "[]"


@pytest.mark.parametrize("command", [[], *([name] for name in COMMANDS)])
def test_help_is_quick_and_tells_the_exit_statuses(command):
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    done = subprocess.run(
        [sys.executable, "-m", "scanner", *command, "--help"], capture_output=True, text=True, check=True
    )
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    assert done.stdout.startswith("Usage: scanner")
    assert "130  interrupted" in done.stdout
    # time of the processor: other work on the machine must not count
    assert after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime < 0.5


def test_all_commands_are_there_in_the_order_of_use():
    assert scanner.list_commands(None) == COMMANDS


def test_no_command_shows_the_help(call):
    status, output, _ = call()
    assert status == 0
    assert output.startswith("Usage: scanner")


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["swoop"], "No such command 'swoop'"),
        (["summary"], "Missing argument 'PATH'; see scanner summary --help"),
        (["summary", "{store}", "--formt", "csv"], "No such option"),
        (["summary", "{store}", "--format", "xml"], "'xml' is not one of 'text', 'csv', 'json'"),
        (["summary", "{store}", "--select", "amplitude"], "'amplitude' is not NAME=VALUE"),
        (["summary", "{store}", "--select", "phase=1"], "'phase' is not a swept parameter"),
        (["summary", "{store}", "--select", "amplitude=0", "--select", "amplitude=1"], "amplitude is given twice"),
        (["summary", "{store}", "--average", "amplitude", "--average", "amplitude"], "amplitude is given twice"),
        (["summary", "{store}", "--rows", "-3"], "-3 is not in the range x>=0"),
        (["summary", "{store}", "--average", "phase"], "'phase' is not a swept parameter"),
        (["summary", "{store}", "--failed", "--average", "amplitude"], "leave out --select and --average"),
        (["summary", "{store}", "--format", "csv", "--rows", "5"], "--rows shortens the columns on a terminal"),
        (["summary", "{folder}/nowhere.zarr"], "nowhere.zarr"),
        (["export", "{store}", "--to", "{out}/all.nc", "--orbits"], "holds all groups: leave out --orbits"),
        (["progress", "{folder}"], "Größe"),
        (["verify", "{study}"], "my study.toml"),
        (["export", "{study}", "--to", "{out}/tables.csv"], "my study.toml"),
        (
            ["export", "{store}", "--to", "{out}/tables.xlsx"],
            "unknown suffix '.xlsx', it must be .nc, .csv or .parquet",
        ),
        (["export", "{store}", "--to", "{out}/no/tables.csv"], "there is no folder"),
        (["export", "{store}", "--to", "{out}"], "is a folder"),
        (["export", "{store}", "--to", "{store}/tables.csv"], "lies inside the store"),
        (["figure", "{store}", "--to", "{store}/orbits/figure.png"], "lies inside the store"),
        (["export", "{store}", "--to", "{out}/rows.csv", "--resonances"], "this store has no resonances"),
        (["export", "{store}", "--to", "{out}/rows.csv", "--resonances", "--orbits"], "write a file each"),
        (["figure", "{store}", "--to", "{out}/figure.gif"], "it must be .png, .pdf or .svg"),
        (["figure", "{store}", "--to", "{out}/figure.png", "--kind", "portrait"], "give a value of amplitude"),
        (["figure", "{store}", "--to", "{out}/figure.png", "--quantity", "chaos"], "no variable 'chaos'"),
        (
            ["figure", "{store}", "--to", "{out}/figure.png", "--kind", "portrait", "--quantity", "area"],
            "--quantity has no effect on a figure of kind portrait: leave it out, or draw curve or map",
        ),
        (["figure", "{store}", "--to", "{out}/figure.png", "--kind", "gaps"], "this store has no resonances"),
        (["figure", "{store}", "--to", "{out}/figure.png", "--s", "1.5"], "1.5 is not in the range 0.0<=x<=1.0"),
        (["estimate", "{folder}"], "cannot be read: Is a directory"),
        (["estimate", "{folder}/nowhere.toml"], "nowhere.toml cannot be read: No such file"),
        (["estimate", "{moody_study}"], "--allow-code"),
        (["sweep", "{study}"], "Missing option '--store'"),
        (["sweep", "{study}", "--store", "{out}/s.zarr", "--workers", "0"], "0 is not in the range x>=1"),
        (["sweep", "{study}", "--store", "{out}/s.zarr", "--scheduler", "a:1", "--scheduler-file", "f"], "exclude"),
        (["sweep", "{study}", "--store", "{out}/s.zarr", "--scheduler", "a:1", "--workers", "2"], "leave one out"),
        (["sweep", "{study}", "--store", "{store}/orbits/s.zarr"], "lies inside the store"),
        (["sweep", "{study}", "--store", "/proc/s.zarr"], "/proc is no place for files; choose a folder on a disk"),
        (["estimate", "/dev/zero"], "is a device or a pipe, must be a file"),
        (["sweep", "{moody_study}", "--store", "{store}", "--allow-code"], "holds another study"),
        (["sweep", "{study}", "--store", "{study}"], "my study.toml"),
    ],
)
def test_whatever_is_wrong_is_one_line_and_nothing_is_written(
    call, arguments, said, folder, study, store, moody_study, tmp_path
):
    places = {"folder": folder, "study": study, "store": store, "moody_study": moody_study, "out": tmp_path}
    status, output, complaint = call(*(argument.format(**places) for argument in arguments))
    assert status == 2
    assert output == ""
    assert complaint.startswith("scanner: ")
    assert complaint.count("\n") == 1
    assert said in complaint
    assert list(tmp_path.iterdir()) == []


def test_an_interrupt_is_130(call, monkeypatch, study, tmp_path):
    def interrupted(*arguments, **options):
        raise KeyboardInterrupt

    monkeypatch.setattr("scanner.engine.run_study", interrupted)
    status, _, complaint = call("sweep", study, "--store", tmp_path / "s.zarr")
    assert status == program.INTERRUPTED == 130
    assert complaint.strip() == "scanner: interrupted"


def test_an_error_of_the_program_itself_is_not_hidden(monkeypatch, store):
    def broken(*arguments):
        raise ZeroDivisionError

    monkeypatch.setattr("scanner.analysis.summarise", broken)
    with pytest.raises(ZeroDivisionError):
        run(["summary", str(store), "--format", "csv"])


@pytest.mark.parametrize("form", ["text", "csv", "json"])
def test_a_reader_that_stops_early_is_no_error(store, form):
    command = [sys.executable, "-m", "scanner", "summary", str(store), "--format", form]
    with subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE) as process:
        process.stdout.close()
        assert process.stderr.read() == b""
        assert process.wait() == 0
