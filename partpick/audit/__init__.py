"""A second look at every result before it is shown: figures, limits and order from the result alone.

Shares no formula and no code with the search or the assessment; only the types and the catalogue are common.
"""

from __future__ import annotations

from partpick.audit.ladder import ladder_faults
from partpick.audit.limits import limit_faults
from partpick.audit.places import proof_faults, rank_faults
from partpick.audit.stock import stock_faults
from partpick.audit.tally import tally_faults
from partpick.audit.tank import band_faults
from partpick.errors import InternalError
from partpick.parts import Catalogue
from partpick.result import Candidate, Result

__all__ = ["audit", "faults_of"]


def audit(result: Result, catalogue: Catalogue) -> Result:
    """Return the result as it is, if it holds against its request and its own figures.

    Parameters
    ----------
    result : Result
        What is about to be shown.
    catalogue : Catalogue
        The parts that it was picked from; their quantities are held against what is used.

    Raises
    ------
    InternalError
        A figure, a count, a limit or the order does not hold: the result is not shown.
    """
    faults = faults_of(result, catalogue)
    if faults:
        more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
        raise InternalError(f"internal error: {faults[0]}{more}; nothing is shown, please report this plan")
    return result


def faults_of(result: Result, catalogue: Catalogue) -> list[str]:
    """Return everything that does not hold, in words; nothing where all is well."""
    faults = []
    for candidate in (*result.candidates, *result.front):
        faults += [f"{_name(candidate)}: {fault}" for fault in _candidate_faults(result, candidate, catalogue)]
    return [*faults, *rank_faults(result), *proof_faults(result)]


def _candidate_faults(result: Result, candidate: Candidate, catalogue: Catalogue) -> list[str]:
    request = result.request
    return [
        *tally_faults(candidate, request),
        *(fault for band in candidate.bands for fault in band_faults(candidate, band, request)),
        *limit_faults(candidate, request),
        *ladder_faults(candidate, request),
        *stock_faults(candidate, request.units, catalogue),
    ]


def _name(candidate: Candidate) -> str:
    return "a plan on the front" if candidate.rank is None else f"rank {candidate.rank}"
