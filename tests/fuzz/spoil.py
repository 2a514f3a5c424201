"""Random texts: made of the words that a reader knows, then spoilt."""

from __future__ import annotations

from random import Random

WORDS = (
    "7.1MHz", "7.1 mhz", "455 kHz", "1e6", "4n7", "4p7", "p47", "1k5", "104", "47 pF", "0.25 pF", "5 %", "500 ppm",
    "-150", "+100 ppm", "20 mm", "4.05 µH", "4,7 nF", "inf", "nan", "1_000", "0", "-1", "1e999", "1e-999", "E24",
    "none", "true", "C0G", "\u03bcH", "\u00b5F", "\u0661", "\u00bd", "\u200b", "\ufeff", "..", "--", "=1+1", "@a",
    "<b>", '"', "'", "\\", "\n", "\r\n", "\t", "\0", ",", ";", "[", "]", "{", "}", "=", ".", "#", "\ud7ff", "\u202e",
)  # fmt: skip
UNITS = ("Hz", "F", "H", "m", "V", "A", "W", "S", "ohm", "Ω", "%", "ppm", "s", "C", "deg")
PREFIXES = ("", "f", "p", "n", "u", "µ", "m", "k", "M", "G", "K", "T")


def text(random: Random, longest: int = 6) -> str:
    """Return words, numbers and letters of any kind in a row."""
    return "".join(_piece(random) for _ in range(random.randint(0, longest)))


def quantity(random: Random) -> str:
    """Return something that is nearly a number with a unit."""
    number = random.choice(
        (
            f"{random.uniform(-10, 1000):.4g}",
            f"{random.randint(0, 99)}",
            f"{random.random():.3f}e{random.randint(-30, 30)}",
            f"{random.randint(0, 9)}{random.choice('pnukMRF')}{random.randint(0, 9)}",
        )
    )
    made = number + random.choice((" ", "", "  ")) + random.choice(PREFIXES) + random.choice(UNITS)
    return spoilt(random, made) if random.random() < 0.4 else made


def _piece(random: Random) -> str:
    kind = random.randrange(4)
    if kind == 0:
        return random.choice(WORDS)
    if kind == 1:
        return chr(random.choice((random.randrange(32, 127), random.randrange(0x20, 0xD7FF), random.randrange(32))))
    return quantity(random) if kind == 2 else str(random.randint(-(10 ** random.randint(0, 30)), 10**9))


def spoilt(random: Random, whole: str) -> str:
    """Return a text with some of it cut, doubled, swapped or replaced."""
    for _ in range(random.randint(1, 4)):
        if not whole:
            return _piece(random)
        start = random.randrange(len(whole))
        end = min(len(whole), start + random.choice((1, 1, 2, 8, 40)))
        whole = random.choice(
            (
                whole[:start] + whole[end:],
                whole[:start] + whole[start:end] * 2 + whole[end:],
                whole[:start] + _piece(random) + whole[end:],
                whole[:start] + _piece(random) + whole[start:],
                whole[:end],
            )
        )
    return whole


def spoilt_bytes(random: Random, whole: str) -> bytes:
    """Return a text as bytes, now and then not those of UTF-8."""
    data = bytearray(spoilt(random, whole).encode("utf-8", "surrogatepass"))
    if data and random.random() < 0.2:
        data[random.randrange(len(data))] = random.randrange(256)
    return bytes(data)
