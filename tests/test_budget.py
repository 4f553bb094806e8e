"""The link budget against published free-space and antenna figures, textbook arithmetic, and its own inverse."""

import json
import math
from dataclasses import asdict, replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.budget import (
    dish_diameter,
    dish_gain,
    far_field_distance,
    free_space_loss,
    least_gain,
    least_power,
    link_budget,
    longest_free_space_range,
    smallest_dish,
)
from profiler.errors import InputError
from profiler.models import Radio, RadioMode, Terminal

QPSK = RadioMode("QPSK", noise_figure_db=6.0, bandwidth_hz=28e6, modulation="QPSK", bit_error_ratio=1e-6)
HIGH = replace(QPSK, name="256-QAM", modulation="256-QAM", power_dbm=22.0, implementation_loss_db=2.0)
A = Terminal(power_dbm=27.0, line_loss_db=1.2, diameter_m=1.8, efficiency=0.55)
B = Terminal(power_dbm=30.0, line_loss_db=2.5, gain_dbi=41.3)
RADIO = Radio(A, B, (QPSK, HIGH), (("radome", 0.5), ("branching", 1.0)))
PATH = {"distance_m": 42e3, "frequency_hz": 7.5e9, "gas_db": 0.5, "diffraction_db": 1.7}


def half_digit(printed: str) -> float:
    return 0.5 * 10.0 ** -len(printed.partition(".")[2])


def printed_close(value: float, printed: str) -> bool:
    return abs(value - float(printed)) <= half_digit(printed) + 1e-9


# --- free space and antennas


@pytest.mark.parametrize(
    ("constant_db", "metre", "hertz"),
    [
        ("32.4", 1e3, 1e6),  # Rec. ITU-R P.525-4: 32.4 + 20 log f(MHz) + 20 log d(km)
        ("92.45", 1e3, 1e9),  # the same in GHz, as most handbooks print it
        ("36.58", 1609.344, 1e6),  # Freeman, Radio System Design for Telecommunications: statute miles, MHz
        ("96.58", 1609.344, 1e9),  # the same in GHz
    ],
)
def test_free_space_constants_of_the_handbooks(constant_db, metre, hertz):
    # All from memory.
    assert printed_close(float(free_space_loss(metre, hertz)), constant_db)
    assert printed_close(float(free_space_loss(37 * metre, 18 * hertz)) - 20 * math.log10(37 * 18), constant_db)


@given(st.floats(1, 1e6), st.floats(1e7, 1e12))
def test_free_space_doubles_with_distance_and_with_frequency(distance_m, frequency_hz):
    once, far, high = free_space_loss(distance_m * np.array([1, 2, 1]), frequency_hz * np.array([1, 1, 2]))
    assert far - once == pytest.approx(20 * math.log10(2), abs=1e-9)
    assert high == pytest.approx(far, abs=1e-9)


def test_free_space_broadcasts():
    grid = free_space_loss(np.array([1e3, 2e3, 3e3])[:, None], np.array([6e9, 11e9]))
    assert grid.shape == (3, 2)
    assert float(grid[2, 1]) == float(free_space_loss(3e3, 11e9))


@pytest.mark.parametrize(
    ("distance", "frequency", "named"), [(0, 1e9, "distance"), (-1, 1e9, "distance"), (1, 0, "freq")]
)
def test_free_space_refuses_nothing_and_less(distance, frequency, named):
    with pytest.raises(InputError, match=f"{named}.*must be finite and more than 0"):
        free_space_loss(distance, frequency)


@pytest.mark.parametrize("ratio", [20.0, 60.0, 150.0])
def test_dish_gain_of_the_published_rule(ratio):
    # Rec. ITU-R F.699-8, recommends 3 (from memory): 20 log(D/λ) ≈ Gmax − 7.7, which is an efficiency of 0.6.
    frequency_hz = 6e9
    diameter_m = ratio * 299_792_458.0 / frequency_hz
    assert printed_close(float(dish_gain(diameter_m, 0.6, frequency_hz)) - 20 * math.log10(ratio), "7.7")


def test_dish_gain_of_the_handbook_constant():
    # G = 17.8 + 20 log(D in m) + 20 log(f in GHz) at 55 % (Freeman and others, from memory).
    assert printed_close(float(dish_gain(1.0, 0.55, 1e9)), "17.8")
    assert printed_close(float(dish_gain(3.0, 0.55, 6e9)) - 20 * math.log10(18), "17.8")


