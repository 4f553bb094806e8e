"""Write the JSON Schemas of what `--json` gives, from what it gives for hops that differ in all that a hop may say.

A schema has every key, whether it is always there, and every type that was seen. What a file leaves out is null there.
Run it after a change of a document; `tests/test_output_schemas.py` holds other hops against it.
"""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parent.parent
FOLDER = ROOT / "profiler" / "document" / "schemas"
RIDGE, QUARRY = "sample_dem/ridge_to_mill.toml", "sample_dem/quarry_to_island.toml"
FULL = [
    "--set=availability.diversity={spacing_m=3}",
    "--set=availability.objective.minutes_per_year=9",
    "--set=availability.objective.errored_seconds_ratio=1e-4",
    "--set=availability.objective.errored_threshold_offset_db=4",
    "--set=radio.mode[1].objective={year_percent=0.1}",
    "--set=return_frequency_ghz=7.66",
    "--set=radio.a.overload_dbm=-20",
    "--set=radio.a.line_length_m=30",
    "--set=radio.a.line_loss_db_per_100m=4",
    "--set=site_a.ground_m=757",
    "--set=site_a.structure_height_m=40",
    "--set=heights.loss_limit_db=6",
]
DISH = "--set=radio.b={power_dbm=20, gain_dbi=36}"
BARE = [DISH, "--set=confidence.vary_k=false", "--set=availability.k_percentiles=[]"]
LOOSE = ["--a", "46.12238, -39.10549", "--b", "46.07878, -38.97025", "--antenna-a", "30", "--antenna-b", "60'"]
LOOSE += ["--frequency-ghz", "7.4", "--terrain", "sample_dem/country.tif", "--preset", "0.6-f1-plus-3m"]
BLIND = ["--set=radio.mode=[]", "--set=rules.rule=[{k=1.0, fresnel_fraction=0.0}]"]
HARD = [
    ["--set=site_b.antenna_m=5"],
    ["--set=radio.a.power_dbm=-60"],
    ["--set=availability.objective.year_percent=1e-7"],
    ["--set=rules.rule=[{k=0.9, fresnel_fraction=0.6}]", "--set=rules.preset=0.6-f1-plus-3m"],
]
"""Not sure by its chance; no margin; a missed objective; an open one."""
RUNS: dict[str, list[list[str]]] = {
    "study": [
        [RIDGE],
        [QUARRY],
        [RIDGE, *FULL],
        [RIDGE, *BARE],
        [RIDGE, *BLIND],
        LOOSE,
        *([RIDGE, *each] for each in HARD),
    ],
    "heights": [[RIDGE], [QUARRY], [RIDGE, *FULL], [RIDGE, *BARE], [QUARRY, "--set=heights.a.highest_m=200"], LOOSE],
    "losses": [[RIDGE], [QUARRY], LOOSE],
    "reach": [
        [RIDGE],
        [RIDGE, DISH],
        [RIDGE, "--resize", "b", "--efficiency", "0.5"],
        [RIDGE, "--resize", "a"],
        [RIDGE, "--resize", "b", DISH],
    ],
    "terrain": [["sample_dem"], ["sample_dem/country.tif", "--hop", RIDGE]],
    "compare": [[RIDGE, QUARRY, "--variant", "site_b.antenna_m=5"]],
}
"""Commands, and the words behind them."""

Schema = dict[str, Any]


def schema_of(value: Any) -> Schema:
    """Describe one value."""
    if isinstance(value, dict):
        properties = {key: schema_of(each) for key, each in value.items()}
        return {"type": ["object"], "properties": properties, "required": sorted(value), "additionalProperties": False}
    if isinstance(value, list):
        return {"type": ["array"], "items": merged([schema_of(each) for each in value])}
    kinds = {str: "string", bool: "boolean", type(None): "null"}
    return {"type": [kinds.get(type(value), "number")]}


def merged(schemas: list[Schema]) -> Schema:
    """Describe all of several values."""
    if not schemas:
        return {}
    found: Schema = {"type": sorted({kind for each in schemas for kind in each.get("type", [])})}
    objects = [each for each in schemas if "properties" in each]
    if objects:
        names = dict.fromkeys(name for each in objects for name in each["properties"])
        found["properties"] = {
            name: merged([each["properties"][name] for each in objects if name in each["properties"]]) for name in names
        }
        found["required"] = sorted(set.intersection(*(set(each["required"]) for each in objects)))
        found["additionalProperties"] = False
    items = [each["items"] for each in schemas if each.get("items")]
    if "array" in found["type"]:
        found["items"] = merged(items)
    return found


def document(command: str, words: list[str]) -> Any:
    """Run a command and read what it gives."""
    call = [sys.executable, "-m", "profiler", command, *words, "--json", "-"]
    done = subprocess.run(call, cwd=ROOT, capture_output=True, text=True, check=False)
    if done.returncode not in (0, 1):
        sys.exit(done.stderr)
    return json.loads(done.stdout)


def main() -> None:
    for command, runs in RUNS.items():
        schema = merged([schema_of(document(command, words)) for words in runs])
        head = {"$schema": "https://json-schema.org/draft/2020-12/schema", "title": f"hopwright {command} --json"}
        whole = head | schema
        parts = whole.pop("properties")
        lines = [f"{json.dumps(key)}: {json.dumps(each, ensure_ascii=False)}" for key, each in whole.items()]
        inner = ",\n".join(f"{json.dumps(key)}: {json.dumps(each, ensure_ascii=False)}" for key, each in parts.items())
        text = "{\n" + ",\n".join([*lines, '"properties": {\n' + inner + "\n}"]) + "\n}\n"
        (FOLDER / f"{command}.json").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
