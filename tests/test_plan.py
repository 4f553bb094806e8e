"""Heights plans over whole studies: the pair chosen, studied again, must hold all that was asked; a step less must not.

The ground is a strip of one-arc-second cells along the meridian 9° E, 20 km long, at 100 m with what a test puts on it.
"""

import json
from dataclasses import replace

import numpy as np
import pytest
from affine import Affine

from profiler.cli import main
from profiler.document.heights_document import heights_document
from profiler.errors import InputError
from profiler.heights import Choice
from profiler.models import (
    AvailabilityChoice,
    ConfidenceChoice,
    CoverChoice,
    DiversityChoice,
    HeightsChoice,
    Hop,
    Objective,
    Radio,
    RadioMode,
    Rule,
    Site,
    Terminal,
    TerrainChoice,
    TowerChoice,
)
from profiler.plan import plan_heights
from profiler.study import run_study
from profiler.study.requirements import lower_antennas

CELL = 1 / 3600
ROWS, COLUMNS, MID = 720, 61, 342
WEST, NORTH = 9.0 - 30.5 * CELL, 46.19
TOWERS = HeightsChoice(TowerChoice(lowest_m=5, highest_m=120), TowerChoice(lowest_m=5, highest_m=120, step_m=1.5))
DIVERSE = AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0, diversity=DiversityChoice(9.0))
DOUBT = ConfidenceChoice(3.0, "test", 300.0, draws=1000, step_m=150.0)


@pytest.fixture
def land(write_raster):
    """Write the strip: 100 m, plus what is given for rows and columns."""

    def write(rise=0.0, name="ground.tif", base=100.0):
        heights = base + np.broadcast_to(np.asarray(rise, dtype=float), (ROWS, COLUMNS))
        return write_raster(name, heights, Affine(CELL, 0.0, WEST, 0.0, -CELL, NORTH))

    return write


def hop_over(path, **changes) -> Hop:
    hop = Hop(
        name="strip",
        site_a=Site("south", 9.0, 46.0, 30.0),
        site_b=Site("north", 9.0, 46.18, 30.0),
        frequency_hz=7.5e9,
        rules=(Rule(4 / 3, 1.0), Rule(2 / 3, 0.3)),
        terrain=TerrainChoice((path,)),
        heights=TOWERS,
    )
    return replace(hop, **changes)


def ridge(height_m, row=MID):
    rise = np.zeros((ROWS, COLUMNS))
    rise[row - 1 : row + 2] = height_m
    return rise


