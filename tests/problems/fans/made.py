"""Fans for tests: made from formulas, so that what must come out can be worked by hand."""

from __future__ import annotations

import numpy as np

from problems.fans.curves import Fan


def quadratic_fan(points: int = 121, **changes) -> Fan:
    """Pressure 500 - 80 q - 120 q^2 [Pa], tested up to 1.6 m3/s, with a hump-free curve."""
    flow = np.linspace(0.0, 1.6, points)
    return fan(flow, 500.0 - 80.0 * flow - 120.0 * flow**2, 200.0 + 300.0 * flow, **changes)


def dipped_fan(**changes) -> Fan:
    """A curve with a stall dip to 300 Pa at 0.4 m3/s and a peak of 400 Pa at 0.8 m3/s."""
    flow = [0.0, 0.2, 0.4, 0.6, 0.8, 1.0, 1.2, 1.4, 1.6]
    pressure = [450.0, 380.0, 300.0, 340.0, 400.0, 380.0, 300.0, 180.0, 20.0]
    return fan(flow, pressure, [600.0] * 9, **changes)


def fan(flow, pressure, power, **changes) -> Fan:
    """A fan through points in SI, tested at 24 1/s in air of 1.2 kg/m3, 8 to 30 1/s allowed."""
    facts = {"name": "made", "speed": 24.0, "density": 1.2} | changes
    facts = {"lowest_speed": 8.0, "highest_speed": 30.0} | facts
    points = (tuple(map(float, values)) for values in (flow, pressure, power))
    return Fan(**dict(zip(("flow", "pressure", "power"), points, strict=True)), **facts)


def random_fans(count: int, seed: int) -> list[Fan]:
    """Fans of random sizes and shapes, every other one with a dip before its peak."""
    rng = np.random.default_rng(seed)
    made = []
    for number in range(count):
        size, height = 10 ** rng.uniform(-1.0, 1.0), 10 ** rng.uniform(1.5, 2.9)
        x = np.sort(rng.uniform(0.02, 0.98, rng.integers(6, 13)))
        x = np.concatenate([[0.0], x[np.diff(x, prepend=0.0) > 0.01], [1.0]])
        pressure = height * (1.0 + 0.8 * x - 1.75 * x**2)
        if number % 2:
            pressure -= 0.35 * height * np.exp(-(((x - 0.25) / 0.12) ** 2))
        power = size * height * (0.35 + 0.5 * x - 0.2 * x**2)
        made.append(fan(x * size, pressure, power, name=f"made {number}", speed=24.0))
    return made
