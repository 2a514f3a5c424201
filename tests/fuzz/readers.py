"""Every reader against spoilt input: a value, or one line that says what was read. By hand, with a count:

python tests/fuzz/readers.py 200000
"""

from __future__ import annotations

import io
import math
import sys
import tempfile
import time
from collections import Counter
from collections.abc import Callable
from pathlib import Path
from random import Random

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).parent.parent))

from fuzz import spoil
from partpick import quantities
from partpick.catalogue import data_folder, load_catalogue
from partpick.errors import InternalError, PartpickError
from partpick.planfile import load_plan
from partpick.report.against import read_result

SLOW = 5.0  # s for one input of a few kilobytes: a hang, not a slow machine
LONGEST_LINE = 600  # letters of a message
PARSERS = [getattr(quantities, name) for name in sorted(dir(quantities)) if name.startswith("parse_")]
CORPUS = Path(__file__).parent / "corpus"
GOLDEN = Path(__file__).parent.parent / "golden" / "plan.json"


class Readers:
    """The readers, each fed with what it nearly understands."""

    def __init__(self, folder: Path, seed: int) -> None:
        self.folder = folder
        self.random = Random(seed)
        self.outcomes: Counter[str] = Counter()
        self.plans = [*(p.read_text(encoding="utf-8") for p in sorted(data_folder().glob("plans/*.toml")))]
        self.plans += [path.read_text(encoding="utf-8") for path in sorted(CORPUS.glob("*.toml"))]
        self.files = {path.name: path.read_text(encoding="utf-8") for path in sorted(data_folder().glob("*.csv"))}
        self.result = GOLDEN.read_text(encoding="utf-8")

    def run(self, count: int) -> Counter[str]:
        """Feed `count` inputs and return how many were read and how many refused, by reader."""
        feeds = (self.quantity, self.plan, self.drawer, self.earlier)
        for feed in self.random.choices(feeds, weights=(16, 3, 1, 2), k=count):
            feed()
        return self.outcomes

    def quantity(self) -> None:
        """Feed one parser of quantities."""
        made = self.random.choice((spoil.quantity, spoil.text))(self.random)
        given: object = self.random.choice((made, made, made, _number(made), [made], None, True))
        parser = self.random.choice([p for p in PARSERS if p is not quantities.parse_range])
        value = self._read("quantity", given, lambda: parser(given))
        if isinstance(value, float):
            assert math.isfinite(value), (parser, given, value)

    def plan(self) -> None:
        """Feed a spoilt plan."""
        whole = self.random.choice(self.plans)
        data = spoil.spoilt_bytes(self.random, whole)
        self._read("plan", data, lambda: load_plan("-", stdin=io.BytesIO(data)))

    def drawer(self) -> None:
        """Feed a drawer with one spoilt file of a few rows."""
        name, whole = self.random.choice(sorted(self.files.items()))
        head, *rows = whole.splitlines()
        kept = "\n".join([head, *self.random.sample(rows, min(len(rows), 3))])
        data = spoil.spoilt_bytes(self.random, kept)
        (self.folder / name).write_bytes(data)
        self._read("drawer", (name, data), lambda: load_catalogue(self.folder))
        (self.folder / name).unlink()

    def earlier(self) -> None:
        """Feed an earlier result."""
        data = spoil.spoilt_bytes(self.random, self.result)
        path = self.folder.parent / "earlier.json"
        path.write_bytes(data)
        self._read("result", data, lambda: read_result(str(path)))

    def _read(self, what: str, given: object, read: Callable[[], object]) -> object:
        began = time.monotonic()
        try:
            value = read()
        except InternalError as error:
            raise AssertionError(f"{what}: {given!r} gave {error}") from error
        except PartpickError as error:
            message = str(error)
            assert message and len(message.splitlines()) == 1 and len(message) < LONGEST_LINE, (what, given, message)
            self.outcomes[f"{what} refused"] += 1
            return None
        except Exception as error:
            raise AssertionError(f"{what}: {given!r} ended in {type(error).__name__}: {error}") from error
        finally:
            assert time.monotonic() - began < SLOW, (what, given)
        self.outcomes[f"{what} read"] += 1
        return value


def _number(text: str) -> object:
    try:
        return float(text)
    except ValueError:
        return len(text)


def main() -> None:
    """Run by hand: how many, and the seed."""
    given = [int(each) for each in sys.argv[1:]]
    count, seed = (given + [20_000, 1][len(given) :])[:2]
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name) / "drawer"
        folder.mkdir()
        outcomes = Readers(folder, seed).run(count)
    for what, times in sorted(outcomes.items()):
        print(f"{what:18s} {times}")


if __name__ == "__main__":
    main()
