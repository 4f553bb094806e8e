"""Hop files, rasters and kills by the thousand, each in a process of its own: called by scripts/fuzz.

Hop files are mutants of the sample ones and of the starter, rasters those of tests/odd_rasters.py and mutants of them,
kills are signals at random moments of every command that writes. The only outcomes allowed are an answer (exit code 0
or 1) and a refusal in one line (2); a raster that hides its wall must not let the hop pass; a kill must leave every
file whole, and all files of a command old or all new. Everything else is a finding: it is printed, kept in the folder
given by ``--keep``, and makes the exit code 1.
"""

from __future__ import annotations

import argparse
import io
import json
import os
import random
import resource
import shutil
import signal
import subprocess
import sys
import tempfile
import time
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import redirect_stdout, suppress
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]

import odd_rasters  # noqa: E402
from odd_hops import KINDS, SAMPLES, fault, good_hops, mutated  # noqa: E402

from profiler.cli import main  # noqa: E402

HANGS_S = 60.0
MEMORY_BYTES = 4_000_000_000
COMMANDS = ("study", "study", "study", "losses", "reach", "heights", "terrain . --metadata-only --hop")


@dataclass(frozen=True)
class Outcome:
    """What a run of the program came to."""

    code: int
    out: str
    err: str
    seconds: float
    peak_bytes: int


def attempt(words: list[str]) -> Outcome:
    """Run the command line in a fork of this process, which has the libraries loaded, under a limit of memory."""
    with tempfile.TemporaryFile() as out, tempfile.TemporaryFile() as err:
        child = os.fork()
        if child == 0:
            run_child(words, out.fileno(), err.fileno())
        started, ended = time.monotonic(), 0
        while not ended:
            ended, status, usage = os.wait4(child, os.WNOHANG)
            if not ended and time.monotonic() - started > HANGS_S:
                os.kill(child, signal.SIGKILL)
            time.sleep(0.0005)
        texts = []
        for file in (out, err):
            file.seek(0)
            texts.append(file.read().decode(errors="surrogateescape"))
    seconds = usage.ru_utime + usage.ru_stime  # other programs disturb the clock on the wall
    return Outcome(os.waitstatus_to_exitcode(status), *texts, seconds, usage.ru_maxrss * 1024)


def run_child(words: list[str], out: int, err: int) -> None:
    """Be the process of one command, to its end."""
    code = 99
    try:
        os.dup2(out, 1)
        os.dup2(err, 2)
        resource.setrlimit(resource.RLIMIT_AS, (MEMORY_BYTES, MEMORY_BYTES))
        sys.argv[1:] = words
        main()
    except SystemExit as stop:
        code = stop.code if isinstance(stop.code, int) else 98
    finally:
        for stream in (sys.stdout, sys.stderr):
            stream.flush()
        os._exit(code)


@dataclass(frozen=True)
class Finding:
    """Something that must not be: which trial, what, and the folder that shows it."""

    trial: str
    what: str
    folder: Path


Trial = Callable[[random.Random, Path], tuple[str, str, str | None]]
"""Given chance and an empty folder to stand in: the kind that was tried, what came of it, and what is wrong with it."""


def try_hop(chance: random.Random, folder: Path) -> tuple[str, str, str | None]:
    """Run a command on a mutant of a good hop file."""
    for raster in SAMPLES.glob("*.tif"):
        (folder / raster.name).symlink_to(raster)
    mutations = [
        (chance.choice(sorted(KINDS)), chance.random(), chance.randrange(10_000))
        for _ in range(chance.choice((1, 1, 2, 4)))
    ]
    stray = chance.randrange(10_000) if chance.random() < 0.02 else None
    Path("hop.toml").write_bytes(mutated(chance.choice(good_hops()), mutations, stray))
    words = [*chance.choice(COMMANDS).split(), "hop.toml"]
    Path("words.json").write_text(json.dumps(words))
    found = attempt(words)
    kind = "several mutations" if len(mutations) > 1 else mutations[0][0]
    return kind, f"exit code {found.code}", fault(found.code, found.out, found.err, found.seconds)


