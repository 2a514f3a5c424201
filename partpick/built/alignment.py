"""Adjusting on the bench: which share of units comes on frequency, at which settings.

A trimmer moves the capacitance of its own band, an adjustable coil the inductance of every band that it
serves. For a build each band asks for an interval of the coil's inductance: the one in which its trimmer
can do the rest, or in which its error is inside the limit. The unit can be aligned where these intervals
and the coil's own range have a point in common; this is exact, whatever the order of adjustment.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from partpick.built.tank import Floats, VaryingTank
from partpick.built.variation import COIL, Variation
from partpick.physics.uncertainty import quantiles

INNER_TRAVEL = (0.2, 0.8)  # a setting outside is too near an end to find; common practice, no source
FULL_TRAVEL = (0.0, 1.0)


@dataclass(frozen=True, kw_only=True)
class Setting:
    """Where one adjustment ends up, as a fraction of its travel."""

    reference: str  # "CT1", or the coil's
    nominal: float  # with nominal parts; outside 0 to 1: out of reach
    low: float  # 5 % of the units that can be aligned are below
    high: float
    value: float  # F, or the inductance over its nominal, with nominal parts


@dataclass(frozen=True, kw_only=True)
class BandAlignment:
    """One band and its adjustments; a swept band at its upper end."""

    share: float | None  # of units in which this band alone comes right; None: no trimmer, coil, limit
    trimmer: Setting | None
    hertz_per_farad: float  # at the setting with nominal parts
    hertz_per_percent: float  # for one per cent of the inductance


@dataclass(frozen=True, kw_only=True)
class Alignment:
    """All bands and adjustable coils of a unit."""

    bands: tuple[BandAlignment, ...]
    coils: tuple[Setting, ...]
    share: float  # of units in which every band comes right, settings inside 20 to 80 % of travel
    share_full: float  # over the full travel
    worst_case: bool  # every unit within tolerance, over the full travel


Interval = tuple[Floats, Floats]


def inductance_asked(
    tank: VaryingTank, x: Floats, travel: tuple[float, float], error_limit: float | None
) -> Interval:
    """Return between which inductances, over nominal, a band comes right in each build, (n,) each. [-]"""
    fixed = tank.fixed_capacitance(x)
    on_target = float(tank.wanted(tank.inductance))
    if tank.low_end is not None:
        return _inductance_that_covers(tank, tank.low_end, x, travel)
    if tank.trimmer is not None:
        span = tank.trimmer.high - tank.trimmer.low
        low, high = (tank.trimmer.low + share * span for share in travel)
        return on_target / (fixed + high), on_target / (fixed + low)
    if error_limit is None:
        return np.zeros(len(fixed)), np.full(len(fixed), np.inf)
    exact = on_target / fixed
    return exact / (1.0 + error_limit) ** 2, exact / (1.0 - error_limit) ** 2


def _inductance_that_covers(
    upper: VaryingTank, lower: VaryingTank, x: Floats, travel: tuple[float, float]
) -> Interval:
    """Return between which inductances, over nominal, a swept band reaches both ends with one trimmer setting."""
    least, most = upper.fixed_capacitance(x), lower.fixed_capacitance(x)
    up, down = float(upper.wanted(upper.inductance)), float(lower.wanted(lower.inductance))
    low, high = 0.0, 0.0
    if upper.trimmer is not None:
        span = upper.trimmer.high - upper.trimmer.low
        low, high = (upper.trimmer.low + share * span for share in travel)
    # one setting t has to be at least down/y - most and at most up/y - least, y being the inductance
    with np.errstate(divide="ignore", invalid="ignore"):
        # where the element moves inductance both ends have one capacitance: any y will do, or none
        apart = np.nan_to_num((down - up) / (most - least), nan=-np.inf, posinf=np.inf, neginf=-np.inf)
        return np.maximum(down / (most + high), apart), up / (least + low)


def coil_range(x: Floats, coil: int, adjust: float, travel: tuple[float, float]) -> Interval:
    """Return between which inductances, over nominal, each build's coil can be set, (n,) each. [-]"""
    as_wound = 1.0 + x[coil]
    low, high = ((2.0 * share - 1.0) * adjust for share in travel)
    return as_wound * (1.0 + low), as_wound * (1.0 + high)


