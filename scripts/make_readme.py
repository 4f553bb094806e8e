"""Fill the README's output blocks and figures with what the program prints now; run from the project's root.

Every command in a ``console`` block that begins with ``.venv/bin/hopwright`` is run through a shell, and what it
prints replaces what stood below it. ``--check`` only says whether the README is up to date.
"""

import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
FIGURES = {
    "ridge_to_mill": "study sample_dem/ridge_to_mill.toml --figure",
    "quarry_to_island": "study sample_dem/quarry_to_island.toml --figure",
    "margin": "study sample_dem/ridge_to_mill.toml --margin-figure",
    "heights": "heights sample_dem/ridge_to_mill.toml --figure",
}
BLOCK = re.compile(r"```console\n\$ (?P<command>\.venv/bin/hopwright .*)\n(?P<output>(?:.*\n)*?)```\n")
MOST_LINES = 45
SETTINGS = {name: value for name, value in os.environ.items() if name not in ("FORCE_COLOR", "TTY_COMPATIBLE")}
SETTINGS |= {"PYTHONUTF8": "1"}  # the same output on every machine


def printed(command: str) -> str:
    """Give what a command prints, cut after MOST_LINES lines."""
    done = subprocess.run(
        command, shell=True, cwd=ROOT, env=SETTINGS, capture_output=True, encoding="utf-8", check=False
    )
    if done.returncode not in (0, 1):
        raise SystemExit(f"{command}\n{done.stderr}")
    lines = [line.rstrip() for line in done.stdout.rstrip("\n").split("\n")]
    return "\n".join([*lines[:MOST_LINES], *(["..."] if len(lines) > MOST_LINES else [])]) + "\n"


def main() -> None:
    """Rewrite the README and its figures, or check the README."""
    (ROOT / "out").mkdir(exist_ok=True)
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    fresh = BLOCK.sub(lambda m: f"```console\n$ {m['command']}\n{printed(m['command'])}```\n", text)
    if "--check" in sys.argv:
        raise SystemExit(0 if fresh == text else "README.md: its output differs from the program's; run this script")
    (ROOT / "README.md").write_text(fresh, encoding="utf-8")
    folder = ROOT / "sample_dem" / "figures"
    shutil.rmtree(folder, ignore_errors=True)
    folder.mkdir()
    for name, command in FIGURES.items():
        printed(f".venv/bin/hopwright {command} sample_dem/figures/{name}.png --quiet")


if __name__ == "__main__":
    main()
