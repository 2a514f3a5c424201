"""Reading one quantity from text: the number, its code or unit, its range, and what is wrong with it.

The machinery behind `quantities.py`. Numbers stay exact fractions. Every refusal is one complete line
that starts with what was read and names the likely meaning.
"""

from __future__ import annotations

import re
from fractions import Fraction
from functools import lru_cache

from partpick.errors import QuantityError
from partpick.units import (
    CAPACITANCE,
    KINDS,
    LENGTH,
    MICRO,
    PREFIXES,
    RESISTANCE,
    Kind,
    format_quantity,
    power_of_ten,
)

# IEC 60062, from memory: letters that may follow a code. They are refused, not read: a part's
# tolerance has its own place, and a letter overlooked there would change the spread unseen.
TOLERANCE_LETTERS = {
    "B": "0.1 %", "C": "0.25 %", "D": "0.5 %", "G": "2 %", "H": "3 %",
    "J": "5 %", "K": "10 %", "M": "20 %", "N": "30 %", "Z": "-20/+80 %",
}  # fmt: skip
_TOLERANCE_LETTERS_PICOFARAD = {"B": "0.1 pF", "C": "0.25 pF", "D": "0.5 pF", "G": "2 pF"}  # below 10 pF

_LONGEST = 80  # characters; keeps exact fractions small whatever is thrown in
_LARGEST_EXPONENT = 40
NUMBER = re.compile(r"([+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE]([+-]?[0-9]+))?)\s*(.*)", re.DOTALL)
_CODE = re.compile(r"([+-]?)([0-9]*)([A-Za-z\u00b5])([0-9]+)\s*(.*)", re.DOTALL)
_THOUSANDS = re.compile(r"[0-9]{1,3}(,[0-9]{3})+(?![0-9])")


