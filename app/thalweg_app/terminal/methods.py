"""`thalweg methods`: every alternative that can be chosen, a line each, with what it is good and bad at."""

from __future__ import annotations

from typing import Any

import click

from thalweg.options import Options
from thalweg.registry import Alternatives, key_of
from thalweg.study.path import PATHS
from thalweg.study.spec import UNIONS

#: Heading of each registry, with the option or setting that takes its keys.
HEADINGS = {
    "system": "Systems (read from the input)",
    "lattice": "Lattices (--set system.lattice=KEY)",
    "model": "Models on a lattice (--set system.model=KEY)",
    "encoding": "Encodings (--encoding KEY)",
    "ansatz": "Trial states (--ansatz KEY)",
    "optimizer": "Searches (--optimizer KEY)",
    "evaluation": "Evaluations (--evaluation KEY)",
    "path": "Scan paths",
}


@click.command()
@click.argument("kinds", nargs=-1, metavar="[KIND]...", type=click.Choice(list(HEADINGS)))
@click.option("--settings", "with_settings", is_flag=True, help="Also list the settings of each, with their defaults.")
def methods(kinds: tuple[str, ...], with_settings: bool) -> int:
    """List every key that a study can be made of, with one line each. KIND is one of system, lattice, model, encoding, ansatz,
    optimizer, evaluation, path; all of them by default."""
    blocks = ["\n".join(_block(kind, with_settings)) for kind in kinds or HEADINGS]
    click.echo("\n\n".join(blocks))
    return 0


def registries() -> dict[str, Alternatives[Any]]:
    """Kind -> its alternatives; every registry of the program."""
    return {**UNIONS, "path": PATHS}


def _block(kind: str, with_settings: bool) -> list[str]:
    alternatives = registries()[kind]
    width = max(map(len, alternatives.keys()))
    lines = [HEADINGS[kind]]
    for cls in alternatives:
        lines.append(f"  {key_of(cls):<{width}}  {cls.title}: {cls.about}")
        lines += [" " * (width + 6) + text for text in _settings(cls) if with_settings]
    return lines


def _settings(cls: type[Options]) -> list[str]:
    fields = [(name, field) for name, field in cls.model_fields.items() if name != "key" and not field.is_required()]
    return [f"{name}={_shown(field.get_default())}  {field.description}" for name, field in fields]


def _shown(value: Any) -> str:
    if isinstance(value, Options):
        return str(getattr(value, "key", value.title))
    return str(value).lower() if isinstance(value, bool) else str(value)
