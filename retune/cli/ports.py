"""`retune ports`: where `retune play` can send to."""

from __future__ import annotations

import click

from retune.cli.console import say, wrapped
from retune.cli.options import examples


@click.command(
    "ports",
    short_help="MIDI ports to play to.",
    epilog=examples(
        "retune ports",
        "retune ports | grep -i synth",
        "retune play hymn.musicxml --port localhost:9080",
    ),
)
@click.option("-q", "--quiet", is_flag=True, help="Say nothing but errors.")
@click.option("--debug", is_flag=True, help="Show the traceback of a fault.", expose_value=False)
def command(quiet: bool) -> None:
    """List the MIDI output ports of this system, as `retune play --port` takes them.

    A part of a name is enough where no other port has it.
    """
    from retune.adapters.ports import output_names

    names = output_names()
    if names:
        click.echo("\n".join(names))
    elif not quiet:
        say(wrapped("There is no MIDI output port: start the synth, or give one as HOST:PORT."))
