"""How far a swept band is tuned beyond what is asked for, and the network with which that is least.

Capacitors with inductance in series act less at the low end. Where the networks are tabled, each has both of its
figures there, and those next to the best place are looked at one by one until none further away can be better.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from partpick.search.networks import Stream, Table
from partpick.search.problem import Bools, Floats, Ints

GRAIN = 2e-12  # rounding of the limits themselves
_STEPS = 40  # of Newton's method; four to six are usual
_LOOKS = 64  # networks looked at to each side; beyond, a bound is taken


class TwinTable:
    """Networks of a table with their capacitance at both ends of a band."""

    def __init__(self, table: Table, low_end: Floats) -> None:
        self.value = table.value  # F, (m,) at the high end, rising
        self.low = table.acting_as(low_end)  # F, (m,) at the low end
        self.least_from = np.minimum.accumulate(self.low[::-1])[::-1]  # of this one and all above it
        self.most_to = np.maximum.accumulate(self.low)  # of this one and all below it


@dataclass(frozen=True, eq=False)
class Overshoot:
    """Pairs of coil and band still in play, flat, (r,) each, and how far each tunes beyond its band."""

    coil: Ints
    band: Ints
    fixed: Floats  # F, strays, self-capacitance and trimmer at the high end
    fixed_low: Floats  # F, at the low end
    need: Floats  # F, least in circuit at the low end
    most: Floats  # F, most in circuit at the high end
    strays: Floats  # F, least in circuit at the high end for the share limit, with a capacitor
    low: Floats  # Hz, as asked for
    high: Floats
    margin: float
    leads: Floats  # 1/F, (2 pi f)^2 times the leads' inductance, at the high end
    leads_low: Floats
    slack: Floats  # by how much the excess may be below what the figures of the high end say

    def take(self, chosen: Ints | Bools) -> Overshoot:
        """Return some of the rows."""
        names = [name for name in self.__dataclass_fields__ if name != "margin"]
        return Overshoot(margin=self.margin, **{name: getattr(self, name)[chosen] for name in names})

    def excess(self, low_total: Floats, high_total: Floats) -> Floats:
        """Return the excess for what is in circuit at the ends, never above the true one. [-]"""
        return np.asarray(np.maximum(self.at_low_end(low_total), self.at_high_end(high_total)) - self.slack)

    def at_low_end(self, total: Floats) -> Floats:
        """Return the excess that the low end has for what is in circuit there. [-]"""
        beyond = self.low * (1.0 - (1.0 - self.margin) * np.sqrt(self.need / total))
        return np.asarray(beyond / (self.high - self.low))

    def at_high_end(self, total: Floats) -> Floats:
        """Return the excess that the high end has for what is in circuit there. [-]"""
        beyond = self.high * ((1.0 + self.margin) * np.sqrt(self.most / total) - 1.0)
        return np.asarray(beyond / (self.high - self.low))

    @property
    def fixed_swing(self) -> Floats:
        """By how much more the low end has in circuit without element and network. [F]"""
        return self.fixed_low - self.fixed

    def totals_inside(self, excess: Floats) -> tuple[Floats, Floats]:
        """Return most in circuit at the low end and least at the high end within an excess. [F]"""
        span = (excess + self.slack) * (self.high - self.low)
        lowest, highest = self.low - span, self.high + span
        reached = lowest > 0
        most = (self.low * (1.0 - self.margin) / np.where(reached, lowest, 1.0)) ** 2
        least = (self.high * (1.0 + self.margin) / highest) ** 2
        return np.where(reached, self.need * most, np.inf), np.asarray(self.most * least)

    def crossing(self, swing: Floats) -> Floats:
        """Return what is in circuit at the high end with least excess for a swing, any x allowed. [F]"""
        ends = self.low + self.high
        at_low = self.low * (1.0 - self.margin) * np.sqrt(self.need / self.most)
        at_high = self.high * (1.0 + self.margin)
        wide = swing / self.most
        total = np.ones_like(wide)  # in units of the most at the high end
        rows = np.flatnonzero(at_low / np.sqrt(np.maximum(1.0 + wide, 1e-9)) + at_high < ends)
        if len(rows):
            total[rows] = _falling_root(at_low[rows], at_high[rows], wide[rows], ends[rows])
        return np.asarray(np.clip(total * self.most, np.minimum(self.need - swing, self.most), self.most))


def _falling_root(one: Floats, two: Floats, wide: Floats, ends: Floats) -> Floats:
    """Return u with one/sqrt(u + wide) + two/sqrt(u) = ends: convex and falling, Newton from below."""
    u = np.maximum((two / ends) ** 2, (one / ends) ** 2 - wide)  # the other term dropped: below the root
    for _ in range(_STEPS):
        first, second = 1.0 / np.sqrt(u + wide), 1.0 / np.sqrt(u)
        value = one * first + two * second - ends
        step = 2.0 * value / (one * first**3 + two * second**3)
        u = u + step
        if np.abs(step).max() < 1e-13:
            break
    return u


def least_excess(rows: Overshoot, low_total: Floats, high_total: Floats, twin: TwinTable) -> Floats:
    """Return the least excess with a network of a table beside what is given, (r,); inf where none covers.

    Exact, but where `_LOOKS` networks to a side are not enough: a bound then. [-]
    """
    best = np.full(len(low_total), np.inf)
    if not len(twin.value):
        return best
    wanted = before_leads(rows.crossing(low_total - high_total) - high_total, rows.leads)
    start = np.searchsorted(twin.value, wanted)
    _look(rows, low_total, high_total, twin, start, 1, best)
    _look(rows, low_total, high_total, twin, start - 1, -1, best)
    return best


def _look(
    rows: Overshoot, low_total: Floats, high_total: Floats, twin: TwinTable, start: Ints, step: int, best: Floats
) -> None:
    """Lower `best` by the networks from `start` on, upwards or downwards, while one might be better."""
    place = start.copy()
    going = np.arange(len(start))
    for looks in range(_LOOKS + 1):
        going = going[(place[going] >= 0) & (place[going] < len(twin.value))]
        at, every = place[going], len(going) == len(start)
        some = rows if every else rows.take(going)
        low, high = (low_total, high_total) if every else (low_total[going], high_total[going])
        whole = high + acting(twin.value[at], some.leads)
        if step > 0:  # the overshoot at the low end grows from here on, up to the last that covers at the high end
            reach = some.at_low_end(low + acting(twin.least_from[at], some.leads_low))
            left = whole <= some.most + GRAIN * some.need
        else:
            reach = some.at_high_end(whole)
            left = low + acting(twin.most_to[at], some.leads_low) >= some.need * (1 - GRAIN)
            left &= whole >= some.strays - GRAIN * some.need
        left &= reach < best[going]
        if not left.any():
            return
        if looks == _LOOKS:
            best[going[left]] = reach[left]
            return
        low_end = low + acting(twin.low[at], some.leads_low)
        covers = (low_end >= some.need * (1 - GRAIN)) & (whole <= some.most + GRAIN * some.need)
        covers &= left & (whole >= some.strays - GRAIN * some.need)
        found = np.maximum(some.at_low_end(low_end), some.at_high_end(whole))
        best[going] = np.where(covers, np.minimum(best[going], found), best[going])
        going = going[left]
        place[going] += step


def bounded_excess(rows: Overshoot, low_total: Floats, high_total: Floats, table: Stream) -> Floats:
    """Return a bound of the same where the networks are in no table, each taken as at the high end. [-]"""
    grain = GRAIN * rows.need
    lower = np.maximum(rows.need - low_total, rows.strays - high_total) - grain
    upper = rows.most - high_total + grain
    wanted = rows.crossing(low_total - high_total) - high_total
    lower, upper, wanted = (before_leads(side, rows.leads) for side in (lower, upper, wanted))
    found = np.full(len(wanted), np.inf)
    for side in table.neighbours(np.clip(wanted, lower, upper)):
        inside = (side >= lower) & (side <= upper)
        value = np.where(inside, side, 0.0)
        network = value / (1.0 - rows.leads * value)
        excess = rows.excess(low_total + network, high_total + network)
        found = np.where(inside, np.minimum(found, excess), found)
    return found


def before_leads(acting: Floats, leads: Floats) -> Floats:
    """Return the network that acts as `acting` behind the leads' inductance. [F]"""
    return np.asarray(acting / (1.0 + leads * np.maximum(acting, 0.0)))


def acting(network: Floats, leads: Floats) -> Floats:
    """Return how a network acts behind the leads' inductance. [F]"""
    return np.asarray(network / (1.0 - leads * network))
