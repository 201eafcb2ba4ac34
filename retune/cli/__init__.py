"""The command line: the only place that knows click.

`main` turns errors into one line and an exit code: 0 done, 1 an input or output failed,
2 wrong usage, 130 interrupted.
"""

from __future__ import annotations

import os
import signal
import sys
import traceback
from importlib import import_module
from types import FrameType

import click

from retune.cli.console import print_error
from retune.errors import RetuneError, WishError

FAILED, WRONG_USAGE, INTERRUPTED = 1, 2, 130

COMMANDS = {
    "make": "retune.cli.make",
    "show": "retune.cli.show",
    "tracks": "retune.cli.tracks",
    "export": "retune.cli.export",
    "choices": "retune.cli.choices",
    "watch": "retune.cli.watch",
    "play": "retune.cli.play",
    "ports": "retune.cli.ports",
    "chord": "retune.cli.chord",
    "exporters": "retune.cli.exporters",
}
"""Where each command lives; a module is imported only when its command is needed."""


class LazyGroup(click.Group):
    """Commands in the order of `COMMANDS`, imported when asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names of all commands."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """The command of a name, or None."""
        if cmd_name not in COMMANDS:
            return None
        found: object = import_module(COMMANDS[cmd_name]).command
        return found if isinstance(found, click.Command) else None


@click.group(cls=LazyGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="retune-choir", prog_name="retune")
def cli() -> None:
    """Put every chord of a choral score in just intonation.

    retune reads a score (MusicXML, MIDI, Humdrum, ABC, MEI), finds the root of every chord,
    gives each note its just pitch without letting the piece drift, and writes files to hear
    it and to practise from.
    """


def _interrupt(signum: int, frame: FrameType | None) -> None:
    raise KeyboardInterrupt


def _run(arguments: list[str] | None, debug: bool = False) -> int:
    try:
        # Of a command that ends early, click hands the exit code back here.
        code: object = cli.main(args=arguments, prog_name="retune", standalone_mode=False)
    except click.ClickException as error:
        error.show()
        return error.exit_code
    except (click.Abort, KeyboardInterrupt):
        print_error("interrupted; nothing was written")
        return INTERRUPTED
    except WishError as error:
        print_error(error.what, error.where, error.hint)
        return WRONG_USAGE
    except RetuneError as error:
        print_error(error.what, error.where, error.hint)
        if debug and error.__cause__ is not None:
            traceback.print_exception(error.__cause__)
        return FAILED
    except BrokenPipeError:
        # The reader of our output has gone; a second flush at exit must not complain.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    return code if isinstance(code, int) else 0


def main(arguments: list[str] | None = None) -> None:
    """Run the command line and exit."""
    debug = "--debug" in (sys.argv[1:] if arguments is None else arguments)
    signal.signal(signal.SIGTERM, _interrupt)
    try:
        code = _run(arguments, debug)
        sys.stdout.flush()
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        code = 0
    except Exception as error:
        if debug:
            raise
        print_error(
            f"a fault inside retune ({type(error).__name__}: {error})",
            hint="Run again with --debug and report what it prints, with the score if you may",
        )
        code = FAILED
    sys.exit(code)
