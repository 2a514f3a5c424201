"""What comes out: frozen values in the shape of the result file, SI, `None` for unknown.

Assessment makes `Candidate`s, `solving.py` makes the `Result`, `report/` only reads them.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from partpick.request import Request


@dataclass(frozen=True, kw_only=True)
class BandFigures:
    """One band of a candidate, as picked."""

    name: str
    target: float | None  # Hz; None for a swept band
    resonance: float | None  # Hz
    error: float | None  # signed fraction of the target
    inductance: float  # H, at this band's frequency
    capacitance: float | None  # F, all in circuit
    network: float | None  # F, the capacitors alone
    stray: float  # F
    self_capacitance: float  # F
    trimmer: float | None  # F, middle of its range
    coil: str  # reference, "L1"
    tap_turns: int | None
    contacts: tuple[str, ...]
    capacitors: tuple[str, ...]  # references in circuit
    connection: str  # "C1 | (C2 + C3)"
    reactance: float  # ohm
    q: float | None  # unloaded
    bandwidth: float | None  # Hz, loaded where a load is stated
    drift: float | None  # 1/K, signed df/f
    drift_spread: float | None  # 1/K, size, added to the nominal drift by size
    hertz_per_farad: float | None  # df/dC, negative
    coil_q: float | None = None  # of the coil alone at this band; None: unknown
    extra: dict[str, object] = field(default_factory=dict)  # further JSON keys of this band


@dataclass(frozen=True, kw_only=True)
class CoilFigures:
    """One coil of a candidate."""

    reference: str
    form: str  # "solenoid", "ring core", "bought", "measured" ...
    label: str  # "14 turns of 0.5 mm on 20 mm former"
    turns: int | None
    former: str | None  # name of the former or core
    wire: str | None
    winding_length: float | None  # m
    wire_length: float | None  # m, tails included
    inductance: float  # H, at its lowest band
    inductance_dc: float | None  # H
    self_capacitance: float | None  # F
    pitch: float | None = None  # m
    mean_diameter: float | None = None  # m
    extra: dict[str, object] = field(default_factory=dict)


@dataclass(frozen=True, kw_only=True)
class PartLine:
    """One piece to buy, pull or wind."""

    reference: str
    kind: str  # "capacitor", "coil", "trimmer", "tuning"; wire is added in the BOM
    value: float | None  # F or H
    unit: str  # "F" or "H"
    label: str  # "47 pF"
    description: str  # what to buy or wind, in words
    grade: str | None
    tolerance: float | None
    tempco: float | None
    bands: tuple[str, ...]
    unit_price: float | None
    source: str
    wire: str | None = None  # coils that are wound: the wire, and how much of it
    wire_length: float | None = None  # m
    wire_price_per_m: float | None = None
    q: float | None = None  # capacitors: at every frequency up to q_below; None: unknown
    q_below: float | None = None  # Hz
    series_inductance: float | None = None  # H
    voltage: float | None = None  # V, peak; None: not rated
    rf_current: float | None = None  # A rms; None: not rated


@dataclass(frozen=True, kw_only=True)
class Candidate:
    """One choice of parts for the whole request."""

    rank: int | None
    on_front: bool
    worst_error: float | None  # size, fraction; None where every band is swept
    worst_excess: float | None
    part_count: int  # capacitors
    inductor_count: int
    piece_count: int
    value_count: int
    price: float | None
    alternatives: int | None
    bands: tuple[BandFigures, ...]
    coils: tuple[CoilFigures, ...]
    parts: tuple[PartLine, ...]
    warnings: tuple[str, ...]
    order: tuple[tuple[str, object], ...] = ()  # steps of the order by name with this choice's figure
    extra: dict[str, object] = field(default_factory=dict)  # further JSON keys: spread, alignment ...


@dataclass(frozen=True, kw_only=True)
class Stage:
    """One objective with the best value reached and the proven bound."""

    objective: str  # "pieces", "worst_error", "worst_excess", "price"
    value: float | int | None
    bound: float | int | None


@dataclass(frozen=True, kw_only=True)
class Proof:
    """How far the answer is proven."""

    status: str  # "optimal", "feasible", "infeasible", "unknown"
    searched: str
    stages: tuple[Stage, ...] = ()
    stopped_by: str | None = None  # "time limit", "work limit", "interrupt"


@dataclass(frozen=True, kw_only=True)
class RuledOut:
    """The limit that leaves nothing, and what it would have to be."""

    limit: str  # key of the plan, "error", "parts_per_band", ...
    needed: float | int | str | None
    text: str  # one sentence for the bench
    unsettled: tuple[str, ...] = ()  # limits of which the search was stopped before it was known
    others: tuple[RuledOut, ...] = ()  # further limits, each of which alone would let a plan through


@dataclass(frozen=True, kw_only=True)
class Front:
    """What one criterion costs in another: no plan is better in one and as good in the other."""

    criteria: tuple[str, str]  # "values", "pieces"; "error" (or excess), "pieces", "price"
    candidates: tuple[Candidate, ...]
    complete: bool  # False: the search was stopped; the last point may not be on the front


@dataclass(frozen=True, kw_only=True)
class Result:
    """The whole answer."""

    request: Request
    floor: float
    proof: Proof
    candidates: tuple[Candidate, ...]
    front: tuple[Candidate, ...]
    fronts: tuple[Front, ...] = ()  # those that were asked for
    nearest_miss: Candidate | None = None
    ruled_out_by: RuledOut | None = None
    warnings: tuple[str, ...] = ()  # of the request as a whole