@given(st.floats(0.1, 30), st.floats(0.05, 1.0), st.floats(1e8, 1e11))
def test_dish_diameter_inverts_dish_gain(diameter_m, efficiency, frequency_hz):
    gain = dish_gain(diameter_m, efficiency, frequency_hz)
    assert float(dish_diameter(gain, efficiency, frequency_hz)) == pytest.approx(diameter_m, rel=1e-12)


def test_far_field_of_a_dish_is_a_textbook_value():
    # 2·D²/λ: a 2 m aperture at a wavelength of 0.05 m reaches its far field at 160 m (Balanis, Antenna Theory, §2.2.4).
    assert float(far_field_distance(2.0, 299_792_458.0 / 0.05)) == pytest.approx(160.0)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((0.0, 0.5, 1e9), "diameter_m = 0: must be finite and more than 0 m"),
        ((1.0, 55, 1e9), "efficiency = 55"),
        ((1.0, 0.5, -1.0), "frequency"),
    ],
)
def test_dish_gain_refuses_impossible_values(arguments, message):
    with pytest.raises(InputError, match=message):
        dish_gain(*arguments)


def test_dish_diameter_refuses_an_infinite_gain():
    with pytest.raises(InputError, match="gain_dbi = inf: must be a finite number of dBi"):
        dish_diameter(math.inf, 0.5, 1e9)


# --- the table


def test_budget_is_textbook_arithmetic_line_by_line():
    budget = link_budget(RADIO, **PATH)
    # Rounded by hand: 32.45 + 20 log(42·7500) = 142.42; 17.81 + 20 log(1.8·7.5) = 40.41; -173.98 + 6 + 74.47 + 13.54.
    down = 27.0 - 1.2 + 40.41 - 142.42 - 0.5 - 1.7 - 0.5 - 1.0 + 41.3 - 2.5
    assert budget.a_to_b.received_dbm == pytest.approx(down, abs=0.02)
    assert budget.b_to_a.received_dbm == pytest.approx(down + 3.0, abs=0.02)
    assert budget.a_to_b.threshold_dbm == pytest.approx(-173.98 + 6.0 + 74.47 + 13.54, abs=0.02)
    assert budget.a_to_b.fade_margin_db == pytest.approx(down + 79.97, abs=0.04)


@given(st.floats(1e3, 1e5), st.floats(1e9, 1e11), st.floats(0, 50), st.floats(0, 80), st.floats(-30, 40))
def test_every_table_adds_up(distance_m, frequency_hz, gas_db, diffraction_db, power_dbm):
    radio = replace(RADIO, terminal_a=replace(A, power_dbm=power_dbm))
    budget = link_budget(radio, distance_m, frequency_hz, gas_db=gas_db, diffraction_db=diffraction_db)
    for way in (budget.a_to_b, budget.b_to_a):
        for row in way.modes:
            assert math.fsum(line.value for line in row.lines) == row.received_dbm
            assert math.fsum(line.value for line in row.threshold_lines) == row.threshold_dbm
            assert row.received_dbm - row.threshold_dbm == row.fade_margin_db
        lines = {line.name: line.value for line in way.modes[0].lines}
        assert (-lines["free space"], -lines["gases"], -lines["diffraction"]) == (
            way.free_space_db,
            gas_db,
            diffraction_db,
        )
        assert way.free_space_db == float(free_space_loss(distance_m, frequency_hz))


def test_directions_name_their_ends_and_lines_in_order():
    budget = link_budget(RADIO, **PATH)
    assert (budget.b_to_a.transmitter, budget.b_to_a.receiver) == ("B", "A")
    assert [line.name for line in budget.b_to_a.modes[0].lines] == [
        "transmit power B",
        "line loss B",
        "antenna gain B",
        "free space",
        "gases",
        "diffraction",
        "radome",
        "branching",
        "antenna gain A",
        "line loss A",
    ]


def test_each_mode_has_a_row_and_its_own_power():
    down = link_budget(RADIO, **PATH).a_to_b
    assert [row.name for row in down.modes] == ["QPSK", "256-QAM"]
    first, second = down.modes
    assert first.received_dbm - second.received_dbm == pytest.approx(27.0 - 22.0, abs=1e-9)
    # F.1101 Table 1 (from memory): S/N 13.5 dB for QPSK, 32.6 dB for 256-QAM; and 2 dB implementation loss.
    assert second.threshold_dbm - first.threshold_dbm == pytest.approx(32.6 - 13.5 + 2.0, abs=0.1)
    assert down.received_dbm == first.received_dbm
    assert down.fade_margin_db == first.fade_margin_db
    assert "those of its first mode, QPSK" in " ".join(link_budget(RADIO, **PATH).assumptions)


