"""Noise, error ratios and thresholds against handbooks, published formulas, quadrature and simulation."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.special import erfc, ndtr

from profiler.errors import InputError
from profiler.models import RadioMode
from profiler.receiver import bit_error_ratio, mode_threshold, noise_density_dbm_hz, required_eb_n0_db
from profiler.receiver.modulation import parse_modulation

SQUARE = [4, 16, 64, 256, 1024, 4096]
SCHEMES = ["BPSK", "QPSK", "8-PSK", "16-PSK", "32-PSK", "16-QAM", "32-QAM", "64-QAM", "128-QAM", "256-QAM", "2048-QAM"]
FULL = RadioMode("64", noise_figure_db=5.0, bandwidth_hz=28e6, modulation="64-QAM", bit_error_ratio=1e-6)


def changed(**fields: object) -> RadioMode:
    return RadioMode(**{name: getattr(FULL, name) for name in FULL.__slots__} | fields)


def half_digit(printed: str) -> float:
    return 0.5 * 10.0 ** -len(printed.partition(".")[2])


def printed_close(value: float, printed: str) -> bool:
    return abs(value - float(printed)) <= half_digit(printed) + 1e-12


# --- noise


def test_noise_density_at_290_kelvin_is_minus_174_dbm_per_hertz():
    # Figures of the trade: kT0 = -174 dBm/Hz (Rec. ITU-R P.372), k_B = -228.6 dBW/(K Hz); from memory.
    assert printed_close(float(noise_density_dbm_hz()), "-174")
    assert printed_close(float(noise_density_dbm_hz(1.0)) - 30.0, "-228.6")


@pytest.mark.parametrize("kelvin", [0.0, -1.0, math.nan])
def test_noise_needs_a_temperature(kelvin):
    with pytest.raises(InputError, match=r"temperature_k = .*: must be finite and more than 0 K"):
        noise_density_dbm_hz(kelvin)


# --- bit error ratios


@pytest.mark.parametrize(("x", "tail"), [("1", "0.15866"), ("2", "0.02275"), ("3", "0.00135"), ("4", "0.0000317")])
def test_bpsk_is_the_gaussian_tail(x, tail):
    # Abramowitz and Stegun, Handbook of Mathematical Functions, Table 26.1 (from memory): BPSK at Eb/N0 = x²/2.
    assert printed_close(float(bit_error_ratio("BPSK", 10 * math.log10(float(x) ** 2 / 2))), tail)


@pytest.mark.parametrize(("ratio", "eb_n0_db"), [(1e-3, "6.8"), (1e-5, "9.6"), (1e-6, "10.5")])
def test_bpsk_and_qpsk_handbook_figures(ratio, eb_n0_db):
    # Sklar, Digital Communications, 2nd ed.: coherent PSK (from memory).
    for name in ("BPSK", "QPSK", "4-QAM"):
        assert printed_close(float(required_eb_n0_db(name, ratio)), eb_n0_db)


S_N_AT_1E_MINUS_6 = {
    "BPSK": "10.5",
    "QPSK": "13.5",
    "8-PSK": "18.8",
    "16-PSK": "24.4",
    "16-QAM": "20.5",
    "32-QAM": "23.5",
    "64-QAM": "26.5",
    "128-QAM": "29.5",
    "256-QAM": "32.6",
    "512-QAM": "35.5",
}


@pytest.mark.parametrize(("name", "s_n_db"), S_N_AT_1E_MINUS_6.items())
def test_signal_to_noise_at_1e_minus_6_of_f1101(name, s_n_db):
    # Rec. ITU-R F.1101, Table 1, theoretical S/N at a bit error ratio of 1e-6 in the Nyquist bandwidth (from memory).
    # Its own note: assumptions differ slightly between rows; so twice the half digit.
    s_n = float(required_eb_n0_db(name, 1e-6)) + 10 * math.log10(parse_modulation(name).bits_per_symbol)
    assert abs(s_n - float(s_n_db)) <= 2 * half_digit(s_n_db)


@pytest.mark.parametrize(("order", "advantage_db"), [(16, "4.20"), (64, "9.95")])
def test_advantage_of_qam_over_psk(order, advantage_db):
    # Proakis, Digital Communications, 5th ed., Table 4.3-1 (from memory): of the arguments of Q alone, which the ratio
    # 1e-300 approaches; what the factors before Q leave there is under 0.003 dB.
    gap = float(required_eb_n0_db(f"{order}-PSK", 1e-300) - required_eb_n0_db(f"{order}-QAM", 1e-300))
    assert abs(gap - float(advantage_db)) <= half_digit(advantage_db) + 0.003


def cho_yoon(order: int, eb_n0: float) -> float:
    """Cho and Yoon, IEEE Trans. Commun. 50(7), 2002, eqs. 14 and 16, as printed (from memory)."""
    side, bits = math.isqrt(order), int(math.log2(order))
    total = 0.0
    for k in range(1, bits // 2 + 1):
        for i in range(round((1 - 2.0**-k) * side)):
            half = i * 2 ** (k - 1) / side
            weight = (-1) ** math.floor(half) * (2 ** (k - 1) - math.floor(half + 0.5))
            total += weight * erfc((2 * i + 1) * math.sqrt(3 * bits * eb_n0 / (2 * (order - 1)))) / side
    return total / (bits / 2)


@pytest.mark.parametrize("order", SQUARE)
def test_square_qam_is_the_published_sum(order):
    for eb_n0_db in (-10.0, 0.0, 5.0, 12.0, 20.0):
        published = cho_yoon(order, 10 ** (eb_n0_db / 10))
        assert float(bit_error_ratio(f"{order}-QAM", eb_n0_db)) == pytest.approx(published, rel=1e-9)


@pytest.mark.parametrize("order", SQUARE)
def test_square_qam_approaches_the_textbook_leading_term(order):
    # Pb ~ (4/log2 M)(1 - 1/sqrt M) Q(sqrt(3 log2 M/(M - 1) Eb/N0)): Proakis, 5th ed., §4.3-3 with Gray coding.
    bits = math.log2(order)
    eb_n0_db = float(required_eb_n0_db(f"{order}-QAM", 1e-6))
    q = ndtr(-math.sqrt(3 * bits / (order - 1) * 10 ** (eb_n0_db / 10)))
    assert 4 / bits * (1 - 1 / math.sqrt(order)) * q == pytest.approx(1e-6, rel=1e-6)


def psk_by_quadrature(order: int, eb_n0: float) -> float:
    """Integrate the phase density (Proakis, 5th ed., eq. 4.3-10) over sectors, weigh by Lassing et al. (2003)."""
    bits = int(math.log2(order))
    es_n0 = bits * eb_n0

    def density(phase: float) -> float:
        v = math.sqrt(2 * es_n0) * math.cos(phase)
        bulk = math.sqrt(2 * math.pi) * v * math.exp(-es_n0 * math.sin(phase) ** 2) * ndtr(v)
        return (math.exp(-es_n0) + bulk) / (2 * math.pi)

    total = 0.0
    for k in range(1, order):
        distance = 2 * abs(k / order - round(k / order))
        distance += 2 * sum(abs(k / 2**i - round(k / 2**i)) for i in range(2, bits + 1))
        low, high = (2 * k - 1) * math.pi / order, (2 * k + 1) * math.pi / order
        total += distance * quad(density, low, high, epsabs=1e-15, epsrel=1e-11)[0]
    return total / bits


@pytest.mark.parametrize("order", [8, 16, 32])
def test_psk_is_the_integral_of_the_phase_density(order):
    # Lassing, Strom, Agrell and Ottosson, IEEE Trans. Commun. 51(11), 2003, for the mean Gray distance (from memory).
    for eb_n0_db in (-5.0, 3.0, 8.0, 14.0):
        by_quadrature = psk_by_quadrature(order, 10 ** (eb_n0_db / 10))
        assert float(bit_error_ratio(f"{order}-PSK", eb_n0_db)) == pytest.approx(by_quadrature, rel=1e-7, abs=1e-14)


def gray(n: int) -> int:
    return n ^ (n >> 1)


def psk_points(order: int) -> dict[int, complex]:
    return {gray(i): np.exp(2j * np.pi * i / order) for i in range(order)}


def qam_points(order: int) -> dict[int, complex]:
    """Gray grid; for a cross the outer columns of the wide grid turned over to above and below, point by point."""
    bits = int(math.log2(order))
    wide, high = 2 ** ((bits + 1) // 2), 2 ** (bits // 2)
    points = {}
    for i in range(wide):
        for j in range(high):
            x, y = 2 * i - wide + 1, 2 * j - high + 1
            if bits % 2 and abs(x) > 3 * wide // 4:
                x, y = int(math.copysign(abs(y), x)), int(math.copysign(high + abs(x) - 3 * wide // 4, y))
            points[gray(i) << (bits // 2) | gray(j)] = complex(x, y)
    assert len(set(points.values())) == order
    return points


def simulate(points: dict[int, complex], eb_n0_db: float, symbols: int, seed: int) -> tuple[float, float]:
    """Bit error ratio of a nearest-point receiver, and its standard error (from the spread over the symbols)."""
    rng = np.random.default_rng(seed)
    labels, where = np.array(list(points)), np.array(list(points.values()))
    bits = math.log2(labels.size)
    sent = rng.integers(0, labels.size, symbols)
    sigma = math.sqrt(np.mean(np.abs(where) ** 2) / bits / 10 ** (eb_n0_db / 10) / 2)
    heard = where[sent] + sigma * (rng.standard_normal(symbols) + 1j * rng.standard_normal(symbols))
    nearest = np.concatenate([np.abs(part[:, None] - where).argmin(1) for part in np.array_split(heard, 20)])
    wrong = np.array([int(value).bit_count() for value in labels[sent] ^ labels[nearest]]) / bits
    return float(wrong.mean()), float(wrong.std() / math.sqrt(symbols))


@pytest.mark.parametrize("name", ["8-PSK", "16-PSK", "16-QAM", "64-QAM", "32-QAM", "128-QAM"])
@pytest.mark.parametrize("ratio", [0.03, 0.004])
def test_error_ratio_of_a_simulated_receiver(name, ratio):
    scheme = parse_modulation(name)
    points = psk_points(scheme.order) if scheme.family == "PSK" else qam_points(scheme.order)
    seen, sigma = simulate(points, float(required_eb_n0_db(name, ratio)), 100_000, seed=scheme.order)
    assert sigma < 0.05 * ratio
    assert abs(seen - ratio) < 4 * sigma


@given(st.sampled_from(SCHEMES), st.floats(-15.0, -1.0))
def test_required_eb_n0_inverts_the_error_ratio(name, exponent):
    ratio = 10.0**exponent
    assert float(bit_error_ratio(name, required_eb_n0_db(name, ratio))) == pytest.approx(ratio, rel=1e-10)


@given(st.sampled_from(SCHEMES), st.floats(-10.0, 30.0), st.floats(0.01, 5.0))
def test_more_signal_means_fewer_errors(name, eb_n0_db, more_db):
    low, high = bit_error_ratio(name, [eb_n0_db, eb_n0_db + more_db])
    assert 0.0 <= high <= low <= 0.5
    assert high < low or low < 1e-200


@pytest.mark.parametrize("order", [8, 16, 64, 256])
def test_pure_noise_gets_every_second_bit_wrong(order):
    assert float(bit_error_ratio(f"{order}-PSK" if order < 16 else f"{order}-QAM", -300.0)) == pytest.approx(0.5)


def test_arrays_keep_their_shape():
    ratios = np.array([[1e-3, 1e-6, 1e-9], [1e-4, 1e-7, 1e-10]])
    for name in ("QPSK", "8-PSK", "64-QAM", "32-QAM"):
        needed = required_eb_n0_db(name, ratios)
        assert needed.shape == bit_error_ratio(name, needed).shape == (2, 3)
        assert float(needed[1, 2]) == float(required_eb_n0_db(name, 1e-10))


@pytest.mark.parametrize(
    ("text", "name"),
    [("bpsk", "BPSK"), ("2-PSK", "BPSK"), ("4psk", "QPSK"), ("4 QAM", "QPSK"), ("1024qam", "1024-QAM")],
)
def test_names_of_modulations(text, name):
    assert parse_modulation(text).name == name


@pytest.mark.parametrize("text", ["8-QAM", "GMSK", "128-PSK", "QAM", "", "0QAM", "1-PSK", "48-QAM", "64-QAM x"])
def test_unknown_modulations_are_refused(text):
    with pytest.raises(InputError, match="must be BPSK, QPSK, M-PSK"):
        parse_modulation(text)


@pytest.mark.parametrize("ratio", [0.0, -1e-6, 0.2, math.nan, 1e-301])
def test_impossible_error_ratios_are_refused(ratio):
    with pytest.raises(InputError, match=r"bit error ratio = .*must be 1e-300 to 0.1"):
        required_eb_n0_db("QPSK", ratio)


def test_method_says_which_count_is_an_approximation():
    assert "nearest neighbours" in parse_modulation("128-QAM").method
    for name in ("BPSK", "8-PSK", "256-QAM"):
        assert "exact" in parse_modulation(name).method


# --- thresholds


@pytest.mark.parametrize("name", S_N_AT_1E_MINUS_6)
def test_threshold_from_bandwidth_is_noise_power_plus_s_n(name):
    threshold = mode_threshold(changed(modulation=name)).level_dbm
    s_n = threshold - (float(noise_density_dbm_hz()) + 10 * math.log10(28e6) + 5.0)  # N = k_B·T0·B·F (Friis 1944)
    assert abs(s_n - float(S_N_AT_1E_MINUS_6[name])) <= 0.1  # Rec. ITU-R F.1101 Table 1, as above


@given(st.floats(0, 20), st.floats(1e3, 1e10), st.sampled_from(SCHEMES), st.floats(-12, -2), st.floats(0, 9))
def test_threshold_lines_add_up(figure_db, rate, name, exponent, extra_db):
    mode = changed(
        noise_figure_db=figure_db,
        bandwidth_hz=None,
        bit_rate_bps=rate,
        modulation=name,
        bit_error_ratio=10.0**exponent,
        coding_gain_db=extra_db,
        implementation_loss_db=2 * extra_db,
    )
    threshold = mode_threshold(mode)
    assert threshold.level_dbm == math.fsum(line.value for line in threshold.lines)
    plain = -173.975 + figure_db + 10 * math.log10(rate) + float(required_eb_n0_db(name, 10.0**exponent)) + extra_db
    assert threshold.level_dbm == pytest.approx(plain, abs=1e-3)


def test_bandwidth_stands_for_the_bit_rate_that_fills_it_and_says_so():
    by_rate = mode_threshold(changed(bit_rate_bps=6 * 28e6))
    by_bandwidth = mode_threshold(FULL)
    assert by_bandwidth.level_dbm == pytest.approx(by_rate.level_dbm, abs=1e-12)
    assert "one symbol per second and hertz" in " ".join(by_bandwidth.assumptions)
    assert "one symbol per second and hertz" not in " ".join(by_rate.assumptions)


def test_temperature_is_that_of_the_whole_receiving_system():
    temperature_k = 290.0 * 10**0.5
    both = mode_threshold(changed(noise_temperature_k=temperature_k))
    alone = mode_threshold(changed(noise_figure_db=None, noise_temperature_k=temperature_k))
    assert both.level_dbm == alone.level_dbm == pytest.approx(mode_threshold(FULL).level_dbm, abs=1e-9)


def test_effective_temperature_beside_its_figure_is_a_contradiction_explained():
    with pytest.raises(InputError, match=r"noise figure 5 dB and noise temperature 627.* 917 K for this figure"):
        mode_threshold(changed(noise_temperature_k=627.06))


def test_given_threshold_stands_and_is_held_against_the_noise():
    computed = mode_threshold(FULL).level_dbm
    near = mode_threshold(changed(threshold_dbm=computed + 0.04))
    assert near.level_dbm == computed + 0.04
    assert [line.note for line in near.lines] == ["as given"]
    with pytest.raises(InputError, match=r"threshold -70 dBm as given and -67.94 dBm from noise"):
        mode_threshold(changed(threshold_dbm=-70.0))


def test_given_threshold_with_part_of_the_noise_data_stands():
    assert mode_threshold(RadioMode("x", threshold_dbm=-70.0, noise_figure_db=5.0)).level_dbm == -70.0


@pytest.mark.parametrize(
    ("dropped", "named"),
    [
        ({"noise_figure_db": None}, "noise figure or temperature not given"),
        ({"bandwidth_hz": None}, "bit rate or bandwidth not given"),
        ({"modulation": None}, "modulation not given"),
        ({"bit_error_ratio": None}, "bit error ratio not given"),
        ({"bit_error_ratio": None, "bandwidth_hz": None}, "bit rate or bandwidth, bit error ratio not given"),
    ],
)
def test_what_is_missing_for_a_threshold_is_named(dropped, named):
    with pytest.raises(InputError, match=f"mode 64: {named}"):
        mode_threshold(changed(**dropped))


def test_mode_without_threshold_data_has_none():
    bare = mode_threshold(RadioMode("64", bandwidth_hz=28e6, bit_rate_bps=150e6, modulation="64-QAM"))
    assert (bare.level_dbm, bare.lines, bare.assumptions) == (None, (), ())


def test_bit_rate_beyond_the_bandwidth_is_refused():
    with pytest.raises(
        InputError, match="bit rate 169 Mbit/s: must be at most 168 Mbit/s, what 64-QAM carries in 28 MHz"
    ):
        mode_threshold(changed(bit_rate_bps=169e6))


def test_modulation_of_a_threshold_from_noise_must_be_known():
    with pytest.raises(InputError, match="modulation = 8-QAM"):
        mode_threshold(changed(modulation="8-QAM"))


@pytest.mark.parametrize(
    ("field", "value", "allowed"),
    [
        ("noise_figure_db", -1.0, "0 dB or more"),
        ("noise_temperature_k", 0.0, "more than 0 K"),
        ("bandwidth_hz", -1.0, "more than 0 Hz"),
        ("bit_rate_bps", math.inf, "more than 0 bit/s"),
        ("bit_error_ratio", 0.5, "under 0.5"),
        ("coding_gain_db", -1.0, "0 dB or more"),
        ("implementation_loss_db", math.nan, "0 dB or more"),
        ("threshold_dbm", math.nan, "a finite number of dBm"),
    ],
)
def test_a_mode_refuses_impossible_values(field, value, allowed):
    with pytest.raises(InputError, match=f"{field} = .*{allowed}"):
        changed(**{field: value})
