"""The group of commands and the one place where errors become messages and exit statuses."""

from __future__ import annotations

import importlib
import os
import sys
from collections.abc import Sequence
from typing import Any, Final

import click

from geoskew import __version__
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
    "layers": "The list of layers: name, unit, meaning.",
}


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
            hint = f" Did you mean {close[0]}?" if close else " 'geoskew --help' lists the commands."
            raise click.UsageError(f"No command is named {args[0]!r}.{hint}", ctx)
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
    arguments = list(sys.argv[1:] if arguments is None else arguments)
    debug = "--debug" in arguments
    try:
        result: Any = commands.main(args=arguments, prog_name="geoskew", standalone_mode=False)
        sys.stdout.flush()
        return result if isinstance(result, int) else 0
    except click.exceptions.Exit as stop:
        return stop.exit_code
    except (KeyboardInterrupt, click.exceptions.Abort):
        _say("interrupted; nothing half-written was left under a final name")
        return 130
    except click.ClickException as error:
        error.show(sys.stderr)
        return 2
    except BrokenPipeError:
        # The reader of our output has gone (`| head`): not a failure; keep Python's own flush quiet.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except InputError as error:
        if debug:
            raise
        for problem in error.problems:
            _say(str(problem))
        return error.exit_status
    except GeoskewError as error:
        if debug:
            raise
        _say(str(error))
        return error.exit_status
    except MemoryError:
        if debug:
            raise
        _say("the machine's memory is not enough; use a coarser step or a smaller region")
        return 1
    except OSError as error:
        if debug:
            raise
        where = f"{error.filename}: " if error.filename else ""
        _say(f"{where}{error.strerror or error}")
        return 1


def _say(text: str) -> None:
    print(f"geoskew: {text}", file=sys.stderr)
