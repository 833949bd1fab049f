"""`thalweg samples`: what ships with the program."""

from __future__ import annotations

import click

from thalweg_app.terminal.answer import aligned


@click.command()
def samples() -> int:
    """List the samples; each name can be given to `thalweg solve` and `thalweg inspect`."""
    from thalweg.systems.samples import list_samples

    click.echo("\n".join(aligned((sample.name, sample.description) for sample in list_samples())))
    return 0
