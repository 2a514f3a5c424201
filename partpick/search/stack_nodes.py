"""Building the graph of stacks: what each band may add, and which circuits are one node."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, fields

import numpy as np

from partpick.progress import Monitor
from partpick.search.bounds import IMPOSSIBLE
from partpick.search.choose import Stopped
from partpick.search.circuits import Circuits, distinct, distinct_rows, species_of_parts
from partpick.search.grades import Grades
from partpick.search.mounts import Mounts, MountsOfStep, Step
from partpick.search.networks import PARALLEL, Rows
from partpick.search.places import spread
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem
from partpick.search.stack_graph import ROWS, Layer, Shorts, Spots, StackGraph
from partpick.search.sum_tables import SumTables, TooManyError

GRAIN = 1e-21  # F; finer differences of values are none
MOST_KINDS = 4
MOST_EDGES = 60_000  # of one layer of one graph
MOST_OF_ONE_NODE = 1_000_000  # a node that cannot be split
WORK_LIMIT = 300_000_000  # places for capacitors in the graphs of one request


class StackNodes:
    """Makes graphs of stacks, exact under every limit of a band; under the shared ones where asked for."""

    def __init__(self, problem: Problem, circuits: Circuits, sums: SumTables, monitor: Monitor) -> None:
        self.problem = problem
        self.circuits = circuits
        self.monitor = monitor
        self.grades = Grades(problem)
        self.sums = sums
        self.scarce_parts = problem.part_stock < problem.bands * problem.most_parts
        self.scarce = self._scarce()
        self._kind, self._amount = self._kinds()
        self._written = self._written_values()
        self.allow(WORK_LIMIT)
        self._cheapest = int(problem.part_price.min(initial=NEVER)) if len(problem.part_price) else 0
        # elsewhere the intervals alone say everything else about a band
        self._exact = problem.by_grade

    def allow(self, work: int) -> None:
        """Set how much may be made from now on, in places for capacitors, before the search stops itself."""
        self._work_left = work

    def _scarce(self) -> bool:
        """Whether stock or another shared limit may rule out a stack."""
        p = self.problem
        most = p.bands * p.most_parts
        return bool(self.scarce_parts.any()) or p.values_limit < most or p.price_limit < NEVER

    def least_rest(self, mounts: Mounts) -> Ints:
        """Return the fewest capacitors that each step and those after it add, (m, steps).

        From the intervals of each step and of the one before; `IMPOSSIBLE` and more where none will do.
        """
        p, rows = self.problem, len(mounts)
        fewest = np.full((rows, len(mounts.steps)), IMPOSSIBLE, dtype=np.int64)
        before_low, before_high = np.zeros(rows), np.zeros(rows)
        for place, step in enumerate(mounts.steps):
            made = mounts.at(place)
            if step.fresh:
                before_low, before_high = np.zeros(rows), np.zeros(rows)
            low, high, behind = made.low, made.high, made.padder >= 0
            own = np.full(len(low), IMPOSSIBLE, dtype=np.int64)
            own[behind] = 1
            left = np.flatnonzero(~behind & (low <= high))
            for added in range(1, p.most_parts + 1):
                low_end = low[left] - before_high[made.row[left]]
                high_end = high[left] - before_low[made.row[left]]
                some = self.sums.any_inside(step.band, added, low_end, high_end)
                own[left[some]] = added
                left = left[~some]
            if step.fresh:
                own[made.bare] = 0
                low = np.where(made.bare, np.minimum(low, 0.0), low)
                high = np.where(made.bare, np.maximum(high, 0.0), high)
            np.minimum.at(fewest[:, place], made.row, own)
            if not step.last:
                least, most = np.full(rows, np.inf), np.full(rows, -np.inf)
                np.minimum.at(least, made.row, low)
                np.maximum.at(most, made.row, high)
                before_low, before_high = self._at_next(least, most, step.band, mounts.steps[place + 1].band)
        return fewest[:, ::-1].cumsum(axis=1)[:, ::-1]

    def _at_next(self, low: Floats, high: Floats, band: int, following: int) -> tuple[Floats, Floats]:
        """Return the interval of a band as its parts act at the next one. [F]"""
        here, there = self.problem.species[band], self.problem.species[following]
        both = np.isfinite(here) & np.isfinite(there)
        ratio = there[both] / here[both]
        least, most = float(ratio.min(initial=1.0)), float(ratio.max(initial=1.0))
        return np.maximum(low, 0.0) * least * (1 - 1e-12), np.maximum(high, 0.0) * most * (1 + 1e-12)

    def _kinds(self) -> tuple[Ints | None, Ints]:
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
            signature: tuple[object, ...] = (
                self._acting(p.species, of_part[part], nominal[part]),
                tuple(np.nan_to_num(p.part_loss[:, part], nan=-1.0)),
                (float(np.nan_to_num(p.part_tempco[part], nan=9.0)), float(p.part_tempco_spread[part])) if drift else 0,
            )
            if p.swept.any():
                signature += (
                    self._acting(p.species_low, of_part[part], nominal[part]),
                    tuple(np.nan_to_num(p.part_loss_low[:, part], nan=-1.0)),
                )
            kind[part] = seen.setdefault(signature, len(seen))
        amount = np.rint(nominal / GRAIN).astype(np.int64)
        exact = np.abs(amount * GRAIN - nominal) <= 1e-12 * nominal
        # a large capacitor carries more of the current than two that make as much
        alike = len(seen) <= MOST_KINDS and exact.all() and p.drive is None
        return (kind if alike else None), amount

    @staticmethod
    def _acting(species: Floats, place: int, nominal: float) -> tuple[float, ...]:
        acts = species[:, place] / nominal if place >= 0 else np.zeros(1)
        return tuple(np.rint(np.where(np.isfinite(acts), acts, 0.0) * 1e14))

    def _written_values(self) -> Ints:
        """Return which written value each part has, one more entry for no part. [-]"""
        p = self.problem
        number = {value: place for place, value in enumerate(sorted(set(p.part_value)))}
        return np.array([number[value] for value in p.part_value] + [-1], dtype=np.int64)

    def graphs(
        self,
        mounts: Mounts,
        budget: Ints,
        price: Ints,
        *,
        shared: bool = False,
        count_pieces: bool = False,
    ) -> Iterator[StackGraph]:
        """Yield graphs that together hold every stack of some plans; several where one would be too large.

        The mounts may be narrowed between two graphs.

        Parameters
        ----------
        mounts : Mounts
            The plans, and what their capacitors may be mounted on.
        budget, price : (m,) arrays
            Capacitors and hundredths (coils included) beyond which paths may be left out. [-]
        shared : bool
            Keep to stock, `values` and `price` too.
        count_pieces : bool
            Circuits of different numbers of capacitors are different nodes, none of which exceeds `budget`.

        Raises
        ------
        Stopped
            The monitor or the work limit ended it.
        """
        rest = self.least_rest(mounts)
        own = np.minimum(self.problem.coil_price[mounts.coils].sum(axis=1), NEVER)
        rules = _Rules(mounts, rest, budget, price, own, shared, count_pieces)
        near = np.flatnonzero(rest[:, 0] <= budget)
        nothing = np.zeros(len(near), dtype=np.int64)
        empty = np.empty((len(near), 0), dtype=np.int16)
        yield from self._below([], _Nodes(near, empty, empty, nothing, nothing), rules)

    def _below(self, layers: list[Layer], at: _Nodes, rules: _Rules) -> Iterator[StackGraph]:
        """Yield the graphs that go on from some nodes of the last layer."""
        if len(layers) == len(rules.mounts.steps):
            yield StackGraph(rules.mounts, [layer.copy() for layer in layers])
            return
        reason = self.monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        try:
            made = self._layer(len(layers), at, rules, MOST_EDGES if len(at) > 1 else MOST_OF_ONE_NODE)
        except TooManyError:
            if len(at) == 1:
                raise Stopped("work limit") from None
            middle = len(at) // 2
            for part in (slice(0, middle), slice(middle, None)):
                above = [*layers[:-1], layers[-1].only(part)] if layers else layers
                yield from self._below(above, at.take(part), rules)
            return
        if made is not None:
            layer, nodes = made
            yield from self._below([*layers, layer], nodes, rules)

    def _layer(self, number: int, before: _Nodes, rules: _Rules, most: int) -> tuple[Layer, _Nodes] | None:
        step, mounts = rules.mounts.steps[number], rules.mounts.at(number)
        tail, mount, added = self._edges(number, before, rules, most)
        if not len(tail):
            return None
        row, padder = before.row[tail], mounts.padder[mount]
        parts, used = _in_circuit(before, tail, added, padder, step, rules.shared)
        self._work_left -= len(tail) * (parts.shape[1] + used.shape[1])
        if self._work_left < 0:
            raise Stopped("work limit")
        pieces = before.pieces[tail] + (added >= 0).sum(axis=1) + (padder >= 0)
        cost = self.circuits.price(np.concatenate([added, padder[:, None]], axis=1))
        spent = np.minimum(before.price[tail] + cost, NEVER)
        first_spot, spot = self._spots(row, parts, mount, mounts)
        spots = Spots(mounts.place[mount[first_spot]], parts[first_spot], padder[first_spot])
        keep = self._admissible(number, spots, row[first_spot], rules)
        if not keep.all():
            edge = np.flatnonzero(keep[spot])
            spots, spot = spots.take(keep), (np.cumsum(keep) - 1)[spot[edge]]
            tail, added, row, parts, used = tail[edge], added[edge], row[edge], parts[edge], used[edge]
            pieces, spent = pieces[edge], spent[edge]
            if not len(tail):
                return None
        plain = mounts.single and not step.last and not rules.counting
        if plain:
            first, head = _representatives(spot, len(spots)), spot
        else:
            first, head = self._heads(row, parts, used, spent, pieces, step, rules)
        nodes = _Nodes(row[first], parts[first], used[first], *_least(head, len(first), pieces, spent))
        first_end, end, passed = (side.astype(np.int32) for side in (tail, head, spot))
        layer = Layer(number, nodes.row, nodes.pieces, first_end, end, passed, added, spots)
        return self._kept(number, nodes, layer, rules)

    def _kept(self, number: int, nodes: _Nodes, layer: Layer, rules: _Rules) -> tuple[Layer, _Nodes] | None:
        """Drop the nodes beyond a limit that plans share, and the edges that end in them."""
        keep = np.ones(len(nodes), dtype=np.bool_)
        if rules.shared:
            keep &= self._inside_shared_limits(nodes, rules)
        limit = rules.price[nodes.row]
        later = rules.rest[nodes.row, number + 1] if number + 1 < len(rules.mounts.steps) else np.zeros_like(nodes.row)
        keep &= (limit >= NEVER) | (nodes.price + rules.own_price[nodes.row] + later * self._cheapest <= limit)
        edge = np.flatnonzero(keep[layer.head])
        if not len(edge):
            return None
        kept = np.flatnonzero(keep)
        last = rules.mounts.steps[number].last
        nodes = nodes.take(kept)
        if last:  # the next stack starts with nothing in circuit
            nodes = _Nodes(nodes.row, nodes.parts[:, :0], nodes.used, nodes.pieces, nodes.price)
        nodes = nodes.trimmed()
        spots = layer.spots
        width = int((spots.parts >= 0).sum(axis=1).max(initial=0))
        cut = Layer(
            number=number,
            row=nodes.row,
            pieces=nodes.pieces,
            tail=layer.tail[edge],
            head=(np.cumsum(keep) - 1)[layer.head[edge]].astype(np.int32),
            spot=layer.spot[edge],
            added=layer.added[edge],
            spots=Spots(spots.place, np.ascontiguousarray(spots.parts[:, :width]), spots.padder),
        )
        return cut, nodes

    def _admissible(self, number: int, spots: Spots, row: Ints, rules: _Rules) -> Bools:
        """Whether circuits on their mounts are inside every limit of their band, (s,)."""
        mounts = rules.mounts
        swept = bool(self.problem.swept[mounts.steps[number].band])
        if not self._exact and not swept:
            return np.ones(len(spots), dtype=np.bool_)
        keep = [np.zeros(0, dtype=np.bool_)]
        for start in range(0, len(spots), ROWS):
            chosen = np.arange(start, min(start + ROWS, len(spots)))
            some = spots.take(chosen)
            columns, inside = mounts.columns(number, some.place, some.parts, some.padder)
            if swept and self.problem.led_by_excess:  # the interval is wider than the excess asked for
                inside &= columns.excess <= mounts.lead[row[chosen]] * (1 + 1e-9)
            keep.append(inside)
        return np.concatenate(keep)

    def _edges(self, number: int, before: _Nodes, rules: _Rules, most: int) -> tuple[Ints, Ints, Shorts]:
        """Return the node before, the mount and the parts added of every edge of a layer, (e,), (e,), (e, most)."""
        problem, mounts, step = self.problem, rules.mounts.at(number), rules.mounts.steps[number]
        spare = rules.budget[before.row] - before.pieces
        if number + 1 < len(rules.mounts.steps):
            spare = spare - rules.rest[before.row, number + 1]
        mount, node = spread(mounts.start[before.row], mounts.start[before.row + 1])
        if len(mount) > 40 * most:
            raise TooManyError
        sums = np.zeros(len(before)) if step.fresh else self.circuits.sums(step.band, before.parts)
        behind = (mounts.padder[mount] >= 0).astype(np.int64)
        spare = spare[node] - behind
        room = problem.most_parts - behind
        low, high = mounts.low[mount] - sums[node], mounts.high[mount] - sums[node]
        none = (behind == 1) & (low <= 0) & (high >= 0)
        if step.fresh:
            none |= mounts.bare[mount]
        none = np.flatnonzero(none & (spare >= 0))
        nodes, mounted, parts = [node[none]], [mount[none]], [np.empty((len(none), 0), dtype=np.int64)]
        for added in range(1, problem.most_parts + 1):
            least = self.sums.smallest(step.band) * added * (1 - 1e-12)
            some = np.flatnonzero((spare >= added) & (room >= added) & (high >= least) & (low <= high))
            if not len(some):
                continue
            species, which = self.sums.inside(step.band, added, low[some], high[some], 2 * most)
            shape = np.full(len(which), PARALLEL, np.int8)
            origin, chosen = self.grades.expand(Rows(np.zeros(len(which)), species.astype(np.int16), shape))
            nodes.append(node[some[which[origin]]])
            mounted.append(mount[some[which[origin]]])
            parts.append(chosen)
            if sum(len(n) for n in nodes) > most:
                raise TooManyError
        filled = []
        for chosen in parts:
            block = np.full((len(chosen), max(1, problem.most_parts)), -1, dtype=np.int16)
            block[:, : chosen.shape[1]] = chosen
            filled.append(block)
        return np.concatenate(nodes), np.concatenate(mounted), np.concatenate(filled)

    def _spots(self, row: Ints, parts: Shorts, mount: Ints, mounts: MountsOfStep) -> tuple[Ints, Ints]:
        """Return one edge of each different circuit on its mount, and the spot of every edge."""
        return self._distinct(row if mounts.single else mount, parts)

    def _distinct(self, first: Ints, parts: Shorts) -> tuple[Ints, Ints]:
        if self._kind is None:
            return distinct(first, parts, len(self._amount))
        return distinct_rows([first, *self._amounts(parts)])

    def _amounts(self, parts: Shorts) -> list[Ints]:
        """Return how much of each kind is in circuit. [grains]"""
        assert self._kind is not None
        kind, amount = np.append(self._kind, -1), np.append(self._amount, 0)
        kinds = range(int(kind.max(initial=0)) + 1)
        return [np.where(kind[parts] == one, amount[parts], 0).sum(axis=1) for one in kinds]

    def _heads(
        self, row: Ints, parts: Shorts, used: Shorts, spent: Ints, pieces: Ints, step: Step, rules: _Rules
    ) -> tuple[Ints, Ints]:
        """Return one edge into each node, and the node of every edge."""
        keys = [row]
        if not step.last:
            keys.append(self._distinct(row, parts)[1])
        if rules.shared:
            p = self.problem
            kept = np.where((used >= 0) & self.scarce_parts[used], used, -1)
            keys.append(distinct(row, _falling(kept), len(self._amount))[1])
            if p.values_limit < NEVER:
                keys.append(distinct(row, _once(self._written[used]), len(self._amount))[1])
            if p.price_limit < NEVER:
                keys.append(spent)
        if rules.count_pieces:
            keys.append(pieces)
        return distinct_rows(keys)

    def _inside_shared_limits(self, nodes: _Nodes, rules: _Rules) -> Bools:
        p, used = self.problem, nodes.used
        keep = np.ones(len(nodes), dtype=np.bool_)
        for part in np.unique(used[used >= 0]):
            if p.part_stock[part] < used.shape[1]:
                keep &= (used == part).sum(axis=1) <= p.part_stock[part]
        if p.values_limit < used.shape[1]:
            keep &= (_once(self._written[used]) >= 0).sum(axis=1) <= p.values_limit
        if p.price_limit < NEVER:
            keep &= np.minimum(nodes.price + rules.own_price[nodes.row], NEVER) <= p.price_limit
        return keep


@dataclass(frozen=True, eq=False)
class _Nodes:
    """What the next layer starts from, (n,) each."""

    row: Ints
    parts: Shorts  # (n, w) in circuit
    used: Shorts  # (n, v) all capacitors so far, where limits that plans share are kept to
    pieces: Ints  # fewest that lead there
    price: Ints  # least that leads there

    def take(self, chosen: slice | Ints) -> _Nodes:
        return _Nodes(*(getattr(self, f.name)[chosen] for f in fields(self)))

    def trimmed(self) -> _Nodes:
        """Return the same without places that no node needs."""
        widths = [int((side >= 0).sum(axis=1).max(initial=0)) for side in (self.parts, self.used)]
        parts, used = (
            np.ascontiguousarray(side[:, :width]) for side, width in zip((self.parts, self.used), widths, strict=True)
        )
        return _Nodes(self.row, parts, used, self.pieces, self.price)

    def __len__(self) -> int:
        return len(self.row)


@dataclass(frozen=True, eq=False)
class _Rules:
    """What holds for one call of `StackNodes.graphs`; see there."""

    mounts: Mounts
    rest: Ints
    budget: Ints
    price: Ints
    own_price: Ints  # of the coils
    shared: bool
    count_pieces: bool

    @property
    def counting(self) -> bool:
        """Whether a node is more than a circuit."""
        return self.shared or self.count_pieces


def _in_circuit(
    before: _Nodes, tail: Ints, added: Shorts, padder: Ints, step: Step, shared: bool
) -> tuple[Shorts, Shorts]:
    """Return what is across the coil after each edge, and all capacitors used so far where that matters."""
    parts = added if step.fresh else np.concatenate([before.parts[tail], added], axis=1)
    used = np.empty((len(tail), 0), dtype=np.int16)
    if shared:
        used = _falling(np.concatenate([before.used[tail], added, padder[:, None].astype(np.int16)], axis=1))
    return _falling(parts), used


def _falling(parts: Shorts) -> Shorts:
    """Return each row from its largest number to its smallest: what is none comes last."""
    return np.sort(parts, axis=1)[:, ::-1]


def _once(numbers: Ints) -> Ints:
    """Return the different numbers of each row, falling; -1 in place of repeats."""
    falling = np.sort(numbers, axis=1)[:, ::-1]
    repeated = np.diff(falling, axis=1, prepend=-2) == 0
    return np.sort(np.where(repeated, -1, falling), axis=1)[:, ::-1]


def _representatives(place: Ints, count: int) -> Ints:
    first = np.empty(count, dtype=np.int64)
    first[place[::-1]] = np.arange(len(place) - 1, -1, -1)
    return first


def _least(head: Ints, count: int, pieces: Ints, spent: Ints) -> tuple[Ints, Ints]:
    """Return the fewest pieces and the least price that lead to each node."""
    least_pieces, least_price = (np.full(count, NEVER, dtype=np.int64) for _ in range(2))
    np.minimum.at(least_pieces, head, pieces)
    np.minimum.at(least_price, head, spent)
    return least_pieces, least_price
