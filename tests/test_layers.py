"""The import rule: ui -> planner -> sim, nothing upwards, and each third-party library has its home."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path
from typing import NamedTuple

import pytest

ROOT = Path(__file__).resolve().parents[1]
LAYERS = ("sim", "planner", "ui")

# Where a library may be imported: file paths that begin with one of these. What is not listed may be imported nowhere.
HOMES: dict[str, tuple[str, ...]] = {
    "altair": ("planner/charts/",),
    "click": ("planner/cli.py", "planner/commands/"),
    "dask": ("planner/execute",),
    "distributed": ("planner/execute",),
    "loky": ("planner/execute",),
    "numpy": ("sim/", "planner/", "ui/"),
    "openpyxl": ("planner/workbook.py",),
    "pandas": ("planner/", "ui/"),
    "pyarrow": ("planner/",),
    "scipy": ("sim/", "planner/"),
    "simpy": ("sim/",),
    "starlette": ("ui/",),
    "streamlit": ("ui/",),
    "vl_convert": ("planner/",),
    "xlsxwriter": ("planner/workbook.py",),
}

# The process files: a process waits, takes and gives resources, asks a pure function, and writes a row.
MOST_PROCESS_FILES = 4

# What a worker process loads to do its chunks; pandas starts at the rim and must stay out of it.
WORKER_MODULES = ("planner.chunk", "planner.rows", "planner.identity", "planner.job")


class Import(NamedTuple):
    """One import statement: the module named, and the names taken from it (empty for a plain import)."""

    module: str
    names: tuple[str, ...]


def _sources() -> list[Path]:
    return sorted(path for layer in LAYERS for path in (ROOT / layer).rglob("*.py"))


def _name(path: Path) -> str:
    return path.relative_to(ROOT).as_posix()


def _imports(path: Path) -> list[Import]:
    """Return every import of a file, those inside functions too; relative ones are written out."""
    package = path.relative_to(ROOT).parent.parts
    found = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found += [Import(alias.name, ()) for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else ()
            module = ".".join((*base, *((node.module or "").split(".") if node.module else ())))
            found.append(Import(module, tuple(alias.name for alias in node.names)))
    return found


def _is_module(dotted: str) -> bool:
    path = ROOT.joinpath(*dotted.split("."))
    return path.with_suffix(".py").exists() or (path / "__init__.py").exists()


def _upward(layer: str, imports: list[Import]) -> list[str]:
    """Return the modules that lie in a layer above ``layer``."""
    above = LAYERS[LAYERS.index(layer) + 1 :]
    return [found.module for found in imports if found.module.split(".")[0] in above]


@pytest.mark.parametrize("path", _sources(), ids=_name)
def test_nothing_is_imported_upwards(path: Path) -> None:
    assert _upward(path.relative_to(ROOT).parts[0], _imports(path)) == []


def test_an_import_upwards_would_be_found() -> None:
    imports = [Import("planner.store", ("save",)), Import("sim.fleet", ()), Import("ui", ())]
    assert _upward("sim", imports) == ["planner.store", "ui"]
    assert _upward("planner", imports) == ["ui"]
    assert _upward("ui", imports) == []


@pytest.mark.parametrize("path", _sources(), ids=_name)
def test_each_library_is_imported_only_in_its_home(path: Path) -> None:
    for found in _imports(path):
        library = found.module.split(".")[0]
        if library in sys.stdlib_module_names or library in LAYERS:
            continue
        homes = HOMES.get(library, ())
        assert _name(path).startswith(homes) if homes else False, f"{_name(path)} imports {library}; homes: {homes}"


def test_few_files_run_processes() -> None:
    users = {_name(path) for path in _sources() for found in _imports(path) if found.module.split(".")[0] == "simpy"}
    assert len(users) <= MOST_PROCESS_FILES, users


@pytest.mark.parametrize("path", [path for path in _sources() if path.name == "__init__.py"], ids=_name)
def test_package_roots_hold_one_docstring_sentence(path: Path) -> None:
    tree = ast.parse(path.read_text(encoding="utf-8"))
    assert len(tree.body) == 1
    sentence = ast.get_docstring(tree)
    assert sentence
    assert "\n" not in sentence
    assert sentence.endswith(".")


@pytest.mark.parametrize("path", _sources(), ids=_name)
def test_no_module_imports_its_own_package_root(path: Path) -> None:
    """Submodules may be named through it (``from planner.schema import work_tables``); the root itself may not."""
    package = ".".join(path.relative_to(ROOT).parent.parts)
    for found in _imports(path):
        if found.module == package:
            assert found.names, f"{_name(path)} imports its own package root {package}"
            for name in found.names:
                assert _is_module(f"{package}.{name}"), (
                    f"{_name(path)} takes {name} from its own package root {package}"
                )


def _loaded(module: str) -> set[str]:
    """Return the libraries that importing ``module`` loads in a fresh interpreter."""
    code = f"import sys, {module}; print('\\n'.join({{name.split('.')[0] for name in sys.modules}}))"
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    return set(done.stdout.split())


@pytest.mark.parametrize("module", [module for module in WORKER_MODULES if _is_module(module)])
def test_what_a_worker_loads_is_free_of_the_rim(module: str) -> None:
    assert _loaded(module) & {"pandas", "pyarrow", "altair", "streamlit", "click", "openpyxl", "xlsxwriter"} == set()