def try_raster(chance: random.Random, folder: Path) -> tuple[str, str, str | None]:
    """Study the hop that a wall stops over an odd raster or a mutant of one."""
    kind = chance.choice(sorted(odd_rasters.KINDS))
    damaged = chance.random() < 0.5
    raster = odd_rasters.mutated(kind, folder, chance.randrange(2**32)) if damaged else odd_rasters.KINDS[kind](folder)
    words = ["study", str(odd_rasters.write_hop(folder, raster)), "-q"]
    Path("words.json").write_text(json.dumps([kind, *words]))
    found = attempt(words)
    wrong = fault(found.code, found.out, found.err, found.seconds)
    if found.code == 0 and wrong is None:
        wrong = "passes, though a wall stands in the way"
    return f"{'damaged' if damaged else 'odd'} {kind.partition('_')[0]}", f"exit code {found.code}", wrong


WRITERS = (
    ("study", "hop.toml", "--json", "a.json", "--csv", "b.csv"),
    ("study", "hop.toml", "--figure", "a.svg", "--margin-figure", "b.pdf", "--json", "c.json"),
    ("heights", "hop.toml", "--write", "a.toml", "--figure", "b.png", "--csv", "c.csv"),
    ("losses", "hop.toml", "--json", "a.json"),
    ("reach", "hop.toml", "--json", "a.json"),
    ("compare", "hop.toml", "--variant", "frequency_ghz=8", "--json", "a.json"),
    ("terrain", "country.tif", "--json", "a.json"),
    ("starter", "a.toml", "--force"),
)
SIGNALS = (signal.SIGTERM, signal.SIGINT, signal.SIGHUP, signal.SIGKILL)
WHOLE = {
    ".json": (b"{", b"}\n"),
    ".csv": (b"", b"\n"),
    ".svg": (b"<?xml", b"</svg>\n"),
    ".pdf": (b"%PDF", b"%%EOF\n"),
    ".png": (b"\x89PNG", b"IEND\xaeB`\x82"),
    ".toml": (b"", b"\n"),
}
OLD = b"old"
_usual_s: dict[tuple[str, ...], float] = {}


def try_kill(chance: random.Random, folder: Path) -> tuple[str, str, str | None]:
    """End a command that writes at a random moment, every other time near its end, where the files are written."""
    for raster in SAMPLES.glob("*.tif"):
        (folder / raster.name).symlink_to(raster)
    Path("hop.toml").write_text(good_hops()[1].replace("draws = 2000", "draws = 100"), encoding="utf-8")
    words = chance.choice(WRITERS)
    outputs = [word for word in words if word[0] in "abc" and word[1:2] == "."]
    number = chance.choice(SIGNALS)
    for output in outputs:
        Path(output).write_bytes(OLD)
    usual = _usual_s.get(words) or _usual_s.setdefault(words, time_of(words, outputs))
    wait = usual * (chance.uniform(0.85, 1.1) if chance.random() < 0.5 else chance.uniform(0.0, 1.0))
    Path("words.json").write_text(json.dumps([*words, number.name, wait]))
    with started(words) as running:
        time.sleep(wait)
        running.send_signal(number)
        err = running.communicate(timeout=HANGS_S)[1]
    return words[0], number.name if running.returncode < 0 else "ended before", left_behind(outputs, number, err)


def started(words: tuple[str, ...]) -> subprocess.Popen[bytes]:
    """Start a command in a process of its own."""
    command = [sys.executable, "-m", "profiler", *words]
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    return subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, env=environment)


def time_of(words: tuple[str, ...], outputs: list[str]) -> float:
    """Seconds that a command takes when nobody ends it; its outputs are made old again."""
    begun = time.monotonic()
    with started(words) as running:
        running.communicate()
    for output in outputs:
        assert Path(output).read_bytes() != OLD, f"{words} did not write {output}"
        Path(output).write_bytes(OLD)
    return time.monotonic() - begun


