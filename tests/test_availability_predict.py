"""The whole prediction: mechanisms together, the objective judged, every number named, every gap said."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.availability import MECHANISMS, KStatistics, PathFacts, outage_curve, outage_model, predict
from profiler.availability.months import worst_month_from_year
from profiler.availability.multipath import fade_percent
from profiler.availability.rain_outage import rain_percent
from profiler.errors import InputError
from profiler.models import AvailabilityChoice, DiversityChoice, Objective, Signature

PATH = PathFacts(48e3, 6.7e9, 300.0, 360.0, latitude=45.0, mean_ground_m=150.0, ground_roughness_m=20.0)
RADIO = Signature(30e6, 18.0, 18.0)
K_PERCENTILES = ((0.1, 0.6), (1.0, 0.8), (50.0, 1.33))
CHOICES = {
    "p530-17": AvailabilityChoice("p530-17", dn1_n_km=-300.0, terrain_roughness_m=60.0),
    "p530-17-quick": AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0),
    "p530-18": AvailabilityChoice("p530-18", geoclimatic_factor=2e-6, dn75_n_km=10.0),
    "vigants-barnett": AvailabilityChoice("vigants-barnett", climate="average"),
}
FULL = replace(
    CHOICES["p530-17"], rain_rate_mm_h=42.0, k_percentiles=K_PERCENTILES, diversity=DiversityChoice(10.0, 1.0)
)

margins_db = st.floats(0.0, 70.0)
methods = st.sampled_from(sorted(CHOICES))
diversities = st.none() | st.builds(DiversityChoice, st.floats(3.0, 23.0), st.floats(-6.0, 6.0))
signatures = st.none() | st.builds(Signature, st.floats(5e6, 60e6), st.floats(10.0, 30.0), st.floats(10.0, 30.0))
rates = st.none() | st.floats(0.0, 120.0)


def losing(*excess_db, k_percentiles=K_PERCENTILES):
    """Losses over those of the budget at the percentages of the percentiles, as the statistics of k take them."""
    return KStatistics([percent for percent, _ in k_percentiles], excess_db) if k_percentiles else None


def full_model(**changes):
    choice, statistics = replace(FULL, **changes), losing(45.0, 20.0, 0.0)
    return outage_model(PATH, choice, signature=RADIO, k_statistics=statistics, low_k=0.5, low_k_excess_db=50.0)


def model_of(year_percent, *, frequency_ghz=4.0, **given):
    """Make a model without rain, which matters little at 4 GHz, against a target for the year."""
    choice = replace(CHOICES["p530-17"], objective=Objective(year_percent=year_percent))
    choice = replace(choice, k_percentiles=given.pop("k_percentiles", ()))
    return outage_model(replace(PATH, frequency_hz=frequency_ghz * 1e9), choice, **given)


@pytest.mark.parametrize("method", sorted(CHOICES))
def test_every_method_by_name(method):
    model = outage_model(PATH, CHOICES[method])
    found = predict(model, 40.0)
    assert found.method == method
    assert found.worst_month_percent.multipath == pytest.approx(model.fading.occurrence_percent * 1e-4)
    assert 0 < found.year_percent.total < found.worst_month_percent.total < 0.1
    assert found.missing == ("selective", "rain", "obstruction")
    assert "not counted, as nothing was given for it: selective, rain, obstruction" in found.assumptions
    assert found.limited_by == "multipath"
    assert found.objective is None
    assert any("untested" in warning for warning in found.warnings) == (method == "p530-18")


def test_mechanisms_add_up():
    found = predict(full_model(diversity=None), 35.0)
    for period in (found.worst_month_percent, found.year_percent):
        assert period.total == pytest.approx(sum(period.part(mechanism) for mechanism in MECHANISMS))
        assert period.clear_air == pytest.approx(period.multipath + period.selective)
    assert found.missing == ()
    month, year = found.worst_month_percent, found.year_percent
    assert month.rain == pytest.approx(worst_month_from_year(year.rain))
    assert year.selective / month.selective == pytest.approx(year.multipath / month.multipath)
    assert found.year_minutes == pytest.approx(year.total / 100 * 365.25 * 24 * 60)


def test_model_is_the_published_functions():
    model = full_model(diversity=None)
    found = predict(model, 20.0)
    assert found.worst_month_percent.multipath == float(fade_percent(model.fading.occurrence_percent, 20.0))
    assert found.year_percent.rain == float(rain_percent(model.rain_fade_001_db, 6.7e9, 20.0))
    used = {given.name: given for given in found.inputs}
    assert used["rain_rate_mm_h"].value == 42.0
    conversion = 10 ** (-used["year_conversion_db"].value / 10)
    assert found.year_percent.multipath == pytest.approx(
        fade_percent(model.fading.occurrence_percent * conversion, 20.0)
    )


def test_polarization_and_signature_reach_their_methods():
    # Flat drops take more of the horizontal (P.838-3); each phase of a signature has its own depth (P.530-17 §5.1).
    tilted = [replace(PATH, frequency_hz=18e9, polarization=name) for name in ("horizontal", "vertical")]
    horizontal, vertical = (outage_model(path, FULL).rain_fade_001_db for path in tilted)
    assert horizontal > 1.1 * vertical

    def selective(deep_db, other_db):
        return outage_model(PATH, CHOICES["p530-17"], signature=Signature(30e6, deep_db, other_db)).selective_percent

    assert selective(18.0, 24.0) == pytest.approx(selective(24.0, 18.0))
    assert 2 * selective(18.0, 24.0) == pytest.approx(selective(18.0, 18.0) + selective(24.0, 24.0))


@given(methods, diversities, signatures, rates, margins_db, st.floats(0.1, 20.0))
def test_more_margin_never_more_outage(method, diversity, signature, rate, margin_db, more_db):
    choice = replace(CHOICES[method], diversity=diversity, rain_rate_mm_h=rate)
    curve = outage_curve(outage_model(PATH, choice, signature=signature), [margin_db, margin_db + more_db])
    for period in (curve.worst_month_percent, curve.year_percent):
        assert 0 <= period.total[1] <= period.total[0] <= 100
        for mechanism in MECHANISMS:
            part = period.part(mechanism)
            assert part is None or part[1] <= part[0]
    assert (curve.year_percent.total <= curve.worst_month_percent.total * (1 + 1e-12)).all()


@given(methods, st.builds(DiversityChoice, st.floats(3.0, 23.0)), signatures, margins_db)
def test_diversity_never_harms_a_mechanism(method, diversity, signature, margin_db):
    with_pair, alone = (
        predict(outage_model(PATH, replace(CHOICES[method], diversity=pair), signature=signature), margin_db)
        for pair in (diversity, None)
    )
    for mechanism in ("multipath", "selective"):
        left, before = (found.worst_month_percent.part(mechanism) for found in (with_pair, alone))
        assert (left is None) == (before is None)
        assert left is None or left <= before


@given(st.lists(margins_db, min_size=1, max_size=8))
def test_point_and_curve_are_one_model(margins):
    model = full_model()
    curve = outage_curve(model, margins)
    for index, margin_db in enumerate(margins):
        point = predict(model, margin_db)
        assert point.year_percent.total == pytest.approx(float(curve.year_percent.total[index]), rel=1e-12)
        assert point.worst_month_percent.selective == float(curve.worst_month_percent.selective[index])
    assert not curve.margin_db.flags.writeable
    assert not curve.year_percent.total.flags.writeable


def test_long_run_limits():
    # Power mends everything but distortion: what remains at 150 dB is selective fading, in both periods.
    found = predict(full_model(), 150.0)
    for period in (found.worst_month_percent, found.year_percent):
        assert period.total == pytest.approx(period.selective, rel=0.02)
        assert period.selective > 0
    assert predict(full_model(), 0.0).worst_month_percent.total == 100.0


@given(
    methods,
    st.builds(
        Objective,
        worst_month_percent=st.none() | st.floats(1e-3, 1.0),
        year_percent=st.none() | st.floats(1e-3, 1.0),
        minutes_per_year=st.floats(10.0, 3000.0),
        severely_errored_seconds_ratio=st.none() | st.floats(1e-4, 1e-2),
    ),
    rates,
)
def test_required_margin_by_the_forward_model(method, objective, rate):
    choice = replace(CHOICES[method], objective=objective, rain_rate_mm_h=rate)
    model = outage_model(replace(PATH, frequency_hz=4.9e9), choice)
    wanted = predict(model, 30.0).objective.required_margin_db
    assert predict(model, wanted).objective.met is True
    if wanted > 0.01:
        short = predict(model, wanted - 0.001).objective
        assert short.met is False
        missed = [target for target in short.targets if not target.met]
        assert all(target.required_margin_db > wanted - 0.001 for target in missed)


def test_margin_that_10_db_more_would_need():
    # Deep fading falls tenfold in 10 dB, so a tenth of the target needs exactly 10 dB more.
    def wanted(percent):
        choice = replace(CHOICES["p530-17"], objective=Objective(worst_month_percent=percent))
        return predict(outage_model(PATH, choice), 30.0).objective.required_margin_db

    assert wanted(1e-4) - wanted(1e-3) == pytest.approx(10.0, abs=1e-5)


def test_no_margin_meets_a_target_under_the_selective_floor():
    model = full_model(objective=Objective(worst_month_percent=1e-7), diversity=None)
    found = predict(model, 40.0)
    (target,) = found.objective.targets
    assert (target.met, target.required_margin_db, found.objective.required_margin_db) == (False, None, None)
    assert found.limited_by == target.limited_by
    assert target.margin_set_by == found.objective.margin_set_by == "selective"
    assert any(
        line.startswith(
            "objective of 1.0·10⁻⁷ % of the worst month: no fade margin up to 200 dB is sure to meet it; most of what"
        )
        and line.endswith("selective")
        for line in found.warnings
    )
    assert predict(model, 199.0).limited_by == "selective"


def test_minutes_and_percent_are_one_target():
    percent = 53.0 / (365.25 * 1440) * 100
    targets = Objective(year_percent=percent, minutes_per_year=53.0)
    first, second = predict(full_model(objective=targets), 35.0).objective.targets
    assert first.met == second.met
    assert first.achieved / first.required == pytest.approx(second.achieved / second.required)
    assert first.required_margin_db == pytest.approx(second.required_margin_db, abs=1e-4)


def test_errored_seconds_count_multipath_in_the_worst_month():
    # G.826: ten seconds or more of outage are unavailable time, not errored seconds; rain and obstruction make those.
    objective = Objective(
        severely_errored_seconds_ratio=1e-4, errored_seconds_ratio=1e-3, errored_threshold_offset_db=4.0
    )
    found = predict(full_model(objective=objective), 35.0)
    severe, errored = found.objective.targets
    assert severe.counts == errored.counts == ("multipath", "selective")
    assert severe.achieved == pytest.approx(found.worst_month_percent.clear_air / 100)
    assert errored.achieved == pytest.approx(predict(full_model(), 31.0).worst_month_percent.clear_air / 100)
    assert predict(full_model(objective=objective), 3.0).objective.targets[1].achieved == 1.0


def test_limited_by_names_the_mechanism():
    objective = Objective(year_percent=1e-3)

    def limit(path, **changes):
        return predict(outage_model(path, replace(CHOICES["p530-17"], objective=objective, **changes)), 30.0).limited_by

    assert limit(replace(PATH, distance_m=90e3), rain_rate_mm_h=10.0) == "multipath"
    assert limit(replace(PATH, distance_m=8e3, frequency_hz=38e9), rain_rate_mm_h=60.0) == "rain"
    blocked = outage_model(PATH, replace(FULL, objective=objective), k_statistics=losing(90.0, 80.0, 0.0))
    assert predict(blocked, 30.0).limited_by == "obstruction"


def test_objective_stays_open_where_what_matters_is_unknown():
    loose = replace(CHOICES["p530-17"], objective=Objective(year_percent=1.0))
    dry = predict(outage_model(replace(PATH, frequency_hz=18e9), loose), 40.0)
    assert dry.objective.met is None
    assert any(warning.startswith("rain is not counted, and above 5 GHz") for warning in dry.warnings)
    low = replace(PATH, frequency_hz=4e9)
    assert predict(outage_model(low, loose), 40.0).objective.met is True
    cut = predict(outage_model(low, loose, low_k=0.7, low_k_excess_db=41.0), 40.0)
    assert (cut.low_k_blocks, cut.objective.met, cut.year_percent.obstruction) == (True, None, None)
    free = predict(outage_model(low, loose, low_k=0.7, low_k_excess_db=39.0), 40.0)
    assert (free.low_k_blocks, free.objective.met) == (False, True)
    tight = replace(loose, objective=Objective(year_percent=1e-9))
    assert predict(outage_model(low, tight, low_k=0.7, low_k_excess_db=41.0), 40.0).objective.met is False


@pytest.mark.parametrize("k_percentiles", [(), ((0.1, 1.1), (50.0, 1.333)), ((0.001, 0.71), (50.0, 1.333))])
def test_a_cut_off_at_a_low_k_that_the_statistics_do_not_reach_leaves_the_objective_open(k_percentiles):
    """At k = 0.7 diffraction takes 23.6 dB more than the budget counts: a margin of 13.6 dB does not hold that."""
    free = losing(*(0.0 for _ in k_percentiles), k_percentiles=k_percentiles)
    excess = {"k_statistics": free, "k_percentiles": k_percentiles}
    model = model_of(20.0, low_k=0.7, low_k_excess_db=23.6, **excess)
    found = predict(model, 13.6)
    assert (found.low_k_blocks, found.objective.met, found.objective.targets[0].met) == (True, None, None)
    [line] = [warning for warning in found.warnings if "low k" in warning]
    assert "0.7, takes 23.6 dB more than the budget counts, over the fade margin of 13.6 dB: the hop is cut" in line
    assert found.objective.undecided == (line,)
    target = found.objective.targets[0]
    assert (target.margin_set_by, target.limited_by) == ("obstruction", "multipath")
    assert target.required_margin_db == pytest.approx(23.6, abs=1e-6)
    held = predict(model, 23.7)
    assert (held.low_k_blocks, held.objective.met) == (False, True)
    assert not any("low k" in warning for warning in held.warnings)


def test_statistics_that_reach_the_low_k_count_it():
    pairs = ((0.1, 0.7), (50.0, 4 / 3))
    statistics = losing(23.6, 0.0, k_percentiles=pairs)
    model = model_of(20.0, low_k=0.7, low_k_excess_db=23.6, k_percentiles=pairs, k_statistics=statistics)
    found = predict(model, 13.6)
    assert (found.low_k_blocks, found.objective.met, found.objective.undecided) == (True, True, ())
    assert found.year_percent.obstruction > 0.1
    assert found.warnings == ()


FINE = {"k_percentiles": ((0.01, 0.6), (50.0, 4 / 3)), "k_statistics": KStatistics([0.01, 50.0], [51.2, 0.0])}
"""Statistics that end at 0.01 % of the year, under a target of 5 minutes, 0.00095 %."""


def test_an_unknown_tail_above_the_target_leaves_it_open():
    model = model_of(5 / 525960 * 100, low_k=0.7, low_k_excess_db=40.0, **FINE)
    found = predict(model, 51.7)
    year, [target] = found.year_percent, found.objective.targets
    assert (year.obstruction, year.obstruction_up_to) == (0.0, pytest.approx(0.01))
    assert year.total_up_to == pytest.approx(year.total + 0.01)
    assert target.achieved < target.required < target.achieved_up_to == pytest.approx(year.total_up_to)
    assert (target.met, found.objective.met) == (None, None)
    assert (target.required_margin_db, target.margin_set_by) == (None, "obstruction")
    assert any("obstruction below the lowest k given could make it 0.01" in line for line in found.objective.undecided)
    assert any("and it could be up to 0.01 %" in line for line in found.assumptions)
    # a target that the whole tail fits into is decided, and the margin for it is that which ends the cut-off
    easy = predict(model_of(0.011, low_k=0.7, low_k_excess_db=40.0, **FINE), 51.7).objective
    assert (easy.met, easy.margin_set_by) == (True, "obstruction")
    assert easy.required_margin_db < 51.2


def test_holding_at_a_lower_k_ends_the_unknown_tail():
    model = model_of(5 / 525960 * 100, low_k=0.5, low_k_excess_db=56.0, **FINE)
    short, held = predict(model, 51.7), predict(model, 56.1)
    assert (short.year_percent.obstruction_up_to, held.year_percent.obstruction_up_to) == (pytest.approx(0.01), 0.0)
    assert (short.objective.met, held.objective.met) == (None, True)
    assert short.objective.required_margin_db == pytest.approx(56.0, abs=1e-6)
    assert any("nor at the low k of the rules, 0.5; below that counted as 0" in line for line in held.assumptions)


@given(margins_db, st.floats(0.0, 20.0), st.floats(0.3, 1.3), st.floats(0.0, 70.0))
def test_what_could_be_is_never_less_than_what_is_counted(margin_db, more_db, low_k, excess_db):
    curve = outage_curve(
        model_of(0.01, low_k=low_k, low_k_excess_db=excess_db, **FINE), [margin_db, margin_db + more_db]
    )
    for period in (curve.worst_month_percent, curve.year_percent):
        assert (period.obstruction <= period.obstruction_up_to).all()
        assert (period.total <= period.total_up_to).all()
        assert period.obstruction_up_to[1] <= period.obstruction_up_to[0]


@given(st.floats(1e-4, 10.0), st.floats(0.3, 1.3), st.floats(0.0, 70.0))
def test_the_margin_asked_for_is_sure_and_less_is_not(year_percent, low_k, excess_db):
    model = model_of(year_percent, low_k=low_k, low_k_excess_db=excess_db, **FINE)
    wanted = predict(model, 30.0).objective.required_margin_db
    if wanted is not None:
        assert predict(model, wanted).objective.met is True
    if wanted is None or wanted > 0.01:
        assert predict(model, 199.0 if wanted is None else wanted - 0.001).objective.met is not True


def test_the_mechanism_that_sets_the_margin_is_not_always_the_one_that_limits():
    """At 55 dB multipath is all there is, but without obstruction, 51.2 dB over at 0.01 %, 43 dB would do."""
    found = predict(model_of(1e-3, low_k=0.5, low_k_excess_db=54.0, **FINE), 55.0).objective
    assert (found.targets[0].limited_by, found.margin_set_by) == ("multipath", "obstruction")
    without = predict(model_of(1e-3), 55.0).objective
    assert (without.margin_set_by, found.required_margin_db) == ("multipath", pytest.approx(54.0, abs=1e-6))
    assert without.required_margin_db < 45.0


def test_every_target_has_its_unit():
    asked = Objective(0.1, 0.1, 50.0, 1e-3, 1e-3, 3.0)
    targets = predict(full_model(objective=asked), 35.0).objective.targets
    assert [(target.name, target.unit) for target in targets] == [
        ("worst_month_percent", "%"),
        ("year_percent", "%"),
        ("minutes_per_year", "min"),
        ("severely_errored_seconds_ratio", "ratio"),
        ("errored_seconds_ratio", "ratio"),
    ]


@pytest.mark.parametrize("method", sorted(CHOICES))
def test_multipath_over_a_blocked_path_is_warned_of(method):
    # An edge that touches the ray takes 6.0 dB (Rec. ITU-R P.526-15 §4.1, J(0) = 6.03).
    def warned(loss_db):
        model = outage_model(replace(PATH, median_k=4 / 3, median_loss_db=loss_db), CHOICES[method])
        return [line for line in predict(model, 30.0).warnings if "for paths clear of the ground" in line]

    assert warned(5.9) == warned(None) == []
    [line] = warned(24.1)
    assert line.startswith("diffraction at the median k = 24.1 dB: more than the 6 dB")


def test_no_margin_at_all():
    found = predict(full_model(objective=Objective(year_percent=0.1)), -3.0)
    for outages in (found.worst_month_percent, found.year_percent):
        assert (outages.total, outages.total_up_to) == (100.0, 100.0)
        assert all(outages.part(mechanism) is None for mechanism in MECHANISMS)
        assert outages.clear_air is outages.obstruction_up_to is None
    assert (found.limited_by, found.objective.met, found.objective.targets[0].achieved) == ("no margin", False, 100.0)
    assert found.objective.required_margin_db > 0
    assert "fade margin −3.0 dB: the hop is below its threshold without any fading" in found.warnings


def test_obstruction_of_the_year_and_of_the_month():
    year, month = (predict(full_model(k_period=period), 30.0) for period in ("year", "worst-month"))
    assert year.year_percent.obstruction == pytest.approx(month.worst_month_percent.obstruction)
    assert year.worst_month_percent.obstruction > year.year_percent.obstruction > month.year_percent.obstruction > 0
    free = predict(full_model(), 46.0)
    assert free.year_percent.obstruction == 0.0
    assert any("and it could be up to 0.1 %" in line for line in free.assumptions)


@pytest.mark.parametrize(
    ("changes", "warning"),
    [
        ({"distance_m": 6e3}, "distance = 6 km: outside the 7.5 to 185 km of multipath by Rec. ITU-R P.530-17 §2.3.1"),
        ({"distance_m": 4e3}, "§2.3 lets multipath on paths of 5 km or less count as zero, which was not done"),
        ({"distance_m": 200e3}, "distance = 200 km: outside the 0 to 60 km of rain by Rec. ITU-R P.530-18 §2.4.1"),
        ({"frequency_hz": 80e9}, "frequency = 80 GHz: outside the 0.45 to 45 GHz of multipath"),
        ({"frequency_hz": 0.3e9}, "frequency = 0.3 GHz: below the 15/d = 0.312 GHz of multipath"),
        ({"frequency_hz": 105e9}, "frequency = 105 GHz: outside the 1 to 100 GHz of rain"),
        ({"frequency_hz": 18e9}, "frequency = 18 GHz: outside the 2 to 11 GHz of space diversity"),
        ({"centre_a_m": 5000.0}, "path inclination = 96.6667 mrad: outside the 0 to 37 mrad of multipath"),
        ({"centre_a_m": 3.0}, "lower antenna = 3 m above sea level: outside the 17 to 2300 m above sea level of"),
    ],
)
def test_ranges_are_named(changes, warning):
    found = predict(outage_model(replace(PATH, **changes), FULL, k_statistics=losing(0.0, 0.0, 0.0)), 30.0)
    assert any(warning in line for line in found.warnings), found.warnings
    assert all(line.count("\n") == 0 for line in found.warnings)


@pytest.mark.parametrize(
    ("method", "changes", "warning"),
    [
        (
            "p530-17",
            {"terrain_roughness_m": 0.5},
            "terrain_roughness_m = 0.5 m: outside the 6 to 850 m of .* counts as 1 m",
        ),
        ("p530-17", {"dn1_n_km": -100.0}, "dn1_n_km = -100 N/km: outside the -860 to -150 N/km of"),
        (
            "vigants-barnett",
            {"annual_temperature_k": 300.0},
            "annual_temperature_k = 300: outside the 274.8 to 297.0 K",
        ),
        ("vigants-barnett", {"diversity": DiversityChoice(40.0)}, "diversity spacing = 40 m: outside the 5 to 15 m of"),
    ],
)
def test_ranges_of_the_climate_are_named(method, changes, warning):
    import re

    found = predict(outage_model(PATH, replace(CHOICES[method], **changes)), 30.0)
    assert any(re.search(warning, line) for line in found.warnings), found.warnings


def test_inside_every_range_nothing_is_warned():
    path = replace(PATH, distance_m=50e3)
    assert predict(outage_model(path, replace(FULL, rain_rate_mm_h=42.0)), 30.0).warnings == ()
    assert predict(outage_model(path, CHOICES["vigants-barnett"]), 30.0).warnings == ()


def test_extreme_multipath_is_warned_of_and_stays_whole():
    found = outage_model(replace(PATH, distance_m=150e3), replace(CHOICES["p530-17"], geoclimatic_factor=1e-3))
    assert any("outside the 0 to 2000 % of the shallow fading" in line for line in predict(found, 20.0).warnings)
    assert (np.diff(outage_curve(found, np.linspace(0, 80, 200)).worst_month_percent.total) <= 0).all()


def test_every_number_has_a_source():
    sources = {"rain_rate_mm_h": "map of P.837-7", "terrain_roughness_m": "terrain", "median_k": "the map of k"}
    given = {"k_statistics": losing(45.0, 20.0, 0.0), "low_k": 0.7, "low_k_excess_db": 25.0}
    model = outage_model(replace(PATH, median_k=1.31), FULL, signature=RADIO, sources=sources, **given)
    used = {given.name: given for given in predict(model, 30.0).inputs}
    assert all(given.source for given in used.values())
    assert used["rain_rate_mm_h"].source == "map of P.837-7"
    assert used["terrain_roughness_m"].source == "terrain"
    assert used["dn1_n_km"].source == used["k_percentiles"].source == "given"
    assert used["k_percentiles"].value == "0.6 at 0.1 %, 0.8 at 1 %, 1.33 at 50 %"
    assert used["k_percentiles"].line == "k_percentiles = 0.6 at 0.1 %, 0.8 at 1 %, 1.33 at 50 %: given"
    assert (used["median_k"].value, used["median_k"].source) == (1.31, "the map of k")
    assert (used["low_k"].value, used["low_k_excess_db"].value) == (0.7, 25.0)
    assert used["multipath_occurrence_percent"].value == model.fading.occurrence_percent
    assert "P.530-17 §2.3.1, detailed design" in used["geoclimatic_factor"].source


def test_geoclimatic_factor_given_replaces_its_formula():
    given = outage_model(PATH, AvailabilityChoice("p530-17", geoclimatic_factor=1e-5))
    more = outage_model(PATH, AvailabilityChoice("p530-17", geoclimatic_factor=2e-5, dn1_n_km=-300.0))
    assert more.fading.occurrence_percent == pytest.approx(2 * given.fading.occurrence_percent)
    assert "dn1_n_km" not in {used.name for used in more.notes.inputs}


@pytest.mark.parametrize(
    ("choice", "message"),
    [
        (AvailabilityChoice("p530-17"), "dn1_n_km = not given: must be given for multipath_method p530-17; give dn1"),
        (
            AvailabilityChoice("p530-17", dn1_n_km=-300.0),
            "terrain_roughness_m = not given: must be given for multipath_method p530-17; .* or choose p530-17-quick",
        ),
        (AvailabilityChoice("p530-18", dn75_n_km=1.0), "geoclimatic_factor = not given: must be given for .* p530-18"),
        (AvailabilityChoice("p530-18", geoclimatic_factor=1e-6), "dn75_n_km = not given: must be given for .* p530-18"),
        (AvailabilityChoice("vigants-barnett"), "climate_factor = not given: must be given for .* vigants-barnett"),
    ],
)
def test_what_is_refused(choice, message):
    with pytest.raises(InputError, match=message):
        outage_model(PATH, choice)


@pytest.mark.parametrize(
    ("field", "value", "message"),
    [
        ("multipath_method", "p530", "multipath_method = 'p530': must be one of 'p530-17', 'p530-17-quick', 'p530-18'"),
        ("climate_factor", 0.0, r"climate_factor = 0\.0: must be more than 0"),
        ("rain_rate_mm_h", -1.0, r"rain_rate_mm_h = -1\.0: must be 0 to 500 mm/h"),
    ],
)
def test_a_choice_refuses_impossible_values(field, value, message):
    with pytest.raises(InputError, match=message):
        replace(FULL, **{field: value})


def test_facts_and_margins_that_are_refused():
    with pytest.raises(InputError, match="mean_ground_m = not given: must be given for multipath_method p530-18"):
        outage_model(replace(PATH, mean_ground_m=None), CHOICES["p530-18"])
    with pytest.raises(InputError, match=r"low_k = 0\.7: must be given together with low_k_excess_db = None"):
        outage_model(PATH, FULL, low_k=0.7)
    with pytest.raises(InputError, match="distance_m = 0: must be finite and more than 0 m"):
        replace(PATH, distance_m=0)
    with pytest.raises(InputError, match="centre_a_m = nan: must be a height in metres"):
        replace(PATH, centre_a_m=np.nan)
    with pytest.raises(InputError, match="latitude = 91: must be -90 to 90 degrees"):
        replace(PATH, latitude=91)
    with pytest.raises(InputError, match="fade_margin_db = nan: must be a finite number of dB"):
        predict(full_model(), np.nan)
    with pytest.raises(InputError, match="margin_db = -1: must be finite and 0 dB or more"):
        outage_curve(full_model(), -1.0)
    with pytest.raises(InputError, match=r"errored_threshold_offset_db = \(missing\): must be given beside"):
        Objective(errored_seconds_ratio=0.01)
    with pytest.raises(InputError, match="year_percent = 0: must be more than 0 and under 100 %"):
        Objective(year_percent=0)
