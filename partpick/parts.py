"""The parts that can be bought, pulled from a drawer or wound: frozen values, no formula.

All numbers are SI floats; a tolerance or a Q is a plain fraction or figure; `None` is "not stated".
`quantity` is how many there are (`None`: as many as wanted), `unit_price` is per piece.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import TypeVar


@dataclass(frozen=True, kw_only=True)
class Capacitor:
    """One capacitor value of one grade."""

    value: float  # F
    exact: Fraction  # the same value in farad, as written: sums and ties are settled with it
    grade: str  # "" where the row states none
    tolerance: float  # fraction of the value
    tempco: float | None  # 1/K
    tempco_tolerance: float | None  # 1/K, size
    q: float | None  # at every frequency up to q_below
    q_below: float | None  # Hz; Q is unknown above, None: no such limit
    voltage: float | None  # V, peak
    rf_current: float | None  # A rms
    series_inductance: float | None  # H
    quantity: int | None
    unit_price: float | None
    label: str  # as printed, such as "47 pF C0G"; unique in its file for rows of one value
    family: str  # the series of the row it came from ("E24"), "" for a row with `value`
    source: str
    notes: tuple[str, ...] = ()  # defaults taken for empty cells, in words


@dataclass(frozen=True, kw_only=True)
class Inductor:
    """One inductor as bought."""

    value: float  # H
    tolerance: float
    tempco: float | None
    tempco_tolerance: float | None
    q: float | None
    q_frequency: float | None  # Hz; None: `q` holds at every frequency
    self_capacitance: float | None  # F
    current: float | None  # A rms
    adjust: float | None  # fraction of L either way
    quantity: int | None
    unit_price: float | None
    label: str
    source: str
    notes: tuple[str, ...] = ()


P = TypeVar("P", Capacitor, Inductor)


@dataclass(frozen=True, kw_only=True)
class Wire:
    """One gauge of round or stranded wire."""

    name: str
    bare_diameter: float  # m, copper (of the bundle for stranded wire)
    overall_diameter: float  # m, over the covering
    strands: int = 1
    strand_diameter: float | None = None  # m
    price_per_m: float | None = None
    source: str = ""

    @property
    def bare(self) -> bool:
        """Whether the wire has no covering, so that its turns may not touch."""
        return self.overall_diameter <= self.bare_diameter


@dataclass(frozen=True, kw_only=True)
class Former:
    """A former or mandrel that takes a single layer."""

    name: str
    support: str  # "tube", "ribbed", "mandrel"
    diameter: float  # m, outside
    winding_length: float  # m, room for the winding
    pitch: float | str | None  # m of its groove, "twin", or None: close
    tolerance: float  # of the diameter
    tempco: float | None  # of a coil wound on it
    tempco_tolerance: float | None
    loss_tangent: float  # of the former, its gaps counted as air; 0: nothing but air
    quantity: int | None
    unit_price: float | None
    source: str
    adjust: float | None = None  # fraction of L either way, by a slug or by spreading turns
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, kw_only=True)
class Core:
    """A magnetic core, or a plastic ring."""

    name: str
    shape: str  # "ring", "pot", "rod"
    outer_diameter: float  # m
    inner_diameter: float | None  # m, ring
    height: float | None  # m
    material: str
    permeability: float | None
    al: float | None  # H per turn squared; wins over permeability
    q: float | None  # reachable, a ceiling
    frequency_low: float | None  # Hz
    frequency_high: float | None  # Hz
    tolerance: float  # of AL
    tempco: float | None
    tempco_tolerance: float | None
    adjust: float | None
    quantity: int | None
    unit_price: float | None
    source: str
    notes: tuple[str, ...] = ()


def labelled_copy(part: P, label: str) -> P:
    """Return the same part under a label; hundreds are made at each start, so that nothing is checked again."""
    made: P = object.__new__(type(part))
    made.__dict__.update(part.__dict__, label=label)
    return made


@dataclass(frozen=True, kw_only=True)
class TrimmerPart:
    """One trimmer capacitor."""

    name: str
    low: float  # F
    high: float  # F
    tempco: float | None  # 1/K
    tempco_tolerance: float | None  # 1/K, size
    q: float | None
    voltage: float | None  # V, peak
    quantity: int | None
    unit_price: float | None
    label: str
    source: str
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, kw_only=True)
class Catalogue:
    """All parts in use, in file order."""

    capacitors: tuple[Capacitor, ...]
    inductors: tuple[Inductor, ...]
    wires: tuple[Wire, ...]
    formers: tuple[Former, ...]
    cores: tuple[Core, ...]
    drawer: bool  # whether any file came from a drawer
    drawer_files: tuple[str, ...] = ()  # names of the files that did
    trimmers: tuple[TrimmerPart, ...] = ()
