"""The floors of the house: imports point strictly down, heavy libraries stay in their rooms, all is described."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from functools import cache
from pathlib import Path

import pytest

import rfstage

ROOT = Path(rfstage.__file__).parent

# A room, or a package as a whole: its rooms may use each other, without circles.
FLOORS = {
    "errors": 0.0,
    "constants": 0.0,
    "quantity": 0.1,
    "kinds": 0.0,
    "fields": 0.2,
    "pulse": 1.0,
    "load": 1.0,
    "limits": 1.0,
    "parts": 1.0,
    "safetyfields": 1.0,
    "devicefields": 1.0,
    "tankfields": 1.0,
    "partfields": 1.0,
    "jobfields": 1.1,
    "branch": 1.05,
    "ladder": 1.1,
    "operating": 2.0,
    "drive": 2.0,
    "device": 2.0,
    "matching": 2.0,
    "filters": 2.0,
    "cautions": 2.0,
    "exposure": 2.0,
    "devicelaw": 2.1,
    "datasheet": 2.1,
    "harmonics": 2.5,
    "stage": 3.0,
    "job": 3.0,
    "steady": 4.0,
    "sweep": 4.5,
    "designs": 5.0,
    "fitting": 5.2,
    "stagevalues": 3.5,
    "retuning": 5.6,
    "verify": 5.6,
    "files": 6.0,
    "report": 7.0,
    "cli": 8.0,
}
ENTRANCES = ("", "__main__")  # the package itself and ``python -m``: above every floor, imported by none

MODULES = sorted(ROOT.rglob("*.py"))


def dotted(path: Path) -> str:
    """``matching.pi`` for the file of that room, ``matching`` for the package's own file."""
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(part for part in parts if part != "__init__")


NAMES = {dotted(path): path for path in MODULES}


def room(name: str) -> str:
    return name.split(".")[0]


@cache
def parsed(path: Path) -> ast.Module:
    return ast.parse(path.read_text(encoding="utf-8"))


def imports_of(path: Path, *, outside_functions: bool = False) -> Iterator[tuple[str, int]]:
    """Every absolute module name a file imports, with its line; relative imports are made absolute."""
    tree = parsed(path)
    inside: set[int] = set()
    if outside_functions:
        for node in ast.walk(tree):
            if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda):
                inside |= {id(child) for child in ast.walk(node)}
    package = ("rfstage", *path.relative_to(ROOT).parent.parts)
    for node in ast.walk(tree):
        if id(node) in inside:
            continue
        if isinstance(node, ast.Import):
            yield from ((alias.name, node.lineno) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else ()
            module = ".".join((*base, *((node.module,) if node.module else ())))
            for alias in node.names:
                whole = f"{module}.{alias.name}"
                is_module = whole.removeprefix("rfstage.") in NAMES and whole.startswith("rfstage.")
                yield (whole if is_module else module), node.lineno


def own_imports(path: Path) -> Iterator[tuple[str, int]]:
    for name, line in imports_of(path):
        if name == "rfstage" or name.startswith("rfstage."):
            yield name.removeprefix("rfstage").removeprefix("."), line


rooms = pytest.mark.parametrize("name", sorted(NAMES), ids=lambda name: name or "rfstage")


@rooms
def test_every_room_has_a_floor(name):
    assert name in ENTRANCES or room(name) in FLOORS, f"give {room(name)!r} a floor"


@rooms
def test_imports_point_strictly_down(name):
    if name in ENTRANCES:
        return
    for imported, line in own_imports(NAMES[name]):
        if imported == "":
            continue  # the package's own name and version
        assert imported not in ENTRANCES
        below = FLOORS[room(imported)] < FLOORS[room(name)]
        siblings = room(imported) == room(name) and NAMES[name].parent != ROOT
        assert below or siblings, f"rfstage/{name.replace('.', '/')}:{line} imports {imported}"


def test_rooms_of_one_package_do_not_import_in_circles():
    graph = {name: {imported for imported, _ in own_imports(path) if imported in NAMES} for name, path in NAMES.items()}
    finished: set[str] = set()

    def visit(name: str, path: tuple[str, ...]) -> None:
        assert name not in path, " -> ".join((*path, name))
        if name in finished:
            return
        for imported in sorted(graph[name] - {""}):
            visit(imported, (*path, name))
        finished.add(name)

    for name in sorted(NAMES):
        visit(name, ())


@pytest.mark.parametrize(
    ("library", "allowed"),
    [
        ("skrf", {"files"}),
        ("rich", {"report", "cli"}),
        ("matplotlib", {"report"}),
        ("schemdraw", {"report"}),
        ("pandas", set()),
        ("argparse", {"cli"}),
    ],
)
def test_library_is_imported_only_in_its_rooms(library, allowed):
    users = {
        room(name)
        for name, path in NAMES.items()
        for imported, _ in imports_of(path)
        if imported.split(".")[0] == library
    }
    assert users <= allowed


@pytest.mark.parametrize("library", ["scipy", "skrf", "matplotlib", "schemdraw", "dask", "distributed"])
def test_heavy_library_is_imported_only_inside_functions(library):
    found = [
        f"{name}:{line}"
        for name, path in NAMES.items()
        for imported, line in imports_of(path, outside_functions=True)
        if imported.split(".")[0] == library
    ]
    assert found == []


@pytest.mark.parametrize(
    "name",
    [
        name
        for name in NAMES
        if FLOORS.get(room(name), 9) < 1 or room(name) in ("jobfields", "limits", "operating", "cautions", "device")
    ],
)
def test_rooms_that_answer_before_numpy_use_the_standard_library_only(name):
    tops = {imported.split(".")[0] for imported, _ in imports_of(NAMES[name])}
    assert not tops & {"numpy", "scipy", "skrf", "rich"}


@pytest.mark.parametrize("name", [name for name in NAMES if FLOORS.get(room(name), 9) < 6 and name not in ENTRANCES])
def test_rooms_below_the_files_neither_print_nor_open_anything(name):
    calls = {
        node.func.id
        for node in ast.walk(parsed(NAMES[name]))
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
    }
    assert not calls & {"print", "open", "input", "exec", "eval"}


def described(tree: ast.Module) -> Iterator[tuple[str, ast.AST]]:
    """Public functions, classes and methods, by name."""
    for node in tree.body:
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_"):
            yield node.name, node
            if isinstance(node, ast.ClassDef):
                for inner in node.body:
                    if isinstance(inner, ast.FunctionDef) and not inner.name.startswith("_"):
                        yield f"{node.name}.{inner.name}", inner


@rooms
def test_every_room_opens_with_its_description(name):
    assert ast.get_docstring(parsed(NAMES[name]))


@rooms
def test_every_public_function_and_class_is_described(name):
    tree = parsed(NAMES[name])
    silent = [who for who, node in described(tree) if not ast.get_docstring(node)]  # type: ignore[arg-type]
    assert silent == []
