"""Random stacked and shared problems of a few coils and capacitors, full of ties and tight limits."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from partpick.search.problem import NEVER, Problem
from tiny.random_problem import random_problem


def random_layout(seed: int, *, bands: int, shared: bool, coupled: bool = False) -> Problem:
    """Return a problem that depends on the seed alone; lower bands want more capacitance."""
    problem = random_problem(seed, bands=bands, coupled=coupled)
    rng = np.random.default_rng(seed + 10**6)
    plain = problem.species[0]
    coils = problem.coils
    on_the_spot = rng.random() < 0.5
    start = rng.choice([0.0, *plain], (coils, 1))
    steps = rng.choice(plain, (coils, bands - 1)) * rng.integers(1, 3, (coils, bands - 1))
    net = np.concatenate([start, start + np.cumsum(steps, axis=1)], axis=1)
    if shared and bands > 2:  # sums that three capacitors can switch in
        chosen = rng.choice(plain, (coils, 3))
        masks = np.array([[m >> i & 1 for i in range(3)] for m in range(8)])
        sums = np.sort(chosen @ masks.T, axis=1)
        net = np.sort(np.array([rng.choice(row, bands, replace=False) for row in sums]), axis=1)
    noise = 1.0 if on_the_spot else rng.uniform(0.97, 1.03, net.shape)
    wanted = (net * noise + 4e-12)[:, ::-1]  # by rising frequency
    if rng.random() < 0.3:  # slightly negative: no capacitor, and still inside a loose limit
        wanted[0, -1] = 3.95e-12
    place = rng.permutation(bands)
    changes: dict[str, object] = {}
    if rng.random() < 0.3:  # capacitors with leads act larger at the higher bands
        leads = rng.choice([0.0, 8e-9, 20e-9], len(plain))
        omega = 2 * np.pi * problem.frequency
        changes["species"] = plain / (1 - (omega**2)[:, None] * leads * plain)
        if rng.random() < 0.3:
            changes["species"][-1, -1] = np.inf  # of no use at the highest band
        changes["species"] = changes["species"][place]
    if rng.random() < 0.2:
        changes["lead_inductance"] = 30e-9
    low_trimmer = problem.trimmer_high[place] > 0
    if coupled and rng.random() < 0.3:
        changes["floor"] = 0.05
    for name in ("trimmer_low", "trimmer_high", "trimmer_loss", "trimmer_tempco", "error_limit", "frequency"):
        changes[name] = getattr(problem, name)[place]
    in_all = NEVER if problem.parts_limit >= NEVER else bands + 1
    return replace(
        problem,
        wanted=np.where(low_trimmer, wanted[:, place] + 6e-12, wanted[:, place]),
        in_play=problem.in_play[:, place] | (rng.random((coils, bands)) < 0.6),
        connect_any=False,
        least_parts=0,
        most_parts=min(problem.most_parts, 2),
        parts_limit=int(rng.integers(min(bands, 3), 4)) if shared else in_all,
        **changes,
    )
