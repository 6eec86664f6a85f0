"""The shape of the project: floors, sizes, thin notebooks, the top level, standing alone."""

from __future__ import annotations

import ast
import fnmatch
import json
import re
import subprocess
import sys
from graphlib import CycleError, TopologicalSorter
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parent.parent
FLOORS = {
    "__init__": 0, "core": 0,
    "physics": 1, "statistics": 1, "handover": 1, "accounting": 1,
    "intake": 2,
    "quality": 3, "evidence": 3, "opening": 3, "keeping": 3,
    "report": 4, "facts": 4, "overview": 4,
    "pipeline": 5,
    "checking": 6, "verifying": 6, "planning": 6, "trying": 6, "starting": 5, "swap": 1,
    "kernels": 1, "locking": 2,
    "producing": 7, "planner": 7, "packing": 7, "exporting": 7, "index": 7,
    "runner": 8, "season": 9,
    "cli": 10,
}
SAME_FLOOR: set[tuple[str, str]] = set()
ARRAYS_ONLY = {"numpy", "scipy", "pvlib", "surveykit"}
FILES = {"pathlib", "os", "io", "json", "csv", "shutil", "tempfile"}

MUST_STAND = {"README.md", "DEVELOPERS.md", "pyproject.toml", "notebooks", "surveykit", "params",
              "tests", "demo_data"}
MAY_STAND = MUST_STAND | {"LICENSE", "CITATION.cff", "constraints.txt"}

LONGEST_FILE, LONGEST_CELL, LONGEST_NOTEBOOK = 300, 12, 80
SOURCES = {".py", ".html", ".j2", ".css", ".sh"}
NOT_IN_NOTEBOOKS = (ast.FunctionDef, ast.AsyncFunctionDef, ast.ClassDef, ast.Lambda, ast.For,
                    ast.AsyncFor, ast.While, ast.Try, ast.TryStar, ast.ListComp, ast.SetComp,
                    ast.DictComp, ast.GeneratorExp)
OPENING = "survey = pipeline.open_survey(globals())"
COMPARED = "nbval-check-output"


# ---- floors

def modules() -> dict[str, Path]:
    """Return dotted name -> file of every module of the package."""
    found = {}
    for path in sorted((ROOT / "surveykit").rglob("*.py")):
        parts = path.relative_to(ROOT).with_suffix("").parts
        found[".".join(parts[:-1] if parts[-1] == "__init__" else parts)] = path
    assert len(found) > 10
    return found


def imported(name: str, path: Path) -> set[str]:
    """Return the dotted names a module imports, anywhere in the file; relative ones resolved."""
    names: set[str] = set()
    package = name.split(".") if path.name == "__init__.py" else name.split(".")[:-1]
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            above = package[: len(package) - node.level + 1] if node.level else []
            base = ".".join([*above, *([node.module] if node.module else [])])
            names |= {f"{base}.{alias.name}" for alias in node.names}
    return names


def known_module(name: str, known: dict[str, Path]) -> str | None:
    """Return the module of the package that an imported name comes from."""
    while name and name not in known:
        name = name.rpartition(".")[0]
    return name or None


def part(module: str) -> str:
    return (module.split(".") + ["__init__"])[1]


def test_every_part_of_the_package_has_a_floor():
    assert {part(name) for name in modules()} - set(FLOORS) == set()


def test_a_file_imports_only_from_floors_below():
    known, faults = modules(), []
    for name, path in known.items():
        for target in imported(name, path):
            if target.split(".")[0] != "surveykit":
                continue
            here, there = part(name), part(known_module(target, known) or target)
            if here == there or (here, there) in SAME_FLOOR:
                continue
            if there not in FLOORS or FLOORS[there] >= FLOORS[here]:
                faults.append(f"{path.relative_to(ROOT)} (floor {FLOORS[here]}) imports {target} "
                              f"(floor {FLOORS.get(there, 'unknown')})")
    assert faults == []


def test_no_two_modules_import_each_other():
    known = modules()
    edges = {name: {known_module(target, known) for target in imported(name, path)} - {None, name}
             for name, path in known.items()}
    try:
        TopologicalSorter(edges).prepare()
    except CycleError as cycle:
        pytest.fail(f"modules import each other in a circle: {' <- '.join(cycle.args[1])}")


def test_physics_and_statistics_know_arrays_only():
    faults = []
    for name, path in modules().items():
        if part(name) in ("physics", "statistics"):
            tops = {target.split(".")[0] for target in imported(name, path)}
            odd = (tops - sys.stdlib_module_names - ARRAYS_ONLY) | (tops & FILES)
            faults += [f"{path.relative_to(ROOT)} imports {top}" for top in sorted(odd)]
    assert faults == []


# ---- files

