"""Random problems of a few coils and a few capacitors, on purpose full of ties and tight limits."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import numpy as np

from partpick.search.drive import Drive
from partpick.search.problem import NEVER, PLENTY, Problem


def random_problem(seed: int, *, bands: int, inductors: int = 1, coupled: bool = False) -> Problem:
    """Return a problem that depends on the seed alone."""
    rng = np.random.default_rng(seed)
    coils = int(rng.integers(1, 5))
    supports = int(rng.integers(1, coils + 1))
    drawn = rng.choice([10, 12, 15, 22, 27, 33, 47, 68, 100], rng.integers(2, 5), False)
    values = [Fraction(int(v), 10**12) for v in sorted(drawn)]
    grades = [int(rng.integers(1, 3)) for _ in values]
    options, part = [], 0
    for count in grades:
        options.append(tuple(range(part, part + count)))
        part += count
    of_part = [s for s, o in enumerate(options) for _ in o]
    any_connection = bool(rng.integers(0, 2))
    most = int(rng.integers(1, 3 if bands > 1 else 4))
    frequency = np.sort(rng.uniform(3e6, 9e6, bands))
    plain = np.array([float(v) for v in values])
    target_total = rng.uniform(25e-12, 160e-12, (coils, bands))
    if rng.random() < 0.5:  # on the spot: ties and zero errors
        target_total = rng.choice(plain, (coils, bands)) * rng.integers(1, 3, (coils, bands)) + 4e-12
    if bands > 1 and rng.random() < 0.3:  # a coil whose wanted capacitance is slightly negative in one band
        target_total[0, -1] = 3.95e-12
    trimmer = np.where(rng.random(bands) < 0.2, 10e-12, 0.0)
    pick = lambda *choices: choices[int(rng.integers(0, len(choices)))]  # noqa: E731
    leads = np.random.default_rng(seed + 10**7).choice([0.0, 0.0, 0.0, 80e-9, 300e-9])  # of every capacitor
    limit = pick(0.02, 0.05, 0.1)
    price = rng.integers(1, 6, part) * 5
    price[rng.random(part) < 0.2] = NEVER
    return Problem(
        frequency=frequency,
        error_limit=np.where(trimmer > 0, np.inf, limit),
        q_limit=np.full(bands, pick(0.0, 0.0, 90.0)),
        q_enough=np.full(bands, 150.0),
        stray=np.full(bands, 3e-12),
        trimmer_low=np.where(trimmer > 0, 2e-12, 0.0),
        trimmer_high=trimmer,
        trimmer_loss=np.where(trimmer > 0, 1 / 400, 0.0),
        trimmer_tempco=np.where(trimmer > 0, -200e-6, 0.0),
        wanted=target_total,
        self_capacitance=np.full(coils, 1e-12),
        in_play=rng.random((coils, bands)) < 0.9,
        coil_loss=np.where(
            rng.random((coils, bands)) < 0.1, np.nan, 1 / rng.choice([60.0, 110.0, 160.0, 250.0], (coils, bands))
        ),
        reactance_class=rng.integers(0, 2, (coils, bands)),
        effort=rng.integers(0, 2, (coils, 3)),
        coil_price=np.where(rng.random(coils) < 0.1, NEVER, rng.integers(1, 4, coils) * 10),
        support=rng.permutation(np.arange(coils) % supports),
        support_stock=np.where(rng.random(supports) < 0.3, 1, PLENTY),
        coil_rank=rng.permutation(coils),
        coil_tempco=np.full((coils, bands), 40e-6),
        coil_tempco_spread=np.full(coils, 10e-6),
        species=acting(plain, leads, frequency),
        commonness=rng.integers(0, 3, len(values)),
        options=tuple(options),
        part_loss=np.tile(1 / rng.choice([300.0, 1000.0], part), (bands, 1)),
        part_tempco=rng.choice([0.0, -750e-6, -150e-6], part),
        part_tempco_spread=rng.choice([0.0, 30e-6], part),
        part_price=price,
        part_stock=np.where(rng.random(part) < (0.6 if coupled else 0.2), rng.integers(1, 3, part), PLENTY),
        part_rank=np.arange(part),
        part_value=tuple(values[s] for s in of_part),
        least_parts=1 if bands == 1 else 0,
        most_parts=most,
        connect_any=any_connection,
        lead_inductance=0.0,
        share=pick(float("inf"), 0.2, 0.12),
        stray_tempco=100e-6,
        drift_limit=pick(float("inf"), float("inf"), 80e-6, 40e-6),
        parts_limit=int(rng.integers(1, 5)) if coupled and rng.random() < 0.3 else NEVER,
        values_limit=int(rng.integers(1, 3)) if coupled and rng.random() < 0.5 else NEVER,
        price_limit=int(rng.integers(20, 60)) if coupled and rng.random() < 0.4 else NEVER,
        inductors=inductors,
        floor=pick(0.001, 0.01),
        by=pick("build", "error", "price"),
    )


def acting(values: np.ndarray, leads: float, frequency: np.ndarray) -> np.ndarray:
    """Return how capacitors with inductance in series act at each band, (B, n)."""
    return values / (1 - (2 * np.pi * frequency[:, None]) ** 2 * leads * values)


def random_moved_problem(seed: int, *, bands: int, moved: int, **shape: object) -> Problem:
    """Return a problem whose first `moved` bands are swept by an element that moves inductance, by the seed alone.

    Both ends of the inductance and of the self-capacitance are drawn for each coil; no tuned capacitance.
    """
    plain = random_swept_problem(seed, bands=bands, swept=moved, **shape)
    rng = np.random.default_rng(seed + 2 * 10**6)
    which = plain.swept
    coils = plain.coils
    own_low, own_high = (np.where(which, rng.choice([0.0, 0.0, 2e-12, -0.6e-12], (coils, bands)), 0.0) for _ in "lh")
    wanted, inductance_low = plain.wanted.copy(), plain.inductance_low.copy()
    low_end = plain.low_end.copy()
    for band in np.flatnonzero(which):
        low_end[band] = plain.frequency[band] / rng.uniform(1.05, 2.5)
        for coil in range(coils):
            across = rng.choice(plain.species[band]) * rng.integers(0, 3) + plain.fixed_capacitance()[coil, band]
            ends = [across + own[coil, band] for own in (own_low, own_high)]
            wanted[coil, band] = ends[1] * (1 + plain.margin) ** 2 * rng.uniform(1.0, 1.15)
            reach = (2 * np.pi * low_end[band] * (1 - plain.margin)) ** 2 * ends[0]
            inductance_low[coil, band] = rng.uniform(1.0, 1.15) / reach
    return replace(
        plain,
        wanted=wanted,
        inductance_low=inductance_low,
        low_end=low_end,
        tuning_low=np.zeros(bands),
        tuning_high=np.zeros(bands),
        tuning_loss=np.zeros(bands),
        tuning_tempco=np.zeros(bands),
        tuning_share=np.inf,
        moved_own_low=own_low,
        moved_own_high=own_high,
    )


def driven(problem: Problem, seed: int) -> Problem:
    """Return the problem with a drive and ratings of which some bind, by the seed alone."""
    rng = np.random.default_rng(seed + 2 * 10**6)
    pick = lambda *choices: choices[int(rng.integers(0, len(choices)))]  # noqa: E731
    kind = pick("power", "voltage", "current")
    omega = 2 * np.pi * problem.frequency
    reactance = float(np.median(1 / (omega * problem.wanted)))
    volts = pick(30.0, 70.0, 100.0)
    amount = {"power": volts**2 / 200 / reactance, "voltage": volts, "current": volts / 100 / reactance}[kind]
    acting = np.array([float(value) for value in problem.part_value])
    usual = 70.0 * float(omega.mean()) * float(np.median(acting)) / np.sqrt(2.0)

    def ratings(count: int, middle: float, without: float) -> np.ndarray:
        drawn = middle * rng.choice([0.4, 0.7, 1.0, 1.5, 3.0], count)
        return np.where(rng.random(count) < without, np.inf, drawn)

    parts = len(problem.part_value)
    modulation = pick(0.0, 0.0, 1.0)
    return replace(
        problem,
        drive=Drive(
            kind=kind,
            amount=amount,
            crest=1 + modulation,
            effective=np.sqrt((1 + modulation**2 / 2) / 2),
            part_voltage=np.append(ratings(parts, 100.0, 0.3), np.inf),
            part_current=np.append(ratings(parts, usual, 0.3), np.inf),
            part_capacitance=np.append(acting * pick(1.0, 0.99), 1.0),
            coil_current=ratings(problem.coils, 2 * usual, 0.6),
            trimmer_voltage=ratings(problem.bands, 150.0, 0.8),
            element_voltage=float(ratings(1, 100.0, 0.5)[0]),
        ),
    )


def random_swept_problem(seed: int, *, bands: int, swept: int, **shape: object) -> Problem:
    """Return a problem whose first `swept` bands are swept by one variable capacitor, by the seed alone.

    Each coil is made for a design drawn at random, a little tighter or wider than it takes.
    """
    plain = random_problem(seed, bands=bands, **shape)
    rng = np.random.default_rng(seed + 10**6)
    pick = lambda *choices: choices[int(rng.integers(0, len(choices)))]  # noqa: E731
    coils = plain.coils
    tuning = pick((5e-12, 40e-12), (12e-12, 150e-12), (3e-12, 15e-12))
    margin = pick(0.0, 0.01, 0.03)
    lead_inductance = pick(0.0, 0.0, 30e-9)
    low_end, wanted = plain.frequency.copy(), plain.wanted.copy()
    inductance_low = plain.inductance_high.copy()
    which = np.arange(bands) < swept
    for band in np.flatnonzero(which):
        values = plain.species[band]
        fixed = plain.fixed_capacitance()[:, band]
        for coil in rng.permutation(coils):
            least, most = tuning
            if plain.most_parts and rng.random() < 0.6:
                padder = rng.choice(values)
                least, most = (t * padder / (t + padder) for t in tuning)
            across = rng.choice(values) * rng.integers(0, 2) + fixed[coil]
            wanted[coil, band] = (least + across) * (1 + margin) ** 2 * rng.uniform(1.0, 1.08)
            ratio = np.sqrt((most + across) / (least + across) * rng.uniform(0.75, 0.95))
            low_end[band] = plain.frequency[band] * min(0.97, (1 + margin) / (1 - margin) / ratio)
        inductance_low[:, band] = rng.uniform(1.0, 1.004, coils) / (
            (2 * np.pi * plain.frequency[band]) ** 2 * wanted[:, band]
        )
    nominal = np.array([float(plain.part_value[options[0]]) for options in plain.options])
    leads = (1 / nominal[0] - 1 / plain.species[0, 0]) / (2 * np.pi * plain.frequency[0]) ** 2
    values_low = acting(nominal, leads, low_end) if leads > 1e-12 else plain.species
    return replace(
        plain,
        wanted=wanted,
        swept=which,
        low_end=low_end,
        margin=margin,
        tuning_low=np.where(which, tuning[0], 0.0),
        tuning_high=np.where(which, tuning[1], 0.0),
        tuning_loss=np.full(bands, pick(0.0, 1 / 500, 1 / 500, 1 / 500, np.nan)),
        tuning_tempco=np.full(bands, pick(0.0, 100e-6)),
        inductance_low=inductance_low,
        coil_loss_low=plain.coil_loss * rng.uniform(0.8, 1.2, plain.coil_loss.shape),
        species_low=values_low * pick(1.0, 1.0, 0.998),
        part_loss_low=plain.part_loss * pick(1.0, 0.5),
        excess_limit=pick(np.inf, np.inf, np.inf, 0.8),
        lead_inductance=lead_inductance,
        in_play=plain.in_play | which,
        tuning_share=0.7 if seed % 8 == 3 else np.inf,
    )
