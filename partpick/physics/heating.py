"""What the loss of a part does to it: estimates of the temperature rise, and the flux density in a ring core."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

SURFACE_COOLING = 10.0  # W/(m2 K), still air with radiation from a dull surface; common practice, no source
SMALL_CAPACITOR = 100.0  # K/W, a ceramic or mica capacitor on its leads in still air; common practice, no source
RISE_FACTOR = 2.0  # either estimate holds within this factor, either way; common practice, no source
USUAL_FLUX = 15e-3  # T at 1 MHz, falling with the square root of the frequency; common practice, from memory


def surface_rise(power: ArrayLike, surface: ArrayLike, cooling: ArrayLike = SURFACE_COOLING) -> FloatArray:
    """Return the steady temperature rise of a body that gives its heat off by its surface.

    Parameters
    ----------
    power : float or (n,) array
        Heat. [W]
    surface : float or (n,) array
        Of the body, taken as smooth. [m2]
    cooling : float or (n,) array
        Heat given off by area and kelvin. [W/(m2 K)]

    Returns
    -------
    rise : float or (n,) array
        P/(h A) above the air around. [K]

    Notes
    -----
    An estimate within a factor of two: h is 5 to 20 W/(m2 K) in still air, more on small bodies, less in a
    closed box. Common practice, no source.

    References
    ----------
    Newton's law of cooling.
    """
    result: FloatArray = np.asarray(power, float) / (np.asarray(cooling, float) * np.asarray(surface, float))
    return result


def winding_surface(mean_diameter: ArrayLike, winding_length: ArrayLike) -> FloatArray:
    """Return the outer surface of a winding as that of a cylinder without its bore.

    Parameters
    ----------
    mean_diameter : float or (n,) array
        From wire centre to wire centre. [m]
    winding_length : float or (n,) array
        [m]

    Returns
    -------
    surface : float or (n,) array
        pi D (l + D/2). [m2]

    Notes
    -----
    Exact for a plain cylinder; air through an open coil cools it better.

    References
    ----------
    Geometry.
    """
    diameter = np.asarray(mean_diameter, float)
    result: FloatArray = np.pi * diameter * (np.asarray(winding_length, float) + diameter / 2.0)
    return result


def bulk_surface(volume: ArrayLike) -> FloatArray:
    """Return the surface of a cube of a volume, for bodies of which no more is known.

    Parameters
    ----------
    volume : float or (n,) array
        [m3]

    Returns
    -------
    surface : float or (n,) array
        6 V^(2/3). [m2]

    Notes
    -----
    Within a fifth for a ball, some tenths below the surface of a flat ring.

    References
    ----------
    Geometry.
    """
    result: FloatArray = 6.0 * np.asarray(volume, float) ** (2.0 / 3.0)
    return result


def peak_flux_density(voltage: ArrayLike, frequency: ArrayLike, turns: ArrayLike, area: ArrayLike) -> FloatArray:
    """Return the peak flux density in a core whose winding has a sine voltage across it.

    Parameters
    ----------
    voltage : float or (n,) array
        Peak. [V]
    frequency : float or (n,) array
        [Hz]
    turns : float or (n,) array
        [-]
    area : float or (n,) array
        Cross-section of the core. [m2]

    Returns
    -------
    flux_density : float or (n,) array
        V/(2 pi f N A). [T]

    Notes
    -----
    The mean over the section; a third or so more at the bore of a ring. For a sine, below the core's own loss
    peak, all flux in the core.

    References
    ----------
    Faraday's law of induction.
    """
    linked = np.asarray(turns, float) * np.asarray(area, float)
    result: FloatArray = np.asarray(voltage, float) / (2.0 * np.pi * np.asarray(frequency, float) * linked)
    return result


def usual_flux_density(frequency: ArrayLike) -> FloatArray:
    """Return the peak flux density up to which small powder and ferrite rings are driven.

    Parameters
    ----------
    frequency : float or (n,) array
        0.1 to 30 MHz. [Hz]

    Returns
    -------
    flux_density : float or (n,) array
        15 mT sqrt(1 MHz/f). [T]

    Notes
    -----
    Heat, not saturation, sets it, so that it is no rating; the range is 0.1 to 30 MHz, in still air.

    References
    ----------
    Common practice, no source; from memory.
    """
    result: FloatArray = USUAL_FLUX * np.sqrt(1e6 / np.asarray(frequency, float))
    return result
