"""Receivers: signal circuit and oscillator of one band, picked together for the least worst tracking error.

For each number of capacitors every signal circuit that covers its band is met with every oscillator that
the windows of `companions.py` leave. A largest error, first small, then four times as large, keeps the work
small: what a pass has found below its largest error is certain.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace

import numpy as np

from partpick.progress import Monitor
from partpick.search.choose import Choice, Stopped, column_content, inside_shared_limits, plan_effort, plan_price
from partpick.search.columns import ColumnSource
from partpick.search.companions import Companions, Hits
from partpick.search.figures import Columns
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem
from partpick.search.sections import CHECKS, band_points, circuits_of, species_of_parts
from partpick.search.swept import SweptColumns

Key = tuple[int, ...]
Group = tuple[int, int]

STEP = 1e-3  # of the limit: tracking errors closer than this are equal to the order by build
FINE = 1e-9
DEEPER = (1 / 64, 1 / 16, 1 / 4, 1.0)  # largest errors tried, of the limit
FREE_MARGIN = -0.5  # an oscillator covers what tracking says, not its range with a margin
_BLOCK = 20_000  # signal circuits at once
_KEPT = 400_000  # signal circuits of one number of parts that are kept for the next pass
_BATCH = 4_000  # hits whose whole curve is computed at once
_MOST_GROUPS = 4_000_000
ORDERS = {
    "build": ("pieces", "tracking", "q_class", "stray_class", "reactance_class", "forms", "wires", "volume",
              "commonness", "fine_tracking", "price"),
    "error": ("fine_tracking", "pieces", "q_class", "stray_class", "reactance_class", "forms", "wires", "volume",
              "commonness", "price"),
}  # fmt: skip


@dataclass(frozen=True, kw_only=True)
class ReceiverBand:
    """One band of a receiver: its two circuits among the bands of the problem."""

    signal: int
    oscillator: int
    offset: float  # Hz, oscillator above the signal; negative: below
    limit: float  # Hz, largest tracking error


@dataclass(frozen=True)
class Pair:
    """Signal circuit and oscillator of one band; pairs are ordered by key, then content."""

    key: Key
    content: tuple[object, ...]
    error: float  # Hz, worst tracking error
    group: Group
    columns: tuple[Columns, Columns]  # one row each

    @property
    def coils(self) -> tuple[int, int]:
        """Coil of the signal circuit and coil of the oscillator."""
        signal, oscillator = self.columns
        return int(signal.coil[0]), int(oscillator.coil[0])

    @property
    def parts(self) -> int:
        """How many capacitors it has. [-]"""
        return int(sum(columns.pieces[0] for columns in self.columns))

    @property
    def place(self) -> tuple[Key, tuple[object, ...]]:
        """What orders it."""
        return self.key, self.content


@dataclass
class _Level:
    """What is wanted of some numbers of capacitors, and what has been found."""

    need: int  # rows still wanted
    taken: set[Group]  # groups that rank before all of this level
    below: float  # Hz; the least error is of interest below this, 0: not at all
    unit: float  # Hz, of a step of the order
    rows: dict[Group, Pair] = field(default_factory=dict)
    least: Pair | None = None

    def first(self) -> list[Pair]:
        """Return the rows wanted, best first."""
        return sorted(self.rows.values(), key=lambda pair: pair.place)[: self.need]

    def add(self, pair: Pair) -> None:
        """Keep a pair where it improves a row or has the least error so far."""
        least = self.below if self.least is None else self.least.error
        if pair.error < least or (self.least and pair.error == least and pair.place < self.least.place):
            self.least = pair
        if self.need and pair.group not in self.taken:
            known = self.rows.get(pair.group)
            if known is None or pair.place < known.place:
                self.rows[pair.group] = pair
                if len(self.rows) > 4 * self.need + 100:
                    self.rows = {pair.group: pair for pair in self.first()}

    def cut(self) -> float:
        """Return the largest error that may still matter. [Hz]"""
        least = self.below if self.least is None else self.least.error
        if self.need == 0:
            return least
        first = self.first()
        if len(first) < self.need:
            return np.inf
        step = max(round(pair.error / self.unit) for pair in first)
        return max(least, (step + 0.5) * self.unit)


class _Oscillators(SweptColumns):
    """Columns of given oscillators."""

    def exactly(self, coil: int, band: int, across: int, place: int, value: float) -> Columns:
        """Return every choice of grades for networks of one value behind one padder, inside the limits."""
        sides = np.full(len(self.valid[band]) + 1, value)
        grain = 1e-13 * value
        return self._block(coil, band, across, np.array([place]), sides - grain, sides + grain)


class BandSearch:
    """Looks for the pairs of one band."""

    def __init__(
        self, problem: Problem, source: ColumnSource, band: ReceiverBand, all_windings: bool, monitor: Monitor
    ) -> None:
        self.problem, self.source, self.band = problem, source, band
        self.all_windings, self.monitor = all_windings, monitor
        self.points = band_points(float(problem.low_end[band.signal]), float(problem.frequency[band.signal]))
        self.target = self.points + band.offset
        free = replace(problem, margin=FREE_MARGIN, excess_limit=float("inf"))
        self.oscillators = _Oscillators(free, source.tables, source.valid, source.grades)
        tables, valid = source.tables[band.oscillator], source.valid[band.oscillator]
        self.companions = Companions(problem, tables, valid, band.oscillator, self.target)
        self.species = species_of_parts(problem)
        self.signal_coils = np.flatnonzero(self._may_cover())
        self._kept: dict[int, list[tuple[Columns, Floats]]] = {}
        self._columns: dict[tuple[int, int, int, float], Columns] = {}
        supports = len(problem.support_stock)
        few = not all_windings and supports**2 <= _MOST_GROUPS
        self._supports = supports if few else 0

    def _may_cover(self) -> Bools:
        """Return which coils leave enough swing for the signal, (J,)."""
        p, band = self.problem, self.band.signal
        need, most = p.least_at_low_end[:, band], p.most_at_high_end[:, band]
        swing = p.tuning_high[band] - p.tuning_low[band]
        fixed = p.fixed_capacitance()[:, band]
        return np.asarray(p.in_play[:, band] & (need - most <= swing * (1 + 1e-9)) & (fixed <= most * (1 + 1e-9)))

    # ------------------------------------------------------------ the passes

    def search(self, level: _Level, splits: list[tuple[int, int]]) -> None:
        """Fill a level from the given numbers of capacitors of signal circuit and oscillator.

        Raises
        ------
        Stopped
            The monitor said so; the level holds what was found.
        """
        for share in DEEPER:
            largest = self.band.limit * share
            self._pass(level, splits, largest)
            if level.cut() <= largest:
                return

    def _pass(self, level: _Level, splits: list[tuple[int, int]], largest: float) -> None:
        windows, reach = self.companions.windows(largest), largest
        for own, companion in splits:
            for columns, section in self._signals(own):
                if min(level.cut(), largest) < 0.8 * reach:
                    reach = min(level.cut(), largest)
                    windows = self.companions.windows(reach)
                for behind in (True, False):
                    for hits in self.companions.hits(section, companion, behind, windows):
                        self._stop_where_asked()
                        self._take(level, columns, section, hits, largest)

    def _stop_where_asked(self) -> None:
        reason = self.monitor.stopped()
        if reason is not None:
            raise Stopped(reason)

    def _signals(self, parts: int) -> Iterator[tuple[Columns, Floats]]:
        """Yield the signal circuits of so many capacitors in blocks, each with its sections at the checks."""
        if parts in self._kept:
            yield from self._kept[parts]
            return
        kept: list[tuple[Columns, Floats]] | None = []
        size = 0
        for columns in self._signal_blocks(parts):
            circuits = circuits_of(self.problem, self.band.signal, columns, self.species)
            block = columns, circuits.section(self.points[list(CHECKS)])
            size += len(columns)
            if kept is not None:
                kept.append(block)
                kept = kept if size <= _KEPT else None
            yield block
        if kept is not None:
            self._kept[parts] = kept

    def _signal_blocks(self, parts: int) -> Iterator[Columns]:
        waiting: list[Columns] = []
        size = 0
        for count, coil in enumerate(self.signal_coils.tolist()):
            if count % 64 == 0:
                self._stop_where_asked()
            columns = self.source.columns(coil, self.band.signal, parts)
            if len(columns):
                waiting.append(columns)
                size += len(columns)
            if size >= _BLOCK:
                yield Columns.join(waiting)
                waiting, size = [], 0
        if waiting:
            yield Columns.join(waiting)

    # ------------------------------------------------------------ from hits to pairs

    def _take(self, level: _Level, columns: Columns, section: Floats, hits: Hits, largest: float) -> None:
        """Add what matters of some hits, by rising error."""
        target = self.target[list(CHECKS)]
        least = np.abs(hits.circuits.tuned(section[hits.curve], target) - target).max(axis=1, initial=0.0)
        best = self._best_of_groups(level)
        chosen = np.flatnonzero(self._matters(level, columns, hits, least, largest, best))
        chosen = chosen[np.argsort(least[chosen], kind="stable")]
        for start in range(0, len(chosen), _BATCH):
            some = chosen[start : start + _BATCH]
            if least[some[0]] > min(level.cut(), largest):
                return
            self._take_batch(level, columns, hits.take(some), largest)

    def _best_of_groups(self, level: _Level) -> Floats | None:
        """Return the error up to which each group is of interest, flat by its two supports."""
        if not self._supports or not level.need:
            return None
        best = np.full(self._supports**2, np.inf)
        for one, two in level.taken:
            best[one * self._supports + two] = -1.0
        for (one, two), pair in level.rows.items():
            best[one * self._supports + two] = (round(pair.error / level.unit) + 0.5) * level.unit
        return best

    def _matters(
        self, level: _Level, columns: Columns, hits: Hits, error: Floats, largest: float, best: Floats | None
    ) -> Bools:
        """Return which hits may still matter, of errors that are at least `error`."""
        inside = (error <= min(level.cut(), largest)) & (columns.coil[hits.curve] != hits.coil)
        if best is None:
            return np.asarray(inside)
        support = self.problem.support
        group = support[columns.coil[hits.curve]] * self._supports + support[hits.coil]
        least = level.below if level.least is None else level.least.error
        return np.asarray(inside & ((error <= best[group]) | (error <= least)))

    def _take_batch(self, level: _Level, columns: Columns, hits: Hits, largest: float) -> None:
        own = circuits_of(self.problem, self.band.signal, columns.take(hits.curve), self.species)
        target = self.target[None, :]
        error = np.abs(hits.circuits.tuned(own.section(self.points), target) - target).max(axis=1, initial=0.0)
        matters = self._matters(level, columns, hits, error, largest, self._best_of_groups(level))
        order = np.flatnonzero(matters)
        cut = level.cut()
        for row in order[np.argsort(error[order], kind="stable")].tolist():
            if error[row] > cut:
                return
            if self._add(level, columns, hits, row, float(error[row])):
                cut = level.cut()

    def _add(self, level: _Level, columns: Columns, hits: Hits, row: int, error: float) -> bool:
        """Add every choice of grades of one hit; return whether there was any."""
        signal = columns.take(hits.curve[row : row + 1])
        group = self._group(int(signal.coil[0]), int(hits.coil[row]))
        known = level.rows.get(group)
        worse = known is not None and round(error / level.unit) > round(known.error / level.unit)
        least = level.below if level.least is None else level.least.error
        if error >= least and (worse or group in level.taken or not level.need):
            return False
        companions = self._companion_columns(hits, row)
        added = False
        for place in range(len(companions)):
            pair = self._pair(signal, companions.take(np.array([place])), error, group)
            if pair is not None:
                level.add(pair)
                added = True
        return added

    def _companion_columns(self, hits: Hits, row: int) -> Columns:
        coil, place, value = int(hits.coil[row]), int(hits.place[row]), float(hits.rows.value[row])
        across = hits.rows.species.shape[1]
        key = coil, place, across, value
        if key not in self._columns:
            if len(self._columns) > 50_000:
                self._columns.clear()
            self._columns[key] = self.oscillators.exactly(coil, self.band.oscillator, across, place, value)
        return self._columns[key]

    def _group(self, signal: int, oscillator: int) -> Group:
        if self.all_windings:
            return signal, oscillator
        return int(self.problem.support[signal]), int(self.problem.support[oscillator])

    def _pair(self, signal: Columns, oscillator: Columns, error: float, group: Group) -> Pair | None:
        """Return a pair, None where stock or a limit of the whole plan does not allow it."""
        p = self.problem
        coils = int(signal.coil[0]), int(oscillator.coil[0])
        both = signal, oscillator
        if not inside_shared_limits(p, Choice((), coils, both)) or not coils_in_stock(p, coils):
            return None
        figures = pair_figures(p, coils, both, error, self.band.limit)
        key = tuple(figures[name] for name in ORDERS[p.by])
        content = tuple(column_content(p, columns, 0) for columns in both)
        return Pair(key, content, error, group, both)


def pair_figures(
    problem: Problem, coils: tuple[int, int], both: tuple[Columns, Columns], error: float, limit: float
) -> dict[str, int]:
    """Return the figures by which pairs are ordered; over several bands each is a sum."""
    price = int(sum(int(columns.price[0]) for columns in both)) + plan_price(problem, coils)
    effort = plan_effort(problem, coils)
    return {
        "pieces": int(sum(columns.pieces[0] for columns in both)) + 2,
        "tracking": round(error / (STEP * limit)),
        "fine_tracking": round(error / (FINE * limit)),
        **{name: max(int(getattr(c, name)[0]) for c in both) for name in ("q_class", "stray_class", "reactance_class")},
        **dict(zip(("forms", "wires", "volume"), effort, strict=True)),
        "commonness": int(sum(columns.commonness[0] for columns in both)),
        "price": min(price, NEVER),
    }


def coils_in_stock(problem: Problem, coils: tuple[int, ...]) -> bool:
    """Whether there are formers, cores or bought inductors enough for these coils, each one wound or bought."""
    supports, used = np.unique(problem.support[list(coils)], return_counts=True)
    return bool((used <= problem.support_stock[supports]).all())


def splits_of(parts: int, most: int) -> list[tuple[int, int]]:
    """Return how so many capacitors may be shared between signal circuit and oscillator, at most `most` each."""
    return [(own, parts - own) for own in range(min(parts, most) + 1) if parts - own <= most]


@dataclass
class BandFound:
    """What the search of one band brought home."""

    rows: list[Pair] = field(default_factory=list)  # best first
    front: list[Pair] = field(default_factory=list)  # fewest capacitors first, each of less error than the last
    stopped_by: str | None = None
    settled: bool = False


def search_band(
    problem: Problem,
    source: ColumnSource,
    band: ReceiverBand,
    *,
    wanted: int,
    all_windings: bool,
    monitor: Monitor,
    front: bool,
) -> BandFound:
    """Return the first rows of one band, and the least error for each number of capacitors."""
    look = BandSearch(problem, source, band, all_windings, monitor)
    most = min(2 * problem.most_parts, problem.parts_limit)
    unit = band.limit * (STEP if problem.by == "build" else FINE)
    found = BandFound()
    if problem.by == "error":
        every = [split for parts in range(most + 1) for split in splits_of(parts, problem.most_parts)]
        _one_level(look, _Level(wanted, set(), 0.0, unit), every, found)
        found.settled = found.stopped_by is None
    below = band.limit * (1 + 1e-9)
    for parts in range(most + 1):
        need = 0 if problem.by == "error" else wanted - len(found.rows)
        found.settled = found.settled or need == 0
        if found.stopped_by is not None or (need == 0 and not front):
            break
        monitor.report(f"the least tracking error with {parts + 2} pieces")
        level = _Level(need, {pair.group for pair in found.rows}, below if front else 0.0, unit)
        _one_level(look, level, splits_of(parts, problem.most_parts), found)
        if level.least is not None:
            found.front.append(level.least)
            below = level.least.error - 1e-9 * band.limit
    found.settled = found.settled or found.stopped_by is None
    return found


def _one_level(look: BandSearch, level: _Level, splits: list[tuple[int, int]], found: BandFound) -> None:
    try:
        look.search(level, splits)
    except Stopped as stop:
        found.stopped_by = stop.reason
    found.rows += level.first()


def curve_of(problem: Problem, band: ReceiverBand, pair: tuple[Columns, Columns]) -> tuple[Floats, Floats]:
    """Return the points of a band and a pair's tracking error at each, (n,) each. [Hz]"""
    species: Ints = species_of_parts(problem)
    signal, oscillator = pair
    points = band_points(float(problem.low_end[band.signal]), float(problem.frequency[band.signal]))
    own = circuits_of(problem, band.signal, signal, species).section(points)
    target = (points + band.offset)[None, :]
    tuned = circuits_of(problem, band.oscillator, oscillator, species).tuned(own, target)
    return points, np.asarray(tuned - target)[0]
