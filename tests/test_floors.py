"""The house stands on its floors: a file imports only from floors below its own, or from its own folder."""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

TOP = Path(__file__).resolve().parents[1]
PACKAGES = {"thalweg": TOP / "core" / "thalweg", "thalweg_app": TOP / "app" / "thalweg_app"}

#: From the ground up. Names on one floor do not import each other.
FLOORS = (
    {"thalweg", "thalweg.errors", "thalweg.units", "thalweg.arrays", "thalweg.options", "thalweg.paths"},
    {"thalweg.registry", "thalweg.watch", "thalweg.estimate", "thalweg.kernels"},
    {"thalweg.parts"},
    {"thalweg.operators"},
    {"thalweg.systems", "thalweg.encoding"},
    {"thalweg.circuit"},
    {"thalweg.ansatz", "thalweg.simulate", "thalweg.exact", "thalweg.evaluate", "thalweg.optimize", "thalweg.cost"},
    {"thalweg.study"},
    {"thalweg.storage"},
    {
        "thalweg_app",
        "thalweg_app.presenters",
        "thalweg_app.messages",
        "thalweg_app.system_libraries",
        "thalweg_app.threads",
        "thalweg_app.user_folders",
    },
    {"thalweg_app.outbox", "thalweg_app.colours", "thalweg_app.compiled"},
    {"thalweg_app.theme", "thalweg_app.rehearsals"},
    {"thalweg_app.widgets"},
    {"thalweg_app.forms"},
    {"thalweg_app.plots"},
    {"thalweg_app.jobs", "thalweg_app.worker", "thalweg_app.worker_process"},
    {"thalweg_app.views"},
    {"thalweg_app.main"},
    {"thalweg_app.terminal"},
    {"thalweg_app.cli"},
    {"thalweg_app.__main__"},
)
FLOOR_OF = {name: number for number, names in enumerate(FLOORS) for name in names}

#: Who may use what from outside.
WINDOW_TOOLKITS = {"PySide6", "pyqtgraph", "shiboken6"}
WITHOUT_TOOLKIT = ("thalweg", "thalweg_app.presenters", "thalweg_app.terminal", "thalweg_app.cli", "thalweg_app.jobs", "thalweg_app.worker_process")


def source_files() -> list[tuple[str, Path]]:
    """(dotted module name, path) of every source file."""
    found = []
    for package, folder in PACKAGES.items():
        for path in sorted(folder.rglob("*.py")):
            parts = [package, *path.relative_to(folder).with_suffix("").parts]
            found.append((".".join(p for p in parts if p != "__init__"), path))
    return found


def imported(tree: ast.AST) -> Iterator[str]:
    """Every absolute import, also those inside functions; `from a import b` gives `a` and `a.b`."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            assert node.module is not None
            yield node.module
            yield from (f"{node.module}.{alias.name}" for alias in node.names)


def unit_of(module: str) -> str:
    """The part of the house that a module belongs to: `thalweg.study` for `thalweg.study.run`."""
    return ".".join(module.split(".")[:2])


def breaches(module: str, tree: ast.AST) -> list[str]:
    own = unit_of(module)
    found = []
    for name in imported(tree):
        other = unit_of(name)
        if name.split(".")[0] not in PACKAGES or other == own or other not in FLOOR_OF:
            continue
        if FLOOR_OF[other] >= FLOOR_OF[own]:
            found.append(f"{module} (floor {FLOOR_OF[own]}) imports {name} (floor {FLOOR_OF[other]})")
    return found


def test_every_part_of_the_house_has_a_floor():
    homeless = {unit_of(module) for module, _ in source_files()} - FLOOR_OF.keys()
    assert not homeless, f"give these a floor here and in DEVELOPERS.md: {sorted(homeless)}"


def test_files_import_only_from_floors_below_or_from_their_own_folder():
    found = [breach for module, path in source_files() for breach in breaches(module, ast.parse(path.read_text(encoding="utf-8")))]
    assert not found, "\n".join(found)


def test_the_walk_sees_an_import_from_above_even_inside_a_function():
    tree = ast.parse("def f():\n    from thalweg.study import run\n")
    assert breaches("thalweg.operators.pauli", tree)
    assert breaches("thalweg.simulate.sector", ast.parse("import thalweg.exact.answer"))
    assert not breaches("thalweg.storage.session", tree)


def test_the_science_and_everything_below_the_views_knows_no_window_toolkit():
    found = [
        f"{module} imports {name}"
        for module, path in source_files()
        if module.startswith(WITHOUT_TOOLKIT) and (module.split(".")[0] == "thalweg" or unit_of(module) in WITHOUT_TOOLKIT)
        for name in imported(ast.parse(path.read_text(encoding="utf-8")))
        if name.split(".")[0] in WINDOW_TOOLKITS
    ]
    assert not found, "\n".join(found)


@pytest.mark.parametrize(
    ("module", "unwanted"),
    [
        ("thalweg.study.spec", {"numba", "scipy", "pyscf", "openfermion", "h5py", "matplotlib", "PySide6"}),
        ("thalweg.storage.session", {"numba", "scipy", "pyscf", "openfermion", "h5py", "matplotlib", "PySide6"}),
        ("thalweg.study.events", {"numba", "scipy", "pyscf", "openfermion", "h5py", "matplotlib", "PySide6"}),
        ("thalweg_app.cli", {"numpy", "pydantic", "numba", "scipy", "pyscf", "openfermion", "h5py", "matplotlib", "PySide6", "rich"}),
    ],
)
def test_light_modules_load_no_heavy_library(module, unwanted):
    code = f"import {module}, sys; print(*sorted({{name.split('.')[0] for name in sys.modules}}))"
    loaded = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=TOP, timeout=60).stdout.split()
    assert not unwanted & set(loaded)
