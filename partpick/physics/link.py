"""A link wound over the cold end of a single layer: its own inductance, and what it has in common with the coil."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from partpick.physics.filaments import mutual_inductance
from partpick.physics.solenoid import solenoid_family

FloatArray = NDArray[np.float64]


class Links(NamedTuple):
    """Links of 1, 2, ... turns over one coil.

    Parameters
    ----------
    inductance : (n,) array
        Of the link. [H]
    mutual : (n,) array
        Between link and coil. [H]
    """

    inductance: FloatArray
    mutual: FloatArray


def links_over_solenoid(turns: int, diameter: float, link_diameter: float, wire: float, pitch: float) -> Links:
    """Return the links of 1 to `turns` turns that lie turn over turn on one end of a single layer.

    Parameters
    ----------
    turns : int
        Of the coil, above 0. [-]
    diameter : float
        Mean diameter of the coil. [m]
    link_diameter : float
        Mean diameter of the link, above that of the coil. [m]
    wire : float
        Bare wire diameter, of both. [m]
    pitch : float
        From turn to turn, of both. [m]

    Returns
    -------
    links : Links
        Inductance and mutual inductance, (turns,) each. [H]

    Notes
    -----
    Every turn is taken as a thin ring, as J. C. Maxwell does; at low frequency, in air. The wire's thickness does
    not enter the mutual inductance to first order.

    References
    ----------
    J. C. Maxwell, A Treatise on Electricity and Magnetism, vol. 2, 1873, section 701, summed over all pairs.
    """
    place = np.arange(turns) * pitch
    each = mutual_inductance(diameter / 2, link_diameter / 2, place[:, None] - place[None, :])
    return Links(solenoid_family(turns, link_diameter, wire, pitch), np.cumsum(each.sum(axis=0)))
