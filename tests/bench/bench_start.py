"""Start-up: `partpick --help` against `import click`, `partpick pair` against `import numpy, click`.

Run: python tests/bench/bench_start.py. Each figure is the least of several runs, taken in turn.
"""

from __future__ import annotations

import subprocess
import sys
import time

RUNS = 7
COMMANDS = {
    "import click": ["-c", "import click"],
    "partpick --help": ["-m", "partpick", "--help"],
    "import numpy, click": ["-c", "import numpy, click"],
    "partpick pair 7.1MHz": ["-m", "partpick", "pair", "7.1MHz"],
}


def seconds(arguments: list[str]) -> float:
    """Return how long one run takes."""
    start = time.perf_counter()
    subprocess.run([sys.executable, *arguments], check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - start


def main() -> None:
    """Print the table."""
    least = {name: float("inf") for name in COMMANDS}
    for _ in range(RUNS):
        for name, arguments in COMMANDS.items():
            least[name] = min(least[name], seconds(arguments))
    print(f"{'':24}{'seconds':>10}{'ratio':>8}")
    for base, command in (("import click", "partpick --help"), ("import numpy, click", "partpick pair 7.1MHz")):
        print(f"{base:24}{least[base]:10.3f}{1.0:8.1f}")
        print(f"{command:24}{least[command]:10.3f}{least[command] / least[base]:8.1f}")


if __name__ == "__main__":
    main()
