"""Why a candidate stands where it does, in words.

The step of the order that decides against its neighbours, limits that are near, what more pieces would buy,
what tolerance makes of it, and what the neighbours' coils would cost.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from partpick.errors import RequestError
from partpick.quantities import format_percent
from partpick.report.bands_table import share_of_strays, worst_q
from partpick.report.charts import spread_of
from partpick.report.sensitivity_table import sensitivity_table
from partpick.report.text import figure, plural, quantity, signed_percent, wrapped
from partpick.report.tracking import worst_tracking
from partpick.request import Request
from partpick.result import BandFigures, Candidate, Result

NEAR = 0.9  # of a limit: near enough to be told
_BEFORE = "bought parts, then rings up to 30 turns, tubes up to 40, then the rest"


def reasons(result: Result, rank: int) -> str:
    """Return why the candidate of a rank stands there, in lines of at most 80 columns.

    Parameters
    ----------
    result : Result
        The whole answer.
    rank : int
        Which candidate, from 1. [-]

    Raises
    ------
    RequestError
        There is no candidate of that rank.
    """
    shown = {candidate.rank: candidate for candidate in result.candidates}
    if rank not in shown:
        most = len(result.candidates)
        raise RequestError(
            f"--why {rank}: there is no such rank; {f'1 to {most} can be asked for' if most else 'nothing fits'}"
        )
    candidate = shown[rank]
    lines = [*wrapped(f"Why rank {rank} stands where it does")]
    told = [_pieces(candidate)]
    if rank > 1:
        told.append(_against(result, candidate, shown[rank - 1], behind=True))
    if rank + 1 in shown:
        told.append(_against(result, candidate, shown[rank + 1], behind=False))
    elif rank == len(shown):
        told.append("It is the last that is shown; --top shows more.")
    told += [_limits(result.request, candidate), _more_pieces(result, candidate), _tolerance(candidate)]
    told += _other_coils(result, candidate)
    for text in told:
        lines += wrapped(text, 2, 2) if text else []
    contributions = sensitivity_table(candidate)
    lines += ["", *contributions] if contributions else []
    return "\n".join(lines) + "\n"


def _pieces(candidate: Candidate) -> str:
    capacitors = plural(candidate.part_count, "capacitor") if candidate.part_count else "no capacitor"
    made = f"{capacitors} and {plural(candidate.inductor_count, 'coil')}"
    return f"It takes {plural(candidate.piece_count, 'piece')}: {made}."


# ---------------------------------------------------------------- the step that decides


def _against(result: Result, candidate: Candidate, other: Candidate, behind: bool) -> str:
    """Return the first step of the order in which two candidates differ."""
    first, second = (other, candidate) if behind else (candidate, other)
    step = next(
        (
            (name, ahead, after)
            for (name, ahead), (_, after) in zip(first.order, second.order, strict=False)
            if ahead != after
        ),
        None,
    )
    where = f"Rank {other.rank} is {'before' if behind else 'after'} it"
    if not first.order or not second.order:
        return ""
    if step is None:
        return f"{where} by name alone: every step of the order is equal."
    reason = _STEPS.get(step[0], _plain)(_Step(result, step[0], step[1], step[2], first, second))
    return f"{where} by {reason}"


@dataclass(frozen=True)
class _Step:
    """A step of the order at which two candidates part: its name, both figures, both candidates."""

    result: Result
    name: str
    ahead: object
    after: object
    first: Candidate
    second: Candidate


def _plain(step: _Step) -> str:
    return f"{step.name.replace('_', ' ')}: {step.ahead} against {step.after}."


def _by_pieces(step: _Step) -> str:
    return f"pieces: {step.first.piece_count} against {step.second.piece_count}."


def _by_error(step: _Step) -> str:
    ahead, after = (_size(c.worst_error) for c in (step.first, step.second))
    if step.name == "error_class":
        reason = f"the worst error: {ahead} against {after}."
        best, floor = step.first.worst_error, step.result.floor
        if best is None or best > floor:
            return reason
        return f"{reason[:-1]}; below {format_percent(floor, 2)} all count as equal."
    return f"the worst error, all coarser steps being equal: {ahead} against {after}."


def _by_excess(step: _Step) -> str:
    ahead, after = (
        "none" if c.worst_excess is None else format_percent(c.worst_excess) for c in (step.first, step.second)
    )
    return f"the overshoot of the tuned ranges: {ahead} against {after}."


def _overshoot(candidate: Candidate) -> str:
    """Return the worst excess in words, "" where no band is swept or where the tracking error leads."""
    if candidate.worst_excess is None or worst_tracking(candidate):
        return ""
    return format_percent(candidate.worst_excess, 3)


def _by_q(step: _Step) -> str:
    ahead, after = (figure(worst_q(c)) for c in (step.first, step.second))
    return f"least Q, in steps of 25 % below enough: {ahead} against {after}."


def _by_strays(step: _Step) -> str:
    ahead, after = (_strays(c) for c in (step.first, step.second))
    return f"strays, in classes up to 10 %, up to 20 % and more: {ahead} against {after}."


def _by_reactance(step: _Step) -> str:
    return f"reactance: {step.ahead} against {step.after} octaves begun outside the usual window in the worst band."


def _by_effort(step: _Step) -> str:
    ahead, after = step.ahead, step.after
    assert isinstance(ahead, tuple) and isinstance(after, tuple)
    if ahead[0] != after[0]:
        return f"the kind of winding, rank {step.first.rank} the easier: {_BEFORE}."
    if ahead[1] != after[1]:
        return f"wire: {ahead[1]} against {plural(after[1], 'coil')} with wire outside 0.3 to 1.0 mm."
    return f"the size of the coils, in steps of 25 %: rank {step.first.rank} has the smaller."


def _by_commonness(step: _Step) -> str:
    return f"capacitor values: rank {step.first.rank} has the commoner (E6 before E12 before E24)."


def _by_price(step: _Step) -> str:
    ahead, after = ("unknown" if c.price is None else f"{c.price:.2f}" for c in (step.first, step.second))
    return f"price: {ahead} against {after}."


def _by_tracking(step: _Step) -> str:
    ahead, after = (worst_tracking(candidate) for candidate in (step.first, step.second))
    return f"the worst tracking error: {ahead} against {after}."


def _by_forms(step: _Step) -> str:
    return f"the kind of winding, rank {step.first.rank} the easier: {_BEFORE}."


def _by_wires(step: _Step) -> str:
    return "wire: fewer coils with wire outside 0.3 to 1.0 mm."


def _by_volume(step: _Step) -> str:
    return f"the size of the coils, in steps of 25 %: rank {step.first.rank} has the smaller."


_STEPS: dict[str, Callable[[_Step], str]] = {
    "pieces": _by_pieces,
    "error_class": _by_error,
    "error_rank": _by_error,
    "fine_error": _by_error,
    "tracking": _by_tracking,
    "fine_tracking": _by_tracking,
    "excess_class": _by_excess,
    "fine_excess": _by_excess,
    "q_class": _by_q,
    "stray_class": _by_strays,
    "reactance_class": _by_reactance,
    "effort": _by_effort,
    "forms": _by_forms,
    "wires": _by_wires,
    "volume": _by_volume,
    "commonness": _by_commonness,
    "price": _by_price,
}


def _size(fraction: float | None) -> str:
    return "none" if fraction is None else signed_percent(abs(fraction)).lstrip("+")


def _strays(candidate: Candidate) -> str:
    known = [share for band in candidate.bands if (share := share_of_strays(band)) is not None]
    return format_percent(max(known), 2) if known else "none"


# ---------------------------------------------------------------- limits


def _limits(request: Request, candidate: Candidate) -> str:
    """Return the limits that are used up or nearly so, each with what is used."""
    near = [*_limits_of_plan(request, candidate), *_tracking_limits(candidate)]
    for band, asked in zip(candidate.bands, request.bands, strict=True):
        near += _limits_of_band(request, band, asked.q)
    if not near:
        return "No limit is near: all could be a tenth tighter and it would still be offered."
    return f"At or near a limit: {'; '.join(near)}."


def _limits_of_plan(request: Request, candidate: Candidate) -> list[str]:
    limits = request.limits
    counted = [
        ("inductors", candidate.inductor_count, limits.inductors if len(request.bands) > 1 else None),
        ("parts", candidate.part_count, limits.parts),
        ("values", candidate.value_count, limits.values),
        ("contacts", _contacts(candidate), limits.contacts),
    ]
    most = max((len(band.capacitors) for band in candidate.bands), default=0)
    if request.switching == "separate":
        counted.append(("parts_per_band", most, limits.parts_per_band))
    near = [f"{name} {used} of {limit}" for name, used, limit in counted if limit is not None and used >= limit]
    held = [
        abs(b.error)
        for b, asked in zip(candidate.bands, request.bands, strict=True)
        if b.error is not None and (limits.error_stated or asked.trimmer is None)
    ]  # a trimmer takes the place of a limit by default
    measured = [("error", max(held, default=None), limits.error), ("excess", candidate.worst_excess, limits.excess)]
    for name, used, limit in measured:
        if used is not None and limit is not None and used >= NEAR * limit:
            near.append(f"{name} {_size(used)} of {format_percent(limit)}")
    if candidate.price is not None and limits.price is not None and candidate.price >= NEAR * limits.price:
        near.append(f"price {candidate.price:.2f} of {limits.price:.2f}")
    return near


def _contacts(candidate: Candidate) -> int:
    switch = candidate.extra.get("switch")
    return int(switch["contacts"]) if isinstance(switch, Mapping) else 0


def _tracking_limits(candidate: Candidate) -> list[str]:
    """Return the limits on tracking that are used up or nearly so, of each band of a receiver."""
    entries = candidate.extra.get("tracking")
    return [
        f"tracking {quantity(entry['worst_error_hz'], 'Hz')} of {quantity(entry['limit_hz'], 'Hz')} at {entry['band']}"
        for entry in (entries if isinstance(entries, list) else ())
        if entry["worst_error_hz"] >= NEAR * entry["limit_hz"]
    ]


def _limits_of_band(request: Request, band: BandFigures, least_q: float | None) -> list[str]:
    near = []
    if least_q and band.q is not None and least_q >= NEAR * band.q:
        near.append(f"q {figure(band.q)} of {figure(least_q)} at {band.name}")
    limit = request.limits.drift
    if limit is not None and band.drift is not None:
        drift = abs(band.drift) + (band.drift_spread or 0.0)
        if drift >= NEAR * limit:
            near.append(f"drift {figure(drift * 1e6)} of {figure(limit * 1e6)} ppm/K at {band.name}")
    share = share_of_strays(band)
    most = request.stray.share if band.capacitors else None
    if most is not None and share is not None and share >= NEAR * most:
        near.append(f"strays {format_percent(share, 2)} of {format_percent(most)} at {band.name}")
    for name, value, window, unit in (
        ("reactance", band.reactance, request.coil.reactance, "\u03a9"),
        ("inductance", band.inductance, request.coil.inductance, "H"),
    ):
        if window is not None:
            low, high = window
            if value <= low / NEAR:
                near.append(f"{name} {quantity(value, unit)}, at least {quantity(low, unit)}, at {band.name}")
            elif value >= high * NEAR:
                near.append(f"{name} {quantity(value, unit)}, at most {quantity(high, unit)}, at {band.name}")
    return near


# ---------------------------------------------------------------- pieces, tolerance, neighbours


def _more_tracking(result: Result, candidate: Candidate) -> str:
    """Return the next step of a receiver's front."""
    own = float(str(candidate.extra["worst_tracking_hz"]))
    for other in result.front:
        more = other.piece_count - candidate.piece_count
        if more > 0 and float(str(other.extra["worst_tracking_hz"])) < own:
            return f"{plural(more, 'piece')} more would bring the tracking error to {worst_tracking(other)}."
    return "More pieces would buy nothing that these limits allow." if result.proof.status == "optimal" else ""


