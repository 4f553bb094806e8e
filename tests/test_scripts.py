"""scripts/_venv: which Python it takes, when it installs, and what it says, with a PATH that holds only stand-ins."""

import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
TOOLS = ("bash", "cat", "cksum", "cp", "mkdir", "rm")

STAND_IN = """#!{bash}
case "$*" in
    *version_info*) exit {old} ;;
    *"import venv, ensurepip"*) exit {bare} ;;
    *base_prefix*) echo {name} ;;
    "-m venv --clear .venv") rm -rf .venv && mkdir -p .venv/bin && cp "$0" .venv/bin/python ;;
    "-m pip --version") [ -e .venv/pip ] ;;
    "-m ensurepip") [ {bare} = 0 ] && : > .venv/pip ;;
    "-m pip install "*) echo "$@" >> installed.log; exit {offline} ;;
esac
"""

pytestmark = pytest.mark.skipif(shutil.which("bash") is None, reason="the scripts are for bash, and there is none")


@pytest.fixture
def project(tmp_path):
    """Make a project with nothing in it but what the script reads, and a folder for its PATH."""
    (tmp_path / "scripts").mkdir()
    shutil.copy(ROOT / "scripts" / "_venv", tmp_path / "scripts")
    (tmp_path / "pyproject.toml").touch()
    (tmp_path / "bin").mkdir()
    for tool in TOOLS:
        (tmp_path / "bin" / tool).symlink_to(shutil.which(tool))
    return tmp_path


def stand_in(project, name, *, old=0, bare=0, offline=0):
    """Put a stand-in for a Python on the PATH: too old, without ensurepip, or without a package index."""
    file = project / "bin" / name
    file.write_text(STAND_IN.format(bash=shutil.which("bash"), name=name, old=old, bare=bare, offline=offline))
    file.chmod(0o755)


def ensure(project, extras="", python=None):
    """Run ensure_venv; return its exit code and what it says."""
    environment = {"PATH": str(project / "bin")} | ({} if python is None else {"PYTHON": python})
    command = [shutil.which("bash"), "-euc", f'. scripts/_venv; ensure_venv "{extras}"']
    done = subprocess.run(command, cwd=project, env=environment, capture_output=True, text=True, check=False)
    assert done.stdout == ""
    return done.returncode, done.stderr.strip()


def made_with(project):
    return re.search(r"echo (python\S+)", (project / ".venv" / "bin" / "python").read_text())[1]


def installs(project):
    log = project / "installed.log"
    return [line.rpartition(" ")[2] for line in log.read_text().splitlines()] if log.exists() else []


def test_a_newer_python_without_ensurepip_does_not_hide_a_good_one(project):
    stand_in(project, "python3.13", bare=1)
    stand_in(project, "python3.12", old=1)
    stand_in(project, "python3.11")
    assert ensure(project) == (0, "Installing hopwright into .venv ...")
    assert made_with(project) == "python3.11"


@pytest.mark.parametrize(
    ("pythons", "message"),
    [
        ({}, "needs Python 3.11 or newer and found none: apt-get install python3 python3-venv"),
        ({"python3": {"old": 1}}, "needs Python 3.11 or newer and found none"),
        (
            {"python3.12": {"bare": 1}, "python3": {"bare": 1}},
            "python3.12 cannot make virtual environments: apt-get install python3.12-venv, then run this again",
        ),
    ],
)
def test_no_python_that_will_do(project, pythons, message):
    for name, faults in pythons.items():
        stand_in(project, name, **faults)
    code, said = ensure(project)
    assert (code, message in said, said.count("\n")) == (2, True, 0)
    assert not (project / ".venv").exists()


@pytest.mark.parametrize(
    ("python", "message"),
    [
        ("python9", "PYTHON=python9: there is no such command: must be a Python 3.11 or newer with venv;"),
        ("python3.8", "PYTHON=python3.8: it is no Python 3.11 or newer: must"),
        ("python3.13", "PYTHON=python3.13: it cannot make virtual environments (no venv or ensurepip): must"),
    ],
)
@pytest.mark.parametrize("made_before", [False, True])
def test_a_wrong_python_that_is_asked_for_is_an_error(project, python, message, made_before):
    stand_in(project, "python3.8", old=1)
    stand_in(project, "python3.13", bare=1)
    stand_in(project, "python3.11")
    if made_before:
        assert ensure(project)[0] == 0
    code, said = ensure(project, python=python)
    assert (code, said[: len(message)]) == (2, message)


