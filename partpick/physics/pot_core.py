"""The winding space of a pot core, from its outer sizes."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# Inner wall, centre post and window height over outer diameter and height: means of the sizes 14x8 to 26x16
# of IEC 60133, from memory; each size within 3 %. Walls of the winding's own former: common practice.
_WALL: Final = 0.82
_POST: Final = 0.43
_WINDOW: Final = 0.68
_FORMER_WALL: Final = 0.5e-3


class PotWindow(NamedTuple):
    """The room that a pot core leaves for a winding, its former taken off.

    Parameters
    ----------
    inner_diameter : float or (n,) array
        Over the former's tube, where the first layer lies. [m]
    width : float or (n,) array
        Along the axis. [m]
    depth : float or (n,) array
        From the innermost to the outermost layer. [m]
    """

    inner_diameter: FloatArray
    width: FloatArray
    depth: FloatArray


def pot_window(outer_diameter: ArrayLike, height: ArrayLike) -> PotWindow:
    """Return the winding space of a pot core of the usual proportions.

    Parameters
    ----------
    outer_diameter : float or (n,) array
        Outer diameter of the core. [m]
    height : float or (n,) array
        Height of both halves together. [m]

    Returns
    -------
    window : PotWindow
        Inner diameter, width and depth, each a float or (n,) array; nothing is below 0. [m]

    Notes
    -----
    Inner wall 0.82, centre post 0.43 of the diameter, window 0.68 of the height; the former takes 0.5 mm on
    each of its sides, and as much stays free towards the core. Winding areas of printed data within 15 %,
    tests/published/pot_window.csv.

    References
    ----------
    IEC 60133, Dimensions of pot-cores made of magnetic oxides, from memory.
    """
    outer, high = np.asarray(outer_diameter, float), np.asarray(height, float)
    inner = _POST * outer + 2.0 * _FORMER_WALL
    width = np.maximum(_WINDOW * high - 2.0 * _FORMER_WALL, 0.0)
    depth = np.maximum((_WALL * outer - inner) / 2.0 - _FORMER_WALL, 0.0)
    return PotWindow(inner_diameter=inner[()], width=width[()], depth=depth[()])
