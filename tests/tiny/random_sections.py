"""Random tapped sections for tiny problems, and the places of a coil worked out one by one."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np

from partpick.search.problem import Problem
from partpick.search.taps import Sections, TappedSource


def random_sections(problem: Problem, seed: int) -> Sections:
    """Give each coil a few sections with figures of any other coil."""
    rng = np.random.default_rng(seed)
    counts = rng.integers(0, 3, problem.coils)
    coil = np.repeat(np.arange(problem.coils), counts)
    turns = np.concatenate([3 + np.arange(n) for n in counts] or [np.empty(0)]).astype(np.int64)
    return Sections(
        coil=coil,
        turns=turns,
        row=rng.integers(0, problem.coils, len(coil)),
        self_capacitance=rng.choice([1e-12, 2e-12], len(coil)),
        in_play=rng.random((len(coil), problem.bands)) < 0.9,
        further_loss=rng.choice([0.0, 1e-3], (len(coil), problem.bands)),
        further_loss_low=rng.choice([0.0, 1e-3], (len(coil), problem.bands)),
    )


def tapped_source(problem: Problem, every: Sections) -> TappedSource:
    """Return the columns of a problem whose coils have these sections."""

    def some(coils: np.ndarray) -> Sections:
        kept = np.flatnonzero(np.isin(every.coil, coils))
        return Sections(*(getattr(every, field.name)[kept] for field in fields(every)))

    return TappedSource(problem, some, np.bincount(every.coil, minlength=problem.coils))


def places_of(problem: Problem, sections: Sections | None, coil: int) -> list[tuple[Problem, int, int]]:
    """Return (problem, coil of it, tap) for the whole coil and for each of its sections as a coil by itself."""
    places = [(problem, coil, 0)]
    for v in np.flatnonzero(sections.coil == coil) if sections is not None else ():
        row = sections.row[v]
        alone = replace(
            problem,
            wanted=problem.wanted[[row]],
            self_capacitance=sections.self_capacitance[[v]],
            in_play=sections.in_play[[v]],
            coil_loss=problem.coil_loss[[row]] + sections.further_loss[[v]],
            coil_loss_low=problem.coil_loss_low[[row]] + sections.further_loss_low[[v]],
            inductance_low=problem.inductance_low[[row]],
            reactance_class=problem.reactance_class[[row]],
            coil_tempco=problem.coil_tempco[[row]],
            coil_tempco_spread=problem.coil_tempco_spread[[coil]],
        )
        places.append((alone, 0, int(sections.turns[v])))
    return places
