"""Instances of switched tanks of several bands, 3 to 30 MHz, E24 from 1 pF to 10 nF, by seed."""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from partpick.search.problem import NEVER, PLENTY, Problem

E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)


def tank_problem(seed: int, bands: int, coils: int, parts: int, *, leads: float = 0.0, **changes: object) -> Problem:
    """Return a problem of random frequencies (log-uniform, ends kept) and random coils."""
    rng = np.random.default_rng(seed)
    inner = np.exp(rng.uniform(np.log(3e6), np.log(30e6), bands - 2)) if bands > 2 else np.empty(0)
    frequency = np.sort(np.concatenate([[3e6], inner, [30e6]]))[-bands:]
    top = np.exp(rng.uniform(np.log(60e-12), np.log(250e-12), coils))  # all in circuit at 30 MHz
    inductance = 1 / ((2 * np.pi * 30e6) ** 2 * top)
    wanted = 1 / ((2 * np.pi * frequency[None, :]) ** 2 * inductance[:, None])
    values = [Fraction(v * 10**d, 10**13) for d in range(4) for v in E24] + [Fraction(1, 10**8)]
    species = np.array([float(v) for v in values])
    n = len(values)
    # capacitors with leads act larger the higher the frequency; near their own resonance they are of no use
    zero, one = np.zeros(bands), np.ones((coils, bands))
    common = [0 if i % 4 == 0 else 1 if i % 2 == 0 else 2 for i in range(24)] * 4 + [0]
    given = {
        "frequency": frequency,
        "error_limit": zero + 0.005,
        "q_limit": zero,
        "q_enough": zero + 150.0,
        "stray": zero + 10e-12,
        "trimmer_low": zero,
        "trimmer_high": zero,
        "trimmer_loss": zero,
        "trimmer_tempco": zero,
        "wanted": wanted,
        "self_capacitance": np.full(coils, 1e-12),
        "in_play": one > 0,
        "coil_loss": one / rng.uniform(100, 250, coils)[:, None],
        "reactance_class": np.repeat(rng.integers(0, 2, coils)[:, None], bands, axis=1),
        "effort": np.stack([rng.integers(0, 4, coils), rng.integers(0, 2, coils), rng.integers(20, 40, coils)], axis=1),
        "coil_price": np.full(coils, NEVER),
        "support": np.arange(coils) // max(1, coils // 400),
        "support_stock": np.full(coils, PLENTY),
        "coil_rank": np.arange(coils),
        "coil_tempco": one * 40e-6,
        "coil_tempco_spread": np.zeros(coils),
        "species": species / (1 - (2 * np.pi * frequency[:, None]) ** 2 * leads * species),
        "commonness": np.array(common),
        "options": tuple((i,) for i in range(n)),
        "part_loss": np.full((bands, n), 1e-3),
        "part_tempco": np.zeros(n),
        "part_tempco_spread": np.zeros(n),
        "part_price": np.full(n, NEVER),
        "part_stock": np.full(n, PLENTY),
        "part_rank": np.arange(n),
        "part_value": tuple(values),
        "least_parts": 0,
        "most_parts": parts,
        "connect_any": False,
        "lead_inductance": 0.0,
        "share": 0.2,
        "stray_tempco": 100e-6,
        "drift_limit": float("inf"),
        "parts_limit": NEVER,
        "values_limit": NEVER,
        "price_limit": NEVER,
        "inductors": 1,
        "floor": 0.001,
        "by": "build",
    }
    omega = 2 * np.pi * frequency[:, None]
    given["species"] = np.where(omega**2 * leads * species > 0.25, np.inf, given["species"])
    return Problem(**{**given, **changes})  # type: ignore[arg-type]
