"""The command `scanner`: its parts, and how whatever goes wrong ends in one line and an exit status."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from typing import NoReturn

import click

from scanner import __version__
from scanner.cli.checking import compact, progress, selfcheck, verify
from scanner.cli.families import families, new
from scanner.cli.looking import atlas
from scanner.cli.reading import export, figure, report, summary
from scanner.cli.running import estimate, jobscript, sweep
from scanner.errors import ScannerError

INTERRUPTED = 130

STATUSES = """\b
Exit status:
  0    done
  1    some tables failed (they are listed), or a check did not hold
  2    the request is wrong: one line says what, where, the bound and what to do
  130  interrupted: what is finished is kept
"""


class InOrder(click.Group):
    """A group that lists its commands in the order in which they are used."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names in the order of registration."""
        return list(self.commands)


@click.group(
    cls=InOrder,
    invoke_without_command=True,
    epilog=STATUSES,
    context_settings={"help_option_names": ["-h", "--help"]},
)
@click.version_option(__version__, message="%(prog)s %(version)s")
@click.pass_context
def scanner(context: click.Context) -> None:
    """Sweep families of near-elliptic billiard tables: how much is regular, how chaotic the rest is."""
    if context.invoked_subcommand is None:
        click.echo(context.get_help())


BEGINNING = (families, new)
ASKING = (estimate, sweep, jobscript)
LOOKING = (progress, summary, export, figure, report, atlas)
KEEPING = (verify, compact, selfcheck)

for command in (*BEGINNING, *ASKING, *LOOKING, *KEEPING):
    command.epilog = STATUSES
    scanner.add_command(command)


def main(arguments: Sequence[str] | None = None) -> NoReturn:
    """Run the command line and leave with its exit status."""
    sys.exit(run(arguments))


def run(arguments: Sequence[str] | None = None) -> int:
    """Run the command line.

    Returns
    -------
    int
        The exit status; whatever is wrong with the request has been said in one line on standard error.
    """
    try:
        status = scanner.main(arguments, prog_name="scanner", standalone_mode=False)
    except ScannerError as error:
        return _complain(str(error), error.exit_status)
    except click.ClickException as error:
        context = getattr(error, "ctx", None)
        where = f"; see {context.command_path} --help" if context else ""
        return _complain(error.format_message().rstrip(".") + where, ScannerError.exit_status)
    except (click.Abort, KeyboardInterrupt):
        return _complain("interrupted", INTERRUPTED)
    except SystemExit:
        # click leaves like this when the reader of a pipe, such as `head`, has seen enough
        return 0
    except OSError as error:
        where = f"{error.filename}: " if error.filename else ""
        return _complain(f"{where}{error.strerror or error}", ScannerError.exit_status)
    return status if isinstance(status, int) else 0


def _complain(message: str, status: int) -> int:
    click.echo(f"scanner: {' '.join(message.split())}", err=True)
    return status