def alignment(
    variation: Variation, adjust: Mapping[int, float], error_limit: float | None, builds: Floats
) -> Alignment | None:
    """Return how far adjustment brings the units of a design right; None where nothing can be adjusted.

    Parameters
    ----------
    variation : Variation
        What varies.
    adjust : mapping of int to float
        For each adjustable coil, its place among the sources: the fraction of its inductance either way.
    error_limit : float, optional
        Bands without trimmer must be inside it; None: they are right anyhow.
    builds : (S, n) array
        Random builds. [fraction]
    """
    tanks = variation.tanks
    if not any(tank.trimmer for tank in tanks) and not any(tank.coil in adjust for tank in tanks):
        return None
    whole, full = np.ones((2, builds.shape[1]), dtype=np.bool_)
    settings: list[Setting] = []
    figures: dict[str, BandAlignment] = {}
    worst_case = True
    for coil in sorted({tank.coil for tank in tanks}):
        served = [tank for tank in tanks if tank.coil == coil]
        group = _Group(variation, served, coil, adjust.get(coil, 0.0), error_limit)
        ok = group.aligned(builds)
        whole &= ok
        full &= group.aligned(builds, FULL_TRAVEL)
        worst_case = worst_case and group.always_aligned()
        # settings are told of the units that can be aligned; if none can, of all of them
        chosen = builds[:, ok] if ok.any() else builds
        setting = group.coil_setting(chosen)
        settings += [] if setting is None else [setting]
        figures.update(group.band_figures(builds, chosen))
    return Alignment(
        bands=tuple(figures[tank.name] for tank in tanks),
        coils=tuple(settings),
        share=float(whole.mean()),
        share_full=float(full.mean()),
        worst_case=worst_case,
    )


@dataclass(frozen=True)
class _Group:
    """The bands of one coil."""

    variation: Variation
    tanks: Sequence[VaryingTank]
    coil: int
    adjust: float
    error_limit: float | None

    def asked(self, x: Floats, travel: tuple[float, float]) -> Interval:
        """Return the inductances, over nominal, at which every band comes right; may be empty."""
        each = [inductance_asked(tank, x, travel, self.error_limit) for tank in self.tanks]
        low, high = zip(*each, strict=True)
        return np.maximum.reduce(low), np.minimum.reduce(high)

    def aligned(
        self, x: Floats, travel: tuple[float, float] = INNER_TRAVEL
    ) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
        """Return in which builds every band comes right inside a part of each travel, 20 to 80 %, (n,)."""
        low, high = self.asked(x, travel)
        least, most = coil_range(x, self.coil, self.adjust, travel)
        ok: np.ndarray[tuple[int], np.dtype[np.bool_]] = np.maximum(low, least) <= np.minimum(high, most)
        return ok

    def always_aligned(self) -> bool:
        """Return whether every unit within tolerance comes right over the full travel.

        Each interval's ends rise or fall with every part, so that their extremes are at the corners; where
        every two intervals meet, all have a point in common. Two bands that share a stray are taken as if
        they did not: the answer may be a careful no.
        """
        corners = self.variation.corners  # all parts low, all parts high
        each = [inductance_asked(tank, corners, FULL_TRAVEL, self.error_limit) for tank in self.tanks]
        least, most = coil_range(corners, self.coil, self.adjust, FULL_TRAVEL)
        for place, (low, high) in enumerate(each):
            others = [other[1] for other in (*each[:place], *each[place + 1 :])]
            if max(low) > most[0] or min(high) < least[1] or any(max(low) > min(other) for other in others):
                return False
        return True

    def set_inductance(self, x: Floats) -> Floats:
        """Return where the coil is left, over nominal: on the lowest band, moved as far as the others ask, (n,)."""
        least, most = coil_range(x, self.coil, self.adjust, FULL_TRAVEL)
        if not self.adjust:
            return least
        plain = [tank for tank in self.tanks if tank.trimmer is None and tank.low_end is None]
        if plain:
            wanted = np.mean([tank.wanted(tank.inductance) / tank.fixed_capacitance(x) for tank in plain], axis=0)
        else:  # a swept band is set at its lower end
            lowest = min((tank.low_end or tank for tank in self.tanks), key=lambda tank: tank.frequency)
            middle = lowest.trimmer.middle if lowest.trimmer else 0.0
            wanted = lowest.wanted(lowest.inductance) / (lowest.fixed_capacitance(x) + middle)
        inner = coil_range(x, self.coil, self.adjust, INNER_TRAVEL)
        low, high = self.asked(x, INNER_TRAVEL)
        low, high = np.maximum(low, inner[0]), np.minimum(high, inner[1])
        moved = np.clip(wanted, low, np.maximum(low, high))
        return np.clip(np.where(low <= high, moved, wanted), least, most)

    def coil_setting(self, x: Floats) -> Setting | None:
        """Return the setting of an adjustable coil, None of a fixed one."""
        if not self.adjust:
            return None
        nothing = np.zeros((len(x), 1))
        factor = self.set_inductance(nothing)
        low, high = _middle_range(self._travelled(self.set_inductance(x), x))
        return Setting(
            reference=self.variation.sources[self.coil].reference,
            nominal=float(self._travelled(factor, nothing)[0]),
            low=low,
            high=high,
            value=float(factor[0]),
        )

    def _travelled(self, factor: Floats, x: Floats) -> Floats:
        moved: Floats = (factor / (1.0 + x[self.coil]) - 1.0) / self.adjust
        return 0.5 + 0.5 * moved

    def band_figures(self, builds: Floats, chosen: Floats) -> dict[str, BandAlignment]:
        """Return the figures of each band by name: shares in all builds, settings in the chosen ones."""
        nothing = np.zeros((len(builds), 1))
        left, here = self.set_inductance(chosen), self.set_inductance(nothing)
        found = {}
        for tank in self.tanks:
            alone = _Group(self.variation, [tank], self.coil, self.adjust, self.error_limit)
            setting, trimmer = None, 0.0
            if tank.trimmer is not None:
                setting = _trimmer_setting(tank, left, here, chosen, nothing)
                trimmer = min(max(setting.value, tank.trimmer.low), tank.trimmer.high)
            frequency = tank.frequency
            swept = tank.low_end is not None
            adjustable = tank.trimmer is not None or self.adjust or self.error_limit is not None or swept
            found[tank.name] = BandAlignment(
                share=float(alone.aligned(builds).mean()) if adjustable else None,
                trimmer=setting,
                hertz_per_farad=-frequency / (2.0 * (tank.nominal_fixed() + trimmer)),
                hertz_per_percent=-0.005 * frequency,
            )
        return found


