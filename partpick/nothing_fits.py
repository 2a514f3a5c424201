"""Nothing fits: which single limit, relaxed, would let a plan through, and what it would have to be."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

from partpick.candidates import realisable_coils
from partpick.parts import Catalogue
from partpick.progress import Monitor
from partpick.quantities import format_quantity
from partpick.receiver import is_receiver, oscillators_alone, with_widest_tracking
from partpick.request import LEAST_WOUND, Request
from partpick.result import Candidate, RuledOut
from partpick.tuning_range import beyond_reach

LADDER = (1.1, 1.25, 1.5, 2.0, 3.0, 5.0, 1e6)  # how far Q and drift are eased, step by step, until a plan exists
LEADS_DECIDE = f"of a wound coil below {format_quantity(LEAST_WOUND, 'H')} the leads decide"
CLOSE_MISS = 5  # times the error limit: up to here a wider error limit is the first thing to think of

Again = Callable[[Request, Catalogue, Monitor], Candidate | None]


@dataclass(frozen=True)
class _Trial:
    """One limit: the request without it, and how to read what it would have to be."""

    limit: str
    relaxed: Request
    needed: Callable[[Candidate], float | int | str | None]
    words: Callable[[Candidate], str]
    catalogue: Callable[[Catalogue], Catalogue] = lambda catalogue: catalogue


def explain(
    request: Request, catalogue: Catalogue, again: Again, monitor: Monitor
) -> tuple[Candidate | None, RuledOut | None]:
    """Return the nearest miss and the limit which alone rules everything out, with what it would have to be.

    Each limit in force is lifted by itself, all others kept. Every one under which a plan exists is named
    with the value that this plan needs (for the error limit the least possible). The error limit comes
    first where it is missed by little, else the first of the others: an error of 20 % helps nobody.
    """
    swept = any(band.swept for band in request.bands)
    if swept and (alone := beyond_reach(request, realisable_coils(request, catalogue))) is not None:
        return None, alone
    if is_receiver(request):
        others = oscillators_alone(request)
        if (alone := beyond_reach(others, realisable_coils(others, catalogue))) is not None:
            return None, alone
    found: list[tuple[Candidate, RuledOut]] = []
    for trial in _trials(request):
        if monitor.stopped() is not None:
            break
        if found and found[-1][1].limit == trial.limit:
            continue  # a smaller step was enough
        monitor.report(f"whether a plan exists without the limit {trial.limit}")
        candidate = again(trial.relaxed, trial.catalogue(catalogue), monitor)
        if candidate is not None:
            text = f"the limit {trial.limit} rules out every choice; {trial.words(candidate)}"
            found.append((candidate, RuledOut(limit=trial.limit, needed=trial.needed(candidate), text=text)))
    if not found and monitor.stopped() is not None:
        text = "which limit rules it out was not found before the search was stopped"
        return None, RuledOut(limit="unknown", needed=None, text=text)
    if not found:
        text = "no single limit rules it out: two or more together do, or there is no coil for these bands at all"
        return None, RuledOut(limit="several", needed=None, text=text)
    first = _most_helpful(request, [ruled for _, ruled in found])
    nearest, ruled_out = found.pop(first)
    return nearest, replace(ruled_out, others=tuple(ruled for _, ruled in found))


def _most_helpful(request: Request, found: list[RuledOut]) -> int:
    needed = found[0].needed
    if found[0].limit != "error" or len(found) == 1:
        return 0
    assert request.limits.error is not None and isinstance(needed, float)
    return 0 if needed <= CLOSE_MISS * request.limits.error else 1


def _trials(request: Request) -> Iterator[_Trial]:
    limits = request.limits
    if limits.error is not None and not all(band.swept for band in request.bands):
        # A default limit is off where a trimmer stands; a very wide one keeps the rest comparable.
        wide = replace(request, by="error", limits=replace(limits, error=0.9, error_stated=True))
        yield _Trial("error", wide, lambda c: c.worst_error, _error_words)
    if is_receiver(request):
        wide = replace(with_widest_tracking(request), by="error")
        yield _Trial("tracking", wide, lambda c: float(str(c.extra["worst_tracking_hz"])), _tracking_words)
    yield from _swept_trials(request)
    yield from _count_trials(request)
    yield from _quality_trials(request)
    yield from _coil_trials(request)
    yield _Trial(
        "quantity", replace(request, units=1), lambda _: "as many as wanted", _stock_words, _in_plenty
    )


def _swept_trials(request: Request) -> Iterator[_Trial]:
    limits = request.limits
    if not any(band.swept for band in request.bands):
        return
    if limits.excess is not None:
        free = replace(request, by="error", limits=replace(limits, excess=None))
        yield _Trial("excess", free, lambda c: c.worst_excess, _excess_words)
    if limits.margin > 0:
        free = replace(request, limits=replace(limits, margin=0.0))
        yield _Trial("margin", free, _margin_of, lambda c: f"{100 * _margin_of(c):.3g} % would do")


def _margin_of(candidate: Candidate) -> float:
    """Return what a candidate covers beyond both ends of its swept bands, the least. [fraction of f]"""
    beyond = []
    for band in candidate.bands:
        if "tuned_low_hz" not in band.extra:
            continue
        keys = ("low_hz", "high_hz", "tuned_low_hz", "tuned_high_hz")
        low, high, tuned_low, tuned_high = (float(str(band.extra[key])) for key in keys)
        beyond += [1 - tuned_low / low, tuned_high / high - 1]
    return max(0.0, min(beyond))


def _count_trials(request: Request) -> Iterator[_Trial]:
    limits = request.limits
    most = 3 if request.capacitors.connect == "any" else 6
    if limits.parts_per_band < most:
        more = replace(request, limits=replace(limits, parts_per_band=min(most, limits.parts_per_band + 2)))
        yield _Trial("parts_per_band", more, _most_in_a_band, lambda c: f"{_most_in_a_band(c)} would do")
    moved = request.tuning is not None and request.tuning.moves_inductance
    able = not moved or (request.tuning is not None and request.tuning.sections > 1)
    if limits.inductors < 2 and len(request.bands) > 1 and able:
        two = replace(request, limits=replace(limits, inductors=2))
        yield _Trial("inductors", two, lambda c: c.inductor_count, lambda c: f"{c.inductor_count} would do")
    if limits.parts is not None:
        free = replace(request, limits=replace(limits, parts=None))
        yield _Trial("parts", free, lambda c: c.part_count, lambda c: f"{c.part_count} would do")
    if limits.values is not None:
        free = replace(request, limits=replace(limits, values=None))
        yield _Trial("values", free, lambda c: c.value_count, lambda c: f"{c.value_count} would do")


def _quality_trials(request: Request) -> Iterator[_Trial]:
    limits = request.limits
    for share in LADDER if any(band.q for band in request.bands) else ():
        bands = tuple(replace(band, q=band.q / share if band.q else None) for band in request.bands)
        yield _Trial("q", replace(request, bands=bands), _worst_q, _q_words)
    for times in LADDER if limits.drift is not None else ():
        assert limits.drift is not None
        wider = replace(request, limits=replace(limits, drift=limits.drift * times))
        yield _Trial("drift", wider, _worst_drift, _drift_words)
    chooses = any(band.trimmer is not None and band.trimmer.to_choose for band in request.bands)
    if limits.alignable is not None or (chooses and not limits.alignable_off):
        free = replace(request, limits=replace(limits, alignable=None, alignable_off=True))
        yield _Trial("alignable", free, lambda _: "none", lambda _: _alignable_words(request))
    if limits.price is not None:
        by = request.by if is_receiver(request) else "price"
        free = replace(request, by=by, limits=replace(limits, price=None))
        yield _Trial("price", free, lambda c: c.price, _price_words)
    if request.stray.share is not None:
        free = replace(request, stray=replace(request.stray, share=None))
        yield _Trial("share", free, _worst_share, lambda c: f"{100 * _worst_share(c):.3g} % would do")


def _coil_trials(request: Request) -> Iterator[_Trial]:
    rules = request.coil
    lifted = (
        ("self_resonance", rules.self_resonance, replace(rules, self_resonance=None)),
        ("reactance", rules.reactance, replace(rules, reactance=None)),
        ("inductance", rules.inductance, replace(rules, inductance=None)),
        ("proportions", rules.proportions, replace(rules, proportions=None)),
    )
    for name, value, without in lifted:
        if value is not None:
            yield _Trial(name, replace(request, coil=without), lambda _: None, _coil_words)
    if rules.least_wound > 0:
        every = replace(request, coil=replace(rules, least_wound=0.0))
        yield _Trial("least_wound", every, _least_coil, _leads_words)
    if rules.forms is not None:
        free = replace(rules, forms=None)
        yield _Trial("forms", replace(request, coil=free), lambda c: c.coils[0].form, _coil_words)


def _excess_words(candidate: Candidate) -> str:
    assert candidate.worst_excess is not None
    return f"the least that these parts reach is {100 * candidate.worst_excess:.3g} %"


def _tracking_words(candidate: Candidate) -> str:
    worst = float(str(candidate.extra["worst_tracking_hz"]))
    return f"the least that these parts reach is {format_quantity(worst, 'Hz')}"


def _error_words(candidate: Candidate) -> str:
    assert candidate.worst_error is not None
    return f"the least that these parts reach is {100 * candidate.worst_error:.3g} %"


def _stock_words(candidate: Candidate) -> str:
    wanted = ", ".join(dict.fromkeys(line.label for line in candidate.parts))
    return f"with more in stock these would do: {wanted}"


def _coil_words(candidate: Candidate) -> str:
    coils = "; ".join(coil.label for coil in candidate.coils)
    return f"without it: {coils}"


def _least_coil(candidate: Candidate) -> float:
    return min(coil.inductance for coil in candidate.coils)


def _leads_words(candidate: Candidate) -> str:
    return f"{_coil_words(candidate)}, but {LEADS_DECIDE}"


def _alignable_words(request: Request) -> str:
    bare = [band.name for band in request.bands if band.trimmer is None and not band.swept]
    if bare:
        return f"without a trimmer, or an adjustable coil of its own, nothing can be aligned: {', '.join(bare)}"
    return "a trimmer of wider range, a coil or capacitors of closer tolerance are needed"


def _price_words(candidate: Candidate) -> str:
    return "no choice has a price" if candidate.price is None else f"{candidate.price:.2f} would do"


def _most_in_a_band(candidate: Candidate) -> int:
    return max(len(band.capacitors) for band in candidate.bands)


def _worst_q(candidate: Candidate) -> float | None:
    known = [band.q for band in candidate.bands if band.q is not None]
    return min(known) if len(known) == len(candidate.bands) else None


def _q_words(candidate: Candidate) -> str:
    q = _worst_q(candidate)
    return "no choice has a known Q" if q is None else f"{q:.3g} would do"


def _worst_drift(candidate: Candidate) -> float | None:
    drifts = [
        abs(band.drift) + (band.drift_spread or 0.0) for band in candidate.bands if band.drift is not None
    ]
    return max(drifts) if drifts else None


def _drift_words(candidate: Candidate) -> str:
    drift = _worst_drift(candidate)
    return "no choice has a known drift" if drift is None else f"{drift * 1e6:.3g} ppm per kelvin would do"


def _worst_share(candidate: Candidate) -> float:
    shares = [
        (band.stray + band.self_capacitance) / band.capacitance
        for band in candidate.bands
        if band.capacitance and band.capacitors
    ]
    return max(shares, default=0.0)


def _in_plenty(catalogue: Catalogue) -> Catalogue:
    return replace(
        catalogue,
        capacitors=tuple(replace(part, quantity=None) for part in catalogue.capacitors),
        inductors=tuple(replace(part, quantity=None) for part in catalogue.inductors),
        formers=tuple(replace(part, quantity=None) for part in catalogue.formers),
        cores=tuple(replace(part, quantity=None) for part in catalogue.cores),
    )
