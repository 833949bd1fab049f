"""What the built package says of itself and carries with it."""

from __future__ import annotations

import ast
import re
import sys
import tomllib
from importlib import metadata
from pathlib import Path

import pytest

import thalweg
from thalweg import paths
from thalweg.paths import data_folder

TOP = Path(__file__).resolve().parents[1]
PROJECT = tomllib.loads((TOP / "pyproject.toml").read_text(encoding="utf-8"))


def test_the_version_is_the_same_everywhere():
    assert PROJECT["project"]["version"] == thalweg.__version__ == metadata.version("thalweg")


def test_the_command_is_installed_and_points_at_a_function():
    entry = next(e for e in metadata.entry_points(group="console_scripts") if e.name == "thalweg")
    assert callable(entry.load())


def test_the_licence_is_named_and_its_text_is_there():
    assert PROJECT["project"]["license"] == "Apache-2.0"
    texts = {path.name for path in (TOP / "resources" / "licences").iterdir()}
    assert "Apache-2.0.txt" in texts
    assert "Version 2.0, January 2004" in (TOP / "resources" / "licences" / "Apache-2.0.txt").read_text()


def test_every_bundled_font_has_its_licence_beside_the_others():
    fonts = [path for path in (TOP / "resources" / "fonts").iterdir() if path.suffix.lower() in (".ttf", ".otf")]
    licences = [path.stem.lower() for path in (TOP / "resources" / "licences").iterdir()]
    for font in fonts:
        family = re.split(r"[-_.]", font.name)[0].lower()
        assert any(family in name for name in licences), font.name


@pytest.mark.parametrize("folder", ["resources", "sample_systems"])
def test_data_is_found_in_the_checkout_and_in_a_wheel(folder, tmp_path, monkeypatch):
    assert data_folder(folder) == TOP / folder
    bundled = PROJECT["tool"]["hatch"]["build"]["targets"]["wheel"]["force-include"][folder]
    package, inside = bundled.split("/", 1)
    assert package == "thalweg"
    (tmp_path / inside).mkdir(parents=True)
    monkeypatch.setattr(paths, "_BUNDLED", tmp_path / inside.split("/")[0])
    assert data_folder(folder) == tmp_path / inside


def test_every_import_of_a_library_is_declared():
    """The names that differ between import and distribution are listed; whatever is imported must be a dependency."""
    distribution = {"PySide6": "PySide6-Essentials", "shiboken6": "PySide6-Essentials", "llvmlite": "numba"}
    declared = {re.split(r"[<>=;\[ ]", text)[0].lower() for text in PROJECT["project"]["dependencies"]}
    optional = {re.split(r"[<>=;\[ ]", text)[0].lower() for text in PROJECT["project"]["optional-dependencies"]["cluster"]}
    own = {"thalweg", "thalweg_app"}
    missing = set()
    for path in [*(TOP / "core").rglob("*.py"), *(TOP / "app").rglob("*.py")]:
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = [a.name for a in node.names] if isinstance(node, ast.Import) else [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            for top in {name.split(".")[0] for name in names} - own - set(sys.stdlib_module_names):
                if distribution.get(top, top).lower() not in declared | optional:
                    missing.add(f"{top} in {path.relative_to(TOP)}")
    assert not missing
