"""Plain enumeration of relay ladders: every set, every subset, no rule about sizes, nothing of the search."""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import lru_cache
from itertools import combinations_with_replacement, product

Part = tuple[float, float]  # F, H in series
HIGHEST = 1.25  # times the upper end, of the frequency with every relay open


@lru_cache(maxsize=100_000)
def resonance(inductance: float, strays: float, parts: tuple[Part, ...]) -> float:
    """Return the resonance of a coil with parts (capacitance, series inductance) across it, by bisection. [Hz]"""

    def beyond(frequency: float) -> bool:
        omega = 2 * math.pi * frequency
        total = strays + sum(c / (1 - omega**2 * ls * c) for c, ls in parts)
        return omega**2 * inductance * total > 1

    low, high = 1e5, 1.0 / (2 * math.pi * math.sqrt(inductance * (strays + sum(c for c, _ in parts))))
    for _ in range(56):
        middle = (low + high) / 2
        low, high = (low, middle) if beyond(middle) else (middle, high)
    return (low + high) / 2


def rungs(inductance: float, strays: float, base: Sequence[Part], switched: Sequence[Part]) -> list[float]:
    """Return the frequencies of all subsets, falling."""
    found = []
    for closed in product((False, True), repeat=len(switched)):
        on = [*base, *(part for part, shut in zip(switched, closed, strict=True) if shut)]
        found.append(resonance(inductance, strays, tuple(sorted(on))))
    return sorted(found, reverse=True)


def is_ladder(frequencies: Sequence[float], low: float, high: float, step: float) -> bool:
    """Whether the rungs go down from the upper end, or above it, to the lower end without a gap above a step."""
    if not high - step / 2 <= frequencies[0] <= HIGHEST * high:
        return False
    at = frequencies[0]
    for frequency in frequencies:
        if at <= low + step / 2:
            break
        if at - frequency > step:
            return False
        at = frequency
    return at <= low + step / 2


def fewest(
    inductance: float,
    strays: float,
    parts: Sequence[tuple[float, float]],
    stock: Sequence[int],
    low: float,
    high: float,
    step: float,
    most: int,
) -> tuple[int, set[tuple[tuple[int, ...], tuple[int, ...]]]] | None:
    """Return the least number of capacitors and every ladder that has as many, None where none has up to `most`."""
    for pieces in range(most + 1):
        found = set()
        for size in range(min(2, pieces) + 1):
            for base in combinations_with_replacement(range(len(parts)), size):
                for switched in combinations_with_replacement(range(len(parts)), pieces - size):
                    used = base + switched
                    if any(used.count(i) > stock[i] for i in used):
                        continue
                    frequencies = rungs(inductance, strays, [parts[i] for i in base], [parts[i] for i in switched])
                    if is_ladder(frequencies, low, high, step):
                        found.add((base, switched))
        if found:
            return pieces, found
    return None
