"""The tables of a plan, read by the keys of `plankeys.py` into the frozen values of `request.py`.

`planfile.py` puts them together. Every refusal names its key by the path that `name_key` renders.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from partpick import plankeys
from partpick.errors import QuantityError, RequestError
from partpick.plankeys import Key, nearest
from partpick.quantities import format_quantity, parse_capacitance, parse_inductance, parse_range, shown
from partpick.request import (
    CHOOSE,
    LOADED_Q_TOLERANCE,
    Band,
    CapacitorRules,
    CoilRules,
    Limits,
    Load,
    MeasuredDips,
    Stray,
    Trimmer,
    Tuning,
)

NameKey = Callable[[str], str]
_FIELD = {"from": "low", "to": "high"}  # keys that are no Python names


class TableReader:
    """Reads tables by their keys and words the refusals."""

    def __init__(self, source: str, name_key: NameKey) -> None:
        self._source = source
        self._name_key = name_key

    def name(self, path: str) -> str:
        """Return the name of a key as the user knows it."""
        return self._name_key(path)

    def fail(self, path: str, text: str) -> RequestError:
        """Return the error for one key, or for the whole where `path` is empty."""
        parts = [self._source, self.name(path) if path else "", text]
        return RequestError(": ".join(part for part in parts if part))

    def table(self, raw: object, keys: Mapping[str, Key], path: str) -> dict[str, Any]:
        """Return the stated keys of a table, read; None for "none"."""
        if not isinstance(raw, Mapping):
            raise self.fail(path, f"read {shown(raw)}: a table is wanted, with {', '.join(keys)}")
        prefix = f"{path}." if path else ""
        values: dict[str, Any] = {}
        for name, given in raw.items():
            if name not in keys:
                raise self._unknown(prefix, str(name), keys)
            values[name] = self.value(given, keys[name], prefix + name)
        return values

    def value(self, given: object, key: Key, path: str) -> Any:
        """Return one value, read."""
        if key.none and isinstance(given, str) and given.strip().casefold() == "none":
            return None
        try:
            return key.read(given)
        except QuantityError as problem:
            raise self.fail(path, str(problem)) from None

    def complete(self, raw: object, keys: Mapping[str, Key], path: str) -> dict[str, Any]:
        """Return all keys of a table, read, defaults filled in; a required key must be there."""
        stated = self.table(raw, keys, path)
        for name, key in keys.items():
            if key.required and name not in stated:
                raise self.fail(f"{path}.{name}", "is missing")
        values = {name: stated.get(name, key.default) for name, key in keys.items()}
        for low, high in plankeys.RISING:
            if keys.get(low) and keys.get(high) and not values[low] < values[high]:
                raise self.fail(f"{path}.{low}", f"is not below {self.name(f'{path}.{high}')}")
        return values

    def _unknown(self, prefix: str, name: str, keys: Mapping[str, Key]) -> RequestError:
        what = "unknown key" if prefix else "unknown key or table"
        homes = [f"{table}.{name}" for table, known in plankeys.TABLES.items() if name in known]
        known = homes[0] if homes else prefix + nearest(name, keys)
        return self.fail(prefix + shown_key(name), f"{what}; nearest known: {self.name(known)}")


def shown_key(name: str) -> str:
    """Return a key name as a message shows it: one short line."""
    return name if name.isprintable() and 0 < len(name) <= 40 else shown(name)


def read_limits(reader: TableReader, raw: object, connect: str, band_count: int) -> Limits:
    """Return [limits]; "none" for a count stands for the most that the plan could use."""
    stated = reader.table(raw, plankeys.TABLES["limits"], "limits")
    most = plankeys.MOST_PARTS_IN_NETWORK if connect == "any" else plankeys.MOST_PARTS_PER_BAND
    without_limit = {"parts_per_band": most, "inductors": max(1, band_count), "margin": 0.0}
    for name, without in without_limit.items():
        if name in stated and stated[name] is None:
            stated[name] = without
    off = "alignable" in stated and stated["alignable"] is None
    limits = Limits(
        **stated, error_stated="error" in stated, inductors_stated="inductors" in stated, alignable_off=off
    )
    if limits.parts_per_band > most:
        where = f' with {reader.name("capacitors.connect")} "any"' if connect == "any" else ""
        raise reader.fail(
            "limits.parts_per_band", f"read {limits.parts_per_band}: at most {most} are accepted{where}"
        )
    return limits


def read_coil(reader: TableReader, raw: object) -> CoilRules:
    """Return [coil]."""
    stated = reader.table(raw, plankeys.TABLES["coil"], "coil")
    stated["measured"] = _measured(reader, stated.get("measured"))
    rules = CoilRules(**stated, self_resonance_stated="self_resonance" in stated)
    if rules.self_capacitance is not None and rules.measured is None:
        raise reader.fail(
            "coil.self_capacitance", f"goes with {reader.name('coil.measured')}, which is not set"
        )
    if rules.self_capacitance is not None and isinstance(rules.measured, MeasuredDips):
        raise reader.fail("coil.self_capacitance", "follows from the two dips; leave one of them out")
    return rules


def _measured(reader: TableReader, raw: object) -> float | MeasuredDips | None:
    path = "coil.measured"
    if raw is None:
        return None
    if not isinstance(raw, (list, tuple)):
        value: float = reader.value(raw, Key(read=parse_inductance), path)
        return value
    if len(raw) != 2:
        raise reader.fail(path, f"read a list of {len(raw)}: an inductance or two dips are wanted")
    dips = [reader.complete(dip, plankeys.DIP, f"{path}.{number}") for number, dip in enumerate(raw, 1)]
    first, second = sorted(dips, key=lambda dip: float(dip["with"]))
    if not (first["with"] < second["with"] and first["at"] > second["at"]):
        raise reader.fail(path, "the two dips contradict each other; more capacitance must dip lower")
    # 1/w^2 = L (C + C_self) at both dips
    fast, slow = ((2 * math.pi * dip["at"]) ** -2 for dip in (first, second))
    inductance = (slow - fast) / (second["with"] - first["with"])
    if fast / inductance < first["with"]:
        raise reader.fail(path, "the two dips contradict each other; the self-capacitance would be negative")
    return MeasuredDips(
        at=(dips[0]["at"], dips[1]["at"]), with_capacitance=(dips[0]["with"], dips[1]["with"])
    )


def read_capacitors(reader: TableReader, raw: object) -> CapacitorRules:
    """Return [capacitors]."""
    stated = reader.table(raw, plankeys.TABLES["capacitors"], "capacitors")
    rules = CapacitorRules(**{_FIELD.get(name, name): value for name, value in stated.items()})
    if rules.low is not None and rules.high is not None and rules.low > rules.high:
        raise reader.fail("capacitors.from", f"is above {reader.name('capacitors.to')}")
    return rules


def read_stray(reader: TableReader, raw: object, capacitance: float) -> Stray:
    """Return [stray]; `capacitance` is the default of the command, in farad."""
    return Stray(**{"capacitance": capacitance, **reader.table(raw, plankeys.TABLES["stray"], "stray")})


def read_trimmer(reader: TableReader, raw: object, path: str) -> Trimmer | None:
    """Return a trimmer, from a table or from "3 pF..20 pF"; `CHOOSE` for "choose" or a table without its ends."""
    if raw is None:
        return None
    if isinstance(raw, str) and raw.strip().casefold() == "choose":
        return CHOOSE
    if isinstance(raw, str) and not any(letter.isdigit() for letter in raw):
        raise reader.fail(path, f'read {shown(raw)}: a range such as 3 pF..20 pF, or "choose", is wanted')
    if isinstance(raw, str):
        low, high = reader.value(raw, Key(read=lambda given: parse_range(given, parse_capacitance)), path)
        return Trimmer(low=low, high=high)
    stated = reader.table(raw, plankeys.TRIMMER, path)
    if not {"low", "high"} & stated.keys():
        for name in stated:
            raise reader.fail(f"{path}.{name}", "goes with low and high; a trimmer that is chosen has its own")
        return CHOOSE
    for name in ("low", "high"):
        if name not in stated:
            raise reader.fail(f"{path}.{name}", "is missing")
    return Trimmer(**reader.complete(raw, plankeys.TRIMMER, path))


def read_load(reader: TableReader, raw: object, path: str) -> Load | None:
    """Return a load."""
    if raw is None:
        return None
    stated = reader.complete(raw, plankeys.LOAD, path)
    if stated["loaded_q"] is not None and stated["bandwidth"] is not None:
        raise reader.fail(f"{path}.bandwidth", f"goes without {reader.name(path + '.loaded_q')}; state one")
    if all(stated[key] is None for key in ("resistance", "loaded_q", "bandwidth", "offset")):
        raise reader.fail(path, "states nothing; resistance, loaded_q, bandwidth or offset is wanted")
    if "q_tolerance" not in raw:  # type: ignore[operator]  # a table: it has been read as one
        stated["q_tolerance"] = LOADED_Q_TOLERANCE.get(stated["connection"])
    elif stated["connection"] not in LOADED_Q_TOLERANCE and stated["q_tolerance"] is not None:
        raise reader.fail(
            f"{path}.q_tolerance",
            f'goes with connection "across" or "divider"; by {stated["connection"]} the nearest whole turn is taken',
        )
    return Load(**stated)


def read_tuning(reader: TableReader, raw: object) -> Tuning | None:
    """Return the tuning element, from a table or from "variable capacitor:12 pF..150 pF"."""
    if raw is None:
        return None
    table = _tuning_table(reader, raw) if isinstance(raw, str) else raw
    if not isinstance(table, Mapping):
        raise reader.fail("tuning", f"read {shown(table)}: a table with kind is wanted")
    if "kind" not in table:
        raise reader.fail("tuning.kind", f"is missing; one of {', '.join(plankeys.TUNING)} is wanted")
    kind = reader.value(table["kind"], plankeys.SECTIONS["tuning"]["kind"], "tuning.kind")
    rest = {name: value for name, value in table.items() if name != "kind"}
    tuning = Tuning(kind=kind, keys=tuple(reader.complete(rest, plankeys.TUNING[kind], "tuning").items()))
    _check_element(reader, tuning)
    return tuning


def _check_element(reader: TableReader, tuning: Tuning) -> None:
    """Refuse an element whose keys contradict each other."""
    parallel = tuning.get("parallel")
    if isinstance(parallel, int) and parallel > tuning.sections:
        there = "is only 1 section" if tuning.sections == 1 else f"are only {tuning.sections} sections"
        raise reader.fail("tuning.parallel", f"read {parallel}: there {there} ({reader.name('tuning.sections')})")
    length, travel = tuning.get("length"), tuning.get("travel")
    if isinstance(length, float) and isinstance(travel, float) and length > travel * (1 + 1e-9):
        raise reader.fail(
            "tuning.length",
            f"read {format_quantity(length, 'm')}: longer than the travel of {format_quantity(travel, 'm')} allows; "
            "a core that starts outside the coil would never be all the way in",
        )


def _tuning_table(reader: TableReader, text: str) -> dict[str, object]:
    """Return the table that "kind:low..high" or "kind:key=value;key=value" stands for."""
    kind, _, rest = text.partition(":")
    table: dict[str, object] = {"kind": kind.strip()}
    for item in filter(None, (part.strip() for part in rest.split(";"))):
        name, equals, value = item.partition("=")
        if equals:
            stated = value.strip()
            table[name.strip()] = {"true": True, "false": False}.get(stated.casefold(), stated)
        elif item.count("..") == 1:
            keys = plankeys.TUNING.get(kind.strip().casefold(), {})
            ends = ("low", "high") if "low" in keys else ("from", "to")
            table.update(zip(ends, (end.strip() for end in item.split("..")), strict=True))
        else:
            raise reader.fail("tuning", f"read {shown(text)}: the form is KIND:LOW..HIGH")
    return table


def read_further(reader: TableReader, stated: Mapping[str, object]) -> tuple[tuple[str, Any], ...]:
    """Return the further tables that are there, complete, each as pairs of key and SI value."""
    tables = []
    for name, keys in plankeys.FURTHER.items():
        if name in stated:
            values = reader.complete(stated[name], keys, name)
            if (
                name == "drive"
                and sum(values[key] is not None for key in ("power", "voltage", "current")) != 1
            ):
                raise reader.fail(name, "states not exactly one of power, voltage and current")
            tables.append((name, tuple(values.items())))
    return tuple(tables)


# ---------------------------------------------------------------- bands


@dataclass(frozen=True)
class BandDefaults:
    """What a band takes from the plan where it states nothing."""

    stray: float  # F
    trimmer: Trimmer | None
    q: float | None
    forms: tuple[str, ...] | None
    load: Load | None


def read_bands(reader: TableReader, raw: object, nameless: bool, defaults: BandDefaults) -> tuple[Band, ...]:
    """Return the bands in plan order; `nameless` allows bands that are named by their frequency."""
    if isinstance(raw, Mapping):
        raise reader.fail("band", "read one table: write [[band]], in double brackets, for each band")
    if not isinstance(raw, (list, tuple)):
        raise reader.fail("band", f"read {shown(raw)}: write [[band]] for each band")
    if len(raw) > plankeys.MOST_BANDS:
        raise reader.fail("band", f"read {len(raw)} bands: at most {plankeys.MOST_BANDS} are accepted")
    bands: list[Band] = []
    for number, table in enumerate(raw, 1):
        band = _band(reader, table, f"band.{number}", nameless, defaults)
        if any(band.name == other.name for other in bands):
            raise reader.fail(f"band.{number}.name", f"read {shown(band.name)}: another band has this name")
        bands.append(band)
    return tuple(bands)


def _band(reader: TableReader, raw: object, path: str, nameless: bool, defaults: BandDefaults) -> Band:
    stated = reader.table(raw, plankeys.BAND, path)
    at, low, high = (stated.get(name) for name in ("at", "from", "to"))
    _check_frequencies(reader, path, at, low, high)
    name = stated.get("name")
    if name is None:
        if not nameless:
            raise reader.fail(f"{path}.name", "is missing")
        name = "..".join(format_quantity(f, "Hz", 6) for f in (at, low, high) if f is not None)
    own = dict(stated)
    if "trimmer" in own:
        own["trimmer"] = read_trimmer(reader, own["trimmer"], f"{path}.trimmer")
    if "stray" in own:
        own["stray"] = _band_stray(reader, own["stray"], f"{path}.stray")
    if "load" in own:
        own["load"] = read_load(reader, own["load"], f"{path}.load")
    return Band(
        name=name,
        at=at,
        low=low,
        high=high,
        trimmer=own.get("trimmer", defaults.trimmer),
        stray=own.get("stray", defaults.stray),
        q=own.get("q", defaults.q),
        forms=own.get("forms", defaults.forms),
        load=own.get("load", defaults.load),
    )


def _check_frequencies(
    reader: TableReader, path: str, at: float | None, low: float | None, high: float | None
) -> None:
    """Refuse a band that is neither one frequency nor one range."""
    if at is not None and (low is not None or high is not None):
        raise reader.fail(f"{path}.at", "stands together with from or to; state one frequency or one range")
    if at is None and low is None and high is None:
        raise reader.fail(path, "has no frequency; at, or from and to, is wanted")
    if (low is None) != (high is None):
        raise reader.fail(f"{path}.{'from' if low is None else 'to'}", "is missing; a range has both ends")
    if low is not None and high is not None and low >= high:
        ends = f"{format_quantity(low, 'Hz', 9)} is not below {format_quantity(high, 'Hz', 9)}"
        raise reader.fail(f"{path}.from", f"{ends}; from is the lower end, to the upper")


def _band_stray(reader: TableReader, raw: object, path: str) -> float:
    """Return the strays of a band, a capacitance or a table with it. [F]"""
    key = plankeys.TABLES["stray"]["capacitance"]
    if isinstance(raw, Mapping):
        values = reader.complete(raw, {"capacitance": Key(read=key.read, required=True)}, path)
        return float(values["capacitance"])
    return float(reader.value(raw, key, path))
