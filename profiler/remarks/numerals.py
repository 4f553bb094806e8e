"""How numbers are written, one notation for each kind: everyone who puts a number into words takes it from here."""

from __future__ import annotations

import math
import re
from fractions import Fraction

from profiler.units import MINUTES_PER_YEAR

__all__ = [
    "chance_text",
    "cost_text",
    "db_text",
    "k_text",
    "listed",
    "minus",
    "outage_text",
    "percent_text",
    "position_text",
    "ratio_text",
    "superscript",
    "target_text",
    "time_text",
    "without_signs",
]

_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def minus(number: str) -> str:
    """Write the minus sign as such, not as a hyphen; a zero has none.

    Examples
    --------
    >>> minus("-3.1"), minus("-0.0")
    ('−3.1', '0.0')
    """
    zero = number.startswith("-") and not number.strip("-0.")
    return number[1:] if zero else number.replace("-", "−")


def db_text(level: float, unit: str = "dB", *, digits: int = 1) -> str:
    """Write decibels, or a level in dBm or dBi.

    Examples
    --------
    >>> db_text(31.04), db_text(-67.55, "dBm", digits=2)
    ('31.0 dB', '−67.55 dBm')
    """
    return f"{minus(f'{level:.{digits}f}')} {unit}"


def cost_text(cost: float) -> str:
    """Write a cost in the user's own currency: two decimals where it is not whole.

    Examples
    --------
    >>> cost_text(29.0), cost_text(28.6512), cost_text(1_299_380.0)
    ('29', '28.65', '1299380')
    """
    return f"{cost:.2f}".removesuffix(".00")


def k_text(k: float) -> str:
    """Write a factor k as the trade does: thirds as such, 1 plainly, anything else with two decimals.

    Examples
    --------
    >>> k_text(4 / 3), k_text(1.333), k_text(0.667), k_text(1.0), k_text(0.8), k_text(0.853), k_text(math.inf)
    ('4/3', '4/3', '2/3', '1', '0.8', '0.85', '∞')
    """
    if math.isinf(k):
        return "∞"
    third = Fraction(k).limit_denominator(3)
    if third.denominator == 3 and abs(k - float(third)) < 5e-4:
        return f"{third.numerator}/3"
    return f"{k:.2f}".rstrip("0").rstrip(".") if k >= 0.1 else f"{k:.2g}"


def percent_text(share: float) -> str:
    """Write a share of a whole in whole percent; what is not all or nothing never reads so.

    Examples
    --------
    >>> percent_text(0.934), percent_text(0.9999), percent_text(1.0), percent_text(0.0001), percent_text(0.0)
    ('93 %', 'more than 99 %', '100 %', 'less than 1 %', '0 %')
    """
    if 0.0 < share < 0.005:
        return "less than 1 %"
    if 0.995 <= share < 1.0:
        return "more than 99 %"
    return f"{100.0 * share:.0f} %"


def chance_text(chance: float) -> str:
    """Write a chance from draws: to a tenth of a percent, and never as certain.

    Examples
    --------
    >>> chance_text(0.9), chance_text(0.0614), chance_text(1.0), chance_text(0.0)
    ('90 %', '6.1 %', 'more than 99.9 %', 'less than 0.1 %')
    """
    if chance > 0.999:
        return "more than 99.9 %"
    if chance < 0.001:
        return "less than 0.1 %"
    tenths = f"{100.0 * chance:.1f}"
    return f"{tenths.removesuffix('.0')} %"


def ratio_text(ratio: float, digits: int = 2) -> str:
    """Write a small ratio with powers of ten.

    Examples
    --------
    >>> ratio_text(0.0123), ratio_text(4.21e-6), ratio_text(0.0), ratio_text(9.96e-5)
    ('0.012', '4.2·10⁻⁶', '0', '1.0·10⁻⁴')
    """
    if not ratio or abs(ratio) >= 1e-3:
        return f"{ratio:.{digits}g}"
    mantissa, power = f"{ratio:.{digits - 1}e}".split("e")
    return f"{mantissa}·10{superscript(int(power))}"


def superscript(power: int) -> str:
    """Write the power of ten.

    Examples
    --------
    >>> superscript(-12)
    '⁻¹²'
    """
    return str(power).translate(_SUPERSCRIPT)


def outage_text(percent: float) -> str:
    """Write an outage in percent of a period with two digits.

    Examples
    --------
    >>> outage_text(0.0123), outage_text(4.2e-6), outage_text(0.0), outage_text(99.7)
    ('0.012 %', '4.2·10⁻⁶ %', '0 %', '100 %')
    """
    return f"{ratio_text(percent)} %" if percent < 99.5 else "100 %"


def time_text(minutes_per_year: float) -> str:
    """Write the outage of a year so that it can be grasped.

    Examples
    --------
    >>> time_text(0.012), time_text(53.2), time_text(3000.0), time_text(525_960.0), time_text(0.0)
    ('0.72 s a year', '53 min a year', '50 h a year', 'all the time', '0 s a year')
    """
    minutes = minutes_per_year
    if minutes > 0.998 * MINUTES_PER_YEAR:
        return "all the time"
    value, unit = (minutes, "min") if minutes < 600.0 else (minutes / 60.0, "h")
    if minutes < 1.0:
        value, unit = 60.0 * minutes, "s"
    return f"{value:.0f} {unit} a year" if value >= 10.0 else f"{ratio_text(value)} {unit} a year"


def without_signs(text: str) -> str:
    """Write numbers with the letters that every terminal has.

    Examples
    --------
    >>> without_signs("−3.1 dB, 4.2·10⁻⁶ %")
    '-3.1 dB, 4.2e-6 %'
    """
    powers = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")
    plain = re.sub("·10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)", lambda found: f"e{found[1].translate(powers)}", text)
    return plain.replace("−", "-")


_COUNTED = {
    "worst_month_percent": "of the worst month",
    "year_percent": "of the year",
    "severely_errored_seconds_ratio": "of the seconds of the worst month severely errored",
    "errored_seconds_ratio": "of the seconds of the worst month errored",
}


def target_text(target: str, amount: float) -> str:
    """Write an outage in the measure of a target of an objective, by the target's name.

    Examples
    --------
    >>> target_text("year_percent", 0.01), target_text("minutes_per_year", 53.0)
    ('0.01 % of the year', '53 min a year')
    """
    if target == "minutes_per_year":
        return time_text(amount)
    written = outage_text(amount) if target.endswith("percent") else ratio_text(amount)
    return f"{written} {_COUNTED[target]}"


def position_text(longitude: float, latitude: float) -> str:
    """Write a position, latitude first, to about a metre.

    Examples
    --------
    >>> position_text(-112.5, 36.25)
    '36.25000° N, 112.50000° W'
    """
    north, east = "N" if latitude >= 0 else "S", "E" if longitude >= 0 else "W"
    return f"{abs(latitude):.5f}° {north}, {abs(longitude):.5f}° {east}"


def listed(items: list[str], last: str = "and") -> str:
    """Join words as a sentence does.

    Examples
    --------
    >>> listed(["rain"]), listed(["a", "b", "c"]), listed(["A", "B"], "or")
    ('rain', 'a, b and c', 'A or B')
    """
    return f"{', '.join(items[:-1])} {last} {items[-1]}" if len(items) > 1 else "".join(items)
