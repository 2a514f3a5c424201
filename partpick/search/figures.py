"""Columns: networks of one coil at one band with the figures by which plans are ordered.

The figures are whole numbers, so that ranks agree across machines.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from partpick.search.divided import NO_DEVICE, OWN_PARTS, Device, divided_weights
from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED
from partpick.search.problem import Floats, Ints


@dataclass(frozen=True, eq=False)
class Columns:
    """Networks of known grades for one (coil, band), (m,) each; `parts` is padded with -1."""

    coil: Ints
    parts: Ints  # (m, most parts), the parallel network first, then the series padder
    series: Ints  # the part that is the series padder, -1: none
    tap: Ints  # turns of the section in use, 0: the whole coil
    shape: NDArray[np.int8]
    network: Floats  # F, effective
    error: Floats  # signed fraction; 0 for a swept band
    excess: Floats  # fraction of the band as asked; 0 for a fixed one
    pieces: Ints
    error_class: Ints  # round(max(|error|, floor) 1e9)
    fine_error: Ints  # round(max(|error|, 1e-9) 1e12)
    q_class: Ints
    stray_class: Ints
    reactance_class: Ints
    commonness: Ints
    error_rank: Ints  # round(|error| 1e9)
    price: Ints
    excess_class: Ints  # round(excess 1e9)
    fine_excess: Ints  # round(excess 1e12)
    trimmer: Ints = field(default_factory=lambda: np.empty(0, np.int64))  # which of those in stock, -1: none of them

    def __post_init__(self) -> None:
        """Fill what columns without a trimmer to choose leave out."""
        if len(self.trimmer) != len(self.network):
            object.__setattr__(self, "trimmer", np.full(len(self.network), -1, dtype=np.int64))

    def __len__(self) -> int:
        return len(self.network)

    def take(self, chosen: NDArray[np.generic]) -> Columns:
        """Return the columns chosen by a mask or an index array."""
        return Columns(*(getattr(self, name)[chosen] for name in self.__dataclass_fields__))

    @staticmethod
    def join(blocks: list[Columns]) -> Columns:
        """Return all columns of several blocks."""
        if len(blocks) == 1:
            return blocks[0]
        names = Columns.__dataclass_fields__
        return Columns(*(np.concatenate([getattr(b, name) for b in blocks]) for name in names))

    @staticmethod
    def empty(most_parts: int) -> Columns:
        """Return no columns, wide enough for `most_parts` parts."""
        whole, real = np.empty(0, np.int64), np.empty(0)
        figures = {name: whole for name in Columns.__dataclass_fields__}
        figures["parts"] = np.empty((0, max(1, most_parts)), np.int64)
        shape = np.empty(0, np.int8)
        return Columns(**{**figures, "shape": shape, "network": real, "error": real, "excess": real})  # type: ignore[arg-type]

    def network_parts(self, row: int) -> tuple[int, ...]:
        """Return the parts of the parallel network of one column, in the order of its shape. [-]"""
        used = [int(part) for part in self.parts[row] if part >= 0]
        return tuple(used[:-1] if self.series[row] >= 0 else used)

    def series_padder(self, row: int) -> int | None:
        """Return the part in series with the tuning element, None where there is none. [-]"""
        return int(self.series[row]) if self.series[row] >= 0 else None


def quality_class(loss: Floats, enough: Floats | float) -> Ints:
    """Return the steps of 25 % by which Q is below enough, 0 to 4; 5 where it is unknown.

    Parameters
    ----------
    loss : array
        1/Q, nan where unknown. [-]
    enough : array or float
        The Q that is enough. [-]
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        below = 1.0 - 1.0 / (loss * enough)
    steps = np.ceil(np.clip(below, 0.0, 1.0) / 0.25 - 1e-9)
    return np.where(np.isnan(loss), 5, np.nan_to_num(steps)).astype(np.int64)


def stray_class(share: Floats) -> Ints:
    """Return 0 up to 10 % of strays in the capacitance in circuit, 1 up to 20 %, else 2. [-]"""
    return np.where(share <= 0.1 * (1 + 1e-12), 0, np.where(share <= 0.2 * (1 + 1e-12), 1, 2)).astype(np.int64)


def coarse_error(error: Floats, floor: float) -> Ints:
    """Return the error class round(max(|error|, floor) 1e9). [-]"""
    return np.rint(np.maximum(np.abs(error), floor) * 1e9).astype(np.int64)


def fine_error(error: Floats) -> Ints:
    """Return round(max(|error|, 1e-9) 1e12); below 1e-9 all are equal. [-]"""
    return np.rint(np.maximum(np.abs(error), 1e-9) * 1e12).astype(np.int64)


def whole_excess(excess: Floats, grain: float) -> Ints:
    """Return round(excess / grain) with `grain` 1e-9 or 1e-12. [-]"""
    return np.rint(excess * (1.0 / grain)).astype(np.int64)


def padded(chosen: Ints, most_parts: int) -> Ints:
    """Return parts (m, k) filled up with -1 to (m, most parts)."""
    filled = np.full((len(chosen), max(1, most_parts)), -1, dtype=np.int64)
    filled[:, : chosen.shape[1]] = chosen
    return filled


def network_weights(
    part: Floats, shape: NDArray[np.int8], network: Floats, device: Device = NO_DEVICE
) -> Floats:
    """Return d ln(network) / d ln(part), (m, k): how much each part weighs in its network. [-]"""
    weights = np.zeros_like(part)
    for kind in OWN_PARTS:
        rows = shape == kind
        if rows.any():
            weights[rows] = divided_weights(part[rows], kind, network[rows], device)
    for kind in (PARALLEL, SERIES, SHUNTED, CHAINED):
        rows = shape == kind
        if not rows.any():
            continue
        c, net = part[rows], network[rows, None]
        if kind == PARALLEL:
            weights[rows] = c / net
        elif kind == SERIES:
            with np.errstate(divide="ignore", invalid="ignore"):
                weights[rows] = np.where(c > 0, net / c, 0.0)
        elif kind == SHUNTED:
            pair = c[:, 1:2] * c[:, 2:3] / (c[:, 1:2] + c[:, 2:3])
            weights[rows, :3] = np.concatenate([c[:, :1], pair**2 / c[:, 1:2], pair**2 / c[:, 2:3]], 1) / net
        else:
            pair = c[:, 1:2] + c[:, 2:3]
            weights[rows, :3] = np.concatenate(
                [net / c[:, :1], net * c[:, 1:2] / pair**2, net * c[:, 2:3] / pair**2], 1
            )
    return weights
