"""The command line: the commands under one roof, and errors as messages and exit codes."""

from __future__ import annotations

import io
import sys

import typer

from porkgrid.commands.chart import chart
from porkgrid.commands.compare import compare
from porkgrid.commands.handoff import handoff
from porkgrid.commands.listings import bodies, measures
from porkgrid.commands.new import new
from porkgrid.commands.page import page
from porkgrid.commands.period import period
from porkgrid.commands.rank import rank
from porkgrid.commands.slip import slip
from porkgrid.commands.sweep import check, sweep
from porkgrid.errors import RequestError, RunError

app = typer.Typer(
    name="porkgrid",
    help="Survey launch windows: sweep dates, see which limits forbid what, rank what is left.\n\n"
    "Early-phase estimates from patched conics; not for flight operations.",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)

for _command in (new, sweep, chart, rank, period, slip, compare, handoff, page, check, bodies, measures):
    app.command()(_command)

_INTERRUPTED = 130  # exit code


def main() -> None:
    """Run the command line; errors become one clear message and an exit code."""
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="surrogateescape")  # the name of a file need not be text
    try:
        code = app(standalone_mode=False)
    except (RequestError, RunError) as error:
        for line in str(error).splitlines():
            print(f"porkgrid: {line}", file=sys.stderr)
        code = 2 if isinstance(error, RequestError) else 1
    except (KeyboardInterrupt, typer.Abort):
        code = _INTERRUPTED
    except OSError as error:
        place = "" if error.filename is None else f"{error.filename}: "
        print(f"porkgrid: {place}{error.strerror or error}", file=sys.stderr)
        code = 1
    except Exception as error:
        code = _usage_error(error)
    if code == _INTERRUPTED:  # typer returns this of an interrupt rather than let it through
        print("porkgrid: interrupted; give the same command again to go on", file=sys.stderr)
    sys.exit(code)


def _usage_error(error: Exception) -> int:
    """Show what is wrong with the command line itself; anything else is a fault of ours and goes up."""
    show = getattr(error, "show", None)
    if show is None:
        raise error
    show()
    return 2
