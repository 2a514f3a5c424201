"""How builds are counted: the keys of [spread], each with its default."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from partpick.built.variation import UNIFORM_PARTS
from partpick.request import Request

FIRST_BUILDS = 20_000  # of the candidate that ranks first: a share is then known within 0.4 % (one deviation)
OTHER_BUILDS = 2_000  # of each further one: within 1.2 %; a thousand candidates must stay quick


@dataclass(frozen=True, kw_only=True)
class SpreadSettings:
    """How random builds are drawn."""

    builds: int
    seed: int = 1
    parts: str = UNIFORM_PARTS  # or "normal": the tolerance is two standard deviations
    batch: float = 0.0  # correlation of capacitors of one value and grade


def spread_settings(request: Request, *, first: bool) -> SpreadSettings:
    """Return the settings of a request for the first candidate, or for a further one."""
    stated: dict[str, Any] = dict(dict(request.extra).get("spread", ()))
    known = {name: value for name, value in stated.items() if value is not None}
    return SpreadSettings(**{"builds": FIRST_BUILDS if first else OTHER_BUILDS, **known})
