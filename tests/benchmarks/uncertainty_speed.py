"""How long a million evaluations under uncertainty take, and a whole study of a front.

python -m tests.benchmarks.uncertainty_speed [WORKERS]
"""

from __future__ import annotations

import sys
import time

from optim import search
from optim.bands import Terms, banded
from optim.crew import crew
from optim.draws import shared
from optim.picks import designs
from optim.robust import studied
from problems import build, load_case, ready_made

_SAMPLES = 3 * 1024


def main(workers: int) -> None:
    """Print, for every ready-made case, seconds for its front by 3072 draws and for a study."""
    for entry in ready_made():
        case = load_case(entry.name)
        problem = build(case)
        front = search(problem, seed=1)
        with crew(case, problem, workers) as each:
            start = time.perf_counter()
            draws = {
                name: values[:_SAMPLES]
                for name, values in shared(problem.uncertain, 4096, 1).items()
            }
            banded(problem, designs(front, problem), Terms(draws, 0.9), each)
            bands = time.perf_counter() - start
            start = time.perf_counter()
            study = studied(problem, front, each=each)
            whole = time.perf_counter() - start
        print(
            f"{entry.name:16s} {len(front) * _SAMPLES:8,d} evaluations in {bands:5.1f} s; "
            f"study of {study.evaluations:9,d} in {whole:5.1f} s"
        )


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1)
