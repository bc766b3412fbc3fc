"""Property tables: what one temperature costs, what a table costs, how far it is from CoolProp.

Run by hand: python tests/benchmarks/property_tables.py. All ratios come from this one run.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from problems.convection.fluids import CACHE_VARIABLE, Fluid, fluid

ROOT = Path(__file__).parents[2]
CHUNK = 8192
CASES = (
    ("air", 101325.0, 290.0, 360.0, None),
    ("humid air", 101325.0, 300.0, 380.0, 0.4),
    ("water", 101325.0, 285.0, 360.0, None),
    ("INCOMP::T66", 101325.0, 300.0, 600.0, None),
)


def seconds(work: Callable[[], object], repeats: int) -> float:
    """Least time of one call among `repeats`."""
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def directly(made: Fluid, temperature: np.ndarray) -> np.ndarray:
    """Density, viscosity, conductivity and heat capacity from CoolProp, one call per property."""
    from CoolProp import CoolProp

    if made.humidity_ratio is not None:
        rows = [
            CoolProp.HAPropsSI(s, "T", temperature, "P", made.pressure, "W", made.humidity_ratio)
            for s in ("Vha", "M", "K", "cp_ha")
        ]
        return np.stack([1.0 / rows[0], *rows[1:]])
    return np.stack(
        [CoolProp.PropsSI(s, "T", temperature, "P", made.pressure, made.name) for s in "DVLC"]
    )


def measure(name: str, pressure: float, low: float, high: float, humidity: float | None) -> str:
    """One line of the report."""

    def make() -> Fluid:
        return fluid(name, pressure, low, high, humidity)

    os.environ[CACHE_VARIABLE] = ""
    made = make()
    built = seconds(make, 3)
    with tempfile.TemporaryDirectory() as folder:
        os.environ[CACHE_VARIABLE] = folder
        make()
        read = seconds(make, 5)
    temperature = np.random.default_rng(1).uniform(made.low, made.high, CHUNK)
    table = seconds(lambda: made.at(temperature), 200) / CHUNK
    few = temperature[:1000]
    asked = seconds(lambda: directly(made, few), 3) / len(few)
    found = made.at(few)
    there = directly(made, few)
    worst = np.max(np.abs(np.stack([found.rho, found.mu, found.k, found.cp]) / there - 1.0))
    return (
        f"{name:14s}{table * 1e9:10.1f}{asked / table:12.0f}{built * 1e3:12.1f}{read * 1e3:10.2f}"
        f"{made.values.shape[1]:8d}{worst:11.1e}"
    )


def start_up() -> tuple[float, float]:
    """CPU time [s] of a fresh process for one table: built, and read from the cache."""
    code = (
        "import time; from problems.convection.fluids import fluid; "
        "fluid('air', 101325.0, 290.0, 360.0).at(300.0); print(time.process_time())"
    )
    with tempfile.TemporaryDirectory() as folder:
        settings = {**os.environ, CACHE_VARIABLE: folder, "PYTHONPATH": str(ROOT)}
        built, read = (
            float(subprocess.check_output([sys.executable, "-c", code], env=settings, cwd=ROOT))
            for _ in range(2)
        )
    return built, read


def main() -> None:
    """Print the report."""
    print(f"six properties at {CHUNK} temperatures at once, one core")
    print("fluid          ns each  to CoolProp    build ms   read ms   nodes      error")
    for case in CASES:
        print(measure(*case))
    built, read = start_up()
    print(f"fresh process, CPU: {built:.2f} s to build, {read:.2f} s with the table in the cache")


if __name__ == "__main__":
    main()
