"""A direct CP-SAT model of a small pair, coil and capacitors as variables, against the look-up of the product.

The model is the plainest that can be written: L as a whole number of picohenry, C of femtofarad, their
product in a window. It has nothing in common with the windows and tables of the search.
"""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import workbench
from ortools.sat.python import cp_model

from partpick.catalogue import load_catalogue
from partpick.planfile import request_from_tables
from partpick.report.result_json import result_json
from partpick.solving import solve

PICOHENRY, FEMTOFARAD = 1e-12, 1e-15
STRAY = 5000  # fF, the default of pair
E12 = (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)  # IEC 60063
# Values of whole picohenry and femtofarad, so that the model's figures are those of the parts exactly.


def small_pair(seed: int, folder: Path) -> tuple[float, list[int], list[int], int, str, dict[str, Any]]:
    """Return frequency, inductances (pH), capacitances (fF), most parts, connection and the product's answer."""
    rng = np.random.default_rng(seed)
    inductances = sorted({int(v) * 10 ** int(rng.integers(4, 6)) for v in rng.choice(E12, 4)})
    capacitances = sorted({int(v) * 10 ** int(rng.integers(3, 5)) for v in rng.choice(E12, 5)})
    most, connect = (3, "parallel") if seed % 2 else (2, "any")
    frequency = float(round(rng.uniform(3e6, 20e6), -3))
    drawer = workbench.write_drawer(
        folder,
        capacitors=[{"value": f"{c / 1000:g} pF", "grade": "C0G", "q": 1000} for c in capacitances],
        inductors=[{"value": f"{L / 1e6:g} µH", "q": 100, "self_capacitance": 0} for L in inductances],
        formers=(),
    )
    tables = {
        "limits": {"error": "20 %", "parts_per_band": most},
        "capacitors": {"connect": connect},
        "stray": {"share": "none"},
        "band": [{"at": frequency}],
    }
    request = request_from_tables(tables, "pair", by="error")
    result = json.loads(result_json(solve(request, load_catalogue(drawer))))
    return frequency, inductances, capacitances, most, connect, result


class DirectModel:
    """Coil, networks and their product in one model; feasible inside an error and a number of parts."""

    def __init__(self, inductances: list[int], capacitances: list[int], most: int, connect: str) -> None:
        self.model = cp_model.CpModel()
        self.pieces: cp_model.LinearExprT
        if connect == "parallel":
            count = [self.model.new_int_var(0, most, "") for _ in capacitances]
            self.pieces = sum(count)
            network = sum(c * n for c, n in zip(capacitances, count, strict=True))
            self.model.add(self.pieces >= 1)
            self.model.add(self.pieces <= most)
        else:
            network = self._one_or_two(capacitances)
        self.total = self.model.new_int_var(1, 10**7, "")  # fF
        self.model.add(self.total == network + STRAY)
        coil = self.model.new_int_var_from_domain(cp_model.Domain.from_values(inductances), "")
        self.product = self.model.new_int_var(1, 10**16, "")  # pH fF
        self.model.add_multiplication_equality(self.product, [coil, self.total])

    def _one_or_two(self, capacitances: list[int]) -> cp_model.LinearExprT:
        """Choose one capacitor, or two in parallel or in series; series values to the nearest femtofarad."""
        rows = [(1, c) for c in capacitances]
        for i, a in enumerate(capacitances):
            for b in capacitances[i:]:
                rows += [(2, a + b), (2, round(a * b / (a + b)))]
        picks = [self.model.new_bool_var("") for _ in rows]
        self.model.add_exactly_one(picks)
        self.pieces = sum(n * pick for (n, _), pick in zip(rows, picks, strict=True))
        return sum(c * pick for (_, c), pick in zip(rows, picks, strict=True))

    def feasible(self, frequency: float, error: float, pieces: int) -> bool:
        """Whether some coil and at most `pieces` capacitors are within the error."""
        trial = self.model.clone()
        wanted = 1 / (2 * math.pi * frequency) ** 2 / (PICOHENRY * FEMTOFARAD)
        product = trial.get_int_var_from_proto_index(self.product.index)
        low, high = math.ceil(wanted / (1 + error) ** 2), math.floor(wanted / (1 - error) ** 2)
        trial.add_linear_constraint(product, low, high)
        trial.add(self.pieces <= pieces)
        solver = cp_model.CpSolver()
        solver.parameters.num_workers = 1
        status = solver.solve(trial)
        assert status in (cp_model.OPTIMAL, cp_model.FEASIBLE, cp_model.INFEASIBLE)
        return status != cp_model.INFEASIBLE


@pytest.mark.parametrize("seed", range(24))
def test_the_look_up_agrees_with_a_direct_model(tmp_path: Path, seed: int) -> None:
    """At each step of the front the model finds something just above its error, and nothing just below."""
    frequency, inductances, capacitances, most, connect, result = small_pair(seed, tmp_path / "drawer")
    model = DirectModel(inductances, capacitances, most, connect)
    front = {entry["part_count"]: entry["worst_error_ppm"] / 1e6 for entry in result["front"]}
    least = math.inf
    slack = 1e-6 if connect == "parallel" else 1e-4  # of a series value to the nearest femtofarad
    for pieces in range(1, most + 1):
        least = min(least, front.get(pieces, math.inf))
        if least == math.inf:
            assert not model.feasible(frequency, 0.2 * (1 - slack), pieces)
            continue
        assert model.feasible(frequency, least + slack, pieces)
        if least > slack:
            assert not model.feasible(frequency, least - slack, pieces)


def test_the_sample_of_the_direct_model_holds_answers(tmp_path: Path) -> None:
    """Agreement on refusals alone would prove little."""
    fronts = [len(small_pair(seed, tmp_path / "drawer")[-1]["front"]) for seed in range(24)]
    assert sum(steps > 0 for steps in fronts) > 12 and max(fronts) > 1
