"""Hop files that went wrong, a few of the many that scripts/fuzz tries: an answer or one line, and nothing else."""

import contextlib
import copy
import functools
import json
import operator
import shutil
import sys
import time
import tomllib
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from odd_hops import KINDS, SAMPLES, fault, good_hops, mutated

from profiler.cli import main
from profiler.errors import InputError
from profiler.hopfile import starter
from profiler.hopfile.build import build_hop

MUTATIONS = st.lists(
    st.tuples(st.sampled_from(sorted(KINDS)), st.floats(0.0, 1.0), st.integers(0, 10_000)), min_size=1, max_size=4
)


@pytest.fixture
def here(tmp_path, monkeypatch):
    """Stand in a folder with the sample country."""
    for raster in SAMPLES.glob("*.tif"):
        shutil.copy(raster, tmp_path)
    monkeypatch.chdir(tmp_path)
    return tmp_path


@settings(max_examples=80, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    text=st.sampled_from(good_hops()),
    mutations=MUTATIONS,
    stray=st.none() | st.none() | st.integers(0, 10_000),
    command=st.sampled_from(["study", "study", "losses", "reach", "heights"]),
)
def test_a_mutated_hop_file_gets_an_answer_or_one_line(here, capfd, text, mutations, stray, command):
    (here / "hop.toml").write_bytes(mutated(text, mutations, stray))
    capfd.readouterr()
    started = time.process_time()
    with pytest.raises(SystemExit) as stop:
        main([command, "hop.toml", "-q"])
    seconds = time.process_time() - started
    sys.stdout.flush()
    assert fault(stop.value.code, *capfd.readouterr(), seconds) is None


def test_the_good_hop_files_are_answered(here, capfd):
    """Else every mutant would be refused for the same reason."""
    for text in good_hops():
        (here / "hop.toml").write_text(text, encoding="utf-8")
        with pytest.raises(SystemExit) as stop:
            main(["study", "hop.toml", "-q"])
        assert stop.value.code in (0, 1)
    assert capfd.readouterr().err == ""


@pytest.mark.parametrize(
    ("outcome", "words"),
    [
        ((70, "", "hopwright: a fault\n"), "exit code 70"),
        ((-11, "", ""), "exit code -11"),
        ((2, "", ""), "refused in 0 lines"),
        ((2, "", "hopwright: a\nb\n"), "refused in 2 lines"),
        ((2, "x", "hopwright: a\n"), "1 letters on standard output"),
        ((2, "", "Traceback\n"), "refused in 1 lines"),
        ((0, "x\n", "warning\n"), "a line beside an answer"),
        ((1, "x\x1b\n", ""), "letters that do not print"),
        ((2, "", "hopwright: \u202ea\n"), "letters that do not print"),
        ((2, "", "hopwright: a\n", 2.5), "took 2.5 s"),
    ],
)
def test_what_counts_as_a_finding(outcome, words):
    assert words in fault(*outcome)
    assert fault(0, "PASSES\n", "") is None
    assert fault(2, "", "hopwright: hop.toml: must be TOML\n", 1.0) is None


def test_any_part_that_is_left_out_is_answered_or_asked_for():
    """Every key, every table and every list of a full hop file in turn: what may be left out may really be."""
    country = json.dumps(str(SAMPLES / "country.tif"))
    full = tomllib.loads(starter().replace('"terrain/"', country))
    places = list(parts(full))
    assert len(places) > 60
    for place in places:
        raw = copy.deepcopy(full)
        table = functools.reduce(operator.getitem, place[:-1], raw)
        del table[place[-1]]
        with contextlib.suppress(InputError):
            build_hop(raw, "hop.toml", Path())


def parts(table, at=()):
    for key, value in table.items():
        yield (*at, key)
        if isinstance(value, dict):
            yield from parts(value, (*at, key))
        for number, inner in enumerate(value) if isinstance(value, list) else []:
            if isinstance(inner, dict):
                yield from parts(inner, (*at, key, number))
