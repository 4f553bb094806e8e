"""The import ranks and the sole users of DEVELOPERS.md, held against the imports themselves."""

import ast
from functools import cache
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parent.parent / "profiler"

RANKS = {
    "printable": -1,  # below even the errors, which are made of it
    "surroundings": 0,
    "errors": 0,
    "units": 0,
    "models": 1,
    "checks": 1,
    "terrain_error": 1,
    "patches": 1,
    "remarks": 1,
    "terrain": 2,
    "path": 2,
    "climate": 2,
    "hopfile": 3,
    "cover": 3,
    "geometry": 4,
    "diffraction": 5,
    "atmosphere": 5,
    "receiver": 5,
    "budget": 6,
    "availability": 6,
    "heights": 7,
    "confidence": 7,
    "study": 8,
    "plan": 9,
    "screen": 9,
    "words": 10,
    "figures": 11,
    "document": 11,
    "cli": 12,
}

SOLE_USERS = {
    "rasterio": {"terrain"},
    "pyproj": {"path", "terrain"},
    "itur": {"climate"},
    "matplotlib": {"figures"},
    "click": {"cli"},
    "rich": {"cli"},
}


@cache
def imports() -> list[tuple[Path, str]]:
    """Every (file, absolute module name imported) of the package, wherever in the file the import stands."""
    found = []
    for path in sorted(PACKAGE.rglob("*.py")):
        for node in ast.walk(ast.parse(path.read_text())):
            if isinstance(node, ast.Import):
                found += [(path, alias.name) for alias in node.names]
            elif isinstance(node, ast.ImportFrom):
                assert node.level == 0, f"{path}: write imports absolutely"
                found.append((path, node.module or ""))
    return found


def module_of(path: Path) -> str:
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def test_imports_go_only_to_a_lower_rank():
    wrong = []
    for path, name in imports():
        parts = name.split(".")
        if parts[0] != "profiler" or len(parts) == 1:
            continue
        here, there = module_of(path), parts[1]
        if here not in ("__init__", "__main__") and here != there and RANKS[there] >= RANKS[here]:
            wrong.append(f"{here} ({path.name}) imports {there}")
    assert wrong == []


@cache
def public_names(name: str) -> set[str]:
    """Give what a module of the package lists in its ``__all__``, and the modules beside it."""
    path = PACKAGE.parent.joinpath(*name.split("."))
    path = path / "__init__.py" if path.is_dir() else path.with_suffix(".py")
    for node in ast.parse(path.read_text()).body:
        if isinstance(node, ast.Assign) and [target.id for target in node.targets] == ["__all__"]:
            return set(ast.literal_eval(node.value)) | {inner.stem for inner in path.parent.glob("*.py")}
    return set()


def test_modules_take_only_public_names_from_each_other():
    hidden = [
        f"{path.relative_to(PACKAGE)} takes {alias.name} from {node.module}"
        for path in sorted(PACKAGE.rglob("*.py"))
        for node in ast.walk(ast.parse(path.read_text()))
        if isinstance(node, ast.ImportFrom) and (node.module or "").startswith("profiler.")
        for alias in node.names
        if alias.name not in public_names(node.module)
    ]
    assert hidden == []


def test_every_module_has_a_rank():
    modules = {module_of(path) for path in PACKAGE.rglob("*.py")} - {"__init__", "__main__"}
    assert modules == set(RANKS)


@pytest.mark.parametrize("library", SOLE_USERS)
def test_each_library_keeps_to_its_users(library):
    users = {module_of(path) for path, name in imports() if name.split(".")[0] == library}
    assert users == SOLE_USERS[library]


def test_only_the_command_line_prints():
    printers = {
        module_of(path)
        for path in PACKAGE.rglob("*.py")
        for node in ast.walk(ast.parse(path.read_text()))
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "print"
    }
    assert printers <= {"cli"}
