"""Which coils share the bands of a stacked plan, and how: every way, or those of the best bounds.

A chain is some coils and a pattern, which says the coil of each band; each coil has a stack of its own.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator

import numpy as np

from partpick.search.bounds import BELOW_PIECES, IMPOSSIBLE, pack, packed_fields
from partpick.search.figures import coarse_error, fine_error
from partpick.search.mounts import Pattern, falling_bands
from partpick.search.plan_rows import LAST, PlanRows
from partpick.search.problem import NEVER, Ints, Problem
from partpick.search.stack_reach import StackReach

MOST_CHAINS = 300_000
MOST_FIGURES = 60_000_000  # coils times stacks whose bounds are added up
WHOLE_PATTERNS = 1100  # beyond it only patterns of neighbouring bands
MOST_CELLS = 6_000_000  # groups of equal bounds joined in all
_CELLS = 1 << 18  # of them at one time


def patterns_of(problem: Problem, size: int, whole: bool) -> Iterator[Pattern]:
    """Yield the ways to share the bands out among `size` coils, each used, the highest band to the first.

    All of them, or where not `whole` those in which every coil serves neighbouring bands.
    """
    falling, count = falling_bands(problem), problem.bands
    if whole:
        growing = (list(g) for g in _growth(count, size))
    else:
        cuts = itertools.combinations(range(1, count), size - 1)
        growing = ([sum(place >= cut for cut in some) for place in range(count)] for some in cuts)
    for slots in growing:
        pattern = [0] * count
        for band, slot in zip(falling, slots, strict=True):
            pattern[band] = slot
        yield tuple(pattern)


def _growth(count: int, size: int) -> Iterator[tuple[int, ...]]:
    """Yield every sequence that starts with 0, never skips a number, and ends having used `size` of them."""

    def grow(so_far: tuple[int, ...], used: int) -> Iterator[tuple[int, ...]]:
        left = count - len(so_far)
        if used + left < size:
            return
        if not left:
            yield so_far
            return
        for slot in range(min(used + 1, size)):
            yield from grow((*so_far, slot), max(used, slot + 1))

    yield from grow((0,), 1)


def _count_of_patterns(bands: int, size: int) -> int:
    """Return the number of ways to part `bands` into `size` sets, none empty (Stirling, second kind)."""
    ways = [1] + [0] * size
    for _ in range(bands):
        ways = [0] + [part * ways[part] + ways[part - 1] for part in range(1, size + 1)]
    return ways[size]


class Chains:
    """The rows of a stacked search."""

    def __init__(self, problem: Problem, reach: StackReach, most_pieces: int) -> None:
        self.problem = problem
        self.reach = reach
        self.most_pieces = most_pieces
        self.patterns: list[Pattern] = [(0,) * problem.bands]
        self.omitted = LAST
        every = np.arange(problem.coils)[:, None]
        found = [(every, np.zeros(problem.coils, dtype=np.int64))]
        for size in range(2, min(problem.inductors, problem.bands) + 1):
            found += self._together(size)
        most = max(coils.shape[1] for coils, _ in found)
        coils = np.concatenate([_widened(coils, most) for coils, _ in found])
        pattern = np.concatenate([pattern for _, pattern in found])
        self.rows = self._bounded(coils, pattern)

    def _together(self, size: int) -> list[tuple[Ints, Ints]]:
        """Return coils and pattern of the chains of `size` coils, and note the bound of those left out."""
        p = self.problem
        count = _count_of_patterns(p.bands, size)
        whole = count <= WHOLE_PATTERNS and count * p.coils * size <= MOST_FIGURES
        if not whole:
            self._leave_out(size + int(self.reach.least_of_any().sum()))
        patterns = list(patterns_of(p, size, whole))
        made = [self._groups(pattern, size) for pattern in patterns]
        usable = [place for place, groups in enumerate(made) if all(len(g.first) for g in groups)]
        first = len(self.patterns)
        self.patterns += [patterns[place] for place in usable]
        self._cut([made[place] for place in usable], size)
        packed, cells, waiting = [], [], 0
        for number, place in enumerate(usable):
            for bound, cell, ways in _joined(p, made[place], self.most_pieces):
                packed.append(bound)
                cells.append(np.column_stack([np.full(len(bound), first + number), ways, cell]))
                waiting += len(bound)
                if waiting > 2 * MOST_CHAINS:
                    packed, cells = self._best_so_far(packed, cells)
                    waiting = len(packed[0])
        if not packed:
            return []
        bound, table = np.concatenate(packed), np.concatenate(cells)
        order = np.argsort(bound, kind="stable")
        fits = np.cumsum(table[order, 1]) <= MOST_CHAINS
        if not fits.all():
            self.omitted = min(self.omitted, int(bound[order[np.flatnonzero(~fits)[0]]]))
        found = []
        for number, _, *cell in table[order[fits]].tolist():
            groups = made[usable[number - first]]
            members = [group.members(own) for group, own in zip(groups, cell, strict=True)]
            coils = np.stack([side.ravel() for side in np.meshgrid(*members, indexing="ij")], axis=1)
            different = np.ones(len(coils), dtype=np.bool_)
            for one, two in itertools.combinations(range(size), 2):
                different &= coils[:, one] != coils[:, two]
            found.append((coils[different], np.full(int(different.sum()), number)))
        return found

    def _cut(self, made: list[list[_Groups]], size: int) -> None:
        """Keep the first groups of each stack where all joined would be too many, and note what is left out."""
        most = max(1, int((MOST_CELLS / max(1, len(made))) ** (1 / size)))
        for groups in made:
            least = [int(group.figures["pieces"].min()) for group in groups]
            for slot, group in enumerate(groups):
                if len(group.first) > most:
                    left_out = int(group.figures["pieces"][most:].min())
                    self._leave_out(size + left_out + sum(least) - least[slot])
                    group.cut(most)

    def _best_so_far(self, packed: list[Ints], cells: list[Ints]) -> tuple[list[Ints], list[Ints]]:
        """Keep the groups of the best bounds, and note the bound of the others."""
        bound, table = np.concatenate(packed), np.concatenate(cells)
        order = np.argsort(bound, kind="stable")
        self.omitted = min(self.omitted, int(bound[order[MOST_CHAINS]]))
        kept = order[:MOST_CHAINS]
        return [bound[kept]], [table[kept]]

    def _leave_out(self, pieces: int) -> None:
        """Note that chains of at least so many pieces are in no row."""
        bound = pieces << BELOW_PIECES if self.problem.by == "build" else 0
        self.omitted = min(self.omitted, bound)

    def _groups(self, pattern: Pattern, size: int) -> list[_Groups]:
        return [self._group(tuple(b for b, own in enumerate(pattern) if own == slot)) for slot in range(size)]

    def _group(self, bands: tuple[int, ...]) -> _Groups:
        """Return the coils that can have a stack on some bands, those of equal bounds together."""
        p, reach, own = self.problem, self.reach, list(bands)
        pieces = reach.least_pieces(bands)
        coils = np.flatnonzero((pieces < IMPOSSIBLE) & (pieces <= self.most_pieces))
        error = reach.worst_error(bands)[coils]
        if p.by == "error":  # in steps of a twelfth, so that few are different
            error = 2.0 ** (np.floor(np.log2(np.maximum(error, 1e-12)) * 8) / 8)
        price = p.coil_price[coils]
        if p.by == "price":
            steps = np.floor(np.log(np.maximum(price, 1)) / np.log(1.05) - 1e-9)
            price = np.where(price < NEVER, np.floor(1.05**steps), NEVER)
        figures = {
            "pieces": pieces[coils],
            "error_class": coarse_error(error * (1 - 1e-9), p.floor),
            "fine_error": fine_error(error * (1 - 1e-9)) - 1,
            "q_class": reach.q_class[coils][:, own].max(axis=1, initial=0),
            "stray_class": reach.stray_class[coils][:, own].max(axis=1, initial=0),
            "reactance_class": reach.reactance_class[coils][:, own].max(axis=1, initial=0),
            "price": price.astype(np.int64),
        }
        figures |= dict(zip(("forms", "wires", "volume"), p.effort[coils].T, strict=True))
        nothing = np.zeros(len(coils), dtype=np.int64)
        figures |= {name: nothing for name in ("excess_class", "fine_excess", "coarse_excess")}
        return _Groups(coils, figures, pack(figures, packed_fields(p, p.by)))

    def _bounded(self, coils: Ints, pattern: Ints) -> PlanRows:
        p, reach, count = self.problem, self.reach, len(coils)
        pieces, error = np.zeros(count, dtype=np.int64), np.zeros(count)
        classes = tuple(np.zeros(count, dtype=np.int64) for _ in range(3))
        tables = reach.q_class, reach.stray_class, reach.reactance_class
        order = np.argsort(pattern, kind="stable")
        for rows in np.split(order, np.flatnonzero(np.diff(pattern[order])) + 1):
            if not len(rows):
                continue
            shared_out = self.patterns[int(pattern[rows[0]])]
            for slot in range(max(shared_out) + 1):
                bands = tuple(b for b, own in enumerate(shared_out) if own == slot)
                coil = coils[rows, slot]
                pieces[rows] += reach.least_pieces(bands)[coil]
                error[rows] = np.maximum(error[rows], reach.worst_error(bands)[coil])
                for kept, table in zip(classes, tables, strict=True):
                    kept[rows] = np.maximum(kept[rows], table[coil][:, list(bands)].max(axis=1, initial=0))
        least = np.minimum(pieces, IMPOSSIBLE)
        q, strays, reactance = classes
        return PlanRows(p, coils, pattern, least, error, q, strays, reactance, self.omitted)


class _Groups:
    """Coils of one stack in groups of equal bounds."""

    def __init__(self, coils: Ints, figures: dict[str, Ints], packed: Ints) -> None:
        _, first, group = np.unique(packed, return_index=True, return_inverse=True)
        self.first = first
        self.figures = {name: figure[first] for name, figure in figures.items()}
        self.sizes = np.bincount(group, minlength=len(first))
        self._coils = coils[np.argsort(group, kind="stable")]
        self._start = np.concatenate([[0], np.cumsum(self.sizes)])

    def cut(self, most: int) -> None:
        """Keep the first groups by bound alone."""
        self.first, self.sizes = self.first[:most], self.sizes[:most]
        self.figures = {name: figure[:most] for name, figure in self.figures.items()}

    def members(self, group: int) -> Ints:
        return self._coils[self._start[group] : self._start[group + 1]]


def _joined(problem: Problem, groups: list[_Groups], most: int) -> Iterator[tuple[Ints, Ints, Ints]]:
    """Yield blocks of (packed bound, group of each coil, number of chains) of the groups joined."""
    shape = [len(g.first) for g in groups]
    total = int(np.prod(shape, dtype=np.int64))
    for start in range(0, total, _CELLS):
        cell = np.stack(np.unravel_index(np.arange(start, min(start + _CELLS, total)), shape), axis=1)
        pieces = sum(g.figures["pieces"][cell[:, i]] for i, g in enumerate(groups))
        cell = cell[np.asarray(pieces) <= most]
        figures = {}
        for name in groups[0].figures:
            own = np.array([g.figures[name][cell[:, i]] for i, g in enumerate(groups)])
            summed = name in ("pieces", "price", "forms", "wires", "volume")
            figures[name] = own.sum(axis=0) if summed else own.max(axis=0)
        figures["pieces"] = figures["pieces"] + len(groups)
        figures["price"] = np.minimum(figures["price"], NEVER)
        count = np.prod([g.sizes[cell[:, i]] for i, g in enumerate(groups)], axis=0)
        yield pack(figures, packed_fields(problem, problem.by)), cell, count


def _widened(coils: Ints, most: int) -> Ints:
    blank = np.full((len(coils), most - coils.shape[1]), -1, dtype=np.int64)
    return np.concatenate([coils, blank], axis=1)
