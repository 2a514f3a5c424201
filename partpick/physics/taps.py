"""Part of a single-layer coil: its own inductance, and what it shares with the rest of the coil."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


class TappedSection(NamedTuple):
    """Inductances of a coil in two parts.

    Parameters
    ----------
    section : float or (n,) array
        Of the section alone: what it shows with the rest open. [H]
    rest : float or (n,) array
        Of the other turns in series; 0 where there are none. [H]
    mutual : float or (n,) array
        Between the section and the rest. [H]
    total : float or (n,) array
        Of the whole coil. [H]
    """

    section: FloatArray
    rest: FloatArray
    mutual: FloatArray
    total: FloatArray

    @property
    def coupling(self) -> FloatArray:
        """Coupling factor of section and rest, 0 where there is no rest, without unit."""
        product = np.sqrt(self.section * self.rest)
        return np.divide(self.mutual, product, out=np.zeros_like(product), where=product > 0.0)[()]

    @property
    def rest_shorted(self) -> FloatArray:
        """Inductance of the section with the other turns shorted on themselves, in henry."""
        rest = np.asarray(self.rest, float)
        lost = np.divide(self.mutual**2, rest, out=np.zeros_like(rest), where=rest > 0.0)
        result: FloatArray = (self.section - lost)[()]
        return result

    @property
    def voltage_ratio(self) -> FloatArray:
        """Voltage over the section for one volt over the whole coil, nothing drawn at the tap, without unit."""
        return (self.section + self.mutual) / self.total


def tapped_section(family: ArrayLike, section_turns: ArrayLike, first_turn: ArrayLike = 0) -> TappedSection:
    """Return the inductances of a section of a coil and of the rest of it.

    Parameters
    ----------
    family : (N,) array
        Low-frequency inductance of 1 ... N turns of the same make (`solenoid.solenoid_family`); the coil
        has all N turns. [H]
    section_turns : int or (n,) array
        Turns of the section, 1 to N. [-]
    first_turn : int or (n,) array
        Turns between the coil's end and the section; broadcasts. [-]

    Returns
    -------
    parts : TappedSection
        Section, rest, mutual and total inductance, each a float or (n,) array. [H]

    Raises
    ------
    ValueError
        If the section does not lie within the coil.

    Notes
    -----
    Neighbouring groups of p and q turns of one coil have 2 M = L(p + q) - L(p) - L(q), exactly. Neither
    n/N nor (n/N)^2 of the whole is right: a quarter of the turns often has a seventh of the inductance.

    References
    ----------
    E. B. Rosa and F. W. Grover, Bull. Bur. Stand. 8 (1912) 1-237 (mutual inductance from self-inductances);
    tests/published/tapped_solenoid.csv.
    """
    of_turns = np.concatenate([[0.0], np.asarray(family, float)])
    whole = len(of_turns) - 1
    section, before = np.asarray(section_turns, np.intp), np.asarray(first_turn, np.intp)
    after = whole - before - section
    if np.any(section < 1) or np.any(before < 0) or np.any(after < 0):
        raise ValueError(f"a section must lie within the coil's {whole} turns")
    own, total = of_turns[section], of_turns[whole]
    below = of_turns[before + section] - of_turns[before] - own
    above = of_turns[whole - before] - of_turns[after] - own
    mutual = (below + above) / 2.0
    rest = np.where(section == whole, 0.0, total - own - 2.0 * mutual)
    return TappedSection(own, rest[()], np.where(section == whole, 0.0, mutual)[()], total)
