"""Finds samples and resources in a checkout, an editable install and a wheel alike; names of files as text."""

from __future__ import annotations

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent
_BUNDLED = _PACKAGE / "_data"


def data_folder(name: str) -> Path:
    """`resources` or `sample_systems`: beside the package in a wheel, else the checkout's top level."""
    return _BUNDLED / name if _BUNDLED.is_dir() else _PACKAGE.parents[1] / name


def as_characters(text: str) -> str:
    """`text` as every file can hold it: a byte of a file's name that is no UTF-8, as from an older system, becomes a question mark."""
    return text.encode("utf-8", "replace").decode("utf-8")
