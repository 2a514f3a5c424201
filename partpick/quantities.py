"""Quantities as people write them, read into SI numbers; `format_quantity` writes them again.

Reads plain numbers with prefix and unit ("7.1 MHz"), the letter-and-digit codes of IEC 60062 ("4n7"),
percentages, ppm and ranges. Everything that is not plainly one quantity is refused with a hint at the
likely meaning, because a silently misread value ends up soldered in. Numbers are kept as exact
fractions until the last step, so that a value in SI is the double nearest to what was written.

Each `parse_*` takes a text or a number (a bare number is SI, booleans are refused) and raises
`QuantityError`, whose text starts with what was read and is complete but for the name of the key.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import TypeVar

from partpick import units
from partpick.errors import QuantityError
from partpick.reading import (
    NUMBER,
    exponent_of,
    other_kind,
    read_exact,
    refusal,
    shown,
    split_code,
    split_number,
    text_of,
)
from partpick.units import format_percent, format_quantity, plain

__all__ = [
    "Tolerance",
    "format_percent",
    "format_quantity",
    "parse_angle",
    "parse_bandwidth",
    "parse_capacitance",
    "parse_count",
    "parse_current",
    "parse_exact_capacitance",
    "parse_fraction",
    "parse_frequency",
    "parse_inductance",
    "parse_length",
    "parse_number",
    "parse_power",
    "parse_range",
    "parse_resistance",
    "parse_tempco",
    "parse_temperature",
    "parse_tolerance",
    "parse_transconductance",
    "parse_voltage",
    "refusal",
    "shown",
]

T = TypeVar("T")


def parse_frequency(given: object) -> float:
    """Return a frequency from 1 kHz to 1 GHz. [Hz]"""
    return float(read_exact(given, units.FREQUENCY))


def parse_bandwidth(given: object) -> float:
    """Return a width in frequency, up to 1 GHz. [Hz]"""
    return float(read_exact(given, units.BANDWIDTH))


def parse_exact_capacitance(given: object, zero: bool = False) -> Fraction:
    """Return a capacitance as the exact fraction that was written, so that sums are exact. [F]"""
    return read_exact(given, units.CAPACITANCE, zero)


def parse_capacitance(given: object, zero: bool = False) -> float:
    """Return a capacitance; zero only where `zero` allows it. [F]"""
    return float(read_exact(given, units.CAPACITANCE, zero))


def parse_inductance(given: object, zero: bool = False) -> float:
    """Return an inductance; zero only where `zero` allows it. [H]"""
    return float(read_exact(given, units.INDUCTANCE, zero))


def parse_resistance(given: object) -> float:
    """Return a resistance or a reactance. [ohm]"""
    return float(read_exact(given, units.RESISTANCE))


def parse_length(given: object, zero: bool = False) -> float:
    """Return a length; a number without prefix or unit is refused. [m]"""
    return float(read_exact(given, units.LENGTH, zero))


def parse_voltage(given: object, zero: bool = False) -> float:
    """Return a voltage; zero only where `zero` allows it. [V]"""
    return float(read_exact(given, units.VOLTAGE, zero))


def parse_current(given: object) -> float:
    """Return a current. [A]"""
    return float(read_exact(given, units.CURRENT))


def parse_power(given: object) -> float:
    """Return a power. [W]"""
    return float(read_exact(given, units.POWER))


def parse_transconductance(given: object) -> float:
    """Return a transconductance. [S]"""
    return float(read_exact(given, units.TRANSCONDUCTANCE))


def parse_angle(given: object) -> float:
    """Return an angle, -360 to 360. [degree]"""
    return float(read_exact(given, units.ANGLE))


def parse_temperature(given: object) -> float:
    """Return a temperature. [degree Celsius]"""
    return float(read_exact(given, units.TEMPERATURE))


def parse_number(given: object, low: float | None = None, high: float | None = None) -> float:
    """Return a finite number without unit, within `low` and `high` where they are given."""
    wanted = "a plain number"
    number, _, rest = split_number(given, text_of(given, wanted), wanted)
    if rest:
        raise refusal(given, f"a plain number is wanted, without {shown(rest)}")
    return _within(given, float(number), low, high)


def parse_count(given: object, low: int = 0, high: int | None = None) -> int:
    """Return a whole number within `low` and `high`."""
    wanted = "a whole number"
    text = text_of(given, wanted)
    if not re.fullmatch(r"[+-]?[0-9]+", text) or isinstance(given, float):
        raise refusal(given, f"{wanted} is wanted")
    _within(given, int(text), low, high)
    return int(text)


def _within(given: object, number: float, low: float | None, high: float | None) -> float:
    if low is not None and number < low:
        raise refusal(given, f"at least {low:g} is wanted")
    if high is not None and number > high:
        raise refusal(given, f"at most {high:g} is accepted")
    return number


def parse_fraction(given: object, high: float = 1.0, bare: float = 0.2, zero: bool = True) -> float:
    """Return a fraction written as percentage, ppm or bare number.

    Parameters
    ----------
    given : str, int or float
        "0.5 %", "500 ppm" or a bare fraction. [-]
    high : float
        Largest fraction accepted. [-]
    bare : float
        Largest bare number accepted; above, a percentage was probably meant. [-]
    zero : bool
        Whether zero is accepted.

    Returns
    -------
    fraction : float
        The fraction. [-]
    """
    wanted = "a percentage such as 5 %"
    text = text_of(given, wanted)
    number, written, rest = split_number(given, text, wanted)
    if rest not in ("", "%", "ppm"):
        raise refusal(given, _why_no_fraction(rest, wanted))
    if rest == "" and number > Fraction(repr(bare)):
        percent = f"{plain(number * 100)} % or {written} %" if number <= 1 else f"{written} %"
        raise refusal(given, f"a bare fraction above {bare:g} is not read; write {percent}")
    fraction = float(number / {"": 1, "%": 100, "ppm": 10**6}[rest])
    if fraction < 0 or (fraction == 0 and not zero):
        raise refusal(given, f"{'zero or more' if zero else 'more than zero'} is wanted, {wanted}")
    if fraction > high:
        raise refusal(given, f"at most {high * 100:g} % is accepted")
    return fraction


def _why_no_fraction(rest: str, wanted: str) -> str:
    other = other_kind(rest, None)
    return f"{other or shown(rest) + ' is not read here'}; {wanted} is wanted"


@dataclass(frozen=True)
class Tolerance:
    """A tolerance, relative (a fraction) or absolute (in the unit of the value)."""

    size: float
    absolute: bool = False

    def of(self, value: float) -> float:
        """Return the tolerance as a fraction of `value`; more than the value itself is refused."""
        fraction = self.size / value if self.absolute else self.size
        if fraction > 1:
            raise QuantityError(f"a tolerance of {fraction * 100:.4g} % of the value is over 100 %")
        return fraction


def parse_tolerance(given: object, unit: str = "F") -> Tolerance:
    """Return "5 %", "500 ppm", a bare fraction, or an absolute tolerance in `unit` (F, H, m): "0.25 pF"."""
    kind = {"F": units.CAPACITANCE, "H": units.INDUCTANCE, "m": units.LENGTH}[unit]
    text = text_of(given, f"a tolerance such as 5 % or {'0.25 pF' if unit == 'F' else '0.1 m' + unit}")
    text = text.removeprefix("\u00b1").removeprefix("+-").strip()
    match = NUMBER.fullmatch(text)
    absolute = (
        match is not None and match[3] not in ("", "%", "ppm") and exponent_of(match[3], kind) is not None
    )
    if absolute or split_code(text, kind) is not None:
        return Tolerance(float(read_exact(text, kind, zero=True)), absolute=True)
    return Tolerance(parse_fraction(text if isinstance(given, str) else given))


def parse_tempco(given: object, signed: bool = True) -> float:
    """Return a temperature coefficient: "30 ppm", "-150 ppm/K", or a bare number in 1/K. [1/K]"""
    wanted = "a temperature coefficient such as 30 ppm"
    number, written, rest = split_number(given, text_of(given, wanted), wanted)
    unit = rest.replace(" ", "")
    if unit not in ("", "ppm", "ppm/K", "ppm/\u00b0C", "ppm/C", "1/K"):
        raise refusal(given, f"{shown(rest)} is not read here; {wanted} is wanted (ppm per kelvin)")
    value = number / 10**6 if unit.startswith("ppm") else number
    if abs(value) > Fraction(1, 20):
        meant = f"; {written} ppm?" if not unit.startswith("ppm") else ""
        raise refusal(given, f"{written} {rest or 'per kelvin'} is above 50000 ppm per kelvin{meant}")
    if value < 0 and not signed:
        raise refusal(given, f"zero or more is wanted, {wanted}")
    return float(value)


def parse_range(given: object, parse: Callable[[object], T]) -> tuple[T, T]:
    """Return both ends of a range such as "7.0MHz..7.3MHz", each read by `parse`; the first is the lower."""
    text = given.strip() if isinstance(given, str) else ""
    parts = text.split("..")
    if len(parts) != 2 or not parts[0].strip() or not parts[1].strip():
        raise refusal(given, "a range such as LOW..HIGH is wanted, each end with its unit")
    low, high = parse(parts[0]), parse(parts[1])
    if not low < high:  # type: ignore[operator]
        raise refusal(given, "the range is empty: its first end is not below its second")
    return low, high
