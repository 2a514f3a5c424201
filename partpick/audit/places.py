"""The order of the candidates, the front, and what the proof says of them."""

from __future__ import annotations

from collections.abc import Iterator

from partpick.result import Candidate, Result

FRONT_BELOW = 1.0  # an error of the whole frequency or more is nothing to choose by, and not on a front
GAIN = 1e-9  # by which a further piece must lower the figure that leads the front


def rank_faults(result: Result) -> Iterator[str]:
    """Yield candidates out of order, a front that does not fall, and candidates that the front overlooks."""
    for before, after in zip(result.candidates, result.candidates[1:], strict=False):
        if [name for name, _ in before.order] == [name for name, _ in after.order] and before.order:
            first, second = (tuple(figure for _, figure in c.order) for c in (before, after))
            if second < first:
                yield f"rank {after.rank} stands behind rank {before.rank} but its figures rank before it"
    if [c.rank for c in result.candidates] != list(range(1, len(result.candidates) + 1)):
        yield "the ranks are not 1, 2, 3 and so on"
    for fewer, more in zip(result.front, result.front[1:], strict=False):
        if more.piece_count <= fewer.piece_count or not _leads(more, fewer):
            yield f"the front has {more.piece_count} pieces after {fewer.piece_count} and gains nothing by them"
    yield from _overlooked(result)


def _overlooked(result: Result) -> Iterator[str]:
    """A candidate with a better figure than the front has for as few pieces."""
    if result.proof.status != "optimal" or not result.front:
        return
    for candidate in result.candidates:
        if candidate.worst_error is not None and candidate.worst_error >= FRONT_BELOW:
            continue
        within = [f for f in result.front if f.piece_count <= candidate.piece_count]
        if not within or all(_leads(candidate, f) for f in within):
            yield f"rank {candidate.rank} is better than the front with {candidate.piece_count} pieces"


def _leading(candidate: Candidate) -> float:
    """Return what leads the front: the worst error, the worst excess where every band is swept.

    Of a receiver it is the worst tracking error as a share of its limit.
    """
    tracking = candidate.extra.get("tracking")
    if isinstance(tracking, list):
        return max(float(entry["worst_error_hz"]) / float(entry["limit_hz"]) for entry in tracking)
    figure = candidate.worst_excess if candidate.worst_error is None else candidate.worst_error
    return 0.0 if figure is None else figure


def _leads(one: Candidate, other: Candidate) -> bool:
    """Whether one is better than another by more than rounding."""
    return _leading(one) < _leading(other) - GAIN


def proof_faults(result: Result) -> Iterator[str]:
    """Yield a status or a bound that the candidates contradict."""
    proof = result.proof
    if proof.status == "optimal" and not result.candidates:
        yield "the proof says optimal of nothing"
    if proof.status in ("infeasible", "unknown") and result.candidates:
        yield f"the proof says {proof.status} of {len(result.candidates)} candidates"
    if proof.status not in ("optimal", "infeasible") and proof.stopped_by is None:
        yield f"the proof says {proof.status} and nothing stopped it"
    for stage in proof.stages:
        if stage.bound is not None and stage.value is not None and stage.bound > stage.value + GAIN:
            yield f"{stage.objective} {stage.value:.9g} is below its bound {stage.bound:.9g}"
    pieces = next((s.bound for s in proof.stages if s.objective == "pieces"), None)
    if result.request.by == "build" and pieces is not None:
        for candidate in (*result.candidates, *result.front):
            if candidate.piece_count < pieces:
                yield f"{candidate.piece_count} pieces are below the bound {pieces}"
