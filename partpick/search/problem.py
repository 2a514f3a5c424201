"""One problem as arrays: what the search may know, and nothing else.

J coils, B bands, n species (distinct capacitances as they act at each band), P parts (a species in
one grade). Whole numbers stand where the order or a limit needs them; `NEVER` is "unknown, last".
"""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from functools import cached_property
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from partpick.search.drive import Drive
from partpick.search.matching import Matching

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

NEVER = 10**12
PLENTY = 10**9


def _unset() -> Floats:
    return np.empty(0)


@dataclass(frozen=True, kw_only=True, eq=False)
class Oscillator:
    """What every band must start with: the device, and the losses at their worst."""

    circuit: str  # "colpitts", "clapp" or "hartley"
    allowed: float  # S, transconductance over margin
    device: tuple[float, float]  # F, output to common and control to common
    coil_loss: Floats  # (J, B) 1/Q at worst, nan: unknown
    coil_loss_low: Floats  # (J, B) at the lower end
    load: Floats  # (B,) S, across the tank
    least_loss: Floats  # (B,) 1/Q, what a load makes of the tank at least; 0: nothing is said
    # of a coil with a tap at its common terminal, (J,) each; of whole coils nothing is read
    output_turns: Floats = field(default_factory=_unset)  # share of the turns between output and tap
    output_share: Floats = field(default_factory=_unset)  # of the inductance
    control_share: Floats = field(default_factory=_unset)
    mutual_share: Floats = field(default_factory=_unset)  # of the inductance, between both

    @property
    def divided(self) -> bool:
        """Whether capacitors make the divider."""
        return self.circuit != "hartley"


