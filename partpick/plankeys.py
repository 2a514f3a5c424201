"""The keys of a plan: one table that says for each what it holds and whether "none" removes it.

`planfile.py` walks this table, so that a key, a table or a value that is not in it is refused. Readers
take what TOML or an option gave and return SI values; they raise `QuantityError`. Defaults of the job
itself live in `request.py`; only keys of the further tables carry theirs here.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass

from partpick.preferred import SERIES
from partpick.quantities import (
    parse_angle,
    parse_bandwidth,
    parse_capacitance,
    parse_count,
    parse_current,
    parse_fraction,
    parse_frequency,
    parse_inductance,
    parse_length,
    parse_number,
    parse_power,
    parse_range,
    parse_resistance,
    parse_tempco,
    parse_temperature,
    parse_transconductance,
    parse_voltage,
    refusal,
    shown,
)

Read = Callable[[object], object]

# grows with the table of winding forms in candidates.py
FORMS = ("solenoid", "ring core", "pot core", "rod core", "multilayer", "bought")
ORDERS = ("build", "error", "price")
MOST_BANDS = 64
MOST_PARTS_PER_BAND = 6
MOST_PARTS_IN_NETWORK = 3  # with `connect = "any"`
MOST_UNITS = 1_000_000
MOST_BUILDS = 200_000


@dataclass(frozen=True, kw_only=True)
class Key:
    """One key: how it is read, whether "none" is a value of it, whether it must be there, its default."""

    read: Read
    none: bool = False
    required: bool = False
    default: object = None


def nearest(name: str, known: Iterable[str]) -> str:
    """Return the known name most like `name`."""
    names = list(known)
    folded = {each.casefold(): each for each in reversed(names)}
    import difflib  # needed for a misspelt name alone

    return folded[difflib.get_close_matches(name[:80].casefold(), list(folded), n=1, cutoff=0.0)[0]]


# ---------------------------------------------------------------- readers


def _choice(*accepted: str) -> Read:
    def read(given: object) -> str:
        named = {each.casefold(): each for each in accepted}
        if not isinstance(given, str):
            raise refusal(given, f"one of {', '.join(accepted)} is wanted")
        if given.strip().casefold() not in named:
            meant = nearest(given, accepted)
            raise refusal(given, f'unknown value; nearest known: "{meant}" (of {", ".join(accepted)})')
        return named[given.strip().casefold()]

    return read


def _names(*accepted: str) -> Read:
    """Read a list of names, each one of `accepted` where any are given."""

    def read(given: object) -> tuple[str, ...]:
        items = [given] if isinstance(given, str) else given
        if not isinstance(items, (list, tuple)) or not items:
            raise refusal(given, "a list of names is wanted")
        names = tuple(_choice(*accepted)(item) if accepted else _text(40)(item) for item in items)
        for index, name in enumerate(names):
            if name in names[:index]:
                raise refusal(given, f"{shown(name)} stands there twice")
        return names  # type: ignore[return-value]

    return read


def _text(longest: int, empty: bool = False) -> Read:
    def read(given: object) -> str:
        if not isinstance(given, str):
            raise refusal(given, "a text in quotes is wanted")
        text = given.strip()
        if not text and not empty:
            raise refusal(given, "nothing given; a text is wanted")
        if len(text) > longest or not text.isprintable():
            raise refusal(given, f"at most {longest} characters on one line are accepted")
        return text

    return read


def _flag(given: object) -> bool:
    if not isinstance(given, bool):
        raise refusal(given, "true or false is wanted")
    return given


def _pair(parse: Callable[[object], float], example: str) -> Read:
    """Read a list of two, or "low..high"."""

    def read(given: object) -> tuple[float, float]:
        if isinstance(given, str) and ".." in given:
            return parse_range(given, parse)
        if not isinstance(given, (list, tuple)) or len(given) != 2:
            raise refusal(given, f"a list of two is wanted, such as {example}")
        low, high = parse(given[0]), parse(given[1])
        if low > high:
            raise refusal(given, f"the first of the two is above the second; {example} is the form")
        return low, high

    return read


def _count(low: int, high: int) -> Read:
    return lambda given: parse_count(given, low, high)


def _positive(high: float, low: float = 0.0) -> Callable[[object], float]:
    """Read a plain number above zero, from `low` to `high`."""

    def read(given: object) -> float:
        number = parse_number(given, low, high)
        if number <= 0:
            raise refusal(given, "more than zero is wanted")
        return number

    return read


def _fraction(high: float = 1.0, zero: bool = True) -> Read:
    return lambda given: parse_fraction(given, high=high, zero=zero)


def _alignable(given: object) -> str | float:
    if isinstance(given, str) and given.strip().casefold() == "worst case":
        return "worst case"
    if isinstance(given, str) and not any(letter.isdigit() for letter in given):
        raise refusal(given, '"worst case", "none" or a share such as 99 % is wanted')
    return parse_fraction(given, zero=False)


def _capacitance_or_zero(given: object) -> float:
    return parse_capacitance(given, zero=True)


def _inductance_or_zero(given: object) -> float:
    return parse_inductance(given, zero=True)


def _voltage_or_zero(given: object) -> float:
    return parse_voltage(given, zero=True)


def _drift(given: object) -> float:
    return parse_tempco(given, signed=False)


def _half_turn(given: object) -> float:
    angle = parse_angle(given)
    if not 0.0 <= angle <= 180.0:
        raise refusal(given, "0 (aiding) to 180 degrees (opposing) is wanted")
    return angle


def as_given(given: object) -> object:
    """Leave a value to `planfile.py`, which reads it as a table of its own."""
    return given


# ---------------------------------------------------------------- the tables of a plan

_QUALITY = _positive(100_000)
DIP = {"at": Key(read=parse_frequency, required=True), "with": Key(read=_capacitance_or_zero, required=True)}
TRIMMER = {
    "low": Key(read=parse_capacitance),  # neither low nor high: one of those in stock
    "high": Key(read=parse_capacitance),
    "tempco": Key(read=parse_tempco),
    "q": Key(read=_QUALITY),
    "voltage": Key(read=parse_voltage),  # rating, V peak
    "spacing": Key(read=parse_length),  # of its plates in air
}
LOAD = {
    "resistance": Key(read=parse_resistance),
    "loaded_q": Key(read=_QUALITY),
    "bandwidth": Key(read=parse_bandwidth),
    "offset": Key(read=parse_bandwidth),
    "connection": Key(read=_choice("across", "tap", "link", "divider"), default="across"),
    "q_tolerance": Key(read=_fraction(zero=False), none=True),  # of the loaded Q; its default goes by connection
}
BAND = {
    "name": Key(read=_text(60)),
    "at": Key(read=parse_frequency),
    "from": Key(read=parse_frequency),
    "to": Key(read=parse_frequency),
    "trimmer": Key(read=as_given, none=True),
    "stray": Key(read=as_given),
    "q": Key(read=_QUALITY, none=True),
    "forms": Key(read=_names(*FORMS)),
    "load": Key(read=as_given, none=True),
}
TOP = {
    "title": Key(read=_text(200, empty=True)),
    "units": Key(read=_count(1, MOST_UNITS)),
    "switching": Key(read=_choice("separate", "stacked", "shared")),
}
TABLES: dict[str, dict[str, Key]] = {
    "limits": {
        "error": Key(read=_fraction(0.5, zero=False), none=True),
        "parts_per_band": Key(read=_count(0, MOST_PARTS_PER_BAND), none=True),
        "parts": Key(read=_count(0, 10_000), none=True),
        "values": Key(read=_count(0, 10_000), none=True),
        "contacts": Key(read=_count(0, 10_000), none=True),
        "inductors": Key(read=_count(1, MOST_BANDS), none=True),
        "q": Key(read=_QUALITY, none=True),
        "drift": Key(read=_drift, none=True),
        "price": Key(read=lambda given: parse_number(given, 0, 1e9), none=True),
        "excess": Key(read=_fraction(1000.0), none=True),
        "margin": Key(read=_fraction(0.5), none=True),
        "alignable": Key(read=_alignable, none=True),
        "stress": Key(read=_choice("derated", "rated"), none=True),
    },
    "coil": {
        "forms": Key(read=_names(*FORMS), none=True),
        "taps": Key(read=_flag),
        "inductance": Key(read=_pair(parse_inductance, '["2 \u00b5H", "6 \u00b5H"]'), none=True),
        "reactance": Key(read=_pair(parse_resistance, '["40 \u03a9", "1 k\u03a9"]'), none=True),
        "self_resonance": Key(read=_positive(1000), none=True),
        "proportions": Key(read=_pair(_positive(1000), "[0.4, 2.5]"), none=True),
        "measured": Key(read=as_given, none=True),
        "self_capacitance": Key(read=_capacitance_or_zero, none=True),
    },
    "capacitors": {
        "series": Key(read=_choice(*SERIES)),
        "from": Key(read=parse_capacitance, none=True),
        "to": Key(read=parse_capacitance, none=True),
        "grades": Key(read=_names(), none=True),
        "connect": Key(read=_choice("parallel", "any")),
    },
    "stray": {
        "capacitance": Key(read=_capacitance_or_zero),
        "tolerance": Key(read=_fraction()),
        "share": Key(read=_fraction(zero=False), none=True),
        "tempco": Key(read=parse_tempco),
        "inductance": Key(read=_inductance_or_zero),
    },
}

# ---------------------------------------------------------------- further tables, kept with their own keys



def _sections(given: object) -> int:
    """Read how many sections a gang has; they are equal."""
    if isinstance(given, (list, tuple)):
        raise refusal(given, "sections that differ are not planned; state low and high of one, and how many are equal")
    return parse_count(given, 1, 6)


_LAWS = ("straight-line capacitance", "straight-line wavelength", "straight-line frequency")
TUNING_OF_ANY_KIND = {
    "sections": Key(read=_sections, default=1),  # that move together
    "law": Key(read=_choice(*_LAWS)),
    "tolerance": Key(read=_fraction()),
    "tempco": Key(read=parse_tempco),
}
TUNING: dict[str, dict[str, Key]] = {
    "variable capacitor": {
        "low": Key(read=parse_capacitance, required=True),
        "high": Key(read=parse_capacitance, required=True),
        **TUNING_OF_ANY_KIND,
        "parallel": Key(read=_count(1, 6)),  # of the sections; all where unstated
        "law": Key(read=_choice(*_LAWS), default=_LAWS[0]),
        "voltage": Key(read=parse_voltage),  # rating, V peak
        "spacing": Key(read=parse_length),  # of its plates in air
    },
    "varactor": {
        "zero_bias": Key(read=parse_capacitance, required=True),
        "potential": Key(read=parse_voltage, default=0.7),  # silicon junction; common practice, no source
        "grading": Key(read=_positive(3), required=True),
        "from": Key(read=_voltage_or_zero, required=True),
        "to": Key(read=parse_voltage, required=True),
        "count": Key(read=_count(1, 16), default=1),
        "connection": Key(read=_choice("parallel", "back to back"), default="parallel"),
        "series": Key(read=parse_capacitance),
        **TUNING_OF_ANY_KIND,
    },
    "sliding core": {
        "diameter": Key(read=parse_length, required=True),
        "length": Key(read=parse_length, required=True),
        "permeability": Key(read=_positive(1e6, low=1), required=True),
        "travel": Key(read=parse_length, required=True),  # from where it stands just outside the winding
        "q": Key(read=_QUALITY),  # of its material
        **TUNING_OF_ANY_KIND,
    },
    "moving contact": {
        "continuous": Key(read=_flag, default=False),
        "least_turns": Key(read=_positive(1000, low=1), default=3.0),  # as for taps
        "unused": Key(read=_choice("open", "shorted"), default="open"),
        **TUNING_OF_ANY_KIND,
    },
    "variometer": {
        "rotor": Key(read=parse_length, required=True),  # mean diameter of the turning coil
        "turns": Key(read=_count(1, 1000)),  # of the rotor; as the stator, or as many as turn inside it
        "connection": Key(read=_choice("series", "parallel"), default="series"),
        "from": Key(read=_half_turn, required=True),  # degrees between the axes, 0: aiding
        "to": Key(read=_half_turn, required=True),
        **TUNING_OF_ANY_KIND,
    },
}
FURTHER: dict[str, dict[str, Key]] = {
    "drive": {
        "power": Key(read=parse_power),  # into tank and load, of the carrier
        "voltage": Key(read=parse_voltage),  # peak, held across the tank
        "current": Key(read=parse_current),  # peak of the fundamental into the tank
        "supply": Key(read=parse_voltage),
        "class": Key(read=_choice("A", "B", "C", "E"), default="C"),
        "modulation": Key(read=_fraction(), default=0.0),  # depth of amplitude modulation
        "bias": Key(read=_voltage_or_zero, default=0.0),  # direct voltage across the tank's capacitors
    },
    "oscillator": {
        "circuit": Key(read=_choice("colpitts", "clapp", "hartley"), required=True),
        "transconductance": Key(read=parse_transconductance, required=True),
        "margin": Key(read=_positive(1000, low=1), default=3.0),  # 2 to 5: common practice, no source
        "input_capacitance": Key(read=_capacitance_or_zero, default=0.0),
        "output_capacitance": Key(read=_capacitance_or_zero, default=0.0),
    },
    "coupling": {  # two equal tanks on one another
        "bandwidth": Key(read=parse_bandwidth),  # wanted; unstated: critical coupling
    },
    "receiver": {
        "intermediate": Key(read=parse_frequency, required=True),
        "side": Key(read=_choice("above", "below"), default="above"),
        "tracking": Key(read=parse_bandwidth),  # largest tracking error
    },
    "temperature": {
        "from": Key(read=parse_temperature, required=True),  # degrees Celsius
        "to": Key(read=parse_temperature, required=True),
        "measured_drift": Key(read=parse_tempco),  # of the frequency, on the bench
    },
    "spread": {
        "builds": Key(read=_count(100, MOST_BUILDS)),
        "seed": Key(read=_count(0, 2**32 - 1), default=1),
        "parts": Key(read=_choice("uniform", "normal"), default="uniform"),
        "batch": Key(read=_fraction(), default=0.0),  # correlation of capacitors of one value and grade
    },
    "cover": {
        "from": Key(read=parse_frequency, required=True),
        "to": Key(read=parse_frequency, required=True),
    },
    "steps": {  # one coil, a set of capacitors with relays
        "from": Key(read=parse_frequency, required=True),
        "to": Key(read=parse_frequency, required=True),
        "step": Key(read=parse_frequency, required=True),  # coarsest
    },
}
# pairs of keys of which the first must stay below the second
RISING = (("low", "high"), ("from", "to"))

SECTIONS: Mapping[str, Mapping[str, Key]] = {
    **TABLES,
    "trimmer": TRIMMER,
    "tuning": {"kind": Key(read=_choice(*TUNING))},
    "load": LOAD,
    **FURTHER,
    "band": BAND,
}