def test_what_a_loss_does_to_the_margin():
    def margin(radio=RADIO, **more):
        return link_budget(radio, **{**PATH, **more}).a_to_b.fade_margin_db

    assert margin() - margin(diffraction_db=4.7) == pytest.approx(3.0)
    assert margin() - margin(gas_db=1.5) == pytest.approx(1.0)
    assert margin() - margin(replace(RADIO, terminal_b=replace(B, line_loss_db=4.5))) == pytest.approx(2.0)
    assert margin(replace(RADIO, other_losses_db=())) - margin() == pytest.approx(1.5)
    assert margin() - margin(distance_m=84e3) == pytest.approx(20 * math.log10(2))


def test_swapping_the_ends_swaps_the_directions():
    there = link_budget(RADIO, **PATH)
    back = link_budget(replace(RADIO, terminal_a=B, terminal_b=A), **PATH)
    assert back.a_to_b.fade_margin_db == pytest.approx(there.b_to_a.fade_margin_db, abs=1e-9)


def test_no_threshold_data_gives_none_and_nothing_invented():
    for modes in ((RadioMode("256-QAM", modulation="256-QAM", bandwidth_hz=28e6),), ()):
        down = link_budget(replace(RADIO, modes=modes), **PATH).a_to_b
        assert (down.threshold_dbm, down.fade_margin_db) == (None, None)
        assert math.isfinite(down.received_dbm)


def test_no_loss_is_zero_not_minus_zero():
    down = link_budget(RADIO, 42e3, 7.5e9, gas_db=0.0, diffraction_db=0.0).a_to_b
    assert all(math.copysign(1, line.value) == 1 for line in down.modes[0].lines if line.value == 0)
    assert math.copysign(1, down.diffraction_db) == 1


def test_budget_is_plain_json():
    budget = link_budget(RADIO, **PATH, gas_note="Rec. ITU-R P.676-13 Annex 1")
    again = json.loads(json.dumps(asdict(budget), allow_nan=False))
    assert again["a_to_b"]["modes"][0]["lines"][4]["note"] == "Rec. ITU-R P.676-13 Annex 1"
    assert again["b_to_a"]["received_dbm"] == budget.b_to_a.received_dbm


def test_near_field_is_a_warning_that_names_its_distance():
    assert link_budget(RADIO, **PATH).warnings == ()
    (warning,) = link_budget(RADIO, **{**PATH, "distance_m": 150.0}).warnings
    assert "distance of 150.0 m is nearer than the far field of the 1.80 m antenna at A" in str(warning)
    assert f"2·D²/λ = {2 * 1.8**2 / (299_792_458 / 7.5e9):.0f} m" in str(warning)
    assert "far field of the 5.91 ft antenna at A" in warning.text(feet=True)  # 1.8 m / 0.3048


@pytest.mark.parametrize("loss", [math.nan, math.inf])
def test_a_loss_must_be_a_number(loss):
    with pytest.raises(InputError, match=r"diffraction loss = .*: must be a finite number of dB"):
        link_budget(RADIO, **{**PATH, "diffraction_db": loss})


def with_a(**fields: float | None) -> Radio:
    return replace(RADIO, terminal_a=replace(A, **fields))


@pytest.mark.parametrize(
    ("fields", "message"),
    [
        ({"efficiency": None}, "terminal A: no antenna gain: give the gain in dBi, or dish diameter and efficiency"),
        ({"diameter_m": None}, "terminal A: no antenna gain"),
        ({"gain_dbi": 42.0}, "terminal A: gain 42 dBi as given and 40.42 dBi from the 1.8 m dish at efficiency 0.55"),
        ({"gain_dbi": 43.2, "efficiency": None}, "gain 43.2 dBi: must be at most 43.01 dBi, what a 1.8 m dish has"),
    ],
)
def test_antenna_statements_that_lack_or_contradict(fields, message):
    with pytest.raises(InputError, match=message):
        link_budget(with_a(**fields), **PATH)


def test_antenna_statements_that_agree():
    plain = link_budget(RADIO, **PATH).a_to_b.received_dbm
    assert link_budget(with_a(gain_dbi=40.4), **PATH).a_to_b.received_dbm == pytest.approx(plain, abs=0.05)
    assert link_budget(with_a(gain_dbi=40.4, efficiency=None), **PATH).a_to_b.received_dbm == pytest.approx(
        plain, abs=0.05
    )


