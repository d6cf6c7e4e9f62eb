"""What may stand at the top of the tree, and what no committed file may hold."""

from __future__ import annotations

import subprocess
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]

FOLDERS = {"sim", "planner", "ui", "tests", "demo_fleet", ".ci"}
FILES = {"README.md", "DEVELOPERS.md", "pyproject.toml", ".gitignore"}
TEST_FOLDERS = {"sim", "planner", "ui", "theory", "outside", "bench"}

# Written in two halves, since this file is committed too.
FORBIDDEN = (
    "pypi" + ".org",
    "python" + "hosted.org",
    "deb." + "debian.org",
    "npm" + "js.org",
    "/work" + "/main",
    "/tmp" + "/sw",
    "/root" + "/",
)


def _tracked() -> list[str]:
    """Return the paths that git knows; the test is skipped in a tree that is no checkout (an unpacked archive)."""
    done = subprocess.run(["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, check=False)
    if done.returncode != 0:
        pytest.skip("not a git checkout")
    return [name for name in done.stdout.decode().split("\0") if name and (ROOT / name).exists()]


def test_the_top_of_the_tree_holds_what_the_design_names_and_nothing_else() -> None:
    tracked = _tracked()
    assert {name.split("/")[0] for name in tracked if "/" in name} == FOLDERS
    assert {name for name in tracked if "/" not in name} == FILES


def test_tests_mirror_the_code() -> None:
    folders = {name.split("/")[1] for name in _tracked() if name.startswith("tests/") and name.count("/") > 1}
    assert folders <= TEST_FOLDERS


def test_no_committed_file_names_a_registry_or_a_path_of_one_machine() -> None:
    for name in _tracked():
        content = (ROOT / name).read_bytes()
        for word in FORBIDDEN:
            assert word.encode() not in content, f"{name} holds {word}"
