"""Set Spoolwright up and run it, or its tests, with nothing but Python itself.

    python3 -m planner.start          make .venv, compare the strategies on the demo fleet, say how to open the screen
    python3 -m planner.start test     make .venv, run the tests (what follows goes to pytest)
    python3 -m planner.start setup    make .venv with all that tests and checks need, and stop

Only the standard library is imported, and nothing that Python 3.8 cannot read, so that an old Python is told what it
lacks. A minimal Debian has neither pip nor a working venv: whatever is there is used, and if nothing is, one line names
what to install. A `.venv` that was half made is made anew; one that somebody else made is installed into, and removed
only when its Python no longer runs.
"""

from __future__ import annotations

import hashlib
import importlib.util
import json
import os
import shlex
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Any, NoReturn

ROOT = Path(__file__).resolve().parents[1]
LEAST_PYTHON = (3, 11)
USAGE = "usage: python3 -m planner.start [test [PYTEST OPTIONS] | setup]"


def main(arguments: list[str]) -> int:
    """Set up and do what is asked; return the exit code of what was run."""
    what = arguments[0] if arguments else "compare"
    if what not in ("compare", "test", "setup"):
        print(USAGE, file=sys.stderr)
        return 2
    if sys.version_info < LEAST_PYTHON:
        return _start_again_with_a_newer_python(arguments)
    try:
        python = set_up(ROOT, extras="" if what == "compare" else "test")
    except OSError as error:
        _stop(f"cannot set up in {ROOT}: {error}")
    if what == "test":
        return subprocess.call([str(python), "-m", "pytest", *arguments[1:]], cwd=ROOT)
    if what == "compare":
        code = subprocess.call([str(python), "-m", "planner.cli", "compare", "demo_fleet"], cwd=ROOT)
        if code != 0:
            return code
        command = [str(python.with_name("spoolwright" + python.suffix)), "serve", str(ROOT / "demo_fleet")]
        print("\nOpen the screen with:\n  " + " ".join(shlex.quote(word) for word in command))
    return 0


def set_up(root: Path, *, extras: str) -> Path:
    """Make `.venv` under ``root`` hold the project as pyproject.toml has it now; return its Python.

    ``extras`` is the name of the optional group that is wanted too, or empty. Nothing is done when the stamp says that
    it has been done. Ends the program with one line when this machine has no means to do it.
    """
    folder = root / ".venv"
    wanted = {"pyproject": hashlib.sha256((root / "pyproject.toml").read_bytes()).hexdigest(), "root": str(root)}
    stamp = _read_stamp(folder)
    extras = extras or stamp.get("extras", "")
    done = {"ready": True, "extras": extras, **wanted}
    if all(stamp.get(key) == value for key, value in done.items()) and _works(_python_of(folder)):
        return _python_of(folder)
    made_here = stamp.get("made_here", not folder.exists())
    half_made = made_here and not stamp.get("ready")
    if folder.exists() and (half_made or not _works(_python_of(folder))):
        print("making .venv anew: it was half made or no longer works", flush=True)
        shutil.rmtree(folder)
        made_here = True
    if not folder.exists():
        _make(folder)
    _write_stamp(folder, {"made_here": made_here, "ready": False, "extras": extras})
    _install(folder, root, extras)
    _write_stamp(folder, {"made_here": made_here, **done})
    return _python_of(folder)


def _make(folder: Path) -> None:
    """Make an empty environment by the first means that this machine has."""
    print(f"making {folder}", flush=True)
    folder.mkdir()
    # The stamp comes first: whatever stops the making from here on leaves a folder that is known to be half made.
    _write_stamp(folder, {"made_here": True, "ready": False})
    ways = []
    if _has("venv") and _has("ensurepip"):
        ways.append([sys.executable, "-m", "venv", str(folder)])
    if _has("venv") and (_has("pip") or shutil.which("uv")):
        ways.append([sys.executable, "-m", "venv", "--without-pip", str(folder)])
    if shutil.which("uv"):
        ways.append(["uv", "venv", "--allow-existing", "--python", sys.executable, str(folder)])
    for way in ways:
        if subprocess.call(way) == 0 and _works(_python_of(folder)):
            return
    shutil.rmtree(folder)
    _stop("this Python has neither venv nor pip: run  sudo apt install python3-venv  and start again")


def _install(folder: Path, root: Path, extras: str) -> None:
    """Install the project with its libraries into the environment, by its own pip, this Python's pip, or uv."""
    python = _python_of(folder)
    what = ["install", "--quiet", "--editable", f".[{extras}]" if extras else "."]
    if subprocess.call([str(python), "-c", "import pip"], stderr=subprocess.DEVNULL) == 0:
        command = [str(python), "-m", "pip", *what]
    elif _has("pip"):
        command = [sys.executable, "-m", "pip", "--python", str(python), *what]
    elif shutil.which("uv"):
        command = ["uv", "pip", *what[:2], "--python", str(python), *what[2:]]
    else:
        _stop("there is no pip to install with: run  sudo apt install python3-venv python3-pip  and start again")
    print("installing the libraries (some hundred megabytes; a minute or two)", flush=True)
    if subprocess.call(command, cwd=root) != 0:
        _stop("the libraries could not be installed (see above); nothing else was touched, start again when mended")


def _start_again_with_a_newer_python(arguments: list[str]) -> int:
    """Hand over to a newer Python that stands beside this one, or say that one is needed."""
    beside = [shutil.which(f"python3.{minor}") for minor in range(20, LEAST_PYTHON[1] - 1, -1)]
    newer = next(filter(None, beside), None)
    if newer is None:
        found = ".".join(str(number) for number in sys.version_info[:3])
        _stop(f"Python {found} is too old: Spoolwright needs 3.11 or later; install a newer one and start again")
    return subprocess.call([newer, "-m", "planner.start", *arguments], cwd=ROOT)


def _python_of(folder: Path) -> Path:
    return folder / ("Scripts/python.exe" if os.name == "nt" else "bin/python")


def _works(python: Path) -> bool:
    """Return whether the environment's Python runs and is new enough (its base may have been removed)."""
    code = f"import sys; sys.exit(sys.version_info < {LEAST_PYTHON})"
    try:
        return subprocess.call([str(python), "-c", code], stderr=subprocess.DEVNULL) == 0
    except OSError:
        return False


def _has(module: str) -> bool:
    return importlib.util.find_spec(module) is not None


def _read_stamp(folder: Path) -> dict[str, Any]:
    try:
        stamp = json.loads((folder / "spoolwright.json").read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return stamp if isinstance(stamp, dict) else {}


def _write_stamp(folder: Path, stamp: dict[str, Any]) -> None:
    (folder / "spoolwright.json").write_text(json.dumps(stamp), encoding="utf-8")


def _stop(why: str) -> NoReturn:
    print(f"spoolwright: {why}", file=sys.stderr)
    raise SystemExit(1)


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
