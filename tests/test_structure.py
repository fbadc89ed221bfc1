"""How the code hangs together, read from the source: direction of imports, sizes, docstrings."""

import ast
from pathlib import Path

import pytest

import gley

SOURCE = Path(gley.__file__).parent
FILES = sorted(SOURCE.rglob("*.py"))
FOUNDATION = ("errors", "constants", "formula", "columns", "units", "findings", "settings", "jsonform")
ROOMS = ("survey", "probe", "stability", "evidence", "site", "drawing", "delivery")
TOP = ("bulk", "charts", "pipeline", "wording", "explain", "cli")
ORDER = {name: level for level, name in enumerate((*ROOMS, *TOP), start=1)} | dict.fromkeys(FOUNDATION, 0)
MAX_FILE_LINES, MAX_FUNCTION_LINES = 400, 50

SEARCHED_OUTSIDE = {"matplotlib", "geopandas", "openpyxl", "pandas", "numpy", "shapely", "pyproj", "typer", "rich"}
FORBIDDEN = {
    # computes only: no drawing, no maps, no files
    "stability": {"matplotlib", "geopandas", "openpyxl", "pyproj", "typer", "rich"},
    "probe": {"matplotlib", "geopandas", "openpyxl", "typer", "rich"},
    "evidence": {"matplotlib", "geopandas", "openpyxl", "typer", "rich"},
    "survey": {"matplotlib", "geopandas", "typer", "rich"},
    "site": {"matplotlib", "openpyxl", "typer", "rich"},
    "drawing": {"openpyxl", "typer", "rich"},
    "delivery": {"typer", "rich"},
    **dict.fromkeys(FOUNDATION, SEARCHED_OUTSIDE),
}


def tree_of(path):
    return ast.parse(path.read_text(encoding="utf-8"), filename=str(path))


def unit_of(path):
    """Room or top module that a file belongs to; '' for the package's own `__init__`."""
    parts = path.relative_to(SOURCE).with_suffix("").parts
    return "" if parts == ("__init__",) else parts[0]


def imports_of(path):
    """(module, name, line) of every import, those inside functions too; name is None for `import module`."""
    for node in ast.walk(tree_of(path)):
        if isinstance(node, ast.Import):
            for item in node.names:
                yield item.name, None, node.lineno
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}:{node.lineno}: relative import"
            for item in node.names:
                yield node.module, item.name, node.lineno


def own_imports(path):
    """(unit, dotted rest, name, line) of imports from the package itself."""
    for module, name, line in imports_of(path):
        if module == "gley":
            yield name, "", None, line
        elif module.startswith("gley."):
            unit, _, rest = module[5:].partition(".")
            yield unit, rest, name, line


def shown_by(room):
    """Names in `__all__` of a room's `__init__`."""
    for node in tree_of(SOURCE / room / "__init__.py").body:
        if isinstance(node, ast.Assign) and any(getattr(t, "id", "") == "__all__" for t in node.targets):
            return {element.value for element in node.value.elts}
    return set()


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.relative_to(SOURCE).as_posix())
def test_imports_come_from_the_left(path):
    unit = unit_of(path)
    if not unit:
        return  # the package's `__init__` loads on first use
    assert unit in ORDER, f"{unit} has no place in the order of the rooms"
    for other, _, _, line in own_imports(path):
        if other in ("__version__", unit):
            continue
        assert other in ORDER, f"{path.name}:{line}: {other}"
        assert ORDER[other] < ORDER[unit] or ORDER[other] == ORDER[unit] == 0, f"{path.name}:{line}: {unit} ← {other}"


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.relative_to(SOURCE).as_posix())
def test_another_room_gives_only_what_its_init_shows(path):
    unit = unit_of(path)
    for other, rest, name, line in own_imports(path):
        if other == unit or other not in ROOMS:
            continue
        assert rest == "", f"{path.name}:{line}: reaches into {other}.{rest}"
        if name is not None:
            assert name in shown_by(other), f"{path.name}:{line}: {other} doesn't show {name}"
    for node in ast.walk(tree_of(path)):
        # `stability.something` after `from gley import stability`
        if isinstance(node, ast.Attribute) and isinstance(node.value, ast.Name) and node.value.id in ROOMS:
            modules = {other for other, rest, name, _ in own_imports(path) if name is None}
            if node.value.id in modules and node.value.id != unit:
                assert node.attr in shown_by(node.value.id), f"{path.name}:{node.lineno}: {node.value.id}.{node.attr}"


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.relative_to(SOURCE).as_posix())
def test_rooms_keep_to_their_libraries(path):
    unit = unit_of(path)
    used = {module.split(".")[0] for module, _, _ in imports_of(path)}
    allowed_here = {"columns"} if unit == "columns" else set()
    assert not (used & FORBIDDEN.get(unit, set())) - allowed_here


def test_foundation_has_no_cycles():
    needs = {name: {other for other, *_ in own_imports(SOURCE / f"{name}.py")} for name in FOUNDATION}
    done: set[str] = set()
    while len(done) < len(FOUNDATION):
        ready = {name for name in FOUNDATION if name not in done and needs[name] <= done}
        assert ready, f"cycle among {sorted(set(FOUNDATION) - done)}"
        done |= ready


@pytest.mark.parametrize("room", ROOMS)
def test_files_of_a_room_have_no_cycles(room):
    files = {path.stem: path for path in (SOURCE / room).glob("*.py") if path.stem != "__init__"}
    needs = {}
    for stem, path in files.items():
        inside = set()
        for other, rest, name, _ in own_imports(path):
            if other == room:
                inside.add(rest.split(".")[0] if rest else name)
        needs[stem] = inside & files.keys()
    done: set[str] = set()
    while len(done) < len(files):
        ready = {stem for stem in files if stem not in done and needs[stem] <= done}
        assert ready, f"cycle among {sorted(files.keys() - done)}"
        done |= ready


@pytest.mark.parametrize("room", ROOMS)
def test_rooms_are_flat_and_say_what_they_show(room):
    assert not [path for path in (SOURCE / room).iterdir() if path.is_dir() and list(path.glob("*.py"))]
    assert shown_by(room)


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.relative_to(SOURCE).as_posix())
def test_sizes(path):
    lines = path.read_text(encoding="utf-8").count("\n")
    assert lines <= MAX_FILE_LINES
    for node in ast.walk(tree_of(path)):
        if isinstance(node, (ast.FunctionDef, ast.AsyncFunctionDef)):
            documented = ast.get_docstring(node) is not None
            first = node.body[1].lineno if documented and len(node.body) > 1 else node.body[0].lineno
            assert node.end_lineno - first + 1 <= MAX_FUNCTION_LINES, f"{node.name}: body too long"


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.relative_to(SOURCE).as_posix())
def test_public_things_have_docstrings(path):
    tree = tree_of(path)
    assert ast.get_docstring(tree), "module docstring"
    missing = []

    def look(body, prefix):
        for node in body:
            if isinstance(node, (ast.FunctionDef, ast.ClassDef)) and not node.name.startswith("_"):
                if not ast.get_docstring(node):
                    missing.append(prefix + node.name)
                if isinstance(node, ast.ClassDef):
                    look(node.body, f"{node.name}.")

    look(tree.body, "")
    assert not missing


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.relative_to(SOURCE).as_posix())
def test_library_neither_prints_nor_logs(path):
    if path.name == "cli.py":
        return
    for node in ast.walk(tree_of(path)):
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
            assert node.func.id not in ("print", "exit", "input", "breakpoint"), f"{path.name}:{node.lineno}"
    assert not {module for module, *_ in imports_of(path)} & {"logging", "pdb"}