@pytest.mark.parametrize(
    ("fields", "message"),
    [
        ({"line_loss_db": -1.0}, "line_loss_db = -1.0: must be 0 dB or more"),
        ({"efficiency": 55.0}, "efficiency = 55.0: .*a fraction, not percent"),
        ({"diameter_m": 0.0}, "diameter_m = 0.0: must be more than 0 m"),
        ({"power_dbm": math.nan}, "power_dbm = nan: must be a finite number of dBm"),
        ({"gain_dbi": math.inf}, "gain_dbi = inf: must be a finite number of dBi"),
    ],
)
def test_terminal_refuses_impossible_values(fields, message):
    with pytest.raises(InputError, match=message):
        with_a(**fields)


def test_radio_refuses_negative_losses_and_modes_of_one_name():
    with pytest.raises(InputError, match=r"other_losses_db\.radome = -1\.0: must be 0 dB or more"):
        replace(RADIO, other_losses_db=(("radome", -1.0),))
    with pytest.raises(InputError, match="name = 'QPSK': must be another name than"):
        replace(RADIO, modes=(QPSK, QPSK))


# --- the inverse questions, each re-checked by the forward budget

WAYS = st.sampled_from(["a_to_b", "b_to_a"])
MODES = st.sampled_from(["QPSK", "256-QAM"])


def row_of(radio: Radio, direction: str, mode: str, **path: float):
    rows = getattr(link_budget(radio, **path), direction).modes
    return next(row for row in rows if row.name == mode)


@given(WAYS, MODES, st.floats(0, 50), st.floats(-12, -2), st.floats(1e9, 1e11))
def test_longest_range_has_exactly_the_wanted_margin(direction, mode, margin_db, exponent, frequency_hz):
    ratio = 10.0**exponent
    question = {"direction": direction, "mode": mode, "bit_error_ratio": ratio, "fade_margin_db": margin_db}
    answer = longest_free_space_range(RADIO, frequency_hz, **question)
    asked = replace(RADIO, modes=tuple(replace(m, bit_error_ratio=ratio) for m in RADIO.modes))
    path = {"distance_m": answer.value, "frequency_hz": frequency_hz, "gas_db": 0.0, "diffraction_db": 0.0}
    assert row_of(asked, direction, mode, **path).fade_margin_db == pytest.approx(margin_db, abs=1e-8)
    loss_db = math.fsum(line.value for line in answer.lines)
    assert loss_db == pytest.approx(float(free_space_loss(answer.value, frequency_hz)), abs=1e-9)


def test_longest_range_is_textbook_arithmetic():
    # By hand, digits rounded: Eb/N0 10.53 (Sklar) -> C/N0 80.53 at 10 Mbit/s -> -87.4 dBm at 6 dB -> 147.4 dB of free
    # space for 20 dBm and 2 x 20 dBi -> 20 log d = 147.4 - 92.45 - 20 log 10 = 35.0, or 56 km.
    end = Terminal(power_dbm=20.0, gain_dbi=20.0)
    mode = RadioMode("QPSK", noise_figure_db=6.0, bit_rate_bps=10e6, modulation="QPSK")
    answer = longest_free_space_range(Radio(end, end, (mode,)), 10e9, bit_error_ratio=1e-6)
    assert answer.value == pytest.approx(56e3, rel=0.01)
    assert answer.unit == "m"
    assert "no gases, no obstacles" in " ".join(answer.assumptions)


def test_range_of_a_given_threshold_and_of_no_threshold():
    end = Terminal(power_dbm=20.0, gain_dbi=20.0)
    given_level = Radio(end, end, (RadioMode("x", threshold_dbm=-80.0),))
    assert float(free_space_loss(longest_free_space_range(given_level, 10e9).value, 10e9)) == pytest.approx(140.0)
    with pytest.raises(InputError, match="mode x: no threshold: give it in dBm, or noise figure"):
        longest_free_space_range(Radio(end, end, (RadioMode("x"),)), 10e9)
    with pytest.raises(InputError, match=r"mode x: noise figure or temperature, .* not given"):
        longest_free_space_range(given_level, 10e9, bit_error_ratio=1e-6)


@given(WAYS, MODES, st.floats(-10, 60), st.floats(0, 60))
def test_least_power_has_exactly_the_wanted_margin(direction, mode, margin_db, diffraction_db):
    path = {**PATH, "diffraction_db": diffraction_db}
    answer = least_power(RADIO, **path, direction=direction, mode=mode, fade_margin_db=margin_db)
    asked = replace(RADIO, modes=tuple(replace(m, power_dbm=answer.value) for m in RADIO.modes))
    assert row_of(asked, direction, mode, **path).fade_margin_db == pytest.approx(margin_db, abs=1e-9)
    assert math.fsum(line.value for line in answer.lines) == answer.value


