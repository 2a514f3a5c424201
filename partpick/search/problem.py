"""One fixed-frequency problem as arrays: what the search may know, and nothing else.

J coils, B bands, n species (distinct capacitances as they act at each band), P parts (a species in
one grade). Whole numbers stand where the order or a limit needs them; `NEVER` is "unknown, last".
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

NEVER = 10**12
PLENTY = 10**9


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

    @property
    def bands(self) -> int:
        """Number of bands. [-]"""
        return len(self.frequency)

    @property
    def coils(self) -> int:
        """Number of coils. [-]"""
        return len(self.self_capacitance)

    @property
    def coupled(self) -> bool:
        """Whether any limit ties the bands together (stock is tested on each answer)."""
        return min(self.parts_limit, self.values_limit, self.price_limit) < NEVER

    def fixed_capacitance(self) -> Floats:
        """Return strays, self-capacitance and middle of the trimmer, (J, B). [F]"""
        middle = (self.trimmer_low + self.trimmer_high) / 2
        return self.self_capacitance[:, None] + (self.stray + middle)[None, :]

    def windows(self, parts: int) -> tuple[Floats, Floats]:
        """Return the closed interval of network capacitance inside the error and share limits, (J, B).

        Empty intervals (low above high) stand where the coil is not in play. [F]
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
        if parts > 0:
            strays = self.self_capacitance[:, None] + self.stray[None, :]
            low = np.maximum(low, strays / self.share - fixed)
        grain = 1e-12 * self.wanted  # rounding of the limits themselves
        low, high = low - grain, high + grain
        low = np.where(self.in_play, low, np.inf)
        high = np.where(self.in_play, high, -np.inf)
        if self.lead_inductance > 0:
            low, high = self._before_leads(low), self._before_leads(high)
        return low, high

    def _before_leads(self, network: Floats) -> Floats:
        """Return the network that acts as `network` behind the leads' inductance."""
        squared = (2 * np.pi * self.frequency[None, :]) ** 2
        finite = np.isfinite(network) & (network > 0)
        inside = network / (1.0 + squared * self.lead_inductance * np.where(finite, network, 0.0))
        return np.where(finite, inside, network)

    def behind_leads(self, network: Floats, band: int) -> Floats:
        """Return how a network acts at a band behind the leads' inductance. [F]"""
        squared = (2 * np.pi * self.frequency[band]) ** 2
        return network / (1.0 - squared * self.lead_inductance * network)
