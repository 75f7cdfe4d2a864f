"""All benchmarks as one table: ours, the named alternative, their ratio, peak memory of each, and the floor.

    python tests/bench/run.py [--size s|m|l] [--only NAME]

Each side runs in a process of its own, so that its peak memory is its own. Times are wall times of this
machine as loaded now; the ratios are what counts. A ratio is refused where the two answers differ.
"""

from __future__ import annotations

import argparse
import json
import resource
import subprocess
import sys
import time
from importlib import import_module
from importlib.util import find_spec
from pathlib import Path
from typing import Any

HERE = Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent.parent))

from tests.bench.case import SIZES, Case  # noqa: E402  (a script finds the tests only after the line above)

COLUMNS = ("work", "size", "ours s", "alternative", "its s", "ratio", "floor s", "ours MB", "its MB")


def cases() -> dict[str, Case]:
    """Every case of every ``bench_*.py`` beside this file, by name."""
    modules = sorted(path.stem for path in HERE.glob("bench_*.py"))
    return {case.name: case for module in modules for case in import_module(f"tests.bench.{module}").CASES}


def run_side(case: Case, side: str, size: str) -> dict[str, Any]:
    """Seconds, peak memory in MB and the answer in a few numbers, measured in a process of its own."""
    command = [sys.executable, str(HERE / "run.py"), "--only", case.name, "--size", size, "--side", side]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    if done.returncode:
        raise SystemExit(f"{case.name}, {side}: {done.stderr.strip().splitlines()[-1]}")
    measured: dict[str, Any] = json.loads(done.stdout.splitlines()[-1])
    return measured


def measure(case: Case, side: str, size: str) -> None:
    """The child's part: do one side once and print what it took."""
    work = getattr(case, side)
    given = case.prepare(size)
    start = time.perf_counter()
    answer = work(given)
    seconds = time.perf_counter() - start
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(json.dumps({"seconds": seconds, "peak_mb": peak, "answer": [float(number) for number in answer]}))


def row(case: Case, size: str) -> list[str]:
    """One line of the table."""
    ours = run_side(case, "ours", size)
    missing = [package for package in case.packages if find_spec(package) is None]
    theirs = None
    if case.theirs is not None and not missing and size in case.theirs_sizes:
        theirs = run_side(case, "theirs", size)
        _agree(case, ours["answer"], theirs["answer"])
    floor = run_side(case, "floor", size) if case.floor is not None else None
    alternative = case.alternative + (f" (needs {', '.join(missing)})" if missing else "")
    return [
        case.work,
        size,
        f"{ours['seconds']:.3g}",
        alternative,
        f"{theirs['seconds']:.3g}" if theirs else "-",
        f"{theirs['seconds'] / ours['seconds']:.1f}" if theirs else "-",
        f"{floor['seconds']:.3g}" if floor else "-",
        f"{ours['peak_mb']:.0f}",
        f"{theirs['peak_mb']:.0f}" if theirs else "-",
    ]


def _agree(case: Case, ours: list[float], theirs: list[float]) -> None:
    scale = max(map(abs, theirs), default=0.0)
    apart = max((abs(a - b) for a, b in zip(ours, theirs, strict=True)), default=0.0)
    if not apart <= case.rtol * scale:
        raise SystemExit(
            f"{case.name}: the answers differ by {apart / scale:.2g}; no ratio of a wrong answer"
        )


def main() -> None:
    """Parse the options and print the table as its lines come."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else "")
    parser.add_argument("--size", choices=SIZES, default="s")
    parser.add_argument("--only", metavar="NAME")
    parser.add_argument("--side", choices=("ours", "theirs", "floor"), help=argparse.SUPPRESS)
    options = parser.parse_args()
    known = cases()
    if options.only is not None and options.only not in known:
        parser.error(f"no benchmark is named {options.only}; there are {', '.join(known)}")
    if options.side:
        measure(known[options.only], options.side, options.size)
        return
    chosen = [known[options.only]] if options.only else [c for c in known.values() if options.size in c.sizes]
    widths = [46, 4, 8, 40, 8, 7, 8, 8, 8]
    _print(COLUMNS, widths)
    for case in chosen:
        _print(row(case, options.size), widths)


def _print(cells: Any, widths: list[int]) -> None:
    texts = (0, 3)  # these columns are words, the others numbers
    print(
        "  ".join(
            f"{c:<{w}}" if i in texts else f"{c:>{w}}"
            for i, (c, w) in enumerate(zip(cells, widths, strict=True))
        ),
        flush=True,
    )


if __name__ == "__main__":
    main()