def _more_pieces(result: Result, candidate: Candidate) -> str:
    """Return the next step of the front, and whether tolerance leaves anything of it."""
    if "tracking" in candidate.extra:
        return _more_tracking(result, candidate)
    swept = candidate.worst_error is None
    own = candidate.worst_excess if swept else candidate.worst_error
    better = [
        other
        for other in result.front
        if other.piece_count > candidate.piece_count
        and (value := other.worst_excess if swept else other.worst_error) is not None
        and own is not None
        and value < own
    ]
    if not better:
        return "More pieces would buy nothing that these limits allow." if result.proof.status == "optimal" else ""
    following = min(better, key=lambda other: other.piece_count)
    more = following.piece_count - candidate.piece_count
    if swept:
        overshoot = format_percent(following.worst_excess or 0.0)
        return f"{plural(more, 'piece')} more would cut the overshoot to {overshoot}."
    text = f"{plural(more, 'piece')} more would bring the error from {_size(own)} to {_size(following.worst_error)}"
    if own is not None and own <= result.floor:
        floor = format_percent(result.floor, 2)
        return f"{text}; it is below the floor of {floor} already, so that tolerance drowns the gain."
    return f"{text}."


def _tolerance(candidate: Candidate) -> str:
    known = [(band, spread) for band in candidate.bands if (spread := spread_of(band))]
    if not known:
        return ""
    band, spread = max(known, key=lambda pair: pair[1].reach)
    most = "" if len(candidate.bands) == 1 else f" at {band.name}, the widest band,"
    low, high, least, most_off = (signed_percent(end) for end in (spread.low, spread.high, spread.least, spread.most))
    return (
        f"As built, nothing adjusted,{most} 9 of 10 units fall between {low} and {high}, every one between "
        f"{least} and {most_off}."
    )


