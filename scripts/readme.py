"""What README.md shows, run again: outputs of its commands and snippets, and its pictures, take the place of the old.

    python scripts/readme.py                    # sweeps configs/first_sweep.toml, rewrites README.md and .pictures/
    python scripts/readme.py --check            # rewrites nothing; status 1 if an output has changed

An output is what stands in comments below a command or an expression, or the lines of a summary.
"""

from __future__ import annotations

import argparse
import ast
import difflib
import re
import shlex
import subprocess
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
README = ROOT / "README.md"
STORE = "out/first_sweep.zarr"
STUDY = "configs/first_sweep.toml"
SUMMARY = "harmonic amplitude "
"""How a block begins that holds some lines of the summary."""


def blocks(text: str) -> list[tuple[str, str]]:
    """Language and contents of every fenced block."""
    return re.findall(r"^```(\w*)\n(.*?)^```$", text, flags=re.MULTILINE | re.DOTALL)


def refresh(text: str, folder: Path) -> str:
    """Put the outputs of now into the text.

    Parameters
    ----------
    text
        The README.
    folder
        Where its paths start: the store is there, under ``out``.
    """
    space: dict[str, object] = {}
    for language, body in blocks(text):
        if language == "python":
            now = replay(body, space, folder)
        elif body.startswith(SUMMARY):
            now = pick_lines(body, run(f"scanner summary {STORE}", folder))
        else:
            now = rerun(body, folder)
        text = text.replace(f"```{language}\n{body}```", f"```{language}\n{now}```")
    return text


def replay(body: str, space: dict[str, object], folder: Path) -> str:
    """Execute a snippet; comments below an expression become its value."""
    lines = body.splitlines()
    statements = ast.parse(body).body
    found: list[str] = []
    for statement, following in zip(statements, [*statements[1:], None], strict=True):
        ends, next_starts = statement.end_lineno or 0, following.lineno - 1 if following else len(lines)
        source, below = lines[statement.lineno - 1 : ends], lines[ends:next_starts]
        code = "\n".join(source).replace(STORE, str(folder / STORE))
        if isinstance(statement, ast.Expr) and any(line.startswith("#") for line in below):
            shown = repr(eval(code, space))
            below = [*as_comments(shown), *(line for line in below if not line.startswith("#"))]
        else:
            exec(code, space)
        found += [*source, *below]
    return "\n".join([*lines[: statements[0].lineno - 1], *found]) + "\n"


def rerun(body: str, folder: Path) -> str:
    """Run the commands of a block that have their output below them in comments."""
    found: list[str] = []
    command = ""
    for line in body.splitlines():
        if not line.startswith("#"):
            command = line
            found.append(line)
        elif command:  # the first line of an output: all of it is run for now, the old lines are passed over
            found += as_comments(run(command, folder))
            command = ""
    return "\n".join(found) + "\n"


def as_comments(output: str) -> list[str]:
    """Lines of an output as comments, without blanks at their ends."""
    return [f"# {line}".rstrip() for line in output.rstrip().splitlines()]


def pick_lines(body: str, output: str) -> str:
    """Lines of a table in which the first two columns are those of the old lines, with its headings."""
    lines = {tuple(line.split()[:2]): line for line in output.splitlines() if len(line.split()) > 2}
    return "\n".join(lines[tuple(line.split()[:2])] for line in body.splitlines()) + "\n"


def run(command: str, folder: Path) -> str:
    """Run a command of the README with this interpreter, and return what it prints."""
    words = shlex.split(command, comments=True)
    if words[0] == "scanner":
        words = ["-m", *words]
    elif words[0] == ".venv/bin/python":
        words = words[1:]
    else:
        raise ValueError(f"{command}: not a command of scanner or of its interpreter")
    words = [str(ROOT / word) if word.startswith(("scripts/", "configs/")) else word for word in words]
    done = subprocess.run([sys.executable, *words], cwd=folder, capture_output=True, text=True, check=True)
    return done.stdout


def figure_commands(text: str) -> list[str]:
    """Commands of the README that draw figures of its store."""
    return re.findall(rf"`(scanner figure {re.escape(STORE)} [^`]+)`", text)


def redraw(text: str, folder: Path) -> None:
    """Draw the pictures of the README again."""
    for command in figure_commands(text):
        run(command.replace("--to ", f"--to {ROOT}/.pictures/") + " --force", folder)


def main() -> int:
    """Rewrite the README, or say what has changed."""
    parser = argparse.ArgumentParser(description="Run what README.md shows again.")
    parser.add_argument("--check", action="store_true", help="change nothing, say what would")
    check = parser.parse_args().check
    old = README.read_text(encoding="utf-8")
    with tempfile.TemporaryDirectory() as temporary:
        folder = Path(temporary)
        (folder / STORE).parent.mkdir()
        run(f"scanner sweep {STUDY} --store {STORE}", folder)
        new = refresh(old, folder)
        if not check:
            README.write_text(new, encoding="utf-8")
            redraw(new, folder)
    print("\n".join(difflib.unified_diff(old.splitlines(), new.splitlines(), "as written", "as it is", lineterm="")))
    return int(check and new != old)


if __name__ == "__main__":
    sys.exit(main())