def test_the_python_asked_for_is_the_one_of_the_environment(project):
    for name in ("python3.12", "python3.11"):
        stand_in(project, name)
    assert ensure(project, python="python3.11")[0] == 0
    assert made_with(project) == "python3.11"
    assert ensure(project, python="python3.11") == (0, "")
    code, said = ensure(project, python="python3.12")
    assert (code, "of another Python: delete it (rm -r .venv)" in said) == (2, True)


def test_it_installs_once_and_again_after_a_change_or_a_move(project):
    stand_in(project, "python3.11")
    assert ensure(project, "[test]")[0] == 0
    assert ensure(project, "[test]") == (0, "")
    assert ensure(project) == (0, "")  # all of it came with the extra
    assert installs(project) == [".[test]"]
    (project / "pyproject.toml").write_text("changed")
    assert ensure(project)[0] == 0
    assert ensure(project, "[test]")[0] == 0
    assert installs(project) == [".[test]", ".", ".[test]"]
    moved = project.with_name("moved")
    project.rename(moved)
    assert ensure(moved)[0] == 0
    assert installs(moved)[3:] == ["."]


def test_an_environment_cut_short_before_pip_gets_it(project):
    stand_in(project, "python3.11")
    (project / ".venv" / "bin").mkdir(parents=True)
    shutil.copy(project / "bin" / "python3.11", project / ".venv" / "bin" / "python")
    assert ensure(project) == (0, "Installing hopwright into .venv ...")


@pytest.mark.parametrize("faults", [{"bare": 1}, {"old": 1}])
def test_an_environment_that_cannot_be_mended_does_not_blame_the_package_index(project, faults):
    stand_in(project, "python3.11")
    stand_in(project, "broken", **faults)
    (project / ".venv" / "bin").mkdir(parents=True)
    shutil.copy(project / "bin" / "broken", project / ".venv" / "bin" / "python")
    code, said = ensure(project)
    assert code == 2
    assert re.fullmatch(
        r"\.venv in \S+ lacks a working Python .*: delete it \(rm -r \.venv\), then run this again", said
    )
    shutil.rmtree(project / ".venv")
    assert ensure(project)[0] == 0


def test_an_environment_whose_python_is_gone_is_made_again(project):
    stand_in(project, "python3.12")
    assert ensure(project)[0] == 0
    (project / ".venv" / "bin" / "python").unlink()
    (project / ".venv" / "bin" / "python").symlink_to("/nowhere/python3.12")
    assert ensure(project) == (0, "Installing hopwright into .venv ...")
    assert installs(project) == [".", "."]


def test_an_install_that_fails_is_tried_again(project):
    stand_in(project, "python3.11", offline=1)
    code, said = ensure(project)
    assert (code, "pip could not install hopwright: see the message above; the package index must be" in said) == (
        2,
        True,
    )
    stand_in(project, "python3.11")
    shutil.copy(project / "bin" / "python3.11", project / ".venv" / "bin" / "python")
    assert ensure(project)[0] == 0
    assert ensure(project) == (0, "")


@pytest.mark.parametrize("script", ["demo", "test", "wheel_check", "lowest_check", "bench"])
def test_the_scripts_can_be_run_and_read(script):
    path = ROOT / "scripts" / script
    assert os.access(path, os.X_OK)
    subprocess.run([shutil.which("bash"), "-n", path], check=True)


def test_every_planted_mistake_has_its_place_and_its_tests():
    """Where a text moved, move its plant along in scripts/plant.toml: it is a slip that the tests must catch."""
    command = [sys.executable, str(ROOT / "scripts" / "plant.py"), "--check"]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert int(done.stdout.split()[0]) >= 95