@given(WAYS, MODES, st.sampled_from(["both", "transmitter", "receiver"]), st.floats(0, 60), st.floats(0.3, 0.8))
def test_smallest_dish_has_exactly_the_wanted_margin(direction, mode, resized, margin_db, efficiency_b):
    radio = replace(RADIO, terminal_b=replace(B, efficiency=efficiency_b))
    answer = smallest_dish(radio, **PATH, direction=direction, mode=mode, resized=resized, fade_margin_db=margin_db)
    sender_is_a = direction == "a_to_b"
    resized_a = resized == "both" or (resized == "transmitter") == sender_is_a
    resized_b = resized == "both" or not resized_a
    dish = {"gain_dbi": None, "diameter_m": answer.value}
    asked = replace(
        radio,
        terminal_a=replace(A, **dish) if resized_a else A,
        terminal_b=replace(radio.terminal_b, **dish) if resized_b else radio.terminal_b,
    )
    assert row_of(asked, direction, mode, **PATH).fade_margin_db == pytest.approx(margin_db, abs=1e-9)
    gains = [line for line in link_budget(asked, **PATH).a_to_b.modes[0].lines if line.unit == "dBi"]
    new = [line.value for line, is_new in zip(gains, (resized_a, resized_b), strict=True) if is_new]
    assert math.fsum(line.value for line in answer.lines) == pytest.approx(sum(new), abs=1e-9)


@given(WAYS, st.sampled_from(["both", "transmitter", "receiver"]), st.floats(0, 60))
def test_least_gain_has_exactly_the_wanted_margin(direction, resized, margin_db):
    answer = least_gain(RADIO, **PATH, direction=direction, resized=resized, fade_margin_db=margin_db)
    sender, receiver = ("terminal_a", "terminal_b") if direction == "a_to_b" else ("terminal_b", "terminal_a")
    ends = {"both": (sender, receiver), "transmitter": (sender,), "receiver": (receiver,)}[resized]
    new = {"gain_dbi": answer.value, "diameter_m": None, "efficiency": None}
    asked = replace(RADIO, **{end: replace(getattr(RADIO, end), **new) for end in ends})
    assert row_of(asked, direction, RADIO.modes[0].name, **PATH).fade_margin_db == pytest.approx(margin_db, abs=1e-9)
    assert math.fsum(line.value for line in answer.lines) == pytest.approx(answer.value * len(ends), abs=1e-9)


def test_what_stands_on_the_other_side_of_the_budget_says_so():
    """A received level is power less losses plus gains: solved for one of them, the others change sign."""
    answer = least_power(RADIO, **PATH, fade_margin_db=30.0)
    assert [line.name for line in answer.lines if not line.name.startswith("less ")] == ["threshold", "fade margin"]
    answer = longest_free_space_range(RADIO, 10e9, fade_margin_db=30.0)
    turned = {line.name: line.value for line in answer.lines if line.name.startswith("less ")}
    assert turned == {
        "less threshold": -math.fsum(line.value for line in answer.threshold_lines),
        "less fade margin": -30.0,
    }


def test_smallest_dish_needs_no_gain_but_an_efficiency():
    bare = Terminal(power_dbm=27.0)
    radio = Radio(bare, bare, (QPSK,))
    with pytest.raises(InputError, match="terminal A: no antenna efficiency"):
        smallest_dish(radio, **PATH, fade_margin_db=30.0)
    by_argument = smallest_dish(radio, **PATH, fade_margin_db=30.0, efficiency=0.6)
    assert by_argument.value > 0
    assert "wavelengths" in " ".join(by_argument.assumptions)


def test_a_large_answer_is_warned_of_by_its_own_near_field():
    answer = smallest_dish(RADIO, **{**PATH, "distance_m": 300.0}, resized="transmitter", fade_margin_db=105.0)
    assert f"far field of the {answer.value:.2f} m antenna at A" in str(answer.warnings[0])


def test_a_wanted_margin_must_be_a_number():
    with pytest.raises(InputError, match="fade_margin_db = nan: must be a finite number of dB"):
        least_power(RADIO, **PATH, fade_margin_db=math.nan)


def test_unknown_mode_is_refused_with_the_known_names():
    with pytest.raises(InputError, match="mode = 512-QAM: must be one of QPSK, 256-QAM"):
        least_power(RADIO, **PATH, mode="512-QAM")
    with pytest.raises(InputError, match="radio modes = none"):
        least_power(replace(RADIO, modes=()), **PATH)
