"""Every error of our own survives a trip through a process pool: same class, same arguments, same words."""

from __future__ import annotations

import ast
import importlib
import inspect
import pickle
import types
import typing
from pathlib import Path

import pytest

from sim.errors import Problem, RequestError

ROOT = Path(__file__).resolve().parents[1]

_PROBLEM = Problem(
    "parts.csv", "parts", 7, "cycles_since_new", "stops", "rule", "-1", "0 or more", "found -1, expected more"
)

# One argument of each kind that an error may ask for.
_EXAMPLES: dict[object, object] = {
    str: "pärt 7",
    int: 3,
    float: 2.5,
    bool: True,
    tuple[str, ...]: ("one", "two"),
    tuple[Problem, ...]: (_PROBLEM, _PROBLEM),
}


def _error_classes() -> list[type[Exception]]:
    """Return every exception class that sim, planner and ui define, found by reading their sources."""
    found = []
    for path in sorted(path for layer in ("sim", "planner", "ui") for path in (ROOT / layer).rglob("*.py")):
        names = [
            node.name
            for node in ast.parse(path.read_text(encoding="utf-8")).body
            if isinstance(node, ast.ClassDef)
            and any(isinstance(base, ast.Name) and base.id.endswith(("Error", "Exception")) for base in node.bases)
        ]
        if names:
            module = importlib.import_module(".".join(path.relative_to(ROOT).with_suffix("").parts))
            found += [getattr(module, name) for name in names]
    return found


def _example(error: type[Exception]) -> Exception:
    """Return an instance whose arguments are made up by the types that its constructor asks for."""
    if isinstance(error.__init__, types.WrapperDescriptorType):  # it takes what every exception takes
        return error("it went wrong")
    hints = typing.get_type_hints(error.__init__)
    wanted = list(inspect.signature(error.__init__).parameters)[1:]
    return error(*(_EXAMPLES[hints[name]] for name in wanted))


@pytest.mark.parametrize("error", _error_classes(), ids=lambda error: error.__name__)
def test_each_error_survives_pickling(error: type[Exception]) -> None:
    before = _example(error)
    after = pickle.loads(pickle.dumps(before))
    assert type(after) is error
    assert after.args == before.args
    assert str(after) == str(before)
    assert vars(after) == vars(before)


@pytest.mark.parametrize("error", _error_classes(), ids=lambda error: error.__name__)
def test_each_error_can_be_built_anew_from_its_own_arguments(error: type[Exception]) -> None:
    """The event kernel of simpy does so when a process fails."""
    before = _example(error)
    assert str(type(before)(*before.args)) == str(before)


def test_a_request_error_says_what_was_found_expected_and_to_do() -> None:
    said = str(RequestError("--runs", "0", "1 or more", "leave it out for the stopping rule"))
    assert said == "--runs: found 0, expected 1 or more; leave it out for the stopping rule"
