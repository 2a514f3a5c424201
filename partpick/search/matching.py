"""Loads on a capacitive divider: which networks bring a load across the tank as the loaded Q that is wanted."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.search.divided import load_across

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
_ROUNDING = 1e-12


@dataclass(frozen=True, kw_only=True, eq=False)
class Matching:
    """Of each band the load on its divider and the loaded Q that it may leave, (B,) each."""

    conductance: Floats  # S, 0: a band without a divider
    least_q: Floats  # 0: none
    most_q: Floats  # inf: none
    unknown_passes: bool = False  # an unknown loss counts as none; else it is never inside a limit

    @property
    def divided(self) -> Bools:
        """Which bands have a divider, (B,)."""
        return np.asarray(self.conductance > 0)


def matched(
    matching: Matching, band: int, values: Floats, load: float, inductance: float, total: Floats, loss: Floats
) -> Bools:
    """Return which networks leave a loaded Q inside the limits of a band, (m,).

    Parameters
    ----------
    matching : Matching
        The load.
    band : int
        Which band. [-]
    values : (m, k) array
        Capacitance of each part as it acts at the band, the divider first. [F]
    load : float
        The load's conductance over the angular frequency. [F]
    inductance : float
        Of the coil. [H]
    total : (m,) array
        All capacitance in circuit, the load on. [F]
    loss : (m,) array
        1/Q without the load, nan: unknown. [-]
    """
    if not matching.divided[band] or not len(total):
        return np.ones(len(total), dtype=np.bool_)
    across = matching.conductance[band] * load_across(values[:, 0], values[:, 1], load)
    own = np.nan_to_num(loss) if matching.unknown_passes else loss
    loaded = 1.0 / (own + np.sqrt(inductance / total) * across)
    above = loaded >= matching.least_q[band] * (1 - _ROUNDING)
    return np.asarray(above & (loaded <= matching.most_q[band] * (1 + _ROUNDING)))
