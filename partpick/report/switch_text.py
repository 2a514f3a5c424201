"""The band switch of a candidate in words: its kind, its contacts, what to do with idle coils."""

from __future__ import annotations

from collections.abc import Mapping

from partpick.report.text import plural, wrapped
from partpick.result import Candidate

_KINDS = {
    "single pole": "one way a band, one pole for {poles}",
    "progressive shorting": "progressive shorting: each position keeps the contacts of the higher bands closed",
    "relays or toggles": "relays or toggles, one a capacitor",
}


def switch_in_words(candidate: Candidate) -> list[str]:
    """Return the switch in sentences, the first its kind and contacts; empty where there is none."""
    switch = candidate.extra.get("switch")
    if not isinstance(switch, Mapping):
        return []
    poles = [str(pole) for pole in switch["poles"]]
    each = " and one for ".join(poles)
    kind = _KINDS[str(switch["kind"])].format(poles=each or "nothing")
    further = [pole for pole in poles if pole != "capacitors"]
    if further and switch["kind"] != "single pole":
        kind += f"; further poles for {' and '.join(further)}"
    said = [f"{kind}; {plural(int(switch['contacts']), 'contact')}"]
    return said + [str(advice) for advice in switch["advice"]]


def switch_lines(candidate: Candidate) -> list[str]:
    """Return the switch as lines of the table."""
    said = switch_in_words(candidate)
    return wrapped(f"Switch: {'. '.join(text[0].upper() + text[1:] for text in said)}.", 2, 2) if said else []


def switch_to_buy(candidate: Candidate) -> list[str]:
    """Return the switch as a line to buy from: positions, poles, contacts; nothing where there is none."""
    switch = candidate.extra.get("switch")
    if not isinstance(switch, Mapping):
        return []
    if switch["kind"] == "relays or toggles":
        return [f"{plural(int(switch['contacts']), 'contact')}, relays or toggles"]
    kind = "band switch" if switch["kind"] == "single pole" else "progressive shorting switch"
    poles = f"{plural(len(switch['poles']), 'pole')}, " if switch["kind"] == "single pole" else ""
    positions = plural(len(candidate.bands), "position")
    return [f"{kind}, {poles}{positions}, {plural(int(switch['contacts']), 'contact')}"]
