"""The JSON Schemas of what the commands give, against hops that they were not made from."""

import json
from functools import cache
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator, ValidationError

from profiler.cli import main
from profiler.document import output_schema
from profiler.hopfile import starter

ROOT = Path(__file__).resolve().parent.parent
COUNTRY = str(ROOT / "sample_dem" / "country.tif")
RIDGE, QUARRY = (str(ROOT / "sample_dem" / name) for name in ("ridge_to_mill.toml", "quarry_to_island.toml"))


@cache
def validator(command: str) -> Draft202012Validator:
    schema = json.loads(output_schema(command))
    Draft202012Validator.check_schema(schema)
    return Draft202012Validator(schema)


@pytest.fixture
def start(tmp_path):
    """Write the starter's hop over the sample country."""
    file = tmp_path / "start.toml"
    country = json.dumps(str(ROOT / "sample_dem" / "country.tif"))
    file.write_text(starter().replace('"terrain/"', country), encoding="utf-8")
    return str(file)


def given(capsys, *words):
    with pytest.raises(SystemExit) as ended:
        main([*words, "--json", "-"])
    out = capsys.readouterr().out
    assert ended.value.code in (0, 1)
    return json.loads(out)


@pytest.mark.parametrize("command", ["study", "heights", "losses", "reach", "compare", "terrain"])
def test_what_a_command_gives_for_another_hop_keeps_to_its_schema(capsys, start, command):
    words = {"compare": (command, start, QUARRY), "terrain": (command, COUNTRY, "--hop", start)}.get(
        command, (command, start)
    )
    found = given(capsys, *words)
    validator(command).validate(found)
    assert found["schema"] == f"hopwright-{command}/1"


@pytest.mark.parametrize(
    "words",
    [
        (QUARRY, "--set", "site_a.antenna_m=60"),
        (RIDGE, "--set", "site_b.antenna_m=2", "--set", "confidence.minimum_chance_percent=99"),
        (
            RIDGE,
            "--set",
            "availability.multipath_method=vigants-barnett",
            "--set",
            "availability.climate=average",
            "--set",
            "availability.annual_temperature_c=11",
        ),
        (RIDGE, "--set", "diffraction.method=knife-edge", "--set", "site_b.position=46.05 -38.98"),
    ],
)
def test_variants_keep_to_the_schema_of_a_study(capsys, words):
    validator("study").validate(given(capsys, "study", *words))


def test_a_schema_refuses_what_is_missing_or_new_or_of_another_sort(capsys):
    found = given(capsys, "losses", QUARRY)
    check = validator("losses")
    check.validate(found)
    for spoil in ({"schema": None}, {"new": 1}):
        with pytest.raises(ValidationError):
            check.validate(found | spoil)
    with pytest.raises(ValidationError):
        check.validate({key: value for key, value in found.items() if key != "schema"})