@dataclass(frozen=True, kw_only=True, eq=False)
class Problem:
    """Coils, capacitors, bands and limits of one search; see the module's text for the shapes."""

    # bands, (B,)
    frequency: Floats  # Hz
    error_limit: Floats  # fraction of f, inf: none
    q_limit: Floats  # 0: none
    q_enough: Floats
    stray: Floats  # F
    trimmer_low: Floats  # F, 0 without a trimmer
    trimmer_high: Floats
    trimmer_loss: Floats  # 1/Q
    trimmer_tempco: Floats  # 1/K
    # coils
    wanted: Floats  # (J, B) F, the capacitance that resonates
    self_capacitance: Floats  # (J,) F
    in_play: Bools  # (J, B) inside every limit on coils alone
    coil_loss: Floats  # (J, B) 1/Q, nan: unknown
    reactance_class: Ints  # (J, B)
    effort: Ints  # (J, 3) form class, wire outside the usual sizes, volume step
    coil_price: Ints  # (J,) hundredths, NEVER: unknown
    support: Ints  # (J,) former, core or bought inductor
    support_stock: Ints  # (S,) sets of one per unit built
    coil_rank: Ints  # (J,) place in the order of content
    coil_tempco: Floats  # (J, B) 1/K, nan: unknown
    coil_tempco_spread: Floats  # (J,) 1/K
    # capacitors
    species: Floats  # (B, n) F, effective at each band
    commonness: Ints  # (n,)
    options: tuple[tuple[int, ...], ...]  # parts of each species
    part_loss: Floats  # (B, P) 1/Q, nan: unknown
    part_tempco: Floats  # (P,) 1/K, nan: unknown
    part_tempco_spread: Floats  # (P,) 1/K
    part_price: Ints  # (P,) hundredths
    part_stock: Ints  # (P,) pieces per unit built
    part_rank: Ints  # (P,) place in the order of content
    part_value: tuple[Fraction, ...]  # (P,) F as written
    # rules
    least_parts: int  # a band's least capacitors: 1 for a single tank, else 0
    most_parts: int
    connect_any: bool
    lead_inductance: float  # H, in series with each band's network
    share: float  # strays in the capacitance in circuit, inf: no limit
    stray_tempco: float
    drift_limit: float  # 1/K, inf: none
    parts_limit: int  # NEVER: none
    values_limit: int
    price_limit: int  # hundredths
    inductors: int
    floor: float
    by: str
    # swept bands, (B,); for a fixed band none of this is read
    swept: Bools = field(default_factory=lambda: np.empty(0, np.bool_))
    low_end: Floats = field(default_factory=_unset)  # Hz, lower end as asked for
    tuning_low: Floats = field(default_factory=_unset)  # F, the element's own ends
    tuning_high: Floats = field(default_factory=_unset)
    tuning_loss: Floats = field(default_factory=_unset)  # 1/Q, nan: unknown
    tuning_tempco: Floats = field(default_factory=_unset)  # 1/K, nan: unknown
    tuning_share: float = float("inf")  # of the tank's voltage, that the element may bear at its most capacitance
    inductance_low: Floats = field(default_factory=_unset)  # (J, B) H, at the lower end
    coil_loss_low: Floats = field(default_factory=_unset)  # (J, B) 1/Q
    species_low: Floats = field(default_factory=_unset)  # (B, n) F
    part_loss_low: Floats = field(default_factory=_unset)  # (B, P) 1/Q
    # an element that moves inductance (`moved`): what it adds to the self-capacitance at both ends, (J, B) F
    moved_own_low: Floats = field(default_factory=_unset)
    moved_own_high: Floats = field(default_factory=_unset)
    contacts_limit: int = NEVER  # of the band switch; NEVER: none
    margin: float = 0.0  # coverage beyond each end, fraction of f
    excess_limit: float = float("inf")
    # alignment: whether each band can be brought right whatever the parts are within tolerance
    alignable: float = 0.0  # share of builds, 1: all corners, 0: not asked
    coil_spread: Floats = field(default_factory=_unset)  # (J,) fraction of the inductance, size
    part_tolerance: Floats = field(default_factory=_unset)  # (P,) fraction, size
    stray_tolerance: float = 0.0
    tuning_tolerance: float = 0.0  # of the element's capacitance
    aligned: Bools = field(default_factory=lambda: np.empty(0, np.bool_))  # (B,) bands for which it is asked
    coil_adjust: Floats = field(default_factory=_unset)  # (J,) fraction of the inductance, either way
    # trimmers to choose from
    trim_share: Floats = field(default_factory=_unset)  # (B,) most range over what is in circuit, inf: no limit
    trimmer_tempco_spread: Floats = field(default_factory=_unset)  # (B,) 1/K
    trimmer_stock: Ints = field(default_factory=lambda: np.empty(0, np.int64))  # (T,) pieces per unit built
    coil_alone: bool = True  # a coil serves the one band alone, so that its adjustment is free for it
    drive: Drive | None = None  # what parts must bear; None: nothing is driven, or ratings are no limit
    oscillator: Oscillator | None = None
    matching: Matching | None = None  # loads by a capacitive divider

    def __post_init__(self) -> None:
        """Fill what a problem of fixed bands leaves out."""
        nothing = np.zeros(len(self.frequency))
        defaults = {
            "swept": nothing.astype(np.bool_),
            "low_end": self.frequency,
            "tuning_low": nothing,
            "tuning_high": nothing,
            "tuning_loss": nothing,
            "tuning_tempco": nothing,
            "inductance_low": self.inductance_high,
            "coil_loss_low": self.coil_loss,
            "species_low": self.species,
            "part_loss_low": self.part_loss,
            "coil_spread": np.zeros(len(self.self_capacitance)),
            "part_tolerance": np.zeros(len(self.part_value)),
            "coil_adjust": np.zeros(len(self.self_capacitance)),
            "aligned": np.ones(len(self.frequency), dtype=np.bool_),
            "trim_share": np.full(len(self.frequency), np.inf),
            "trimmer_tempco_spread": nothing,
        }
        for name, value in defaults.items():
            if getattr(self, name).size == 0:
                object.__setattr__(self, name, value)

    def part_gain(self, *, low_end: bool = False) -> Floats:
        """Return d ln(as it acts) / d ln(its value) of each part, (B, P): above 1 with inductance in series.

        A part C with Ls in series acts as C/(1 - w^2 Ls C), and the quotient of the two is this very slope. [-]
        """
        gain = np.ones((self.bands, len(self.part_value)))
        for acting, options in zip((self.species_low if low_end else self.species).T, self.options, strict=True):
            if options:
                slope = acting / float(self.part_value[options[0]])
                gain[:, list(options)] = np.where(np.isfinite(slope), slope, 1.0)[:, None]
        return gain

    @property
    def trimmer_span(self) -> Floats:
        """Range of each band's trimmer, (B,), 0 without one. [F]"""
        return self.trimmer_high - self.trimmer_low

    @property
    def device(self) -> tuple[float, float]:
        """Capacitance of the device across the two halves of a divider; none where there is no divider. [F]"""
        divided = self.oscillator is not None and self.oscillator.divided
        return self.oscillator.device if divided and self.oscillator is not None else (0.0, 0.0)

    def device_at(self, band: int) -> tuple[float, float]:
        """Return what is across the two halves of a divider at a band, the load's conductance over w for a load. [F]"""
        matching = self.matching
        if matching is None or not matching.divided[band]:
            return self.device
        return 0.0, float(matching.conductance[band] / (2 * np.pi * self.frequency[band]))

    @property
    def inductance_high(self) -> Floats:
        """Inductance at the target, the upper end of a swept band, (J, B). [H]"""
        return 1.0 / ((2 * np.pi * self.frequency[None, :]) ** 2 * self.wanted)

    def wanted_at_end(self, coil: int, band: int, *, low_end: bool) -> float:
        """Return the capacitance that resonates at the target, or at the lower end of a swept band. [F]"""
        if not low_end:
            return float(self.wanted[coil, band])
        return float(1.0 / ((2 * np.pi * self.low_end[band]) ** 2 * self.inductance_low[coil, band]))

    @property
    def most_at_high_end(self) -> Floats:
        """Most capacitance in circuit with which a swept band reaches its widened upper end, (J, B). [F]"""
        return self.wanted / (1.0 + self.margin) ** 2

    @property
    def least_at_low_end(self) -> Floats:
        """Least capacitance in circuit with which a swept band reaches its widened lower end, (J, B). [F]"""
        omega = 2 * np.pi * self.low_end * (1.0 - self.margin)
        return 1.0 / (omega[None, :] ** 2 * self.inductance_low)

    @property
    def led_by_excess(self) -> bool:
        """Whether the worst excess, not the worst error, leads: every band is swept."""
        return bool(self.swept.all())

    @property
    def mixed(self) -> bool:
        """Whether some bands are swept and some are fixed."""
        return bool(self.swept.any()) and not self.led_by_excess

    @property
    def bands(self) -> int:
        """Number of bands. [-]"""
        return len(self.frequency)

    @property
    def coils(self) -> int:
        """Number of coils. [-]"""
        return len(self.self_capacitance)

    @property
    def by_grade(self) -> bool:
        """Whether a limit of a band looks at the grades, and not at capacitances alone."""
        limited = bool((self.q_limit > 0).any()) or bool(np.isfinite(self.drift_limit))
        return limited or self.drive is not None

    @property
    def coupled(self) -> bool:
        """Whether any limit ties the bands together (stock is tested on each answer)."""
        return min(self.parts_limit, self.values_limit, self.price_limit, self.contacts_limit) < NEVER

    @property
    def moved(self) -> Bools:
        """Which bands are swept by an element that moves inductance: no capacitance is tuned, (B,)."""
        return np.asarray(self.swept & (self.tuning_high <= 0))

    def strays(self, *, low_end: bool = False) -> Floats:
        """Return strays and self-capacitance at each band, or at its lower end, (J, B). [F]"""
        own = self.moved_own_low if low_end else self.moved_own_high
        both = self.self_capacitance[:, None] + self.stray[None, :]
        return both + own if own.size else both

    def fixed_capacitance(self, *, low_end: bool = False) -> Floats:
        """Return strays, self-capacitance and middle of the trimmer, (J, B). [F]"""
        middle = (self.trimmer_low + self.trimmer_high) / 2
        return self.strays(low_end=low_end) + middle[None, :]

    def windows(self, parts: int) -> tuple[Floats, Floats]:
        """Return the closed interval of network capacitance inside the error and share limits, (J, B).

        Empty intervals (low above high) stand where the coil is not in play or the band is swept. [F]
        """
        fixed = self.fixed_capacitance()
        limit = np.minimum(self.error_limit, 1.0 - 1e-9)[None, :]
        low = self.wanted / (1.0 + self.error_limit[None, :]) ** 2 - fixed
        high = self.wanted / (1.0 - limit) ** 2 - fixed
        trimmed = self.trimmer_high > 0
        if trimmed.any():  # a trimmer must be able to bring the nominal parts on frequency
            slack = (self.trimmer_high - self.trimmer_low)[None, :] / 2
            reach_low, reach_high = self.wanted - fixed - slack, self.wanted - fixed + slack
            low = np.where(trimmed[None, :], np.maximum(low, reach_low), low)
            high = np.where(trimmed[None, :], np.minimum(high, reach_high), high)
        strays = self.self_capacitance[:, None] + self.stray[None, :]
        if parts > 0:
            low = np.maximum(low, strays / self.share - fixed)
        if self.alignable > 0:
            least, most = self._alignable_window(strays) if self.alignable >= 1.0 else self._window_of_share()
            low = np.where(self.aligned, np.maximum(low, least), low)
            high = np.where(self.aligned, np.minimum(high, most), high)
        low = np.maximum(low, self.trimmer_span / self.trim_share - fixed)
        grain = 1e-12 * self.wanted  # rounding of the limits themselves
        low, high = low - grain, high + grain
        in_play = self.in_play & ~self.swept[None, :]  # swept.py has its own intervals
        low = np.where(in_play, low, np.inf)
        high = np.where(in_play, high, -np.inf)
        if self.lead_inductance > 0:
            low, high = self._before_leads(low), self._before_leads(high)
        return low, high

    def _alignable_window(self, strays: Floats) -> tuple[Floats, Floats]:
        """Return what the network must be for the trimmer to reach every corner, with the closest capacitor, (J, B).

        A network is never closer than its closest part, so that no network outside can be aligned. [F]
        """
        down, up = (end[:, None] for end in self.coil_ends)
        part = min(float(self.part_tolerance.min()), 0.999) if len(self.part_tolerance) else 0.0
        least = self.wanted / down - self.trimmer_high - strays * (1.0 - self.stray_tolerance)
        most = self.wanted / up - self.trimmer_low - strays * (1.0 + self.stray_tolerance)
        least = np.where(least > 0, least / (1.0 - part), least)
        return least, np.where(most > 0, most / (1.0 + part), most)

    def _window_of_share(self) -> tuple[Floats, Floats]:
        """Return what the network must be for the share asked for, with capacitors that have no tolerance, (J, B). [F]

        Either failure may have at most the chance that is left: its margin is so many standard deviations.
        """
        deviations = NormalDist().inv_cdf(max(self.alignable, 0.5))
        strays = self.self_capacitance[:, None] + self.stray[None, :]
        of_strays = (self.self_capacitance**2)[:, None] + (self.stray**2)[None, :]
        least, most = np.full(self.wanted.shape, np.inf), np.full(self.wanted.shape, -np.inf)
        for (down, up), spread in self.coil_ways:
            ends = []
            for factor, sign in ((down, 1.0), (up, -1.0)):
                wanted = self.wanted / factor[:, None]
                square = (wanted * spread[:, None]) ** 2 + self.stray_tolerance**2 * of_strays
                ends.append(wanted - strays - sign * deviations * np.sqrt(square / 3.0))
            most = np.maximum(most, ends[0] - self.trimmer_low)
            least = np.minimum(least, ends[1] - self.trimmer_high)
        return least, most

    @cached_property
    def coil_ways(self) -> list[tuple[tuple[Floats, Floats], Floats]]:
        """The ways to use adjustable coils: two factors of their inductance, and the spread left, (J,) each. [-]

        Set to nominal as near as it goes; and, where a coil serves one band alone, turned down or up all the way.
        The spread that is left is the size of a uniform one of the same variance.
        """
        one, over = np.ones_like(self.coil_spread), np.maximum(self.coil_spread - self.coil_adjust, 0.0)
        left = np.sqrt(over**3 / np.maximum(self.coil_spread, 1e-300))
        ways = [((one, one), left)]
        if self.coil_alone and bool((self.coil_adjust > 0).any()):
            ways.append(((1.0 - self.coil_adjust, 1.0 + self.coil_adjust), self.coil_spread))
        return ways

    @cached_property
    def written(self) -> Floats:
        """Each part's capacitance as it is printed, (P,). [F]"""
        return np.array([float(value) for value in self.part_value], dtype=np.float64)

    @cached_property
    def coil_ends(self) -> tuple[Floats, Floats]:
        """Which inductances every build can be given at least, and at most, over nominal, (J,) each. [-]

        A coil that serves one band is turned as that band asks: the weakest one up, the strongest one down. A coil
        of several bands is set once, to its nominal inductance as near as it goes; the trimmers do the rest.
        """
        spread = np.minimum(self.coil_spread, 1.0 - 1e-9)
        weakest = (1.0 - spread) * (1.0 + self.coil_adjust)
        strongest = (1.0 + spread) * (1.0 - self.coil_adjust)
        if self.coil_alone:
            return weakest, strongest
        return np.minimum(weakest, 1.0), np.maximum(strongest, 1.0)

    def swings_enough(self) -> Bools:
        """Return where the tuning element alone has swing enough in every build asked for, (J, B).

        A padder takes some of the swing away, so that nothing outside can cover.
        """
        if self.alignable < 1.0:
            return np.ones(self.wanted.shape, dtype=np.bool_)
        wide = 1.0 / ((2 * np.pi * self.low_end[None, :]) ** 2 * self.inductance_low)
        swing = (self.tuning_high - self.tuning_low)[None, :] * (1.0 - self.tuning_tolerance)
        enough: Bools = self.coil_ends[0][:, None] * swing >= wide - self.wanted - 1e-11 * wide
        return enough | ~self.aligned[None, :]

    def _before_leads(self, network: Floats) -> Floats:
        """Return the network that acts as `network` behind the leads' inductance."""
        squared = (2 * np.pi * self.frequency[None, :]) ** 2
        finite = np.isfinite(network) & (network > 0)
        inside = network / (1.0 + squared * self.lead_inductance * np.where(finite, network, 0.0))
        return np.where(finite, inside, network)

    def behind_leads(self, network: Floats, band: int, *, low_end: bool = False) -> Floats:
        """Return how a network acts at a band, or its lower end, behind the leads' inductance. [F]"""
        squared = (2 * np.pi * (self.low_end if low_end else self.frequency)[band]) ** 2
        return network / (1.0 - squared * self.lead_inductance * network)
