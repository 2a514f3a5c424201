"""Random tanks of a few coils and capacitors with loads on dividers, the loaded Q on purpose near what there is."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from partpick.search.matching import Matching
from partpick.search.problem import Problem
from tiny.random_problem import random_problem


def random_loads(seed: int, *, bands: int, plain: int = 0, inductors: int = 1) -> Problem:
    """Return a problem whose bands but the first `plain` have a divider; it depends on the seed alone."""
    drawn = random_problem(seed, bands=bands, inductors=inductors, coupled=seed % 5 == 0)
    rng = np.random.default_rng(seed + 4 * 10**6)
    pick = lambda *choices: choices[int(rng.integers(0, len(choices)))]  # noqa: E731
    most = pick(2, 2, 3) if bands > 1 else pick(2, 3, 3, 4)
    wanted, conductance = np.empty_like(drawn.wanted), np.zeros(bands)
    least, most_q = np.zeros(bands), np.full(bands, np.inf)
    fixed = drawn.fixed_capacitance()
    for band in range(bands):
        omega = 2 * np.pi * drawn.frequency[band]
        if band >= plain:  # from a light load to one that all but shorts the lower capacitor
            conductance[band] = omega * rng.choice(drawn.species[band]) / rng.choice([0.3, 1.0, 3.0, 10.0])
        found = []
        for coil in range(drawn.coils):
            one, two = rng.choice(drawn.species[band], 2)
            net = one
            if band >= plain:
                branch = 1 / (1 / (1j * omega * one) + 1 / (1j * omega * two + conductance[band]))
                net = branch.imag / omega
                found.append(omega * (net + fixed[coil, band]) / branch.real)
            if most > 2 and rng.random() < 0.5:
                net = net + rng.choice(drawn.species[band])
            off = rng.uniform(0.99, 1.01) if rng.random() < 0.7 else 1.0
            wanted[coil, band] = (net + fixed[coil, band]) * off
        if found:
            centre = 1 / (1 / rng.choice(found) + 1 / 150)
            width = pick(0.1, 0.3, 0.6)
            least[band], most_q[band] = centre * (1 - width), centre * (1 + width)
    return replace(
        drawn,
        wanted=wanted,
        inductance_low=np.empty(0),
        connect_any=False,
        lead_inductance=0.0,
        most_parts=most,
        least_parts=2 if plain == 0 else drawn.least_parts,
        in_play=drawn.in_play | (rng.random(wanted.shape) < 0.8),
        share=pick(float("inf"), float("inf"), 0.4),
        matching=Matching(conductance=conductance, least_q=least, most_q=most_q, unknown_passes=seed % 3 == 0),
    )
