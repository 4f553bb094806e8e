"""Plant mistakes in copies of the project and see whether its tests catch them: called by scripts/plant.

Each plant is one replacement in one file: a wrong sign, a swap of the two ends, a constant. The tests run on a copy,
the likely ones first and then the whole suite, and stop at the first that fails. A plant that every test passes over
has SURVIVED: a test is missing, and the exit code is 1. A plant whose text no longer stands in its file, or stands
there more than once, is an error: move it along with the code.
"""

from __future__ import annotations

import argparse
import os
import re
import shutil
import subprocess
import sys
import tempfile
import time
import tomllib
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
PLANTS = Path(__file__).with_suffix(".toml")
LEFT_OUT = shutil.ignore_patterns(".git", ".venv", "__pycache__", ".*_cache", ".hypothesis", "dist", "out")


@dataclass(frozen=True, slots=True)
class Plant:
    """One mistake: ``old`` stands once in ``file`` and becomes ``new``; ``tests`` should see it first."""

    what: str
    file: str
    old: str
    new: str
    tests: tuple[str, ...] = ()

    def into(self, text: str) -> str:
        """Plant the mistake in the text of its file."""
        if text.count(self.old) != 1:
            raise SystemExit(
                f"{PLANTS.name}: {self.what}: {self.old!r} stands {text.count(self.old)} times in {self.file}"
            )
        return text.replace(self.old, self.new)


def plants() -> list[Plant]:
    """Read the plants."""
    rows = tomllib.loads(PLANTS.read_text(encoding="utf-8"))["plant"]
    return [Plant(**{**row, "tests": tuple(row.get("tests", ()))}) for row in rows]


def run(copy: Path, tests: tuple[str, ...], workers: str) -> str | None:
    """Run tests on a copy; the first that fails, or None."""
    command = [
        sys.executable,
        "-m",
        "pytest",
        "-q",
        "-x",
        "-m",
        "not slow",
        "-p",
        "no:cacheprovider",
        "-n",
        workers,
        *tests,
    ]
    environment = {**os.environ, "PYTHONPATH": str(copy), "PYTHONDONTWRITEBYTECODE": "1"}
    done = subprocess.run(command, cwd=copy, env=environment, capture_output=True, text=True, check=False)
    if done.returncode == 0:
        return None
    found = re.search(r"^(?:FAILED|ERROR) (\S+)", done.stdout, re.MULTILINE)
    return found[1] if found else f"pytest stopped with exit code {done.returncode}"


def outcome(plant: Plant, folder: Path, workers: str) -> str | None:
    """Plant one mistake in a fresh copy and give the test that sees it."""
    copy = folder / "hopwright"
    shutil.rmtree(copy, ignore_errors=True)
    shutil.copytree(ROOT, copy, ignore=LEFT_OUT, symlinks=True)
    file = copy / plant.file
    file.write_text(plant.into(file.read_text(encoding="utf-8")), encoding="utf-8")
    return (run(copy, plant.tests, "0") if plant.tests else None) or run(copy, (), workers)


def main() -> None:
    """Plant each mistake in turn and say what became of it."""
    parser = argparse.ArgumentParser(prog="scripts/plant", description=__doc__)
    parser.add_argument("words", nargs="*", help="plant only those whose description holds one of these words")
    parser.add_argument("--workers", default="auto", help="processes for the whole suite")
    parser.add_argument("--check", action="store_true", help="only see that every plant still has its place")
    asked = parser.parse_args()
    chosen = [each for each in plants() if not asked.words or any(word in each.what for word in asked.words)]
    for plant in chosen:
        plant.into((ROOT / plant.file).read_text(encoding="utf-8"))
    if asked.check:
        print(f"{len(chosen)} plants have their place")
        return
    survived = 0
    with tempfile.TemporaryDirectory() as folder:
        if run(shutil.copytree(ROOT, Path(folder, "clean"), ignore=LEFT_OUT, symlinks=True), (), asked.workers):
            raise SystemExit("the tests fail before anything is planted")
        for plant in chosen:
            start = time.perf_counter()
            seen = outcome(plant, Path(folder), asked.workers)
            survived += seen is None
            print(
                f"{'SURVIVED' if seen is None else 'caught':<9}{time.perf_counter() - start:6.0f} s  {plant.what}",
                flush=True,
            )
            print(f"{'':18}{seen or 'by no test'}", flush=True)
    print(f"{len(chosen)} planted, {survived} survived")
    sys.exit(survived > 0)


if __name__ == "__main__":
    main()
