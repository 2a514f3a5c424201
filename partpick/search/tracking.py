"""Receivers: signal circuit and oscillator of one band, picked together for the least worst tracking error.

For each number of capacitors every signal circuit that covers its band is met with every oscillator that
the windows of `companions.py` leave. A largest error, first small, then wider, keeps the work
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
from partpick.search.sections import CHECKS, Made, band_points, circuits_of, species_of_parts
from partpick.search.signals import Signals
from partpick.search.swept import SweptColumns

Key = tuple[int, ...]
Group = tuple[int, int]

STEP = 1e-3  # of the limit: tracking errors closer than this are equal to the order by build
FINE = 1e-9
DEEPER = ((1.0, 1 / 64), (1.1, 1 / 16), (1.0, 1.0))  # largest errors tried: shares of the hint and of the limit
FREE_MARGIN = -0.5  # an oscillator covers what tracking says, not its range with a margin
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
    hint: float = 0.0  # Hz, about the least that parts of any value reach: where to begin


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
        known = self.least
        if pair.error < self.least_error() or (known and pair.error == known.error and pair.place < known.place):
            self.least = pair
        if self.need and pair.group not in self.taken:
            row = self.rows.get(pair.group)
            if row is None or pair.place < row.place:
                self.rows[pair.group] = pair
                if len(self.rows) > 4 * self.need + 100:
                    self.rows = {pair.group: pair for pair in self.first()}

    def least_error(self) -> float:
        """Return the error below which a pair is of interest for its error alone. [Hz]"""
        return self.below if self.least is None else self.least.error

    def cut(self) -> float:
        """Return the largest error that may still matter. [Hz]"""
        least = self.least_error()
        if self.need == 0:
            return least
        first = self.first()
        if len(first) < self.need:
            return np.inf
        step = max(round(pair.error / self.unit) for pair in first)
        return max(least, (step + 0.5) * self.unit)


class _Exact(SweptColumns):
    """Columns of given circuits."""

    def exactly(self, band: int, made: Made, row: int) -> Columns:
        """Return every choice of grades for one circuit inside the limits of its band."""
        value = float(made.rows.value[row])
        sides, grain = np.full(len(self.valid[band]) + 1, value), 1e-13 * value
        place = np.array([int(made.place[row])])
        across = made.rows.species.shape[1]
        return self._block(int(made.coil[row]), band, across, place, sides - grain, sides + grain)


class BandSearch:
    """Looks for the pairs of one band."""

    def __init__(
        self, problem: Problem, source: ColumnSource, band: ReceiverBand, all_windings: bool, monitor: Monitor
    ) -> None:
        self.problem, self.band = problem, band
        self.all_windings, self.monitor = all_windings, monitor
        self.points = band_points(float(problem.low_end[band.signal]), float(problem.frequency[band.signal]))
        self.target = self.points + band.offset
        self.checks = self.target[list(CHECKS)]
        free = replace(problem, margin=FREE_MARGIN, excess_limit=float("inf"))
        common = source.tables, source.valid, source.grades, source.gain
        self.exact = {band.signal: _Exact(problem, *common), band.oscillator: _Exact(free, *common)}
        signal, oscillator = ((source.tables[b], source.valid[b], b) for b in (band.signal, band.oscillator))
        self.signals = Signals(problem, *signal)
        self.companions = Companions(problem, *oscillator, self.target)
        self._kept: dict[int, list[tuple[Made, Floats]]] = {}
        self._columns: dict[object, Columns] = {}
        supports = len(problem.support_stock)
        few = not all_windings and supports**2 <= _MOST_GROUPS
        self._supports = supports if few else 0

    # ------------------------------------------------------------ the passes

    def search(self, level: _Level, splits: list[tuple[int, int]]) -> None:
        """Fill a level from the given numbers of capacitors of signal circuit and oscillator.

        Raises
        ------
        Stopped
            The monitor said so; the level holds what was found.
        """
        band = self.band
        steps = [min(band.limit, band.hint * more + band.limit * share) for more, share in DEEPER]
        for largest in steps if level.need else [band.limit]:
            self._pass(level, splits, largest)
            if level.cut() <= largest:
                return

    def _pass(self, level: _Level, splits: list[tuple[int, int]], largest: float) -> None:
        reach = min(level.cut(), largest)
        windows = self.companions.windows(reach)
        for own, companion in splits:
            for made, section in self._signals(own):
                if min(level.cut(), largest) < 0.8 * reach:
                    reach = min(level.cut(), largest)
                    windows = self.companions.windows(reach)
                for behind in (True, False):
                    for hits in self.companions.hits(section, companion, behind, windows):
                        self._stop_where_asked()
                        self._take(level, made, section, hits, largest)

    def _stop_where_asked(self) -> None:
        reason = self.monitor.stopped()
        if reason is not None:
            raise Stopped(reason)

    def _signals(self, parts: int) -> Iterator[tuple[Made, Floats]]:
        """Yield the signal circuits of so many capacitors in blocks, each with its sections at the checks."""
        if parts in self._kept:
            yield from self._kept[parts]
            return
        kept: list[tuple[Made, Floats]] | None = []
        size = 0
        for made in self.signals.blocks(parts):
            self._stop_where_asked()
            block = made, made.circuits.section(self.points[list(CHECKS)])
            size += len(made)
            if kept is not None:
                kept.append(block)
                kept = kept if size <= _KEPT else None
            yield block
        if kept is not None:
            self._kept[parts] = kept

    # ------------------------------------------------------------ from hits to pairs

    def _take(self, level: _Level, made: Made, section: Floats, hits: Hits, largest: float) -> None:
        """Add what matters of some hits, by rising error."""
        tuned = hits.made.circuits.tuned(section[hits.curve], self.checks)
        least = np.abs(tuned - self.checks).max(axis=1, initial=0.0)
        best = self._best_of_groups(level)
        chosen = np.flatnonzero(self._matters(level, made, hits, least, largest, best))
        chosen = chosen[np.argsort(least[chosen], kind="stable")]
        for start in range(0, len(chosen), _BATCH):
            some = chosen[start : start + _BATCH]
            if least[some[0]] > min(level.cut(), largest):
                return
            self._take_batch(level, made, hits.take(some), largest)

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
        self, level: _Level, made: Made, hits: Hits, error: Floats, largest: float, best: Floats | None
    ) -> Bools:
        """Return which hits may still matter, of errors that are at least `error`."""
        own, companion = made.coil[hits.curve], hits.made.coil
        inside = (error <= min(level.cut(), largest)) & (own != companion)
        if best is None:
            return np.asarray(inside)
        group = self.problem.support[own] * self._supports + self.problem.support[companion]
        return np.asarray(inside & ((error <= best[group]) | (error <= level.least_error())))

    def _take_batch(self, level: _Level, made: Made, hits: Hits, largest: float) -> None:
        own = made.take(hits.curve)
        target = self.target[None, :]
        tuned = hits.made.circuits.tuned(own.circuits.section(self.points), target)
        error = np.abs(tuned - target).max(axis=1, initial=0.0)
        order = np.flatnonzero(self._matters(level, made, hits, error, largest, self._best_of_groups(level)))
        cut = level.cut()
        for row in order[np.argsort(error[order], kind="stable")].tolist():
            if error[row] > cut:
                return
            if self._add(level, own, hits.made, row, float(error[row])):
                cut = level.cut()

    def _add(self, level: _Level, own: Made, companion: Made, row: int, error: float) -> bool:
        """Add every choice of grades of one hit; return whether there was any."""
        group = self._group(int(own.coil[row]), int(companion.coil[row]))
        known = level.rows.get(group)
        worse = known is not None and round(error / level.unit) > round(known.error / level.unit)
        if error >= level.least_error() and (worse or group in level.taken or not level.need):
            return False
        signals = self._columns_of(self.band.signal, own, row)
        companions = self._columns_of(self.band.oscillator, companion, row) if len(signals) else signals
        added = False
        for one in range(len(signals)):
            for two in range(len(companions)):
                both = signals.take(np.array([one])), companions.take(np.array([two]))
                pair = self._pair(both, error, group)
                if pair is not None:
                    level.add(pair)
                    added = True
        return added

    def _columns_of(self, band: int, made: Made, row: int) -> Columns:
        rows = made.rows
        key = band, int(made.coil[row]), int(made.place[row]), rows.species.shape[1], float(rows.value[row])
        if key not in self._columns:
            if len(self._columns) > 50_000:
                self._columns.clear()
            self._columns[key] = self.exact[band].exactly(band, made, row)
        return self._columns[key]

    def _group(self, signal: int, oscillator: int) -> Group:
        if self.all_windings:
            return signal, oscillator
        return int(self.problem.support[signal]), int(self.problem.support[oscillator])

    def _pair(self, both: tuple[Columns, Columns], error: float, group: Group) -> Pair | None:
        """Return a pair, None where stock or a limit of the whole plan does not allow it."""
        p = self.problem
        coils = int(both[0].coil[0]), int(both[1].coil[0])
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
