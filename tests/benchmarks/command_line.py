"""What the command line costs: CPU time of the help, and of the pictures of a run.

python -m tests.benchmarks.command_line
"""

from __future__ import annotations

import resource
import subprocess
import sys
import tempfile
import time

_REPEATS = 5


def cpu_seconds(*argv: str) -> float:
    """Least CPU time, user and system, of a command among a few repeats."""
    least = float("inf")
    for _ in range(_REPEATS):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        subprocess.run(argv, check=True, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        spent = (after.ru_utime - before.ru_utime) + (after.ru_stime - before.ru_stime)
        least = min(least, spent)
    return least


def main() -> None:
    """Print the figures, matplotlib's start-up counted in with the first pictures."""
    help_time = cpu_seconds(sys.executable, "-m", "optim.cli", "--help")
    print(f"help: {help_time:.3f} s of CPU time")

    from optim import search
    from problems import build, load_case, ready_made

    problem = build(load_case(ready_made()[0].name))
    front = search(problem, evaluations=20_000)
    for turn in ("first", "second"):
        with tempfile.TemporaryDirectory() as folder:
            start = time.process_time()
            from optim.plots import save_pictures

            save_pictures(front, problem, folder)
            spent = time.process_time() - start
        print(f"pictures of {len(front)} designs, {turn} time: {spent:.2f} s of CPU time")


if __name__ == "__main__":
    main()
