"""The group of commands and the one place where errors become messages and exit statuses."""

from __future__ import annotations

import contextlib
import importlib
import io
import os
import sys
from collections.abc import Sequence
from typing import Any, Final

import click

from geoskew import __version__
from geoskew.cli import console
from geoskew.errors import GeoskewError, InputError

# Name of a command and what it does, in the order of the help; the module geoskew.cli.NAME is
# imported only when its command runs, so that the help needs none of them.
COMMANDS: Final[dict[str, str]] = {
    "demo": "The whole job on the bundled scenario.",
    "new": "Write a commented scenario to start from.",
    "check": "Read and validate all inputs, compute nothing.",
    "run": "The whole job, everything into one folder.",
    "spot": "Every value at one place.",
    "raster": "Layers as cloud-optimised GeoTIFFs.",
    "contours": "Isolines of layers as vector lines.",
    "sites": "The assessed site list.",
    "visits": "Plan of visits: who goes where, and when.",
    "cards": "Job cards for the crews, to print or for the phone.",
    "reports": "Reconcile reports from the field with the plan.",
    "zones": "Areas within which one setting serves.",
    "report": "The planner's report.",
    "fieldmap": "The self-contained HTML map.",
    "database": "Tables for results in a PostGIS database.",
    "layers": "The list of layers: name, unit, meaning.",
}


INTERRUPTED: Final = (
    "interrupted; what was finished is whole, the rest is missing, nothing half-written is left"
)


class LazyCommands(click.Group):
    """Commands that are imported when they are called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """All names, in the order of `COMMANDS`."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Import a command's module and take its `command`."""
        if cmd_name not in COMMANDS:
            return None
        module = importlib.import_module(f"geoskew.cli.{cmd_name}")
        command: click.Command = module.command
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """List the commands without importing any."""
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """As click does, with the nearest name for an unknown one."""
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            from difflib import get_close_matches

            close = get_close_matches(args[0], COMMANDS, n=1)
            hint = f"; did you mean {close[0]}?" if close else ""
            raise click.UsageError(f"no command is named {args[0]!r}{hint}", ctx)
        return super().resolve_command(ctx, args)


@click.group(
    cls=LazyCommands,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog="Start with 'geoskew demo', or 'geoskew new plan.toml' and 'geoskew run plan.toml --out result'.",
)
@click.version_option(__version__, prog_name="geoskew")
def commands() -> None:
    """Plan the changeover of a network of fixed dishes from one geostationary satellite to another.

    Where each feed stands wrong after the changeover, which one setting serves both satellites, who
    must be visited, when, and which way to turn.
    """


def main(arguments: Sequence[str] | None = None) -> int:
    """Run a command line and return the exit status: 0 done, 1 failed, 2 wrong input, 130 interrupted."""
    arguments = list(sys.argv[1:] if arguments is None else arguments) or ["--help"]
    _encodable()
    if "--debug" not in arguments:
        # GDAL's errors reach us as exceptions; what it would say on the terminal as well is for --debug.
        os.environ.setdefault("CPL_LOG", os.devnull)
    streams = sys.stdout, sys.stderr
    try:
        result: Any = commands.main(args=arguments, prog_name="geoskew", standalone_mode=False)
        click.echo(nl=False)  # a full disk or a reader that has gone shows now, not at the very end
        return result if isinstance(result, int) else 0
    except (KeyboardInterrupt, click.exceptions.Abort):
        console.say(
            "interrupted; what was finished is whole, the rest is missing, nothing half-written is left"
        )
        return 130
    except click.ClickException as error:
        console.say(_usage(error))
        return 2
    except SystemExit as stop:
        # click ends the program by itself when the reader of our output has gone, other streams in place.
        if streams == (sys.stdout, sys.stderr):
            return stop.code if isinstance(stop.code, int) else 0
        sys.stdout, sys.stderr = streams
        return _reader_gone()
    except BrokenPipeError:
        return _reader_gone()
    except (GeoskewError, MemoryError, OSError) as error:
        if "--debug" in arguments:
            raise
        return _told(error)


def _told(error: Exception) -> int:
    """Say an error in one line a problem and return its exit status."""
    if isinstance(error, InputError):
        for problem in error.problems:
            console.say(str(problem))
        return error.exit_status
    if isinstance(error, GeoskewError):
        console.say(str(error))
        return error.exit_status
    if isinstance(error, MemoryError):
        console.say("the machine's memory is not enough; use a coarser step or a smaller region")
        return 1
    where = getattr(error, "filename", None)
    reason = getattr(error, "strerror", None) or error
    console.say(f"{where}: {reason}" if where else str(reason))
    return 1


def _usage(error: click.ClickException) -> str:
    """A wrong command line in one line, with where to read on."""
    message = " ".join(error.format_message().split()).rstrip(".")
    context = getattr(error, "ctx", None)
    return f"{message}; '{context.command_path if context else 'geoskew'} --help' tells more"


def _encodable() -> None:
    """Never stop at a sign that the terminal's encoding lacks."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper) and stream.errors == "strict":
            stream.reconfigure(errors="backslashreplace")


def _reader_gone() -> int:
    """Keep quiet when the reader of our output has gone (`| head`), Python's own last flush included."""
    with contextlib.suppress(OSError, ValueError):  # a stream without a file has nothing to keep quiet
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    return 0