def left_behind(outputs: list[str], number: signal.Signals, err: bytes) -> str | None:
    """Say what is wrong with the files of a command that was ended. Nothing can be tidied up after SIGKILL."""
    new = []
    for output in outputs:
        data = Path(output).read_bytes()
        first, last = WHOLE[Path(output).suffix]
        new.append(data != OLD)
        if data != OLD and not (data.startswith(first) and data.endswith(last)):
            return f"{output} is neither old nor whole"
    if number is not signal.SIGKILL:
        if len(set(new)) > 1:
            return f"some of {', '.join(outputs)} are new, some old"
        if stray := [path.name for path in Path().iterdir() if path.name.startswith(".")]:
            return f"left {', '.join(stray)}"
    # Ctrl-C in the first hundredths of a second finds Python itself still loading: none of our modules is in its words
    python_loads = number is signal.SIGINT and str(ROOT).encode() not in err
    said = err.decode(errors="replace")[:300]
    return None if not said or python_loads or ": not written, since " in said else f"said {said}"


def tried(name: str, trial: Trial, count: int, seed: int, keep: Path) -> Iterator[Finding]:
    """Make many trials of one sort, print what was tried and what came of it, and give the findings."""
    kinds: Counter[str] = Counter()
    results: Counter[str] = Counter()
    begun = time.monotonic()
    for number in range(count):
        folder = Path(tempfile.mkdtemp(prefix="fuzz-"))
        os.chdir(folder)
        kind, result, wrong = trial(random.Random(f"{seed} {name} {number}"), folder)
        kinds[kind] += 1
        results[result] += 1
        os.chdir(ROOT)
        if wrong:
            kept = keep / f"{name.replace(' ', '_')}_{number}"
            shutil.rmtree(kept, ignore_errors=True)
            shutil.copytree(folder, kept, symlinks=True, ignore_dangling_symlinks=True, copy_function=copied)
            print(f"{name} {number} ({kind}): {wrong}", file=sys.stderr, flush=True)
            yield Finding(f"{name} {number}", wrong, kept)
        shutil.rmtree(folder)
        if number % 1000 == 999:
            print(f"{name}: {number + 1} so far", file=sys.stderr, flush=True)
    minutes = (time.monotonic() - begun) / 60.0
    print(f"{name}: {count} in {minutes:.1f} min, seed {seed}")
    for title, counts in (("tried", kinds), ("came to", results)):
        print(f"  {title}: " + ", ".join(f"{what} {often}" for what, often in counts.most_common()), flush=True)


def copied(source: str, target: str) -> str:
    """Copy a file, but no pipe, which would never end."""
    return shutil.copy2(source, target) if Path(source).is_file() else target


def run() -> int:
    parser = argparse.ArgumentParser(
        prog="scripts/fuzz", description=__doc__, formatter_class=argparse.RawTextHelpFormatter
    )
    parser.add_argument("--hops", type=int, default=20_000)
    parser.add_argument("--rasters", type=int, default=500)
    parser.add_argument("--kills", type=int, default=200)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--keep", type=Path, default=ROOT / "out" / "fuzz", help="folder for what shows a finding")
    given = parser.parse_args()
    warm_up()
    signal.signal(signal.SIGINT, signal.default_int_handler)  # nohup has it ignored, and children would
    findings: list[Finding] = []
    for name, trial, count in (
        ("hop files", try_hop, given.hops),
        ("rasters", try_raster, given.rasters),
        ("kills", try_kill, given.kills),
    ):
        findings += tried(name, trial, count, given.seed, given.keep.resolve())
    print(f"findings: {len(findings)}")
    for what, often in Counter(finding.what for finding in findings).most_common():
        print(f"  {often} x {what}")
    return 1 if findings else 0


def warm_up() -> None:
    """Run some commands here, so that every fork has loaded what they need."""
    for words in (("study", "-q"), ("heights", "-q"), ("losses", "-q"), ("reach",), ("study",)):
        with redirect_stdout(io.TextIOWrapper(io.BytesIO())), suppress(SystemExit):
            main([words[0], str(SAMPLES / "ridge_to_mill.toml"), *words[1:]])


if __name__ == "__main__":
    sys.exit(run())