def top_level_files() -> list[str]:
    """Return the project's files, from git or else from the folder less what git ignores."""
    command = ["git", "-C", str(ROOT), "ls-files", "--cached", "--others", "--exclude-standard"]
    try:
        listed = subprocess.run(command, capture_output=True, text=True, check=True).stdout
    except (OSError, subprocess.CalledProcessError):
        listed = ""
    files = [line for line in listed.splitlines() if (ROOT / line).exists()]
    if files:
        return files
    ignored = [line.strip("/") for line in (ROOT / ".gitignore").read_text().split()]
    return [path.relative_to(ROOT).as_posix() for path in ROOT.rglob("*") if path.is_file()
            and not any(fnmatch.fnmatch(piece, pattern) for pattern in ignored
                        for piece in path.relative_to(ROOT).parts)]


def test_top_level_is_as_published():
    top = {name.split("/")[0] for name in top_level_files()}
    assert MUST_STAND - top == set()
    assert {name for name in top - MAY_STAND if not name.startswith(".")} == set()


def test_no_file_is_long():
    lengths = {name: len((ROOT / name).read_text(encoding="utf-8").splitlines())
               for name in top_level_files() if Path(name).suffix in SOURCES}
    assert len(lengths) > 20
    assert {name: n for name, n in lengths.items() if n > LONGEST_FILE} == {}


def test_the_project_stands_alone():
    outside = re.compile(r"\.\./" + r"shared|/\s*[\"']" + r"shared[\"'/]")
    readable = SOURCES | {".ipynb", ".yml", ".yaml", ".toml", ".cfg"}
    files = [name for name in top_level_files() if Path(name).suffix in readable]
    assert [name for name in files
            if outside.search((ROOT / name).read_text(encoding="utf-8"))] == []


# ---- notebooks

Notebook = dict[str, Any]


@pytest.fixture(scope="module")
def notebooks() -> dict[str, Notebook]:
    found = {path.name: json.loads(path.read_text(encoding="utf-8"))
             for path in sorted((ROOT / "notebooks").glob("*.ipynb"))}
    assert found, "the project has no notebooks"
    return found


def code_cells(notebook: Notebook) -> list[Notebook]:
    return [cell for cell in notebook["cells"] if cell["cell_type"] == "code"]


def source(cell: Notebook) -> str:
    return "".join(cell["source"])


def tags(cell: Notebook) -> list[str]:
    return cell["metadata"].get("tags", [])


def code_lines(cell: Notebook) -> int:
    lines = (line.strip() for line in source(cell).splitlines())
    return sum(bool(line) and not line.startswith("#") for line in lines)


def test_notebooks_are_thin(notebooks):
    faults = []
    for name, notebook in notebooks.items():
        total = 0
        for place, cell in enumerate(code_cells(notebook)):
            total += code_lines(cell)
            if code_lines(cell) > LONGEST_CELL and "parameters" not in tags(cell):
                faults.append(f"{name}: code cell {place} has {code_lines(cell)} lines")
            faults += [f"{name}: code cell {place} holds a {type(node).__name__}"
                       for node in ast.walk(ast.parse(source(cell)))
                       if isinstance(node, NOT_IN_NOTEBOOKS)]
        if total > LONGEST_NOTEBOOK:
            faults.append(f"{name}: {total} code lines")
    assert faults == []


def test_notebooks_open_the_survey_alike(notebooks):
    for name, notebook in notebooks.items():
        first, second = code_cells(notebook)[:2]
        assert tags(first) == ["parameters"], name
        assert OPENING in source(second).splitlines(), name
        assert not any(tags(cell).count("parameters") for cell in code_cells(notebook)[1:]), name
        whole = "\n".join(source(cell) for cell in code_cells(notebook))
        assert whole.count("globals()") == 1, name


def test_parameters_cells_hold_every_key_of_a_campaign(notebooks):
    from surveykit.intake.params import Campaign

    keys = {field.alias or name for name, field in Campaign.model_fields.items()}
    assert {"campaign", "site", "loggers", "surfaces", "settings"} <= keys
    for name, notebook in notebooks.items():
        given = {}
        for node in ast.parse(source(code_cells(notebook)[0])).body:
            assert isinstance(node, ast.Assign), name
            given[ast.unparse(node.targets[0])] = ast.literal_eval(node.value)
        assert set(given) == keys | {"params_file", "run_folder"}, name
        assert {key for key, value in given.items() if value is not None} <= {"params_file"}, name


def test_committed_notebooks_keep_compared_outputs_only(notebooks):
    faults = []
    for name, notebook in notebooks.items():
        for place, cell in enumerate(code_cells(notebook)):
            if COMPARED in tags(cell) and not cell["outputs"]:
                faults.append(f"{name}: code cell {place} is to be compared and has no output")
            if COMPARED not in tags(cell) and cell["outputs"]:
                faults.append(f"{name}: code cell {place} keeps an output")
        if not any(COMPARED in tags(cell) for cell in code_cells(notebook)):
            faults.append(f"{name}: no cell's output is compared")
        text = json.dumps(notebook)
        if re.search(r'"image/|data:image/|"attachments"', text):
            faults.append(f"{name}: holds an image")
    assert faults == []
