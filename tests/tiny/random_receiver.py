"""Random receivers of a few coils and capacitors, some of which track and some of which do not."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import numpy as np

from partpick.physics.tracking import three_point_circuit
from partpick.search.problem import NEVER, PLENTY, Problem
from partpick.search.tracking import ReceiverBand
from tiny.random_problem import random_problem


def random_receiver(seed: int, *, bands: int = 1, coupled: bool = False) -> tuple[Problem, tuple[ReceiverBand, ...]]:
    """Return a problem of `bands` signal circuits, each with its oscillator behind it, and how they belong together.

    Coils are made for designs drawn at random, then put off a little.
    """
    rng = np.random.default_rng(seed + 7 * 10**6)
    plain = random_problem(seed, bands=2 * bands, inductors=2 * bands)
    pick = lambda *choices: choices[int(rng.integers(0, len(choices)))]  # noqa: E731
    least, most = pick((5e-12, 60e-12), (12e-12, 150e-12), (12e-12, 365e-12))
    options = plain.options
    coils = int(rng.integers(2, 5)) if bands == 1 else 2 * bands
    margin = pick(0.0, 0.01, 0.03)
    low, high = np.empty(2 * bands), np.empty(2 * bands)
    inductance = rng.uniform(5e-6, 400e-6, coils)
    offsets, fixed = [], 4e-12
    wished: list[float] = []
    for band in range(bands):
        extra, side = float(rng.choice([0.0, 10e-12, 22e-12, 47e-12])), pick(1.0, 1.0, -1.0)
        one, two = rng.permutation(coils)[:2] if bands == 1 else (2 * band, 2 * band + 1)
        swing = (most + fixed + extra) / (least + fixed + extra)
        ratio = max(np.sqrt(swing) * rng.uniform(0.6, 0.9 if bands == 1 else 0.7) * (1 - margin) / (1 + margin), 1.1)
        if side < 0:  # the oscillator has the larger ratio: leave it room
            ratio = max(ratio**0.6, 1.05)
        top = 1 / (2 * np.pi * np.sqrt(inductance[one] * (least + fixed + extra))) / (1 + margin)
        top *= rng.uniform(0.85, 0.99)
        high[2 * band], low[2 * band] = top, top / ratio
        offset = side * low[2 * band] * (rng.uniform(0.05, 0.3) if side < 0 else rng.uniform(0.1, 1.5))
        offsets.append(float(offset))
        low[2 * band + 1], high[2 * band + 1] = low[2 * band] + offset, high[2 * band] + offset
        f = np.array([low[2 * band], np.sqrt(low[2 * band] * top), top])
        section = 1 / ((2 * np.pi * f) ** 2 * inductance[one]) - fixed - extra
        fit = three_point_circuit(section, f + offset, fixed)
        if np.isfinite(fit.padder):
            whole = float(fit.padder + fit.trimmer)
            inductance[two] = fit.inductance * (fit.padder / whole) ** 2
            wished += [extra, whole, float(fit.inductance * (fit.padder + fixed) / inductance[two]) - whole - fixed]
        else:
            inductance[two] = 1 / ((2 * np.pi * (f[1] + offset)) ** 2 * (section[1] + fixed))
            wished += [extra]
        inductance[two] *= rng.uniform(0.97, 1.03) if rng.random() < 0.3 else rng.uniform(0.995, 1.005)
    usual = rng.choice([6.8e-12, 10e-12, 22e-12, 47e-12, 120e-12, 220e-12, 470e-12], len(options), False)
    good = [w * rng.uniform(0.98, 1.02) for w in rng.permutation(wished) if 2e-12 < w < 5e-9]
    own = [round(v * 1e13) for v in [*good, *usual][: len(options)]]
    values = [Fraction(v, 10**13) for v in sorted(set(own))]
    options = options[: len(values)]
    parts = sum(len(each) for each in options)
    species = np.tile([float(v) for v in values], (2 * bands, 1))
    shape = coils, 2 * bands
    at_high = inductance[:, None] * rng.uniform(0.998, 1.0, shape)
    limits = {
        "parts_limit": int(rng.integers(0, 5)) if coupled and rng.random() < 0.4 else NEVER,
        "values_limit": int(rng.integers(1, 3)) if coupled and rng.random() < 0.5 else NEVER,
        "price_limit": int(rng.integers(20, 90)) if coupled and rng.random() < 0.5 else NEVER,
    }
    # of several bands each usually has coils of its own: one winding in two places is no plan
    apart = np.arange(coils)[:, None] // 2 == np.arange(2 * bands)[None, :] // 2
    own_coils = apart if bands > 1 and rng.random() < 0.9 else np.ones(shape, dtype=np.bool_)
    trimmed = float(rng.random() < 0.2)
    supports = int(rng.integers(1, coils + 1))
    stocked = coupled or bands == 1
    problem = replace(
        plain,
        frequency=high,
        low_end=low,
        swept=np.ones(2 * bands, dtype=np.bool_),
        wanted=1 / ((2 * np.pi * high[None, :]) ** 2 * at_high),
        inductance_low=at_high * rng.uniform(1.0, 1.004, shape),
        self_capacitance=np.full(coils, 1e-12) * rng.uniform(0.5, 1.5, coils),
        trimmer_low=plain.trimmer_low * trimmed,
        trimmer_high=plain.trimmer_high * trimmed,
        in_play=(rng.random(shape) < 0.95) & own_coils,
        coil_loss=1 / rng.choice([60.0, 110.0, 160.0, 250.0], shape),
        coil_loss_low=1 / rng.choice([60.0, 110.0, 160.0, 250.0], shape),
        reactance_class=rng.integers(0, 2, shape),
        effort=rng.integers(0, 2, (coils, 3)),
        coil_price=np.where(rng.random(coils) < 0.1, NEVER, rng.integers(1, 4, coils) * 10),
        support=rng.permutation(np.arange(coils) % supports),
        support_stock=np.where(stocked & (rng.random(supports) < 0.3), 1, PLENTY),
        coil_rank=rng.permutation(coils),
        coil_tempco=np.full(shape, 40e-6),
        coil_tempco_spread=np.full(coils, 10e-6),
        coil_spread=np.zeros(coils),
        species=species,
        species_low=species * (1 - pick(0.0, 1e-5, 2e-3) * species / 470e-12),
        part_value=tuple(values[s] for s, o in enumerate(options) for _ in o),
        options=options,
        commonness=plain.commonness[: len(options)],
        part_loss=plain.part_loss[:1, :parts].repeat(2 * bands, axis=0),
        part_tempco=plain.part_tempco[:parts],
        part_tempco_spread=plain.part_tempco_spread[:parts],
        part_price=plain.part_price[:parts],
        part_rank=plain.part_rank[:parts],
        part_tolerance=np.zeros(parts),
        part_stock=plain.part_stock[:parts] if stocked else np.full(parts, PLENTY),
        part_loss_low=plain.part_loss[:1, :parts].repeat(2 * bands, axis=0),
        most_parts=int(rng.integers(1, 3)),
        least_parts=0,
        connect_any=False,
        lead_inductance=pick(0.0, 0.0, 30e-9),
        share=pick(np.inf, np.inf, 0.5, 0.3) if bands == 1 else np.inf,
        tuning_low=np.full(2 * bands, least),
        tuning_high=np.full(2 * bands, most),
        tuning_loss=np.full(2 * bands, 1 / 500),
        tuning_tempco=np.zeros(2 * bands),
        margin=margin,
        excess_limit=pick(np.inf, np.inf, np.inf, 1.0),
        q_limit=np.full(2 * bands, pick(0.0, 0.0, 0.0, 70.0) if bands == 1 else 0.0),
        drift_limit=pick(np.inf, np.inf, np.inf, 200e-6),
        by=pick("build", "error"),
        **limits,
    )
    shares = [0.02, 0.06, 0.15] if bands == 1 else [0.1, 0.15]
    belong = tuple(
        ReceiverBand(
            signal=2 * band,
            oscillator=2 * band + 1,
            offset=offsets[band],
            limit=float(low[2 * band : 2 * band + 2].min() * rng.choice(shares)),
        )
        for band in range(bands)
    )
    return problem, belong
