"""How long the march takes and how its error falls with the grid.

python -m tests.benchmarks.march_speed
"""

from __future__ import annotations

import time

import numpy as np

from problems.convection.march_surface import Marched, march_surface
from problems.convection.sweep import Surface, sweep
from problems.problem import Floats

_FINE = (480, 1600)  # cells, stations
_GRIDS = ((60, 200), (120, 400), (240, 800))


def designs(count: int) -> dict[str, Surface]:
    """Gaps and plates over the envelope, half of them with a wire ahead of natural onset."""
    rng = np.random.default_rng(1)
    re_d = np.geomspace(200.0, 1e5, count)
    pr = np.exp(rng.uniform(np.log(0.7), np.log(100.0), count))
    re_l = re_d * np.exp(rng.uniform(np.log(0.5), np.log(200.0), count))
    every_other = np.arange(count) % 2 == 0
    gap = Surface(
        re_l, pr, 6e4, 4.0, re_d,
        wire_x=np.where(every_other, 0.1, 2.0) * re_l, wire_k=np.minimum(900.0, 0.05 * re_d),
    )  # fmt: skip
    long = np.geomspace(1e4, 1e7, count)
    place = np.where(every_other, 0.1, 2.0) * long
    plate = Surface(long, pr, 6e5, 1.0, wire_x=place, wire_k=np.full(count, 900.0))
    return {"gap": gap, "plate": plate}


def errors(found: Marched, limit: Marched) -> Floats:
    """Largest relative deviations of mean friction, mean Stanton number and pressure drop."""
    pairs = [(found.friction, limit.friction), (found.stanton, limit.stanton)]
    if np.any(limit.drop[:, -1]):
        pairs.append((found.drop[:, -1], limit.drop[:, -1]))
    return np.array([np.abs(value / exact - 1.0).max() for value, exact in pairs])


def main() -> None:
    """Print seconds for 50 designs, then errors and order of convergence for 16."""
    for name, surface in designs(50).items():
        swept = sweep(surface)
        for stations in (400, 1000):
            started = time.perf_counter()
            march_surface(surface, swept, stations=stations)
            seconds = time.perf_counter() - started
            print(f"50 designs, {name:5s} {stations:5d} stations: {seconds:5.2f} s")
    for name, surface in designs(16).items():
        swept = sweep(surface)
        limit = march_surface(surface, swept, cells=_FINE[0], stations=_FINE[1])
        before = np.zeros(0)
        for cells, stations in _GRIDS:
            now = errors(march_surface(surface, swept, cells=cells, stations=stations), limit)
            order = np.log2(before / now) if before.size else np.full(now.shape, np.nan)
            words = ", ".join(
                f"{100 * e:.3f} % (order {o:.1f})" for e, o in zip(now, order, strict=True)
            )
            print(f"{name:5s} {cells:4d} x {stations:4d}: friction, heat, drop {words}")
            before = now


if __name__ == "__main__":
    main()