def _other_coils(result: Result, candidate: Candidate) -> list[str]:
    """Return what the neighbours, each on another former or core, cost against this one."""
    assert candidate.rank is not None
    near = [c for c in result.candidates if c.rank in (candidate.rank - 1, candidate.rank + 1)]
    lines = []
    for other in near:
        own_coils = {coil.label for coil in candidate.coils}
        changed = "; ".join(coil.label for coil in other.coils if coil.label not in own_coils)
        if changed:
            lines.append(f"With {changed} instead (rank {other.rank}): {_difference(candidate, other)}.")
    return lines


def _difference(candidate: Candidate, other: Candidate) -> str:
    told = []
    if other.piece_count != candidate.piece_count:
        told.append(f"{plural(other.piece_count, 'piece')} for {candidate.piece_count}")
    for name, own, new in (
        ("worst error", _size(candidate.worst_error), _size(other.worst_error)),
        ("overshoot", _overshoot(candidate), _overshoot(other)),
        ("tracking error", worst_tracking(candidate), worst_tracking(other)),
        ("least Q", figure(worst_q(candidate)), figure(worst_q(other))),
        ("strays", _strays(candidate), _strays(other)),
    ):
        if own != new:
            told.append(f"{name} {new} for {own}")
    if candidate.price is not None and other.price is not None and candidate.price != other.price:
        told.append(f"price {other.price:.2f} for {candidate.price:.2f}")
    return ", ".join(told) or "the same figures"
