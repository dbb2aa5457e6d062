"""How long one ``combine`` takes: as a whole process after the first run, and within a process.

Run ``python tests/benchmarks/bench_combine.py``. The limits are those of the design for a two-solution case with its
dosing path; the best of several runs counts, since whatever else the machine does only adds to it. Exit status 1 if
one is missed.
"""

from __future__ import annotations

import argparse
import os
import subprocess
import sys
import tempfile
import time

PORTIONS = ("1 L of 0.1 M sodium sulfide", "1 L of 0.5 M hydrochloric acid")
PROCESS_LIMIT, CALL_LIMIT = 0.7, 0.25  # s


def process_times(runs: int) -> list[float]:
    """Seconds of whole processes, the cache filled by one before them. Modules are compiled as in an installed copy."""
    with tempfile.TemporaryDirectory() as cache:
        environment = {key: value for key, value in os.environ.items() if key != "PYTHONDONTWRITEBYTECODE"}
        environment["CARBOY_CACHE"] = cache
        command = [sys.executable, "-m", "carboy", "combine", *PORTIONS, "--json"]
        times = []
        for _ in range(runs + 1):
            start = time.perf_counter()
            ran = subprocess.run(command, env=environment, capture_output=True, check=False)
            times.append(time.perf_counter() - start)
            if ran.returncode != 1:
                raise SystemExit(ran.stderr.decode())
        return times[1:]


def call_times(runs: int) -> list[float]:
    """Seconds of the Python call, graph and rules loaded before."""
    import carboy

    carboy.combine(*PORTIONS)
    times = []
    for run in range(runs):
        other = f"{1.0 + 0.01 * (run + 1):g} L of 0.1 M sodium sulfide"  # no state of it was solved before
        start = time.perf_counter()
        carboy.combine(other, PORTIONS[1])
        times.append(time.perf_counter() - start)
    return times


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--runs", type=int, default=7)
    runs = max(1, parser.parse_args().runs)
    missed = 0
    for name, times, limit in (("process", process_times(runs), PROCESS_LIMIT), ("call", call_times(runs), CALL_LIMIT)):
        best, middle = min(times), sorted(times)[len(times) // 2]
        missed += best > limit
        print(
            f"{name:8} best {best:.3f} s, median {middle:.3f} s of {len(times)}; limit {limit} s{'  MISSED' if best > limit else ''}"
        )
    return 1 if missed else 0


if __name__ == "__main__":
    sys.exit(main())
