"""The kinds of quantities: their units, ranges and likely meanings, and how values are written.

`quantities.py` reads with these tables. Ranges are wide: they only catch a value in the wrong unit.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from decimal import ROUND_HALF_EVEN, Context, Decimal
from fractions import Fraction

MICRO = "\u00b5"
PREFIXES = {"f": -15, "p": -12, "n": -9, "u": -6, MICRO: -6, "m": -3, "k": 3, "M": 6, "G": 9}
_WRITTEN = {-15: "f", -12: "p", -9: "n", -6: MICRO, -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}


def power_of_ten(exponent: int) -> Fraction:
    """Return ten to a whole power, exactly."""
    return Fraction(10) ** exponent


def mantissa(value: Fraction) -> Fraction:
    """Return the figures of a value in engineering form, 1 to below 1000."""
    figures = abs(value)
    while figures >= 1000:
        figures /= 1000
    while 0 < figures < 1:
        figures *= 1000
    return figures


@dataclass(frozen=True, kw_only=True, eq=False)
class Kind:
    """One kind of quantity: how its unit is written and what range makes sense."""

    noun: str  # with its article
    unit: str  # as written
    spellings: tuple[str, ...]  # as read
    low: Fraction
    high: Fraction
    example: str
    point: str = ""  # letter that stands for the decimal point in a code without prefix
    kilo: bool = False  # also "K" for kilo, usual for resistances
    prefixed: bool = True
    codes: bool = True
    bare: bool = True  # a number without prefix and unit is read
    signed: bool = False
    reason: str = ""  # why the range ends where it does
    likely: Callable[[Fraction], Fraction | None] = lambda value: None


def _likely_frequency(value: Fraction) -> Fraction:
    figures = mantissa(value)
    return figures * (10**6 if figures <= 200 else 10**3)


def _likely_capacitance(value: Fraction) -> Fraction | None:
    if value < Fraction(1, 1000):
        return None
    return value / (10**12 if value >= 1 else 10**6)  # "47" is said for 47 pF, "0.01" for 0.01 microfarad


def _likely_inductance(value: Fraction) -> Fraction | None:
    return value / 10**6 if value > 1 else None


def _likely_length(value: Fraction) -> Fraction | None:
    return value / 1000 if value > 1 else None


FREQUENCY = Kind(
    noun="a frequency",
    unit="Hz",
    spellings=("Hz",),
    low=power_of_ten(3),
    high=power_of_ten(9),
    example="7.1 MHz",
    reason="coils and capacitors act as lumped parts from 1 kHz to 1 GHz",
    likely=_likely_frequency,
)
BANDWIDTH = Kind(
    noun="a bandwidth",
    unit="Hz",
    spellings=("Hz",),
    low=power_of_ten(-3),
    high=power_of_ten(9),
    example="20 kHz",
)
CAPACITANCE = Kind(
    noun="a capacitance",
    unit="F",
    spellings=("F",),
    point="F",
    low=power_of_ten(-15),
    high=power_of_ten(-3),
    example="47 pF",
    likely=_likely_capacitance,
)
INDUCTANCE = Kind(
    noun="an inductance",
    unit="H",
    spellings=("H",),
    point="H",
    low=power_of_ten(-12),
    high=Fraction(1),
    example=f"4.7 {MICRO}H",
    likely=_likely_inductance,
)
RESISTANCE = Kind(
    noun="a resistance",
    unit="\u03a9",
    spellings=("\u03a9", "ohms", "ohm", "Ohm", "R"),
    point="R",
    kilo=True,
    low=power_of_ten(-6),
    high=power_of_ten(9),
    example="50 ohm",
)
LENGTH = Kind(
    noun="a length",
    unit="m",
    spellings=("m",),
    low=power_of_ten(-7),
    high=Fraction(10),
    example="20 mm",
    codes=False,
    bare=False,
    likely=_likely_length,
)
VOLTAGE = Kind(
    noun="a voltage",
    unit="V",
    spellings=("V",),
    point="V",
    low=power_of_ten(-9),
    high=power_of_ten(6),
    example="12 V",
)
CURRENT = Kind(
    noun="a current",
    unit="A",
    spellings=("A",),
    point="A",
    low=power_of_ten(-9),
    high=power_of_ten(4),
    example="0.5 A",
)
POWER = Kind(
    noun="a power",
    unit="W",
    spellings=("W",),
    point="W",
    low=power_of_ten(-12),
    high=power_of_ten(7),
    example="5 W",
)
TRANSCONDUCTANCE = Kind(
    noun="a transconductance",
    unit="S",
    spellings=("S", "A/V"),
    low=power_of_ten(-9),
    high=power_of_ten(3),
    example="5 mS",
)
ANGLE = Kind(
    noun="an angle",
    unit="\u00b0",
    spellings=("\u00b0", "degrees", "deg"),
    low=Fraction(-360),
    high=Fraction(360),
    example="90",
    prefixed=False,
    codes=False,
    signed=True,
)
TEMPERATURE = Kind(
    noun="a temperature",
    unit="\u00b0C",
    spellings=("\u00b0C", "C"),
    low=Fraction(-100),
    high=Fraction(300),
    example="25 \u00b0C",
    prefixed=False,
    codes=False,
    signed=True,
)
KINDS = (
    FREQUENCY,
    CAPACITANCE,
    INDUCTANCE,
    RESISTANCE,
    LENGTH,
    VOLTAGE,
    CURRENT,
    POWER,
    TRANSCONDUCTANCE,
    TEMPERATURE,
)


def plain(number: Fraction, digits: int = 12) -> str:
    """Return a number without exponent and without needless zeros."""
    return f"{Decimal(repr(float(number))).normalize(Context(prec=digits)):f}"


def format_quantity(value: float, unit: str, digits: int = 3) -> str:
    """Return a value in engineering form with its unit, such as "47 pF".

    Parameters
    ----------
    value : float
        Value in SI, finite. [any]
    unit : str
        Unit without prefix.
    digits : int
        Significant figures, at least 1; trailing zeros are left out.

    Returns
    -------
    text : str
        Figures from 1 to below 1000, a blank, prefix (f to G) and unit. Smaller and larger values keep
        the last prefix.
    """
    number = Decimal(repr(float(value)))
    if not number.is_finite():
        raise ValueError("only finite values can be written")
    if number == 0:
        return f"0 {unit}".strip()
    rounded = number.normalize(Context(prec=digits, rounding=ROUND_HALF_EVEN))
    exponent = min(max(rounded.adjusted() // 3 * 3, -15), 9)
    return f"{rounded.scaleb(-exponent):f} {_WRITTEN[exponent]}{unit}".strip()


def format_percent(fraction: float, digits: int = 3) -> str:
    """Return a fraction as a percentage, such as "0.5 %"."""
    return f"{plain(Fraction(repr(float(fraction))) * 100, digits)} %"
