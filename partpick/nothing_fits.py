"""Nothing fits: which single limit, relaxed, would let a plan through, and what it would have to be."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

from partpick.candidates import realisable_coils
from partpick.errors import RequestError
from partpick.layouts import check_layout
from partpick.load_words import q_missed, q_words
from partpick.matching import has_divider, load_to_meet
from partpick.oscillating import MOST_PARTS, oscillator_keys
from partpick.parts import Catalogue
from partpick.progress import Monitor, Unsettled
from partpick.quantities import format_quantity
from partpick.rating_words import rating_words
from partpick.ratings import drive_of
from partpick.receiver import is_receiver, oscillators_alone, with_widest_tracking
from partpick.request import LEAST_WOUND, Band, CoilRules, Load, Request
from partpick.result import Candidate, RuledOut
from partpick.tuning import most_share
from partpick.tuning_range import beyond_reach
from partpick.unstated import unknown_drifts

LADDER = (1.1, 1.25, 1.5, 2.0, 3.0, 5.0, 1e6)  # how far Q and drift are eased, step by step, until a plan exists
LEADS_DECIDE = f"of a wound coil below {format_quantity(LEAST_WOUND, 'H')} the leads decide"
MOST_COILS = 3  # more together are not looked at one by one
MORE_IN_A_SET = 3  # capacitors tried beyond the size asked for
LARGE_TRANSCONDUCTANCE = 1e3  # S, of no device: start-up is left aside
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
    if request.limits.drift is not None and (unknown := unknown_drifts(request)):
        text = f"the limit drift rules out every choice, since an unknown drift does not pass: {'; '.join(unknown)}"
        return None, RuledOut(limit="drift", needed=None, text=text)
    if is_receiver(request):
        others = oscillators_alone(request)
        if (alone := beyond_reach(others, realisable_coils(others, catalogue))) is not None:
            return None, alone
    found: list[tuple[Candidate, RuledOut]] = []
    open_ends: dict[str, None] = {}
    for trial in _trials(request):
        if monitor.stopped() is not None:
            open_ends[trial.limit] = None
            continue
        if (found and found[-1][1].limit == trial.limit) or not _is_planned(trial.relaxed):
            continue  # a smaller step was enough
        monitor.report(f"whether a plan exists without the limit {trial.limit}")
        try:
            candidate = again(trial.relaxed, trial.catalogue(catalogue), monitor)
        except Unsettled:
            open_ends[trial.limit] = None
            continue
        if candidate is not None:
            text = f"the limit {trial.limit} rules out every choice; {trial.words(candidate)}"
            found.append((candidate, RuledOut(limit=trial.limit, needed=trial.needed(candidate), text=text)))
    unsettled = tuple(name for name in open_ends if name not in {ruled.limit for _, ruled in found})
    if not found and unsettled:
        text = f"which limit rules it out is not known, the search was stopped before: {', '.join(unsettled)}"
        return None, RuledOut(limit="unknown", needed=None, text=text, unsettled=unsettled)
    if not found:
        text = "no single limit rules it out: two or more together do, or there is no coil for these bands at all"
        return None, RuledOut(limit="several", needed=None, text=text)
    first = _most_helpful(request, [ruled for _, ruled in found])
    nearest, ruled_out = found.pop(first)
    return nearest, replace(ruled_out, others=tuple(ruled for _, ruled in found), unsettled=unsettled)


def _is_planned(request: Request) -> bool:
    """Whether the layout is planned with what a trial allows."""
    try:
        check_layout(request)
    except RequestError:
        return False
    return True


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
    yield from _stress_trials(request)
    yield from _swept_trials(request)
    yield from _count_trials(request)
    yield from _quality_trials(request)
    yield from _coil_trials(request)
    yield from _oscillator_trials(request)
    yield from _load_trials(request)
    yield _Trial(
        "quantity", replace(request, units=1), lambda _: "as many as wanted", _stock_words, _in_plenty
    )


def _stress_trials(request: Request) -> Iterator[_Trial]:
    limits = request.limits
    if drive_of(request) is None or limits.stress is None:
        return
    if limits.stress == "derated":
        full = replace(request, limits=replace(limits, stress="rated"))
        yield _Trial("stress", full, lambda _: "rated", lambda _: 'limits.stress = "rated", ratings in full, would do')
    free = replace(request, limits=replace(limits, stress=None))
    yield _Trial("stress", free, lambda _: "none", lambda c: rating_words(request, c))


def _swept_trials(request: Request) -> Iterator[_Trial]:
    limits = request.limits
    if not any(band.swept for band in request.bands):
        return
    if request.tuning is not None and request.tuning.kind == "varactor" and "drive" in dict(request.extra):
        extra = tuple((name, keys) for name, keys in request.extra if name != "drive")
        bias = request.tuning.get("from")
        peak = float(str(bias)) / most_share(request.tuning, dict(dict(request.extra)["drive"]))  # 0: not known
        text = _CONDUCTS.format(*(format_quantity(volts, "V", digits=3) for volts in (peak, float(str(bias)))))
        if peak > 0:
            yield _Trial("drive", replace(request, extra=extra), lambda _: peak, lambda _: text)
    if limits.excess is not None:
        free = replace(request, by="error", limits=replace(limits, excess=None))
        yield _Trial("excess", free, lambda c: c.worst_excess, _excess_words)
    if limits.margin > 0:
        free = replace(request, limits=replace(limits, margin=0.0))
        yield _Trial("margin", free, _margin_of, lambda c: f"{100 * _margin_of(c):.3g} % would do")


_CONDUCTS = (
    "the varactor would be driven into conduction: {} peak on a junction across the tank at a least bias of {}; more "
    "bias (tuning.from), two back to back, or less drive"
)


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
    beyond = 2
    if oscillator_keys(request) or any(has_divider(request, band) for band in request.bands):  # dividers are many
        most, beyond = MOST_PARTS, 1
    most = min(most, limits.parts_per_band + beyond) if request.switching != "shared" else 0  # no such limit on a set
    for count in range(limits.parts_per_band + 1, most + 1):
        more = replace(request, limits=replace(limits, parts_per_band=count))
        yield _Trial("parts_per_band", more, _most_in_a_band, lambda c: f"{_most_in_a_band(c)} would do")
    if limits.contacts is not None:
        free = replace(request, limits=replace(limits, contacts=None))
        yield _Trial("contacts", free, _contacts, lambda c: f"{_contacts(c)} would do")
    moved = request.tuning is not None and request.tuning.moves_inductance
    able = not moved or (request.tuning is not None and request.tuning.sections > 1)
    if limits.inductors < min(len(request.bands), MOST_COILS) and able:
        more = replace(request, limits=replace(limits, inductors=limits.inductors + 1))
        yield _Trial("inductors", more, lambda c: c.inductor_count, lambda c: f"{c.inductor_count} would do")
    for parts in _more_parts(request):
        more = replace(request, limits=replace(limits, parts=parts))
        yield _Trial("parts", more, lambda c: c.part_count, lambda c: f"{c.part_count} would do")
    if limits.values is not None:
        free = replace(request, limits=replace(limits, values=None))
        yield _Trial("values", free, lambda c: c.value_count, lambda c: f"{c.value_count} would do")


def _more_parts(request: Request) -> tuple[int | None, ...]:
    """Return the limits on parts to try: none, or some more where a shared set must have a size."""
    if request.limits.parts is None:
        return ()
    if request.switching != "shared":
        return (None,)
    return tuple(range(request.limits.parts + 1, request.limits.parts + 1 + MORE_IN_A_SET))


def _contacts(candidate: Candidate) -> int:
    switch = candidate.extra.get("switch")
    return int(switch["contacts"]) if isinstance(switch, dict) else 0


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


def _oscillator_trials(request: Request) -> Iterator[_Trial]:
    keys = oscillator_keys(request)
    if keys is None:
        return
    eager = tuple((key, LARGE_TRANSCONDUCTANCE if key == "transconductance" else value) for key, value in keys.items())
    extra = tuple((name, eager if name == "oscillator" else values) for name, values in request.extra)
    free = replace(request, extra=extra)
    words = "with {} the first that fits would start, all else as asked for"
    yield _Trial(
        "transconductance",
        free,
        _transconductance,
        lambda c: words.format(format_quantity(_transconductance(c), "S", digits=3)),
    )


def _load_trials(request: Request) -> Iterator[_Trial]:
    met = [band for band in request.bands if band.load and band.load.q_tolerance and load_to_meet(request, band)]
    for times in (1.5, 2.0, 4.0, None) if met else ():
        eased = tuple(replace(band, load=_eased(band.load, times)) if band in met else band for band in request.bands)
        free = replace(request, bands=eased)
        yield _Trial("q_tolerance", free, lambda c: q_missed(request, c), lambda c: q_words(request, c))


def _eased(load: Load | None, times: float | None) -> Load | None:
    if load is None or load.q_tolerance is None:
        return load
    return replace(load, q_tolerance=None if times is None else load.q_tolerance * times)


def _transconductance(candidate: Candidate) -> float:
    """Return what the device of a candidate must have for its worst band to start with the margin. [S]"""
    found = [dict(band.extra["oscillator"]) for band in candidate.bands]  # type: ignore[call-overload]
    return max(float(each["needed_s"]) * float(each["margin_wanted"]) for each in found)


def _coil_trials(request: Request) -> Iterator[_Trial]:
    rules = request.coil
    lifted: tuple[tuple[str, object, CoilRules, Callable[[Candidate], float | str | None]], ...] = (
        ("self_resonance", rules.self_resonance, replace(rules, self_resonance=None), _self_resonance),
        ("reactance", rules.reactance, replace(rules, reactance=None), _reactances),
        ("inductance", rules.inductance, replace(rules, inductance=None), _inductances),
        ("proportions", rules.proportions, replace(rules, proportions=None), _proportions),
    )
    for name, value, without, needed in lifted:
        if value is not None:
            yield _Trial(name, replace(request, coil=without), needed, _with_coil(needed))
    if rules.least_wound > 0:
        every = replace(request, coil=replace(rules, least_wound=0.0))
        yield _Trial("least_wound", every, _least_coil, _leads_words)
    if rules.forms is not None:
        free = replace(rules, forms=None)
        yield _Trial("forms", replace(request, coil=free, bands=_any_form(request)), _forms, _coil_words)
    yield from _capacitor_trials(request)


def _any_form(request: Request) -> tuple[Band, ...]:
    """Return the bands without the limit on forms that they have from the plan."""
    own = request.coil.forms
    return tuple(replace(band, forms=None) if band.forms == own else band for band in request.bands)


def _capacitor_trials(request: Request) -> Iterator[_Trial]:
    rules = request.capacitors
    if rules.grades is not None:
        yield _Trial("grades", replace(request, capacitors=replace(rules, grades=None)), _grades, _grade_words)
    if rules.low is not None:
        free = replace(rules, low=None)
        yield _Trial("from", replace(request, capacitors=free), lambda c: min(_values(c), default=None), _from_words)
    if rules.high is not None:
        free = replace(rules, high=None)
        yield _Trial("to", replace(request, capacitors=free), lambda c: max(_values(c), default=None), _to_words)


def _values(candidate: Candidate) -> list[float]:
    return [part.value for part in candidate.parts if part.kind == "capacitor" and part.value is not None]


def _grades(candidate: Candidate) -> str:
    return ", ".join(dict.fromkeys(part.grade for part in candidate.parts if part.grade))


def _grade_words(candidate: Candidate) -> str:
    return f"{_grades(candidate)} would do"


def _from_words(candidate: Candidate) -> str:
    return f"{format_quantity(min(_values(candidate), default=0.0), 'F')} would do"


def _to_words(candidate: Candidate) -> str:
    return f"{format_quantity(max(_values(candidate), default=0.0), 'F')} would do"


def _forms(candidate: Candidate) -> str:
    return ", ".join(dict.fromkeys(coil.form for coil in candidate.coils))


def _self_resonance(candidate: Candidate) -> float | None:
    """Return the least self-resonance of the coils, as a multiple of the highest frequency of their bands."""
    times = []
    for band in candidate.bands:
        frequency = band.target if band.target is not None else float(str(band.extra["high_hz"]))
        if band.self_capacitance > 0:
            own = 1.0 / (2.0 * math.pi * math.sqrt(band.inductance * band.self_capacitance))
            times.append(own / frequency)
        coil = next(each for each in candidate.coils if each.reference == band.coil)
        if band.tap_turns is not None and coil.self_capacitance:
            times.append(0.5 / (math.pi * math.sqrt(coil.inductance * coil.self_capacitance)) / frequency)
    return min(times, default=None)


def _reactances(candidate: Candidate) -> str:
    return _span([band.reactance for band in candidate.bands], "\u03a9")


def _inductances(candidate: Candidate) -> str:
    return _span([coil.inductance for coil in candidate.coils], "H")


def _proportions(candidate: Candidate) -> str:
    known = [c for c in candidate.coils if c.winding_length is not None and c.mean_diameter]
    ratios = sorted(coil.winding_length / coil.mean_diameter for coil in known)  # type: ignore[operator]
    return " to ".join(dict.fromkeys(f"{ratio:.3g}" for ratio in (ratios[:1] + ratios[-1:])))


def _span(values: list[float], unit: str) -> str:
    ends = (format_quantity(min(values), unit, 3), format_quantity(max(values), unit, 3))
    return " to ".join(dict.fromkeys(ends))


def _with_coil(needed: Callable[[Candidate], float | str | None]) -> Callable[[Candidate], str]:
    """Return what makes words of a figure that would do, and of the coil that has it."""

    def words(candidate: Candidate) -> str:
        figure = needed(candidate)
        shown = f"{figure:.3g}" if isinstance(figure, float) else figure
        coils = "; ".join(coil.label for coil in candidate.coils)
        return f"{shown} would do: {coils}" if shown else f"without it: {coils}"

    return words


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
