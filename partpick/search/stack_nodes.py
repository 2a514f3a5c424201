"""Building the graph of stacks: what each band may add, and which circuits are one node."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.progress import Monitor
from partpick.search.bounds import IMPOSSIBLE
from partpick.search.choose import Stopped
from partpick.search.circuits import Circuits, Windows, distinct, distinct_rows, species_of_parts
from partpick.search.grades import Grades
from partpick.search.networks import PARALLEL, Rows
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem
from partpick.search.stack_graph import ROWS, Layer, StackGraph
from partpick.search.sum_tables import SumTables, TooManyError

Shorts = NDArray[np.int16]

GRAIN = 1e-21  # F; finer differences of values are none
MOST_KINDS = 4
MOST_EDGES = 60_000  # of one layer of one graph
WORK_LIMIT = 300_000_000  # places for capacitors in the graphs of one request


class StackNodes:
    """Makes graphs of stacks, exact under every limit of a band; under the shared ones where asked for."""

    def __init__(self, problem: Problem, circuits: Circuits, monitor: Monitor) -> None:
        self.problem = problem
        self.circuits = circuits
        self.monitor = monitor
        self.order = np.argsort(-problem.frequency, kind="stable")
        self.grades = Grades(problem)
        limits = circuits.windows(np.full(problem.coils, np.inf))
        self.sums = SumTables(self._lasting_species(), limits[1][1], 2 * MOST_EDGES)
        self.scarce = self._scarce()
        self._kind, self._amount = self._kinds(shared=False)
        self._kind_shared, self._amount_shared = self._kinds(shared=True)
        self.allow(WORK_LIMIT)
        self._cheapest = int(problem.part_price.min(initial=NEVER)) if len(problem.part_price) else 0
        # the intervals alone say everything else about a band
        self._exact = bool((problem.q_limit > 0).any()) or np.isfinite(problem.drift_limit)

    def allow(self, work: int) -> None:
        """Set how much may be made from now on, in places for capacitors, before the search stops itself."""
        self._work_left = work

    def _lasting_species(self) -> Floats:
        """Return the species of use at a band and all lower ones: what is added stays in circuit. [F]"""
        lasting = self.problem.species.copy()
        usable = np.isfinite(lasting)[self.order]
        usable = np.logical_and.accumulate(usable[::-1], axis=0)[::-1]
        lasting[self.order] = np.where(usable, lasting[self.order], np.inf)
        return lasting

    def _scarce(self) -> bool:
        """Whether stock or another shared limit may rule out a stack."""
        p = self.problem
        most = p.bands * p.most_parts
        return bool((p.part_stock < most).any()) or p.values_limit < most or p.price_limit < NEVER

    def least_rest(self, limits: Windows) -> Ints:
        """Return the fewest capacitors that each layer and those after it add, (m, B).

        From the interval of each band and that of the band before; `IMPOSSIBLE` and more where none will do.
        """
        p = self.problem
        coils = len(limits[0][0])
        fewest = np.full((coils, p.bands), IMPOSSIBLE, dtype=np.int64)
        before_low, before_high = np.zeros(coils), np.zeros(coils)
        for place, band in enumerate(self.order):
            low, high = (side[:, band] for side in limits[1])
            left = np.flatnonzero(low <= high)
            for added in range(1, p.most_parts + 1):
                low_end, high_end = low[left] - before_high[left], high[left] - before_low[left]
                some = self.sums.any_inside(int(band), added, low_end, high_end)
                fewest[left[some], place] = added
                left = left[~some]
            none_low, none_high = (side[:, band] for side in limits[0])
            if place == 0:
                without = (none_low <= 0) & (none_high >= 0)
                fewest[without, 0] = 0
                low = np.where(without, np.minimum(low, 0.0), low)
                high = np.where(without, np.maximum(high, 0.0), high)
            if place + 1 < p.bands:
                before_low, before_high = self._at_next(low, high, int(band), int(self.order[place + 1]))
        return fewest[:, ::-1].cumsum(axis=1)[:, ::-1]

    def _at_next(self, low: Floats, high: Floats, band: int, following: int) -> tuple[Floats, Floats]:
        """Return the interval of a band as its parts act at the next one. [F]"""
        here, there = self.problem.species[band], self.problem.species[following]
        both = np.isfinite(here) & np.isfinite(there)
        ratio = there[both] / here[both]
        least, most = float(ratio.min(initial=1.0)), float(ratio.max(initial=1.0))
        return np.maximum(low, 0.0) * least * (1 - 1e-12), np.maximum(high, 0.0) * most * (1 + 1e-12)

    def _kinds(self, *, shared: bool) -> tuple[Ints | None, Ints]:
        """Return the kind of each part and its amount; circuits of equal amounts are one node.

        None where there are too many kinds: then only circuits of the same parts are one node.
        """
        p = self.problem
        of_part = species_of_parts(p)
        nominal = np.array([float(value) for value in p.part_value])
        drift = np.isfinite(p.drift_limit)
        seen: dict[tuple[object, ...], int] = {}
        kind = np.zeros(len(nominal), dtype=np.int64)
        for part in range(len(nominal)):
            acts = p.species[:, of_part[part]] / nominal[part] if of_part[part] >= 0 else np.zeros(1)
            signature: tuple[object, ...] = (
                tuple(np.rint(np.where(np.isfinite(acts), acts, 0.0) * 1e14)),
                tuple(np.nan_to_num(p.part_loss[:, part], nan=-1.0)),
                (float(np.nan_to_num(p.part_tempco[part], nan=9.0)), float(p.part_tempco_spread[part])) if drift else 0,
            )
            if shared and p.values_limit < NEVER:
                signature += (p.part_value[part],)
            if shared and p.part_stock[part] < p.bands * p.most_parts:
                signature += (part,)
            kind[part] = seen.setdefault(signature, len(seen))
        amount = np.rint(nominal / GRAIN).astype(np.int64)
        exact = np.abs(amount * GRAIN - nominal) <= 1e-12 * nominal
        return (kind if len(seen) <= MOST_KINDS and exact.all() else None), amount

    def graphs(
        self,
        coils: Ints,
        windows: Windows,
        budget: Ints,
        price: Ints,
        *,
        shared: bool = False,
        count_pieces: bool = False,
    ) -> Iterator[StackGraph]:
        """Yield graphs that together hold every stack of some coils; several where one would be too large.

        The windows may be tightened in place between two graphs.

        Parameters
        ----------
        coils : (m,) array
            Which coils. [-]
        windows : tuple
            Intervals of these coils as from `Circuits.windows`, (m, B). [F]
        budget, price : (J,) arrays
            Capacitors and hundredths (coil included) beyond which paths may be left out. [-]
        shared : bool
            Keep to stock, `values` and `price` too.
        count_pieces : bool
            Circuits of different numbers of capacitors are different nodes, none of which exceeds `budget`.

        Raises
        ------
        Stopped
            The monitor or the work limit ended it.
        """
        rest = self.least_rest(windows)
        rules = _Rules(coils, windows, rest, budget, price, shared, count_pieces)
        near = np.flatnonzero(rest[:, 0] <= budget[coils])
        nothing = np.zeros(len(near), dtype=np.int64)
        start = _Nodes(near, np.empty((len(near), 0), dtype=np.int16), nothing, nothing)
        yield from self._below([], start, rules)

    def _below(self, layers: list[Layer], at: _Nodes, rules: _Rules) -> Iterator[StackGraph]:
        """Yield the graphs that go on from some nodes of the last layer."""
        if len(layers) == self.problem.bands:
            yield StackGraph(rules.coils, [layer.copy() for layer in layers])
            return
        reason = self.monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        try:
            made = self._layer(len(layers), at, rules)
        except TooManyError:
            if len(at.coil) == 1:
                raise Stopped("work limit") from None
            middle = len(at.coil) // 2
            for part in (slice(0, middle), slice(middle, None)):
                above = [*layers[:-1], layers[-1].only(part)] if layers else layers
                yield from self._below(above, at.take(part), rules)
            return
        if made is not None:
            layer, nodes = made
            yield from self._below([*layers, layer], nodes, rules)

    def _layer(self, place: int, before: _Nodes, rules: _Rules) -> tuple[Layer, _Nodes] | None:
        problem, coils, band = self.problem, rules.coils, int(self.order[place])
        tail, added = self._edges(place, before, rules)
        if not len(tail):
            return None
        self._work_left -= len(tail) * (before.parts.shape[1] + problem.most_parts)
        if self._work_left < 0:
            raise Stopped("work limit")
        coil = before.coil[tail]
        parts = np.sort(np.concatenate([before.parts[tail], added], axis=1), axis=1)[:, ::-1]
        size = (added >= 0).sum(axis=1)
        cost = self.circuits.price(added)
        pieces, spent = before.pieces[tail] + size, np.minimum(before.price[tail] + cost, NEVER)
        first, head = self._merged(coil, parts, spent, rules)
        width = int((parts >= 0).sum(axis=1).max(initial=0))
        parts = np.ascontiguousarray(parts[first][:, :width])
        keep = np.ones(len(first), dtype=np.bool_)
        if self._exact:
            keep = self._admissible(coils[coil[first]], band, parts)
        least_pieces, least_price = (np.full(len(first), NEVER, dtype=np.int64) for _ in range(2))
        np.minimum.at(least_pieces, head, pieces)
        np.minimum.at(least_price, head, spent)
        if rules.shared:
            keep &= self._inside_shared_limits(coils[coil[first]], parts, least_price)
        limit = rules.price[coils[coil[first]]]
        later = rules.rest[coil[first], place + 1] if place + 1 < problem.bands else np.zeros_like(first)
        least_total = least_price + problem.coil_price[coils[coil[first]]] + later * self._cheapest
        keep &= (limit >= NEVER) | (least_total <= limit)
        new = np.cumsum(keep) - 1
        edge = np.flatnonzero(keep[head])
        kept = np.flatnonzero(keep)
        if not len(edge):
            return None
        layer = Layer(
            band=band,
            coil=coil[first][kept],
            parts=parts[kept],
            tail=tail[edge].astype(np.int32),
            head=new[head[edge]].astype(np.int32),
            added=added[edge],
        )
        return layer, _Nodes(coil[first][kept], parts[kept], least_pieces[kept], least_price[kept])

    def _admissible(self, coil: Ints, band: int, parts: Shorts) -> Bools:
        """Whether circuits are inside the limits on Q and drift at a band, (m,)."""
        keep = [np.zeros(0, dtype=np.bool_)]
        for start in range(0, len(coil), ROWS):
            some = slice(start, start + ROWS)
            _, inside = self.circuits.columns(coil[some], np.full(len(coil[some]), band), parts[some])
            keep.append(inside)
        return np.concatenate(keep)

    def _edges(self, place: int, before: _Nodes, rules: _Rules) -> tuple[Ints, Shorts]:
        """Return the node before and the parts added of every edge of a layer, (e,) and (e, most parts)."""
        problem, band = self.problem, int(self.order[place])
        spare = rules.budget[rules.coils[before.coil]] - before.pieces
        if place + 1 < problem.bands:
            spare = spare - rules.rest[before.coil, place + 1]
        sums = self.circuits.sums(band, before.parts)
        tails, parts = [], []
        if place == 0:
            low, high = (side[before.coil, band] for side in rules.windows[0])
            bare = np.flatnonzero((low <= 0) & (high >= 0) & (spare >= 0))
            tails.append(bare)
            parts.append(np.empty((len(bare), 0), dtype=np.int64))
        for added in range(1, problem.most_parts + 1):
            some = np.flatnonzero(spare >= added)
            if not len(some):
                break
            low, high = (side[before.coil[some], band] - sums[some] for side in rules.windows[1])
            open_ = (high >= self.sums.smallest(band) * added * (1 - 1e-12)) & (low <= high)
            some, low, high = some[open_], low[open_], high[open_]
            species, which = self.sums.inside(band, added, low, high)
            shape = np.full(len(which), PARALLEL, np.int8)
            origin, chosen = self.grades.expand(Rows(np.zeros(len(which)), species.astype(np.int16), shape))
            tails.append(some[which[origin]])
            parts.append(chosen)
            if sum(len(t) for t in tails) > MOST_EDGES:
                raise TooManyError
        filled = []
        for chosen in parts:
            block = np.full((len(chosen), max(1, problem.most_parts)), -1, dtype=np.int16)
            block[:, : chosen.shape[1]] = chosen
            filled.append(block)
        if not tails:
            return np.empty(0, dtype=np.int64), np.empty((0, 1), dtype=np.int16)
        return np.concatenate(tails), np.concatenate(filled)

    def _merged(self, coil: Ints, parts: Shorts, spent: Ints, rules: _Rules) -> tuple[Ints, Ints]:
        """Return one row of each node, and the node of every row."""
        kind, amount = (self._kind_shared, self._amount_shared) if rules.shared else (self._kind, self._amount)
        if kind is None:
            return distinct(coil, parts, len(amount))
        keys = [coil]
        kind, amount = np.append(kind, -1), np.append(amount, 0)
        for one in range(int(kind.max(initial=0)) + 1):
            keys.append(np.where(kind[parts] == one, amount[parts], 0).sum(axis=1))
        if rules.shared and self.problem.price_limit < NEVER:
            keys.append(spent)
        if rules.count_pieces:
            keys.append((parts >= 0).sum(axis=1))
        return distinct_rows(keys)

    def _inside_shared_limits(self, coil: Ints, parts: Shorts, spent: Ints) -> Bools:
        p = self.problem
        keep = np.ones(len(parts), dtype=np.bool_)
        for part in np.unique(parts[parts >= 0]):
            if p.part_stock[part] < parts.shape[1]:
                keep &= (parts == part).sum(axis=1) <= p.part_stock[part]
        if p.values_limit < parts.shape[1]:
            written = sorted(set(p.part_value))
            place = np.array([written.index(value) for value in p.part_value] + [-1], dtype=np.int64)
            values = np.sort(place[parts], axis=1)
            different = (np.diff(values, axis=1, prepend=-2) != 0) & (values >= 0)
            keep &= different.sum(axis=1) <= p.values_limit
        if p.price_limit < NEVER:
            keep &= np.minimum(spent + p.coil_price[coil], NEVER) <= p.price_limit
        return keep


@dataclass(frozen=True, eq=False)
class _Nodes:
    """What the next layer starts from, (n,) each."""

    coil: Ints
    parts: Shorts  # (n, w)
    pieces: Ints  # fewest that lead there
    price: Ints  # least that leads there

    def take(self, chosen: slice) -> _Nodes:
        return _Nodes(self.coil[chosen], self.parts[chosen], self.pieces[chosen], self.price[chosen])


@dataclass(frozen=True, eq=False)
class _Rules:
    """What holds for one call of `StackNodes.graphs`; see there."""

    coils: Ints
    windows: Windows
    rest: Ints
    budget: Ints
    price: Ints
    shared: bool
    count_pieces: bool
