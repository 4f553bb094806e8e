"""Plant mistakes in a copy of the project and see whether its tests catch them: called by scripts/plant.

Each plant is one replacement in one file (scripts/plant.toml): a wrong sign, a swap of the two ends, a constant. The
likely tests run first, then the whole suite, and stop at the first that fails. A plant that every test passes over has
SURVIVED: a test is missing, and the exit code is 1. A plant whose text no longer stands in its file, or stands there
more than once, is an error: move it along with the code.
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
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
PLANTS = Path(__file__).with_suffix(".toml")
LEFT_OUT = shutil.ignore_patterns(".git", ".venv", "__pycache__", ".*_cache", ".hypothesis", "dist", "out")
OPTIONS = ("-q", "-x", "-m", "not slow", "-p", "no:cacheprovider")


@dataclass(frozen=True, slots=True)
class Plant:
    """One mistake: ``old`` stands once in ``file`` and becomes ``new``; ``tests`` should see it first."""

    what: str
    file: str
    old: str
    new: str
    tests: tuple[str, ...]

    def into(self, text: str) -> str:
        """Plant the mistake in the text of its file."""
        if text.count(self.old) != 1 or self.old == self.new:
            raise SystemExit(
                f"{PLANTS.name}: {self.what}: {self.old!r} stands {text.count(self.old)} times in {self.file}: must"
                " stand there once; give the text that stands there now"
            )
        return text.replace(self.old, self.new)


def plants() -> list[Plant]:
    """Read the plants."""
    rows = tomllib.loads(PLANTS.read_text(encoding="utf-8"))["plant"]
    return [Plant(**{**row, "tests": tuple(row["tests"])}) for row in rows]


def run(copy: Path, tests: Sequence[str], workers: str) -> str | None:
    """Run tests on a copy; the first that fails, or None."""
    command = [sys.executable, "-m", "pytest", *OPTIONS, "-n", workers, *tests]
    environment = {**os.environ, "PYTHONPATH": str(copy), "PYTHONDONTWRITEBYTECODE": "1"}
    done = subprocess.run(command, cwd=copy, env=environment, capture_output=True, text=True, check=False)
    if done.returncode == 0:
        return None
    if done.returncode in (4, 5):  # a test that is not there catches nothing
        raise SystemExit(f"{' '.join(tests)}: pytest did not run: {(done.stdout + done.stderr).strip()}")
    found = re.search(r"^(?:FAILED|ERROR) (\S+)", done.stdout, re.MULTILINE)
    return found[1] if found else f"pytest stopped with exit code {done.returncode}"


def seen_by(plant: Plant, copy: Path, workers: str, *, likely_only: bool) -> str | None:
    """Plant one mistake in the copy, give the test that sees it, and take it out again."""
    file = copy / plant.file
    sound = file.read_text(encoding="utf-8")
    file.write_text(plant.into(sound), encoding="utf-8")
    try:
        return run(copy, plant.tests, "0") or (None if likely_only else run(copy, (), workers))
    finally:
        file.write_text(sound, encoding="utf-8")


def main() -> None:
    """Plant each mistake in turn and say what became of it."""
    parser = argparse.ArgumentParser(prog="scripts/plant", description=__doc__)
    parser.add_argument("words", nargs="*", help="plant only those whose description holds one of these words")
    parser.add_argument("--workers", default="auto", help="processes for the whole suite")
    parser.add_argument("--likely", action="store_true", help="run only the tests that each plant names: quick")
    parser.add_argument("--check", action="store_true", help="only see that every plant still has its place")
    asked = parser.parse_args()
    chosen = [each for each in plants() if not asked.words or any(word in each.what for word in asked.words)]
    for plant in chosen:
        plant.into((ROOT / plant.file).read_text(encoding="utf-8"))
        if gone := [test for test in plant.tests if not (ROOT / test).is_file()]:
            raise SystemExit(f"{PLANTS.name}: {plant.what}: there is no {', '.join(gone)}")
    if asked.check:
        print(f"{len(chosen)} plants have their place")
        return
    survived = 0
    with tempfile.TemporaryDirectory() as folder:
        copy = shutil.copytree(ROOT, Path(folder, "hopwright"), ignore=LEFT_OUT, symlinks=True)
        likely = sorted({test for plant in chosen for test in plant.tests})
        if failed := run(copy, likely if asked.likely else (), asked.workers):
            raise SystemExit(f"the tests fail before anything is planted: {failed}")
        for plant in chosen:
            start = time.perf_counter()
            seen = seen_by(plant, copy, asked.workers, likely_only=asked.likely)
            survived += seen is None
            word = "SURVIVED" if seen is None else "caught"
            print(f"{word:<9}{time.perf_counter() - start:6.0f} s  {plant.what}: {seen or 'by no test'}", flush=True)
    print(f"{len(chosen)} planted, {survived} survived")
    sys.exit(survived > 0)


if __name__ == "__main__":
    main()
