"""`retune exporters`: what outputs are installed, and their options."""

from __future__ import annotations

import dataclasses

import click

from retune.cli.console import print_findings, width
from retune.cli.options import examples


@click.command(
    "exporters",
    short_help="What outputs are installed, with options.",
    epilog=examples(
        "retune exporters",
        "retune exporters | grep midi",
        "retune export hymn.musicxml --to midi --set midi.bend_range=12 -o out",
    ),
)
def command() -> None:
    """List the outputs that are installed, where each comes from, and its options."""
    from retune.export.registry import find_exporters

    formatter = click.HelpFormatter(width=width(), max_width=width())
    found = find_exporters()
    for entry in found.entries:
        exporter = entry.exporter
        defaults = exporter.Options()
        formatter.write_heading(
            f"{exporter.name} ({', '.join(exporter.suffixes)}) from {entry.distribution}"
        )
        with formatter.indentation():
            formatter.write_text(exporter.summary)
            rows = [
                (f"--set {exporter.name}.{field.name}={shown(defaults, field)}", help_of(field))
                for field in dataclasses.fields(exporter.Options)
            ]
            if rows:
                formatter.write_dl(rows)
        formatter.write_paragraph()
    click.echo(formatter.getvalue().rstrip())
    print_findings(found.findings, everything=True)


def shown(defaults: object, field: dataclasses.Field[object]) -> str:
    """The default of an option as the user would type it."""
    value = getattr(defaults, field.name)
    return str(value).lower() if isinstance(value, bool) else str(value)


def help_of(field: dataclasses.Field[object]) -> str:
    """The one-line help in a field's metadata."""
    return str(field.metadata.get("help", ""))
