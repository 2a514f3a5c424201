"""How many contacts the switch of bands with their own capacitors needs: a limit that the bands share.

A pole for the capacitors, with a contact for each band that has any across its coil, or a trimmer; a pole
for the coil where bands differ in coil or use taps, and one for the tuning element where it goes through a
series padder or some bands are fixed, each with a contact a band.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from partpick.search.figures import Columns
from partpick.search.problem import Bools, Ints, Problem


def across_the_coil(problem: Problem, columns: Columns, band: int) -> Bools:
    """Return which columns put something of the band's own across the coil, (m,): capacitors or a trimmer."""
    own = columns.pieces - (columns.series >= 0) > 0
    return np.asarray(own | (problem.trimmer_high[band] > 0) | (columns.trimmer >= 0))


def coil_contacts(problem: Problem) -> int:
    """Return the contacts of the pole for the coil, where there is one. [-]"""
    return problem.bands


def element_contacts(problem: Problem) -> int:
    """Return the contacts of the pole for the tuning element, where there is one. [-]"""
    return int((problem.swept & ~problem.moved).sum())  # an element that moves inductance is the coil itself


def contacts_of(problem: Problem, coils: tuple[int, ...], taken: Sequence[Columns]) -> int:
    """Return the contacts that a plan needs, one column a band. [-]"""
    if problem.bands < 2:
        return 0
    count = sum(int(across_the_coil(problem, columns, band)[0]) for band, columns in enumerate(taken))
    if len(coils) > 1 or any(int(columns.tap[0]) for columns in taken):
        count += coil_contacts(problem)
    if problem.mixed or any(int(columns.series[0]) >= 0 for columns in taken):
        count += element_contacts(problem)
    return count


def least_contacts(problem: Problem, fewest: Ints, coils: int) -> int:
    """Return the contacts that no plan on so many coils can do without. [-]

    Parameters
    ----------
    problem : Problem
        Knows trimmers and swept bands.
    fewest : (B,) array
        Least capacitors of each band. [-]
    coils : int
        How many coils share the bands. [-]
    """
    if problem.bands < 2:
        return 0
    own = (problem.trimmer_high > 0) | ((fewest > 0) & ~problem.swept)  # a swept band's one may be in series
    count = int(own.sum()) + (element_contacts(problem) if problem.mixed else 0)
    return count + (coil_contacts(problem) if coils > 1 else 0)


def figures_for_contacts(problem: Problem, bands: list[Columns]) -> tuple[list[Ints], list[Ints], list[Ints]]:
    """Return for each column whether it needs a contact across the coil, uses a tap, has a series padder."""
    own = [across_the_coil(problem, columns, band).astype(np.int64) for band, columns in enumerate(bands)]
    tapped = [(columns.tap > 0).astype(np.int64) for columns in bands]
    padded = [(columns.series >= 0).astype(np.int64) for columns in bands]
    return own, tapped, padded
