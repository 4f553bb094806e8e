"""Outage as a study judges it: objectives of every mode, diversity by its lower antennas, methods side by side."""

from dataclasses import replace

import numpy as np
import pytest
from affine import Affine

from profiler.availability import PathFacts, outage_model, predict
from profiler.availability.diversity import improvement_p530
from profiler.availability.multipath import fade_percent, geoclimatic_factor_17_quick, occurrence_17_quick
from profiler.availability.vigants import improvement_vigants, occurrence_vigants
from profiler.document import to_document
from profiler.models import (
    AvailabilityChoice,
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

CELL = 1 / 1200
ROWS, COLUMNS = 420, 15
WEST, NORTH = 9.0 - 7.5 * CELL, 46.345
CLIMATE = AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0, rain_rate_mm_h=20.0)


@pytest.fixture
def land(write_raster):
    """Write a strip of 100 m, with a ridge three rows wide across it."""

    def write(rise_m=0.0, row=ROWS // 2):
        heights = np.full((ROWS, COLUMNS), 100.0)
        heights[row - 1 : row + 2] += rise_m
        return write_raster("ground.tif", heights, Affine(CELL, 0.0, WEST, 0.0, -CELL, NORTH))

    return write


def radio(*modes, power_b_dbm=24.0):
    return Radio(Terminal(power_dbm=26.0, gain_dbi=38.0), Terminal(power_dbm=power_b_dbm, gain_dbi=36.0), modes)


def mode(name, threshold_dbm, **objective):
    return RadioMode(name, threshold_dbm=threshold_dbm, objective=Objective(**objective) if objective else None)


def hop_over(path, **changes) -> Hop:
    hop = Hop(
        name="strip",
        site_a=Site("south", 9.0, 46.0, 90.0),
        site_b=Site("north", 9.0, 46.34, 70.0),
        frequency_hz=6.7e9,
        rules=(Rule(4 / 3, 0.0),),
        terrain=TerrainChoice((path,)),
        radio=radio(mode("256-QAM", -64.0), mode("QPSK", -86.0)),
        availability=CLIMATE,
    )
    return replace(hop, **changes)


# Objectives of the modes ----------------------------------------------------------------------------------------------

LOOSE, TIGHT = {"year_percent": 1.0}, {"year_percent": 1e-9}


@pytest.mark.parametrize(
    ("of_hop", "of_qam", "of_qpsk", "meets", "missed"),
    [
        (LOOSE, {}, {}, True, ()),
        (LOOSE, TIGHT, {}, False, ("256-QAM",)),  # its own stands in place of the hop's
        (TIGHT, LOOSE, {}, True, ()),
        (TIGHT, {}, LOOSE, False, ("256-QAM",)),
        (LOOSE, {}, TIGHT, False, ("QPSK",)),
        ({}, {}, LOOSE, True, ()),
        ({}, TIGHT, TIGHT, False, ("256-QAM", "QPSK")),
        ({}, {}, {}, None, ()),
    ],
)
def test_the_verdict_needs_the_objective_of_every_mode_that_has_one(land, of_hop, of_qam, of_qpsk, meets, missed):
    modes = mode("256-QAM", -64.0, **of_qam), mode("QPSK", -86.0, **of_qpsk)
    availability = replace(CLIMATE, objective=Objective(**of_hop))
    hop = hop_over(land(), radio=radio(*modes), availability=availability)
    study = run_study(hop)
    assert hop.has_objective == (meets is not None)
    assert (study.outage.meets, study.outage.missed, study.outage.undecided) == (meets, missed, ())
    assert study.verdict.outcome == ("fails" if meets is False else "passes")
    rows = to_document(study)["availability"]["modes"]
    assert [row["mode"] for row in rows] == ["256-QAM", "QPSK"]
    assert [row["asked"] for row in rows] == [bool(of_hop or of_qam), bool(of_qpsk)]


def test_each_mode_is_held_against_its_own_target(land):
    """QPSK is to be up all but 0.0001 % of the year, 256-QAM all but 0.1 %: the same outage law, 22 dB apart."""
    modes = mode("256-QAM", -64.0, year_percent=0.1), mode("QPSK", -86.0, year_percent=0.0001)
    rows = run_study(hop_over(land(), radio=radio(*modes))).outage.modes
    assert [row.objective.targets[0].required for row in rows] == [0.1, 0.0001]
    assert rows[1].fade_margin_db == pytest.approx(rows[0].fade_margin_db + 22.0)
    for row in rows:
        assert row.objective.targets[0].achieved == row.year_percent


def test_another_mode_is_a_way_only_where_it_is_not_asked_for_itself(land):
    """256-QAM misses the hop's objective, which QPSK meets; what QPSK's own asks for 256-QAM cannot do instead."""
    steps = {}
    for name, of_hop, of_qpsk, of_modes_dbm in (
        ("first", {"year_percent": 1e-6}, {}, (-40.0, -130.0)),
        ("own", LOOSE, TIGHT, (-64.0, -86.0)),
    ):
        modes = mode("256-QAM", of_modes_dbm[0]), mode("QPSK", of_modes_dbm[1], **of_qpsk)
        availability = replace(CLIMATE, objective=Objective(**of_hop))
        verdict = run_study(hop_over(land(), radio=radio(*modes), availability=availability)).verdict
        assert verdict.outcome == "fails"
        steps[name] = [step.kind for step in verdict.next_step]
    assert steps["first"][0] == "take_mode"
    assert "take_mode" not in steps["own"]


def test_a_mode_whose_threshold_is_not_known_leaves_its_objective_undecided(land):
    silent = RadioMode("4096-QAM", objective=Objective(year_percent=1.0))
    study = run_study(hop_over(land(), radio=radio(mode("QPSK", -86.0, year_percent=1.0), silent)))
    assert (study.outage.meets, study.outage.missed, study.outage.undecided) == (None, (), ("4096-QAM",))
    assert study.verdict.outcome == "not_sure"
    assert "mode 4096-QAM: its objective was not judged, as no threshold is known" in study.warnings


def test_an_objective_of_a_mode_without_a_climate_is_not_called_met(land):
    study = run_study(hop_over(land(), availability=None, radio=radio(mode("QPSK", -86.0, year_percent=1.0))))
    assert (study.outage.meets, study.outage.undecided, study.verdict.outcome) == (None, ("QPSK",), "not_sure")
    assert any("gives no [availability]" in line for line in study.warnings)


def test_the_heights_hold_every_mode_to_its_objective(land):
    """Over a ridge the first mode would do with less height than the second one's objective asks for."""
    received = run_study(hop_over(land(40.0), site_a=Site("south", 9.0, 46.0, 150.0))).budget.b_to_a.received_dbm
    easy = mode("QPSK", received - 60.0, year_percent=1.0)
    hard = mode("16-QAM", received - 42.0, year_percent=0.001)
    tower = TowerChoice(lowest_m=30, highest_m=120, step_m=3)
    hop = hop_over(land(40.0), radio=radio(easy, hard), heights=HeightsChoice(tower, tower))
    plans = {
        name: plan_heights(run_study(replace(hop, radio=radio(*modes)), losses=False))
        for name, modes in (("easy", (easy,)), ("both", (easy, hard)))
    }
    pairs = {name: (plan.answer.pair.antenna_a_m, plan.answer.pair.antenna_b_m) for name, plan in plans.items()}
    assert sum(pairs["both"]) > sum(pairs["easy"])

    def meets(pair):
        a, b = pair
        raised = replace(hop, site_a=replace(hop.site_a, antenna_m=a), site_b=replace(hop.site_b, antenna_m=b))
        return run_study(raised).outage

    assert meets(pairs["both"]).meets is True
    assert meets(pairs["easy"]).missed == ("16-QAM",)


# Diversity ------------------------------------------------------------------------------------------------------------


def test_no_improvement_is_credited_to_a_lower_antenna_without_its_clearance(land):
    """The ridge stands near A: the lower antenna there is behind it, that at B is not. What A receives decides."""
    hop = hop_over(land(64.0, row=ROWS - 60), availability=replace(CLIMATE, diversity=DiversityChoice(15.0)))
    with_pair, alone = run_study(hop), run_study(replace(hop, availability=CLIMATE))
    [warning] = [line for line in map(str, with_pair.warnings) if line.startswith("diversity at")]
    assert warning.startswith("diversity at A: the lower antenna at 75.00 m needs")
    assert warning.endswith("no improvement is credited to what it receives")
    # B sends 2 dB less, so that A receives least anyway; turned round, A's direction still has more outage by far
    for power_b_dbm in (24.0, 30.0):
        changed = replace(hop, radio=radio(*hop.radio.modes, power_b_dbm=power_b_dbm))
        found, single = run_study(changed), run_study(replace(changed, availability=CLIMATE))
        margin_db = found.budget.b_to_a.modes[0].fade_margin_db
        assert found.outage.modes[0].direction == "b_to_a"
        assert found.outage.availability.fade_margin_db == margin_db
        if power_b_dbm == 24.0:
            assert found.outage.modes[0].worst_month_percent == single.outage.modes[0].worst_month_percent
    clear = run_study(replace(hop, terrain=TerrainChoice((land(),))))
    assert clear.outage.availability.worst_month_percent.multipath < 0.2 * (
        alone.outage.availability.worst_month_percent.multipath
    )


LONG = PathFacts(60e3, 6.7e9, 300.0, 360.0, latitude=45.0)


def improved(path, spacing_m, method="p530-17-quick"):
    choice = replace(CLIMATE, multipath_method=method, climate_factor=1.0, diversity=DiversityChoice(spacing_m))
    model = outage_model(path, choice)
    p0 = model.fading.occurrence_percent
    return model.improvement_at_0_db, p0, [line for line in predict(model, 40.0).outside_fit if "space div" in line]


def test_diversity_stays_at_the_edge_of_its_fit_where_the_formula_would_promise_more():
    at_edge, p0, inside = improved(LONG, 23.0)
    assert inside == []
    assert at_edge == pytest.approx(float(improvement_p530(60e3, 6.7e9, 23.0, 0.0, occurrence_percent=p0)))
    beyond, _, [line] = improved(LONG, 60.0)
    assert beyond == at_edge
    assert line.endswith(
        "diversity spacing = 60 m: outside the 3 to 23 m of space diversity by " + line.split(" by ")[1]
    )
    assert line.endswith("taken as 23 m")
    # closer or shorter than the fit, the formula promises less: it is carried on
    close, p0, [line] = improved(LONG, 1.0)
    assert close == pytest.approx(float(improvement_p530(60e3, 6.7e9, 1.0, 0.0, occurrence_percent=p0)))
    assert line.endswith("its formula was carried on, which promises less")
    short, p0, _ = improved(replace(LONG, distance_m=20e3), 10.0)
    assert short == pytest.approx(float(improvement_p530(20e3, 6.7e9, 10.0, 0.0, occurrence_percent=p0)))
    low, p0, [line] = improved(replace(LONG, frequency_hz=1e9), 10.0)
    assert low == pytest.approx(float(improvement_p530(60e3, 2e9, 10.0, 0.0, occurrence_percent=p0)))
    assert "frequency = 1 GHz: outside the 2 to 11 GHz" in line


def test_vigants_diversity_stays_at_its_edges():
    # I = 1.2e-3·(f/d)·s²: short, high and wide would promise without end
    short, _, _ = improved(replace(LONG, distance_m=5e3), 10.0, "vigants-barnett")
    assert short == pytest.approx(float(improvement_vigants(24e3, 6.7e9, 10.0, 0.0)))
    high, _, _ = improved(replace(LONG, frequency_hz=38e9), 10.0, "vigants-barnett")
    assert high == pytest.approx(float(improvement_vigants(60e3, 11e9, 10.0, 0.0)))
    wide, _, _ = improved(LONG, 60.0, "vigants-barnett")
    assert wide == pytest.approx(float(improvement_vigants(60e3, 6.7e9, 15.0, 0.0)))
    long, _, _ = improved(replace(LONG, distance_m=150e3), 10.0, "vigants-barnett")
    assert long == pytest.approx(float(improvement_vigants(150e3, 6.7e9, 10.0, 0.0)))


# Multipath side by side -----------------------------------------------------------------------------------------------


def test_every_method_whose_numbers_are_known_stands_beside_the_chosen_one():
    choice = AvailabilityChoice("p530-17", dn1_n_km=-300.0, terrain_roughness_m=60.0, climate_factor=2.0)
    found = predict(outage_model(LONG, choice), 40.0)
    rows = {row.method: row for row in found.multipath}
    assert list(rows) == ["p530-17", "p530-17-quick", "vigants-barnett"]
    assert [row.chosen for row in found.multipath] == [True, False, False]
    assert rows["p530-17"].worst_month_percent == found.worst_month_percent.multipath
    assert rows["p530-17"].year_percent == pytest.approx(found.year_percent.multipath)
    quick = occurrence_17_quick(60e3, 6.7e9, 300.0, 360.0, geoclimatic_factor=geoclimatic_factor_17_quick(-300.0))
    assert rows["p530-17-quick"].worst_month_percent == pytest.approx(float(fade_percent(quick, 40.0)))
    vigants = fade_percent(occurrence_vigants(60e3, 6.7e9, 2.0), 40.0)
    assert rows["vigants-barnett"].worst_month_percent == pytest.approx(float(vigants))
    [warning] = [line for line in found.warnings if line.startswith("multipath methods differ")]
    low, high = (
        min(rows.values(), key=lambda r: r.worst_month_percent),
        max(rows.values(), key=lambda r: r.year_percent),
    )
    assert f"({low.method}) to" in warning
    assert f"({high.method}) of the worst month" in warning
    assert warning.endswith("p530-17 is the one that was chosen, and decides")


def test_a_geoclimatic_factor_is_that_of_the_chosen_method_alone():
    given = AvailabilityChoice("p530-18", geoclimatic_factor=2e-6, dn75_n_km=10.0, dn1_n_km=-300.0)
    path = replace(LONG, mean_ground_m=150.0)
    assert [row.method for row in predict(outage_model(path, given), 40.0).multipath] == ["p530-18", "p530-17-quick"]
    quick = predict(outage_model(path, replace(given, multipath_method="p530-17-quick")), 40.0)
    assert [row.method for row in quick.multipath] == ["p530-17-quick"]


def test_methods_that_agree_within_a_factor_of_three_are_not_warned_of():
    choice = AvailabilityChoice("p530-17", dn1_n_km=-300.0, terrain_roughness_m=60.0)
    found = predict(outage_model(LONG, choice), 40.0)
    both = [row.worst_month_percent for row in found.multipath]
    assert len(both) == 2
    assert max(both) < 3 * min(both)
    assert not any("methods differ" in line for line in found.warnings)


def test_what_is_used_outside_its_fit_is_marked():
    choice = AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0, climate_factor=1.0, rain_rate_mm_h=30.0)
    assert predict(outage_model(LONG, choice), 40.0).outside_fit == ()
    short = predict(outage_model(replace(LONG, distance_m=10e3), choice), 40.0)
    assert (
        short.outside_fit == ()
    )  # of the chosen one; Vigants-Barnett, which is for 24 km and more, only stands beside
    assert [bool(row.outside_fit) for row in short.multipath] == [False, True]
    shorter = predict(outage_model(replace(LONG, distance_m=5.5e3), choice), 40.0)
    assert "distance = 5.5 km: outside the 7.5 to 185 km" in shorter.outside_fit[0]
    assert set(shorter.outside_fit) <= set(shorter.warnings)


def test_a_short_path_has_one_method_less_to_compare(land):
    """Vigants-Barnett with a named climate wants the ground at three one-mile points: an error only where chosen."""
    near = Site("north", 9.0, 46.04, 70.0)
    hop = hop_over(land(), site_b=near, availability=replace(CLIMATE, climate="average"))
    assert [row.method for row in run_study(hop).outage.availability.multipath] == ["p530-17-quick"]
    far = hop_over(land(), availability=replace(CLIMATE, climate="average"))
    assert len(run_study(far).outage.availability.multipath) == 2
