"""Start-up: `partpick --help` against `import click`, `partpick pair` against `import numpy, click`.

Run: python tests/bench/bench_start.py. Each figure is the least of several runs, taken in turn, with
compiled files at hand as after an installation. Processor time tells the same where a machine is busy.
"""

from __future__ import annotations

import os
import resource
import subprocess
import sys
import tempfile
import time

RUNS = 9
COMMANDS = {
    "import click": ["-c", "import click"],
    "partpick --help": ["-m", "partpick", "--help"],
    "import numpy, click": ["-c", "import numpy, click"],
    "partpick pair 7.1MHz": ["-m", "partpick", "pair", "7.1MHz"],
}


def processor() -> float:
    """Return the processor time of all processes started so far. [s]"""
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def seconds(arguments: list[str], environment: dict[str, str]) -> tuple[float, float]:
    """Return time by the clock and of the processor of one run. [s]"""
    start, before = time.perf_counter(), processor()
    subprocess.run([sys.executable, *arguments], check=True, stdout=subprocess.DEVNULL, env=environment)
    return time.perf_counter() - start, processor() - before


def main() -> None:
    """Print the table."""
    with tempfile.TemporaryDirectory() as compiled:
        environment = {**os.environ, "PYTHONPYCACHEPREFIX": compiled}
        environment.pop("PYTHONDONTWRITEBYTECODE", None)
        for arguments in COMMANDS.values():
            seconds(arguments, environment)
        runs = [{name: seconds(a, environment) for name, a in COMMANDS.items()} for _ in range(RUNS)]
    least = {name: tuple(min(run[name][kind] for run in runs) for kind in (0, 1)) for name in COMMANDS}
    print(f"{'':24}{'seconds':>10}{'ratio':>8}{'processor':>12}{'ratio':>8}")
    for base, command in (("import click", "partpick --help"), ("import numpy, click", "partpick pair 7.1MHz")):
        for name in (base, command):
            clock, used = least[name]
            print(f"{name:24}{clock:10.3f}{clock / least[base][0]:8.1f}{used:12.3f}{used / least[base][1]:8.1f}")


if __name__ == "__main__":
    main()