def shown(value: object) -> str:
    """Return `value` as an error message shows it: one short line, whatever was given."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, (int, float)):
        text = repr(value) if not isinstance(value, int) or abs(value) < 10**_LONGEST else "a huge number"
        return text if len(text) <= 40 else text[:37] + "..."
    if isinstance(value, str):
        text = "".join(letter if letter.isprintable() else "\ufffd" for letter in value[:41])
        return f'"{text}"' if len(text) <= 40 else f'"{text[:37]}..."'
    if isinstance(value, (list, tuple)):
        return "a list"
    return "a table" if isinstance(value, dict) else f"a {type(value).__name__}"


def refusal(value: object, wrong: str) -> QuantityError:
    """Return the error that says what was read and what is wrong with it."""
    return QuantityError(f"read {shown(value)}: {wrong}")


def text_of(given: object, wanted: str) -> str:
    """Return stripped text with one spelling of micro and of ohm; only text and numbers pass."""
    if isinstance(given, bool) or not isinstance(given, (str, int, float)):
        raise refusal(given, f"{wanted} is wanted")
    if isinstance(given, int) and abs(given) >= 10**_LONGEST:
        raise refusal(given, "too large")
    text = " ".join(given.split()) if isinstance(given, str) else repr(given)
    if not text:
        raise refusal(given, f"nothing given; {wanted} is wanted")
    if len(text) > _LONGEST:
        raise refusal(given, f"too long; {wanted} is wanted")
    if not text.isprintable():
        raise refusal(given, f"a character that cannot be printed; {wanted} is wanted")
    return text.replace("\u03bc", MICRO).replace("\u2126", "\u03a9")


def split_number(given: object, text: str, wanted: str) -> tuple[Fraction, str, str]:
    """Return the number, how it was written and what follows it."""
    match = NUMBER.fullmatch(text)
    if match is None or re.search(r"[,_]", text):
        raise refusal(given, _why_no_number(text, wanted))
    written, exponent, rest = match.groups()
    if exponent is not None and (len(exponent) > 4 or abs(int(exponent)) > _LARGEST_EXPONENT):
        raise refusal(given, f"the exponent is out of range; {wanted} is wanted")
    if rest[:1].isdigit() or rest[:1] in (".", "+", "-"):
        raise refusal(given, f"not one number; {wanted} is wanted")
    return Fraction(written), written, rest


def _why_no_number(text: str, wanted: str) -> str:
    if "," in text:
        better = text.replace(",", ".")
        if _THOUSANDS.search(text):
            return f"a comma is not read; write {better} or {text.replace(',', '')}"
        return f"a comma is not read; write {better}"
    if "_" in text:
        return f"an underscore is not read; write {text.replace('_', '')}"
    if re.match(r"[+-]?(inf|nan)", text, re.IGNORECASE):
        return f"not a finite number; {wanted} is wanted"
    if any(letter.isdigit() and not "0" <= letter <= "9" for letter in text):
        return "only the digits 0 to 9 are read"
    if text[0] in "\u2212\u2013":
        return f"write the minus sign as -{text[1:]}"
    return f"no number; {wanted} is wanted"


def split_code(text: str, kind: Kind) -> tuple[Fraction, int, str] | None:
    """Return number, exponent and what follows, where the text is a letter-and-digit code (IEC 60062)."""
    match = _CODE.fullmatch(text)
    if match is None or not kind.codes:
        return None
    sign, whole, letter, decimals, rest = match.groups()
    if letter in PREFIXES:
        exponent = PREFIXES[letter]
    elif letter == "K" and kind.kilo:
        exponent = 3
    elif letter == kind.point:
        exponent = 0
    else:
        return None
    return Fraction(f"{sign}{whole or '0'}.{decimals}"), exponent, rest


def exponent_of(rest: str, kind: Kind) -> int | None:
    """Return the power of ten of a prefix, a unit or both; None where `rest` is no unit of this kind."""
    if rest == "cm" and kind is LENGTH:
        return -2
    for spelling in kind.spellings:
        if rest.endswith(spelling):
            prefix = rest[: -len(spelling)]
            if prefix == "":
                return 0
            if kind.prefixed and prefix in PREFIXES:
                return PREFIXES[prefix]
            if kind.kilo and prefix == "K":
                return 3
    if kind.prefixed:
        return 3 if rest == "K" and kind.kilo else PREFIXES.get(rest)
    return None


def other_kind(rest: str, kind: Kind | None) -> str | None:
    """Return what another kind of quantity the unit belongs to, in words, or None."""
    for other in KINDS:
        if other is not kind and rest not in PREFIXES and exponent_of(rest, other) is not None:
            return f"{rest} is the unit of {other.noun}"
    return None


def _why_no_unit(text: str, rest: str, kind: Kind, number: Fraction) -> str:
    """Return what is wrong with a unit, naming the one that was probably meant."""
    accepted = f"{kind.noun} is in {kind.unit}, such as {kind.example}"
    units = [
        prefix + unit for unit in kind.spellings for prefix in ("", *(PREFIXES if kind.prefixed else ()))
    ]
    alike = [unit for unit in units if unit.lower() == rest.lower()]
    if alike:
        fits = [u for u in alike if kind.low <= number * power_of_ten(exponent_of(u, kind) or 0) <= kind.high]
        return f"{rest} is no unit, upper and lower case differ; {(fits or alike)[0]}?"
    if rest == "K" and kind.prefixed:
        return f"K is no prefix; k{kind.unit}?"
    other = other_kind(rest, kind)
    if other is not None:
        return f"{other}; {accepted}"
    if rest in ("%", "ppm"):
        return f"{rest} belongs to a fraction; {accepted}"
    if rest[:-1] in PREFIXES:
        letter = _tolerance_letter(text, number * power_of_ten(PREFIXES[rest[:-1]]), kind)
        if letter is not None:
            return letter
    code = _CODE.fullmatch(text)
    if code is not None:
        return f"a code with the letter {code[3]} is not read here; {accepted}"
    return f"{shown(rest)} is no unit; {accepted}"


def _tolerance_letter(text: str, value: Fraction, kind: Kind) -> str | None:
    """Return the message for a value that ends in a tolerance letter, or None."""
    letter = text[-1]
    if kind not in (CAPACITANCE, RESISTANCE) or letter not in TOLERANCE_LETTERS:
        return None
    small = kind is CAPACITANCE and value < power_of_ten(-11)
    meaning = _TOLERANCE_LETTERS_PICOFARAD.get(letter) if small else None
    return (
        f"{letter} is a tolerance letter ({meaning or TOLERANCE_LETTERS[letter]}), not read with the value; "
        f"write {text[:-1].strip()} and state the tolerance apart"
    )


def read_exact(given: object, kind: Kind, zero: bool = False) -> Fraction:
    """Return the value in SI, exact, after all checks of the kind."""
    return _read_text(given, kind, zero) if isinstance(given, str) else _read_given(given, kind, zero)


@lru_cache(maxsize=4096)
def _read_text(given: str, kind: Kind, zero: bool) -> Fraction:
    """Return the value of a text: files of parts hold the same few texts over and over."""
    return _read_given(given, kind, zero)


def _read_given(given: object, kind: Kind, zero: bool) -> Fraction:
    wanted = f"{kind.noun} such as {kind.example}"
    text = text_of(given, wanted)
    code = split_code(text, kind)
    if code is not None:
        number, exponent, rest = code
        if rest and rest not in kind.spellings:
            letter = _tolerance_letter(text, number * power_of_ten(exponent), kind)
            raise refusal(given, letter or f"{shown(rest)} after a code is not read; {wanted} is wanted")
        as_read = text
    else:
        number, written, rest = split_number(given, text, wanted)
        if not rest and not kind.bare:
            raise refusal(given, f"{kind.noun} needs its unit; write {written} mm")
        found = exponent_of(rest, kind) if rest else 0
        if found is None:
            raise refusal(given, _why_no_unit(text, rest, kind, number))
        exponent = found
        as_read = f"{written} {rest if rest.endswith(kind.spellings) else rest + kind.unit}"
    value = number * power_of_ten(exponent)
    _check_range(given, as_read, value, kind, zero)
    return value


def _check_range(given: object, as_read: str, value: Fraction, kind: Kind, zero: bool) -> None:
    if value == 0 and zero:
        return
    if value <= 0 and not kind.signed:
        raise refusal(
            given, f"{kind.noun} is {'zero or more' if zero else 'above zero'}, such as {kind.example}"
        )
    if kind.low <= value <= kind.high:
        return
    code = _three_figures(given) if kind is CAPACITANCE else None
    if code is not None:
        raise refusal(given, f"{as_read}; {code}")
    side, end = ("below", kind.low) if value < kind.low else ("above", kind.high)
    likely = kind.likely(value)
    meant = f"; {format_quantity(float(likely), kind.unit, 6)}?" if likely is not None else ""
    limit = format_quantity(float(end), kind.unit) if kind.prefixed else f"{float(end):g} {kind.unit}"
    reason = f" ({kind.reason})" if kind.reason else ""
    raise refusal(given, f"{as_read} is {side} {limit}{meant}{reason}")


def _three_figures(given: object) -> str | None:
    """Return the hint for a capacitor marking of three figures: two digits and a power of ten, in pF."""
    figures = given.strip() if isinstance(given, str) else str(given)
    if not re.fullmatch(r"[1-9][0-9]{2}", figures):
        return None
    power = {"8": -2, "9": -1}.get(figures[2], int(figures[2]))
    marked = format_quantity(float(int(figures[:2]) * power_of_ten(power - 12)), "F")
    if figures[2] == "0":
        return f"{figures} pF? (three-figure codes are not read; as such a code it is {marked})"
    return f"{marked}? (three-figure codes are not read)"