def _trimmer_setting(tank: VaryingTank, left: Floats, here: Floats, x: Floats, nothing: Floats) -> Setting:
    """Return where a trimmer ends up with the coil at `left` (n,) in the builds and at `here` nominally."""
    assert tank.trimmer is not None
    span, low_end = tank.trimmer.high - tank.trimmer.low, tank.trimmer.low
    value = float(_trimmer_left(tank, here, nothing)[0])
    set_to = _trimmer_left(tank, left, x)
    low, high = _middle_range((set_to - low_end) / span)
    return Setting(
        reference=f"trimmer of {tank.name}",
        nominal=(value - low_end) / span,
        low=low,
        high=high,
        value=value,
    )


def _trimmer_left(tank: VaryingTank, inductance: Floats, x: Floats) -> Floats:
    """Return where a trimmer is left: on frequency, of a swept band with as much to spare at both ends. [F]"""
    exact: Floats = tank.wanted(tank.inductance * inductance) - tank.fixed_capacitance(x)
    if tank.low_end is None:
        return exact
    low = tank.low_end
    assert tank.trimmer is not None
    least = low.wanted(low.inductance * inductance) - low.fixed_capacitance(x)
    ends = np.clip(np.stack([least, exact]), tank.trimmer.low, tank.trimmer.high)
    return ends.mean(axis=0)


def _middle_range(settings: Floats) -> tuple[float, float]:
    low, high = quantiles(settings, (0.05, 0.95))
    return float(low), float(high)


def adjustable_coils(variation: Variation, adjust_of: Mapping[str, float | None]) -> dict[int, float]:
    """Return the adjustable coils by their places among the sources, from their references."""
    return {
        place: adjust
        for place, source in enumerate(variation.sources)
        if source.kind == COIL and (adjust := adjust_of.get(source.reference))
    }
