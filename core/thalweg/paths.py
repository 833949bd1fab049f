"""Finds samples and resources in a checkout, an editable install and a wheel alike."""

from __future__ import annotations

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent
_BUNDLED = _PACKAGE / "_data"


def data_folder(name: str) -> Path:
    """`resources` or `sample_systems`: beside the package in a wheel, else the checkout's top level."""
    return _BUNDLED / name if _BUNDLED.is_dir() else _PACKAGE.parents[1] / name
