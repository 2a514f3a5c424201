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


def random_swept_layout(seed: int, *, bands: int, swept: int, inductors: int = 1, coupled: bool = False) -> Problem:
    """Return a stacked problem of which some bands are swept by one variable capacitor, by the seed alone.

    Each coil is made for a stack drawn at random: more across it from the highest band down.
    """
    plain = random_layout(seed, bands=bands, shared=False, coupled=coupled)
    rng = np.random.default_rng(seed + 2 * 10**6)
    pick = lambda *choices: choices[int(rng.integers(0, len(choices)))]  # noqa: E731
    which = np.isin(np.arange(bands), rng.permutation(bands)[:swept])
    tuning = pick((5e-12, 40e-12), (12e-12, 150e-12), (3e-12, 15e-12))
    margin, leads = pick(0.0, 0.01, 0.03), pick(0.0, 0.0, 30e-9)
    frequency = plain.frequency[np.argsort(plain.frequency)] * 1.35 ** np.arange(bands)
    frequency = frequency[rng.permutation(bands)] if rng.random() < 0.3 else frequency
    low_end, wanted = frequency.copy(), plain.wanted.copy()
    species = np.tile(np.array([float(plain.part_value[o[0]]) for o in plain.options]), (bands, 1))
    fixed = plain.self_capacitance[:, None] + (plain.stray + (plain.trimmer_low + plain.trimmer_high) / 2)[None, :]
    for coil in rng.permutation(plain.coils):
        across = 0.0
        for band in np.argsort(-frequency, kind="stable"):
            across += rng.choice(species[0]) * rng.integers(0, 3)
            if not which[band]:
                wanted[coil, band] = (across + fixed[coil, band]) * pick(1.0, 1.0, rng.uniform(0.97, 1.03))
                continue
            least, most = tuning
            if rng.random() < 0.5:
                padder = rng.choice(species[0])
                least, most = (t * padder / (t + padder) for t in tuning)
            base = across + fixed[coil, band]
            wanted[coil, band] = (least + base) * (1 + margin) ** 2 * rng.uniform(1.0, 1.08)
            ratio = np.sqrt((most + base) / (least + base) * rng.uniform(0.75, 0.95))
            low_end[band] = frequency[band] * min(0.97, (1 + margin) / (1 - margin) / ratio)
    inductance_low = rng.uniform(1.0, 1.004, wanted.shape) / ((2 * np.pi * frequency) ** 2 * wanted)
    return replace(
        plain,
        frequency=frequency,
        wanted=wanted,
        species=species,
        species_low=species * pick(1.0, 1.0, 0.998),
        part_loss_low=plain.part_loss * pick(1.0, 0.5),
        swept=which,
        low_end=low_end,
        margin=margin,
        tuning_low=np.where(which, tuning[0], 0.0),
        tuning_high=np.where(which, tuning[1], 0.0),
        tuning_loss=np.full(bands, pick(0.0, 1 / 500, 1 / 500, np.nan)),
        tuning_tempco=np.full(bands, pick(0.0, 100e-6)),
        inductance_low=inductance_low,
        coil_loss_low=plain.coil_loss * rng.uniform(0.8, 1.2, plain.coil_loss.shape),
        excess_limit=pick(np.inf, np.inf, np.inf, 0.8),
        lead_inductance=leads,
        in_play=plain.in_play | which,
        inductors=inductors,
    )
