"""No odd raster lets a hop pass over ground that nobody knows, hangs, or is answered by more than one line."""

import signal

import pytest
from odd_rasters import EXPECTED, KINDS, write_hop

from profiler.cli import main


def run(arguments, capsys, seconds=20):
    """Run the command line in this process; return exit code, standard output and standard error."""

    def too_long(*_):
        raise TimeoutError

    before = signal.signal(signal.SIGALRM, too_long)
    signal.alarm(seconds)
    try:
        with pytest.raises(SystemExit) as done:
            main([str(argument) for argument in arguments])
    finally:
        signal.alarm(0)
        signal.signal(signal.SIGALRM, before)
    return done.value.code, *capsys.readouterr()


def require_answered(code, out, err):
    assert code in (0, 1, 2)
    if code == 2:
        assert out == ""
        assert err.startswith("hopwright: ")
        assert err.count("\n") == 1
        assert len(err) < 2000
    for text in (out, err):
        assert text.replace("\n", "").isprintable()


@pytest.mark.parametrize("kind", KINDS)
def test_no_odd_raster_hides_the_wall(kind, tmp_path, capsys):
    folder = tmp_path / "terrain"
    folder.mkdir()
    hop = write_hop(tmp_path, KINDS[kind](folder))
    code, out, err = run(["study", hop, "--quiet"], capsys)
    require_answered(code, out, err)
    assert code == (2 if EXPECTED[kind] else 1), out + err
    assert EXPECTED[kind] in err


@pytest.mark.parametrize("kind", KINDS)
def test_terrain_and_study_judge_alike(kind, tmp_path, capsys):
    folder = tmp_path / "terrain"
    folder.mkdir()
    terrain = KINDS[kind](folder)
    hop = write_hop(tmp_path, terrain)
    code, out, err = run(["terrain", terrain, "--hop", hop, "--no-color"], capsys)
    require_answered(code, out, err)
    assert (code == 0) == (EXPECTED[kind] == ""), out + err