def wall(height_m, column=COLUMNS // 2 - 1):
    """Put a wall of five rows into one column: the next to the west, unless told."""
    rise = np.zeros((ROWS, COLUMNS))
    rise[MID - 2 : MID + 3, column] = height_m
    return rise


def at(hop, pair) -> Hop:
    a, b = pair
    return replace(hop, site_a=replace(hop.site_a, antenna_m=a), site_b=replace(hop.site_b, antenna_m=b))


def pair_of(plan):
    assert isinstance(plan.answer.pair, Choice)
    return plan.answer.pair.antenna_a_m, plan.answer.pair.antenna_b_m


def steps_down(hop, pair):
    """Both pairs with one antenna a step lower, where the tower has one."""
    towers = hop.heights.tower_a, hop.heights.tower_b
    lower = [(pair[0] - towers[0].step_m, pair[1]), (pair[0], pair[1] - towers[1].step_m)]
    return [each for each, main, tower in zip(lower, pair, towers, strict=True) if main > tower.lowest_m]


# Diversity ------------------------------------------------------------------------------------------------------------


def holds(hop, pair) -> bool:
    """Whether a pair passes every rule and holds both lower antennas clear, on a position, by a study of its own."""
    lows = [main - hop.availability.diversity.spacing_m for main in pair]
    if lows[0] < hop.heights.tower_a.lowest_m or lows[1] < hop.heights.tower_b.lowest_m:
        return False
    study = run_study(at(hop, pair))
    ends = lower_antennas(hop, study.lower_regions, antenna_a_m=pair[0], antenna_b_m=pair[1])
    assert all(end.clears for end in ends) != any("lower antenna" in warning for warning in map(str, study.warnings))
    return study.verdict.clears and all(end.clears for end in ends)


@pytest.mark.parametrize("obstruction", ["isolated", "extended"])
@pytest.mark.parametrize(
    "rise", [0.0, ridge(45.0), ridge(25.0, row=60), wall(60.0)], ids=["flat", "mid", "near B", "wall"]
)
def test_a_diversity_pair_holds_all_four_antennas_clear_and_a_step_less_does_not(land, rise, obstruction):
    hop = hop_over(land(rise), availability=DIVERSE, heights=replace(TOWERS, diversity_obstruction=obstruction))
    plan = plan_heights(run_study(hop, losses=False))
    pair = pair_of(plan)
    assert plan.feasible
    assert "hold their lower antennas clear" in plan.answer.asked
    assert holds(hop, pair)
    for lower in steps_down(hop, pair):
        assert not holds(hop, lower)
    sheet = plan.sheet
    assert (sheet.end_a.lower_m, sheet.end_b.lower_m) == (pair[0] - 9.0, pair[1] - 9.0)
    assert sheet.passes
    assert [each.ray for each in sheet.rays] == ["main", "main", "lower A", "lower B"]
    assert all(end.clears for end in plan.diversity)


def test_lower_antennas_ask_for_more_than_the_main_ones_alone(land):
    rise = ridge(60.0, row=420)
    alone, diverse = (
        plan_heights(run_study(hop_over(land(rise), availability=choice), losses=False))
        for choice in (replace(DIVERSE, diversity=None), replace(DIVERSE, diversity=DiversityChoice(30.0)))
    )
    assert diverse.cheapest.cost > alone.cheapest.cost
    assert diverse.least_equal.height_m > alone.least_equal.height_m
    labels = [rule["label"] for rule in heights_document(diverse)["rules"]]
    assert labels == ["", "", "lower antenna at A", "lower antenna at B"]


def test_a_hop_that_no_diversity_pair_fits_says_which_tower_is_short(land):
    low = HeightsChoice(TowerChoice(lowest_m=5, highest_m=60), TowerChoice(lowest_m=5, highest_m=12))
    plan = plan_heights(run_study(hop_over(land(), availability=DIVERSE, heights=low), losses=False))
    assert not plan.feasible
    assert str(plan.answer.pair.reason) == (
        "no pair: tower B offers no two positions 9.0 m apart for the diversity pair, 5.0 m to 12.0 m"
    )
    short = replace(low, tower_b=TowerChoice(lowest_m=5, highest_m=20))
    proven = plan_heights(
        run_study(hop_over(land(ridge(60.0)), availability=DIVERSE, heights=short), losses=False)
    ).cheapest
    assert "the ray is still" in str(proven.reason)
    assert proven.proven


@pytest.mark.parametrize(
    ("spacing_m", "antenna_m", "cover_m", "match"),
    [
        (45.0, 30.0, 0.0, r"spacing_m = 45: must be under 30 m, to keep the lower antenna above the ground at south"),
        (30.0, 30.0, 0.0, r"spacing_m = 30: must be under 30 m"),
        (12.0, 30.0, 18.0, r"spacing_m = 12: must be under 12 m, to keep the lower antenna above the 18\.0 m of cover"),
    ],
)
def test_a_study_gives_no_credit_to_a_lower_antenna_underground_or_in_the_trees(
    land, spacing_m, antenna_m, cover_m, match
):
    canopy = CoverChoice(canopy=(land(name="canopy.tif", base=cover_m),))
    hop = hop_over(land(), availability=replace(DIVERSE, diversity=DiversityChoice(spacing_m)), cover=canopy)
    with pytest.raises(InputError, match=rf"^availability\.diversity\.{match}"):
        run_study(at(hop, (antenna_m, antenna_m)))
    least_m = spacing_m + cover_m + 0.1
    run_study(at(hop, (least_m, least_m)))


def test_a_study_warns_of_a_lower_antenna_behind_a_hill(land):
    hop = hop_over(land(ridge(40.0)), availability=DIVERSE, rules=(Rule(4 / 3, 0.0),))
    study = run_study(at(hop, (50, 50)))
    warned = [warning for warning in map(str, study.warnings) if warning.startswith("diversity at")]
    assert len(warned) == 2
    assert "A: the lower antenna at 41.00 m needs" in warned[0]
    assert not [
        warning for warning in map(str, run_study(at(hop, (80, 80))).warnings) if warning.startswith("diversity at")
    ]


# Beside the path and where requirements come from ---------------------------------------------------------------------


def test_a_wall_beside_the_path_is_named_where_it_stands(land):
    """The wall is one cell, 21.5 m, to the west of a path to the north: to the left of it."""
    plan = plan_heights(run_study(hop_over(land(wall(60.0))), losses=False))
    assert plan.sheet.beside
    assert plan.sheet.passes
    place = plan.source(plan.least_equal.point, plan.least_equal.rule)
    assert place.side == "left"
    assert -21.5 <= place.offset_m < -5.0
    assert place.longitude == pytest.approx(9.0 + place.offset_m / 21.5 * CELL, abs=1e-6)
    assert place.latitude == pytest.approx(NORTH - CELL * (MID + 0.5), abs=3 * CELL)
    # bilinear between the path's column at 100 m and the wall's at 160 m
    assert place.ground_m == pytest.approx(100 + 60 * -place.offset_m / 21.5, abs=1.0)
    document = heights_document(plan)
    assert document["least_equal_for"]["side"] == "left"
    governing = [stretch for stretch in document["stretches"] if stretch["side"] == "left"]
    assert {"longitude", "latitude", "ground_m", "cover_m", "offset_m"} <= governing[0].keys()


def test_what_the_path_itself_asks_for_is_named_on_the_path(land):
    plan = plan_heights(run_study(hop_over(land(ridge(40.0))), losses=False))
    place = plan.source(plan.least_equal.point, plan.least_equal.rule)
    assert (place.offset_m, place.side, place.ground_m) == (0.0, "centre", pytest.approx(140.0))
    assert (place.longitude, place.latitude) == (
        pytest.approx(9.0),
        pytest.approx(NORTH - CELL * (MID + 0.5), abs=2 * CELL),
    )


def test_an_antenna_goes_above_the_top_of_its_own_trees_not_level_with_it(land):
    canopy = CoverChoice(canopy=(land(name="canopy.tif", base=18.0),))
    hop = hop_over(land(ridge(-40.0)), cover=canopy, rules=(Rule(np.inf, 0.0),))
    plan = plan_heights(run_study(hop, losses=False))
    pair = pair_of(plan)
    assert pair == (19.0, 19.5)
    assert run_study(at(hop, pair)).verdict.clears
    with pytest.raises(InputError, match=r"site_a.antenna_m = 18: must be above the 18.0 m of cover"):
        run_study(at(hop, (18.0, 19.5)))


# Everything at once ---------------------------------------------------------------------------------------------------


def radio(threshold_dbm):
    end = Terminal(power_dbm=20.0, gain_dbi=36.0)
    return Radio(end, end, (RadioMode("mute"), RadioMode("16-QAM", threshold_dbm=threshold_dbm)))


LINE = {"rules": (Rule(4 / 3, 0.0),), "radio": radio(-70.0)}
CLIMATE = AvailabilityChoice("p530-17-quick", Objective(worst_month_percent=0.01), dn1_n_km=-300.0, rain_rate_mm_h=30.0)


def test_the_answer_meets_the_objective_too_and_lower_pairs_of_its_kind_do_not(land):
    """Grazing rays clear a rule of 0 F1, but lose 16 dB over the ridge: the objective asks for more height."""
    hop = hop_over(land(ridge(50.0)), **LINE, availability=CLIMATE)
    hop = replace(hop, terrain=replace(hop.terrain, spacing_m=30.0))
    plan = plan_heights(run_study(hop, losses=False))
    assert plan.answer.asked == ("clear every rule", "meet the availability objective")
    assert plan.answer.by_trial
    assert 0 <= plan.answer.cheaper_by_at_most < 3
    pair = pair_of(plan)
    clearing = plan.cheapest.antenna_a_m, plan.cheapest.antenna_b_m
    assert run_study(at(hop, clearing)).verdict.meets_objective is False
    assert run_study(at(hop, pair)).verdict.outcome == "passes"
    assert plan.answer.pair.cost > plan.cheapest.cost
    for lower in steps_down(hop, pair):
        assert run_study(at(hop, lower)).verdict.outcome == "fails"
    assert plan.for_objective.trials < 200


def test_an_objective_out_of_reach_leaves_the_clearing_pair_but_no_answer(land):
    hop = hop_over(land(), **(LINE | {"radio": radio(-30.0)}), availability=CLIMATE)
    hop = replace(hop, terrain=replace(hop.terrain, spacing_m=100.0))
    document = heights_document(plan_heights(run_study(hop, losses=False)))
    assert document["feasible"] is True
    assert document["cheapest_m"] is not None
    assert document["answer_m"] is None
    assert "the antennas fail to meet the availability objective by" in document["answer"]["why_not"]["reason"]
    assert document["answer"]["why_not"]["proven"] is False


def test_an_objective_that_cannot_be_judged_is_said_to_be(land):
    mute = replace(radio(-76.0), modes=(RadioMode("mute"),))
    answer = plan_heights(run_study(hop_over(land(), radio=mute, availability=CLIMATE), losses=False)).answer
    assert isinstance(answer.pair, Choice)
    assert "objective was not judged" in answer.unjudged[0]


def test_a_hop_without_an_objective_still_needs_a_fade_margin(land):
    weak = replace(radio(-30.0), modes=(RadioMode("16-QAM", threshold_dbm=-30.0),))
    plan = plan_heights(run_study(hop_over(land(), radio=weak), losses=False))
    assert plan.feasible
    assert "the antennas fail to keep a fade margin by" in str(plan.answer.pair.reason)
    assert run_study(at(plan.study.hop, (100, 100))).verdict.outcome == "fails"


def test_the_answer_keeps_the_loss_limit(land):
    hop = hop_over(land(ridge(50.0)), rules=(Rule(4 / 3, 0.0),), heights=replace(TOWERS, loss_limit_db=3.0))
    plan = plan_heights(run_study(hop, losses=False))
    assert plan.answer.asked[-1] == "keep the diffraction loss within 3 dB"
    losses = [
        run_study(at(hop, pair)).diffraction[0].loss_db
        for pair in (pair_of(plan), (plan.cheapest.antenna_a_m, plan.cheapest.antenna_b_m))
    ]
    assert losses[0] <= 3.0 < losses[1]
    for lower in steps_down(hop, pair_of(plan)):
        assert run_study(at(hop, lower)).diffraction[0].loss_db > 3.0


@pytest.mark.parametrize("rise", [0.0, ridge(40.0, row=200), wall(60.0)], ids=["flat", "ridge", "wall"])
def test_the_sure_answer_is_as_sure_in_a_study_of_its_own_and_a_step_less_is_not(land, rise):
    hop = hop_over(land(rise), confidence=DOUBT)
    hop = replace(hop, terrain=replace(hop.terrain, spacing_m=60.0))
    plan = plan_heights(run_study(hop, losses=False), sure=0.95)
    pair = pair_of(plan)
    assert not plan.answer.by_trial
    again = run_study(at(hop, pair), losses=False).confidence.chance
    assert again.value == pytest.approx(plan.answer.chance.value, abs=0.02)  # other points, other draws
    assert plan.answer.chance.value >= 0.95
    for lower in steps_down(hop, pair):
        assert run_study(at(hop, lower), losses=False).confidence.chance.value < 0.95
    assert plan.answer.pair.cost >= plan_heights(run_study(hop, losses=False), sure=0.9).answer.pair.cost


def test_the_sure_answer_counts_the_lower_antennas(land):
    hop = hop_over(land(ridge(20.0)), confidence=DOUBT, availability=replace(DIVERSE, diversity=DiversityChoice(30.0)))
    alone = plan_heights(run_study(replace(hop, availability=None), losses=False), sure=0.95)
    diverse = plan_heights(run_study(hop, losses=False), sure=0.95)
    assert diverse.answer.pair.cost > alone.answer.pair.cost
    assert diverse.answer.chance.value >= 0.95


def test_a_chance_out_of_reach_says_what_the_highest_pair_has(land):
    low = HeightsChoice(TowerChoice(highest_m=42), TowerChoice(highest_m=42))
    hop = hop_over(land(ridge(20.0)), confidence=DOUBT, heights=low, rules=(Rule(4 / 3, 1.0),))
    plan = plan_heights(run_study(hop, losses=False), sure=0.99)
    assert plan.feasible
    chance = run_study(at(hop, (42, 42)), losses=False).confidence.chance.value
    told, _, value = str(plan.answer.pair.reason).removesuffix(" %").rpartition(" ")
    assert told == (
        "no pair clears with a chance of 99 %: at the highest there is, A 42.0 m and B 42.0 m, the chance is"
    )
    # the plan draws at the places that decide the region too, which lie between the points of the study
    assert float(value) == pytest.approx(100 * chance, abs=0.3)


def test_the_plan_is_the_same_whatever_the_heights_in_the_file_were(land):
    """Its sure pairs and its answer have the chances that a study of them gives, and pass there."""
    hop = hop_over(land(ridge(20.0)), confidence=DOUBT)
    plans = [plan_heights(run_study(at(hop, heights), losses=False)) for heights in ((8.0, 110.0), (100.0, 12.0))]
    for plan in plans:
        assert pair_of(plan) == pair_of(plans[0])
        assert plan.answer.chance == plans[0].answer.chance
        assert [each.pair for each in plan.sure] == [each.pair for each in plans[0].sure]
    for each in plan.sure:
        heights = each.pair.antenna_a_m, each.pair.antenna_b_m
        assert each.chance.value >= each.asked
        again = run_study(at(hop, heights), losses=False).confidence.chance.value
        assert 0 <= again - each.chance.value <= 2 / DOUBT.draws
        for lower in steps_down(hop, heights):
            assert run_study(at(hop, lower), losses=False).confidence.chance.value < each.asked


def test_where_an_error_is_known_the_answer_passes_and_the_merely_clearing_pair_is_kept(land):
    hop = hop_over(land(ridge(20.0)), confidence=replace(DOUBT, minimum_chance=0.8))
    plan = plan_heights(run_study(hop, losses=False))
    assert plan.answer.asked[-1] == "clear with 80 % chance"
    assert plan.answer.asked_chance == 0.8
    assert run_study(at(hop, pair_of(plan)), losses=False).confidence.chance.value >= 0.8
    merely = plan.cheapest.antenna_a_m, plan.cheapest.antenna_b_m
    assert plan.cheapest.cost < plan.answer.pair.cost
    alone = plan_heights(run_study(replace(hop, confidence=None), losses=False))
    assert pair_of(alone) == merely
    assert (alone.answer.asked_chance, alone.answer.chance, alone.cheapest_chance, alone.sure) == (None, None, None, ())
    found = run_study(at(hop, merely), losses=False).confidence.chance.value
    assert 0 <= found - plan.cheapest_chance.value <= 2 / DOUBT.draws
    assert plan.cheapest_chance.value < 0.8
    document = heights_document(plan)
    assert document["cheapest_chance"]["value"] == plan.cheapest_chance.value
    assert [each["asked_chance"] for each in document["sure"]] == [0.90, 0.95]


def test_another_seed_finds_the_printed_chance_of_the_pair_within_its_interval(land):
    """The pair was chosen by the very draws that give its chance: is it flattered? Other draws, and many, say."""
    hop = hop_over(land(ridge(20.0)), confidence=replace(DOUBT, draws=400))
    hop = replace(hop, terrain=replace(hop.terrain, spacing_m=150.0))
    study = run_study(hop, losses=False)
    inside = []
    for seed in range(20):
        plan = plan_heights(replace(study, hop=replace(hop, confidence=replace(hop.confidence, seed=seed))))
        fresh = at(replace(hop, confidence=replace(DOUBT, draws=6000, seed=1000 + seed)), pair_of(plan))
        truth = run_study(fresh, losses=False).confidence.chance.value
        inside.append(plan.answer.chance.low <= truth <= plan.answer.chance.high)
    assert sum(inside) >= 16  # of 20 at 95 %: 15 or fewer has a probability of 3e-4


@pytest.mark.parametrize(
    ("doubt", "sure", "match"),
    [
        (None, 0.95, r"^confidence = \(missing\): must say how wrong the terrain may be"),
        (DOUBT, 0.995, r"^confidence\.draws = 1000: must be at least 2000 for a chance of 99\.5 %"),
        (DOUBT, 0.3, r"^sure = 0\.3: must be a chance of 0\.5 to 0\.999"),
    ],
)
def test_chances_that_cannot_be_had_are_refused(land, doubt, sure, match):
    study = run_study(hop_over(land(), confidence=doubt), losses=False)
    with pytest.raises(InputError, match=match):
        plan_heights(study, sure=sure)


# The command ----------------------------------------------------------------------------------------------------------

HOP = """\
name = "Strip"
frequency_ghz = 7.5
[site_a]
name = "South"
position = "46.0, 9.0"
antenna_m = 5
[site_b]
name = "North"
position = "46.18, 9.0"
antenna_m = 5
[terrain]
paths = ["ground.tif"]
[rules]
preset = "1.0-and-0.3-f1"
[confidence]
terrain_rmse_m = 3.0
correlation_m = 100
draws = 400
[heights.a]
highest_m = 60
step_m = 0.1
[heights.b]
highest_m = 60
"""


@pytest.fixture
def run(land, tmp_path, capsys, monkeypatch):
    """Run a command beside a hop file: exit code, output, errors."""
    land(wall(40.0))
    (tmp_path / "hop.toml").write_text(HOP)
    monkeypatch.chdir(tmp_path)

    def call(*words):
        with pytest.raises(SystemExit) as stopped:
            main(list(words))
        streams = capsys.readouterr()
        return stopped.value.code, streams.out, streams.err

    return call


def test_the_sure_pair_is_written_and_as_sure_when_it_is_studied(run, tmp_path):
    code, out, _ = run("heights", "hop.toml", "--sure", "95", "--write", "sure.toml", "--json", "plan.json")
    assert code == 0
    said = " ".join(out.split())
    assert "clear every rule and clear with 95 % chance, cost" in said
    assert "of the path (46.09" in said  # the wall that asks for the heights
    document = json.loads((tmp_path / "plan.json").read_text())
    assert document["answer"]["chance"]["value"] >= 0.95
    assert run("study", "sure.toml", "-q", "--json", "study.json")[0] == 0
    study = json.loads((tmp_path / "study.json").read_text())
    assert [study["hop"][site]["antenna_m"] for site in ("site_a", "site_b")] == document["answer_m"]
    assert study["confidence"]["chance"]["value"] >= 0.95
    assert document["cheapest_m"] != document["answer_m"]


@pytest.mark.parametrize(
    ("change", "words", "message"),
    [
        (("draws", "draws"), ("--sure", "30"), "--sure = 30: must be a chance of 50 to 99.9 %"),
        (("step_m = 0.1", "step_m = 0.01"), (), "heights.a.step_m = 0.01: must leave at most 5000 positions"),
        (
            ("[heights.b]\n", "[heights.b]\nlowest_m = 59.5\nstep_m = 7\n"),
            (),
            "heights.b.lowest_m = 59.5, heights.b.highest_m = 60",
        ),
    ],
)
def test_wrong_input_is_named_in_one_line(run, tmp_path, change, words, message):
    (tmp_path / "hop.toml").write_text(HOP.replace(*change))
    code, out, err = run("heights", "hop.toml", *words)
    assert (code, out) == (2, "")
    assert message in err
    assert err.count("\n") == 1


def test_where_nothing_clears_no_pair_is_sure(run, tmp_path):
    (tmp_path / "hop.toml").write_text(HOP.replace("highest_m = 60", "highest_m = 20"))
    code, out, _ = run("heights", "hop.toml")
    assert code == 1
    assert "% sure of every rule: " not in out
    assert "In the way: 10.48 km from A, " in out
