"""Set-up with nothing but Python: what is made, what is made anew, what is left alone, and what is said."""

from __future__ import annotations

import ast
import json
import os
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

from planner import start

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture
def root(tmp_path: Path) -> Path:
    """A project folder whose path holds a space and an accent."""
    folder = tmp_path / "flotte à réacteurs"
    folder.mkdir()
    (folder / "pyproject.toml").write_text("[project]\nname = 'nothing'\n", encoding="utf-8")
    return folder


@pytest.fixture
def installs(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """Record what would be installed instead of installing it; environments are made for real, without pip."""
    asked: list[str] = []
    monkeypatch.setattr(start, "_has", lambda module: module in ("venv", "pip"))
    monkeypatch.setattr(start, "_install", lambda folder, root, extras: asked.append(extras))
    return asked


def test_set_up_makes_an_environment_that_runs_and_does_nothing_the_second_time(
    root: Path, installs: list[str]
) -> None:
    python = start.set_up(root, extras="test")
    assert subprocess.check_output([str(python), "-c", "print(2 + 3)"]) == b"5\n"
    made = python.lstat().st_ctime_ns
    assert start.set_up(root, extras="") == python
    assert installs == ["test"]
    assert python.lstat().st_ctime_ns == made


def test_asking_for_the_tests_later_installs_them_too(root: Path, installs: list[str]) -> None:
    start.set_up(root, extras="")
    start.set_up(root, extras="test")
    start.set_up(root, extras="")
    assert installs == ["", "test"]


def test_a_changed_pyproject_is_installed_again_with_what_was_there(root: Path, installs: list[str]) -> None:
    start.set_up(root, extras="test")
    (root / "pyproject.toml").write_text("[project]\nname = 'other'\n", encoding="utf-8")
    start.set_up(root, extras="")
    assert installs == ["test", "test"]


def test_a_half_made_environment_is_made_anew(root: Path, installs: list[str], capsys: pytest.CaptureFixture) -> None:
    start.set_up(root, extras="")
    stamp = root / ".venv" / "spoolwright.json"
    stamp.write_text(json.dumps({**json.loads(stamp.read_text()), "ready": False}))
    (root / ".venv" / "left_over").touch()
    start.set_up(root, extras="")
    assert not (root / ".venv" / "left_over").exists()
    assert "making .venv anew" in capsys.readouterr().out
    assert installs == ["", ""]


def test_an_environment_whose_python_is_gone_is_made_anew(root: Path, installs: list[str]) -> None:
    python = start.set_up(root, extras="")
    python.unlink()
    assert start.set_up(root, extras="").exists()
    assert installs == ["", ""]


def test_a_moved_project_is_installed_again(root: Path, installs: list[str]) -> None:
    start.set_up(root, extras="")
    moved = root.rename(root.with_name("elsewhere"))
    start.set_up(moved, extras="")
    assert installs == ["", ""]


def test_an_environment_that_somebody_else_made_is_installed_into_and_kept(root: Path, installs: list[str]) -> None:
    subprocess.run([sys.executable, "-m", "venv", "--without-pip", str(root / ".venv")], check=True)
    (root / ".venv" / "theirs").touch()
    start.set_up(root, extras="")
    (root / "pyproject.toml").write_text("[project]\nname = 'other'\n", encoding="utf-8")
    start.set_up(root, extras="")
    assert (root / ".venv" / "theirs").exists()
    assert installs == ["", ""]


def test_an_interrupted_installation_leaves_an_environment_known_to_be_half_made(
    root: Path, installs: list[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupted(folder: Path, root: Path, extras: str) -> None:
        (folder / "half").touch()
        raise KeyboardInterrupt

    with monkeypatch.context() as patch:
        patch.setattr(start, "_install", interrupted)
        with pytest.raises(KeyboardInterrupt):
            start.set_up(root, extras="")
    start.set_up(root, extras="")
    assert not (root / ".venv" / "half").exists()


def test_without_venv_pip_and_uv_one_line_says_what_to_install_and_nothing_is_left(
    root: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    monkeypatch.setattr(start, "_has", lambda module: False)
    monkeypatch.setenv("PATH", str(root))
    with pytest.raises(SystemExit, match="1"):
        start.set_up(root, extras="")
    said = capsys.readouterr().err
    assert said.count("\n") == 1
    assert "apt install python3-venv" in said
    assert not (root / ".venv").exists()


def test_without_a_working_venv_pip_drives_one_that_has_no_pip_of_its_own(
    root: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    calls = []
    real = subprocess.call

    def call(command: list[str], **more: object) -> int:
        if "install" in command:
            calls.append(command)
            return 0
        return real(command, **more)

    monkeypatch.setattr(start, "_has", lambda module: module in ("venv", "pip"))
    monkeypatch.setattr(start.subprocess, "call", call)
    python = start.set_up(root, extras="test")
    wanted = ["-m", "pip", "--python", str(python), "install", "--quiet", "--editable", ".[test]"]
    assert calls == [[sys.executable, *wanted]]


def test_a_failed_installation_ends_with_one_line(
    root: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    real = subprocess.call
    monkeypatch.setattr(start, "_has", lambda module: module in ("venv", "pip"))
    monkeypatch.setattr(
        start.subprocess, "call", lambda command, **more: 1 if "install" in command else real(command, **more)
    )
    with pytest.raises(SystemExit, match="1"):
        start.set_up(root, extras="")
    assert "could not be installed" in capsys.readouterr().err


@pytest.mark.skipif(os.name == "nt", reason="links and shells of another kind")
def test_the_main_job_ends_with_the_command_that_opens_the_screen(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    ran = []
    monkeypatch.setattr(start, "set_up", lambda root, extras: root / ".venv/bin/python")
    monkeypatch.setattr(start.subprocess, "call", lambda command, **more: ran.append(command[1:]) or 0)
    assert start.main([]) == 0
    assert ran == [["-m", "planner.cli", "compare", "demo_fleet"]]
    last = capsys.readouterr().out.splitlines()[-1]
    assert shlex.split(last) == [str(ROOT / ".venv/bin/spoolwright"), "serve", str(ROOT / "demo_fleet")]


def test_an_old_python_can_read_the_file_and_is_told_what_it_lacks(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture
) -> None:
    ast.parse(Path(start.__file__).read_text(encoding="utf-8"), feature_version=(3, 8))
    monkeypatch.setattr(start.sys, "version_info", (3, 8, 10, "final", 0))
    monkeypatch.setenv("PATH", "")
    with pytest.raises(SystemExit, match="1"):
        start.main([])
    assert "Python 3.8.10 is too old" in capsys.readouterr().err


def test_only_the_standard_library_is_imported() -> None:
    code = "import sys; sys.path.insert(0, sys.argv[1]); import planner.start; print(planner.start.USAGE)"
    done = subprocess.run([sys.executable, "-I", "-S", "-c", code, str(ROOT)], capture_output=True, check=True)
    assert done.stdout.startswith(b"usage")


def test_a_wrong_word_is_wrong_usage(capsys: pytest.CaptureFixture) -> None:
    assert start.main(["tset"]) == 2
    assert "usage" in capsys.readouterr().err


@pytest.mark.long
def test_a_fresh_copy_sets_itself_up_for_real(root: Path) -> None:
    subprocess.run(["git", "clone", "--quiet", str(ROOT), str(root / "copy")], check=True)
    subprocess.run([sys.executable, "-m", "planner.start", "setup"], cwd=root / "copy", check=True)
    command = [str(root / "copy/.venv/bin/spoolwright"), "--version"]
    assert b"spoolwright" in subprocess.check_output(command)
