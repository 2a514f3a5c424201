"""All windings of the shipped catalogue with L, Q and self-capacitance, against the plain current sheet.

Run: python tests/bench/bench_windings.py. The current sheet has the exact Nagaoka coefficient by scipy's
elliptic integrals, on the same rows: one formula a row, no wire, no loss, no self-capacitance.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ellipe, ellipk

from partpick.candidates import Coils, realisable_coils
from partpick.catalogue import load_catalogue
from partpick.planfile import request_from_tables

RUNS = 7
Floats = NDArray[np.float64]


def least(run: Callable[[], object]) -> float:
    """Return the seconds of processor time of the fastest of several runs."""
    times = []
    for _ in range(RUNS):
        start = time.process_time()
        run()
        times.append(time.process_time() - start)
    return min(times)


def current_sheet(turns: Floats, diameter: Floats, length: Floats) -> Floats:
    """Return mu0 pi N^2 d^2 / (4 l) times the Nagaoka coefficient. [H]"""
    square = length**2 + diameter**2
    m = diameter**2 / square
    first, second = ellipk(m), ellipe(m)
    ratio = (length / diameter) ** 2
    nagaoka = 4 / (3 * np.pi * np.sqrt(1 - m)) * (ratio * (first - second) + second - np.sqrt(m))
    return np.pi**2 * 1e-7 * (turns * diameter) ** 2 / length * nagaoka


def main() -> None:
    """Print the table."""
    catalogue = load_catalogue(None)
    limits_off = {"self_resonance": "none", "proportions": "none"}
    print(f"{'':40}{'rows':>8}{'seconds':>10}{'ratio':>8}{'a row, ns':>12}")
    for forms in (["solenoid"], None):
        coil = limits_off if forms is None else {"forms": forms, **limits_off}
        request = request_from_tables({"coil": coil, "band": [{"at": 7.1e6}]}, "pair")
        request = replace(request, coil=replace(request.coil, least_wound=0.0))
        every: Coils = realisable_coils(request, catalogue)
        block = next(block for block in every.blocks if block.form == "solenoid")
        rows = np.resize(np.arange(len(block.turns)), len(every))  # as many rows as there are coils
        turns, diameter, length = (
            np.asarray(each, float)[rows] for each in (block.turns, block.mean_diameter, block.winding_length)
        )
        sheet = current_sheet(turns, diameter, length)
        near = (length > diameter / 2) & (turns >= 10)
        assert np.allclose(sheet[near], block.inductance_dc[rows][near], rtol=0.25), "not the same coils"
        plain = least(lambda: current_sheet(turns, diameter, length))  # noqa: B023
        ours = least(lambda: realisable_coils(request, catalogue))  # noqa: B023
        name = "single-layer windings" if forms else "all windings and bought inductors"
        for text, seconds in (("current sheet, exact Nagaoka", plain), (name, ours)):
            each = seconds / len(every) * 1e9
            print(f"{text:40}{len(every):8}{seconds:10.4f}{seconds / plain:8.1f}{each:12.0f}")


if __name__ == "__main__":
    main()
