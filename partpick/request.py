"""What is asked for: frozen values, every default in one place.

`planfile.py` fills these from a plan file, `cli.py` from options; both through the same keys.
Numbers are SI; `None` in a limit means "none". A `*_stated` flag tells a default from a wish.
"""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(frozen=True, kw_only=True)
class Trimmer:
    """A trimmer, stated in the plan or chosen from the parts: middle of its range in nominal figures."""

    low: float  # F
    high: float  # F
    tempco: float | None = None  # 1/K
    q: float | None = None
    tempco_tolerance: float | None = None  # 1/K, size
    name: str | None = None  # of a part of catalogue or drawer; None: stated in the plan
    unit_price: float | None = 0.0  # what the plan states costs nothing
    quantity: int | None = None
    voltage: float | None = None  # V peak; None: not rated
    spacing: float | None = None  # m, between its plates in air
    source: str = "stated in the plan"
    notes: tuple[str, ...] = ()

    @property
    def to_choose(self) -> bool:
        """Whether the plan asks for a trimmer without saying which (`CHOOSE`)."""
        return self.high == 0.0

    @property
    def middle(self) -> float:
        """Capacitance taken for nominal figures. [F]"""
        return (self.low + self.high) / 2


CHOOSE = Trimmer(low=0.0, high=0.0)  # one of those in stock
CHOSEN_ALIGNS = 0.99  # of the builds, where the plan sets no limit `alignable`


@dataclass(frozen=True, kw_only=True)
class Limits:
    """A design outside one of these is not offered."""

    error: float | None = 0.005
    error_stated: bool = False  # a default error limit is off for a band that has a trimmer
    parts_per_band: int = 2
    parts: int | None = None
    values: int | None = None
    contacts: int | None = None  # of the band switch
    inductors: int = 1
    inductors_stated: bool = False  # [cover] gives every band that it makes a coil where this is unstated
    q: float | None = None
    drift: float | None = None  # 1/K
    price: float | None = None
    excess: float | None = None
    margin: float = 0.03
    alignable: str | float | None = None  # "worst case" or a share
    alignable_off: bool = False  # "none", said so; unstated: a trimmer that is chosen aligns `CHOSEN_ALIGNS`
    stress: str | None = "derated"  # "rated": ratings in full; None: what is over is offered, and flagged


@dataclass(frozen=True, kw_only=True)
class MeasuredDips:
    """Two dips of one coil, each with a known capacitor across it."""

    at: tuple[float, float]  # Hz
    with_capacitance: tuple[float, float]  # F


# A wound coil with less inductance than three times that of one centimetre of lead (8 nH) does not measure as
# computed: its leads decide. Common practice, no source.
LEAST_WOUND = 24e-9  # H


@dataclass(frozen=True, kw_only=True)
class CoilRules:
    """Which coils are in play."""

    forms: tuple[str, ...] | None = None  # None: all that the catalogue has
    taps: bool = False
    inductance: tuple[float, float] | None = None  # H
    reactance: tuple[float, float] | None = None  # ohm, at resonance
    self_resonance: float | None = 3.0  # times the highest frequency
    self_resonance_stated: bool = False  # unstated: bought and multilayer coils need 2
    proportions: tuple[float, float] | None = (0.4, 2.5)
    measured: float | MeasuredDips | None = None  # H
    self_capacitance: float | None = None  # F, goes with measured
    least_wound: float = LEAST_WOUND  # H, at the band; no key of a plan, 0 where coils are but listed


@dataclass(frozen=True, kw_only=True)
class CapacitorRules:
    """Which capacitors are in play."""

    series: str = "E24"
    low: float | None = None  # F, key `from`
    high: float | None = None  # F, key `to`
    grades: tuple[str, ...] | None = None
    connect: str = "parallel"  # or "any"


@dataclass(frozen=True, kw_only=True)
class Stray:
    """Wiring, switch and device."""

    capacitance: float = 10e-12  # F; 5 pF for `pair`
    tolerance: float = 0.30
    share: float | None = 0.20
    tempco: float = 100e-6  # 1/K
    inductance: float = 0.0  # H


# How far the loaded Q may be from the one wanted, where the plan does not say; common practice, no source.
LOADED_Q_TOLERANCE = {"across": 0.25, "divider": 0.10}


@dataclass(frozen=True, kw_only=True)
class Load:
    """What the tank feeds or is fed by."""

    resistance: float | None = None  # ohm
    loaded_q: float | None = None
    bandwidth: float | None = None  # Hz
    offset: float | None = None  # Hz, of a neighbour whose rejection is told
    connection: str = "across"  # "tap", "link", "divider"
    q_tolerance: float | None = None  # fraction of the wanted loaded Q, across or by divider; None: no limit


@dataclass(frozen=True, kw_only=True)
class Tuning:
    """The one element that sweeps the bands with a range; `keys` are the kind's own, SI."""

    kind: str  # "variable capacitor", "varactor", "sliding core", "moving contact", "variometer"
    keys: tuple[tuple[str, object], ...] = ()

    @property
    def moves_inductance(self) -> bool:
        """Whether the coil is tuned, not the capacitance."""
        return self.kind in ("sliding core", "moving contact", "variometer")

    @property
    def sections(self) -> int:
        """How many sections of the element move together."""
        stated = self.get("sections")
        return stated if isinstance(stated, int) else 1

    def get(self, name: str, default: object = None) -> object:
        """Return one key of the element."""
        return dict(self.keys).get(name, default)


@dataclass(frozen=True, kw_only=True)
class Band:
    """One frequency, or one range that the tuning element sweeps."""

    name: str
    at: float | None = None  # Hz
    low: float | None = None  # Hz, key `from`
    high: float | None = None  # Hz, key `to`
    trimmer: Trimmer | None = None  # the plan's where the band states none
    stray: float = 10e-12  # F; the plan's where the band states none
    q: float | None = None  # unloaded, least; the plan's where the band states none
    forms: tuple[str, ...] | None = None
    load: Load | None = None

    @property
    def swept(self) -> bool:
        """Whether the band is a range."""
        return self.at is None

    @property
    def highest(self) -> float:
        """Highest frequency of the band. [Hz]"""
        frequency = self.at if self.at is not None else self.high
        assert frequency is not None
        return frequency

    @property
    def lowest(self) -> float:
        """Lowest frequency of the band: its target, or `from`. [Hz]"""
        frequency = self.at if self.at is not None else self.low
        assert frequency is not None
        return frequency


@dataclass(frozen=True, kw_only=True)
class Request:
    """One job, complete."""

    command: str  # "pair" or "bands"
    bands: tuple[Band, ...]
    title: str = ""
    units: int = 1
    switching: str = "separate"  # "stacked", "shared"
    by: str = "build"  # "error", "price"
    all_windings: bool = False
    limits: Limits = field(default_factory=Limits)
    coil: CoilRules = field(default_factory=CoilRules)
    capacitors: CapacitorRules = field(default_factory=CapacitorRules)
    stray: Stray = field(default_factory=Stray)
    trimmer: Trimmer | None = None
    tuning: Tuning | None = None
    load: Load | None = None
    extra: tuple[tuple[str, tuple[tuple[str, object], ...]], ...] = ()  # [drive], [oscillator] ... checked, SI
