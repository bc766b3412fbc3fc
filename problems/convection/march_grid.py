"""Where the marched equations are solved: cells across the layer, stations along the plate.

Cells crowd at the wall, stations at the leading edge, behind wires and through transition, for
each design by its own Reynolds and Prandtl number. What is solved there is in `march_steps`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Cells:
    """Cells between the wall and the outer edge or the middle of the gap, for n designs.

    `faces` (n, c + 1) from 0; `width`, `centre` (n, c); `conduct` one over the distance of
    neighbouring centres, `lower` the weight of the lower cell at inner faces, (n, c - 1); `near`,
    `next` (n,) the weights of the two cells at the wall in a slope there.
    """

    faces: Floats
    width: Floats
    centre: Floats
    conduct: Floats
    lower: Floats
    near: Floats
    next: Floats

    @classmethod
    def crowded(cls, growth: Floats, cells: int) -> Cells:
        """Cells from 0 to 1 that grow from the wall by exp(growth/cells) each; growth (n,)."""
        growth = growth[:, None]
        faces = np.expm1(growth * np.linspace(0.0, 1.0, cells + 1)) / np.expm1(growth)
        centre = 0.5 * (faces[:, 1:] + faces[:, :-1])
        distance = np.diff(centre)
        a, b = centre[:, 0], centre[:, 1]
        return cls(
            faces=faces,
            width=np.diff(faces),
            centre=centre,
            conduct=1.0 / distance,
            lower=(centre[:, 1:] - faces[:, 1:-1]) / distance,
            near=b / (a * (b - a)),
            next=a / (b * (b - a)),
        )

    def scaled(self, scale: Floats) -> Cells:
        """The same cells, all lengths times `scale` (n,)."""
        column = scale[:, None]
        return Cells(
            faces=self.faces * column,
            width=self.width * column,
            centre=self.centre * column,
            conduct=self.conduct / column,
            lower=self.lower,
            near=self.near / scale,
            next=self.next / scale,
        )

    def at_faces(self, values: Floats) -> Floats:
        """Cell values (n, c) at the inner faces (n, c - 1)."""
        return np.asarray(values[:, 1:] + self.lower * (values[:, :-1] - values[:, 1:]))

    def wall_slope(self, values: Floats) -> Floats:
        """Slope at the wall (n,) of values (n, c) that are zero there, second order."""
        return np.asarray(self.near * values[:, 0] - self.next * values[:, 1])

    def wall_value(self, values: Floats, slope: Floats) -> Floats:
        """Value at the wall (n,) of values (n, c) that rise from it with `slope` (n,)."""
        return np.asarray((self.wall_slope(values) - slope) / (self.near - self.next))

    def middle(self, values: Floats) -> Floats:
        """Value (n,) at the last face, where the slope is zero: a parabola through two cells."""
        a, b = ((self.faces[:, -1:] - self.centre[:, -2:]) ** 2).T
        return np.asarray((values[:, -1] * a - values[:, -2] * b) / (a - b))

    def reach(self, values: Floats, level: Floats) -> Floats:
        """Distance from the wall (n,) at which values, rising from 0, first reach `level` (n,)."""
        above = np.argmax(values > level[:, None], axis=1)
        rows = np.arange(above.size)
        below = np.maximum(above - 1, 0)
        low = np.where(above > 0, values[rows, below], 0.0)
        start = np.where(above > 0, self.centre[rows, below], 0.0)
        share = (level - low) / (values[rows, above] - low)
        return np.asarray(start + share * (self.centre[rows, above] - start))


def growth_for(first: Floats, cells: int) -> Floats:
    """The `growth` of `Cells.crowded` that gives the first cell about the width `first` (n,)."""
    wanted = 1.0 / (first * cells)  # (exp(g) - 1)/g
    growth = np.log(np.maximum(wanted, 3.0)) + 1.5
    for _ in range(30):
        growth = np.log1p(growth * np.maximum(wanted, 3.0))
    return np.clip(growth, 2.0, 11.0)


@dataclass(frozen=True)
class Stretch:
    """A piece of the plate, in Re_x; shape (n,): from `start` to `end` without a wire between.

    `first` is the length that the first steps are scaled on, `onset` and `length` those of
    transition.
    """

    start: Floats
    end: Floats
    first: Floats
    onset: Floats
    length: Floats

    def stations(self, count: int) -> Floats:
        """Re_x of the ends of `count` steps and of the start, (n, count + 1).

        Steps grow from `first`; a third of them falls into transition, where there is one.
        """
        start, end, first = self.start[:, None], self.end[:, None], self.first[:, None]
        span = np.log1p((end - start) / first)
        x = start + first * np.expm1(span * np.linspace(0.0, 1.0, 1500))
        x[:, -1] = self.end
        place = (x - self.onset[:, None]) / self.length[:, None]
        reached = place[:, -1:] > 0.0
        through = np.clip(place, 0.0, 4.0)
        behind = np.log1p(np.maximum(place, 0.0))
        passed = through[:, -1:] * reached + ~reached
        grown = np.where(reached, behind[:, -1:], 1.0)
        part = 0.5 * (through / passed + behind / grown) * reached
        covered = np.log1p((x - start) / first) / span + 0.7 * (part - part[:, :1])
        covered /= covered[:, -1:]
        wanted = np.broadcast_to(np.linspace(0.0, 1.0, count + 1), (x.shape[0], count + 1))
        found = by_rows(wanted, covered, x)
        found[:, 0], found[:, -1] = self.start, self.end
        return found


def by_rows(at: Floats, key: Floats, value: Floats) -> Floats:
    """Linear interpolation in every row: `at` (n, k), `key` (n, m) rising from 0 to 1."""
    row = 2.0 * np.arange(at.shape[0])[:, None]
    return np.interp((at + row).ravel(), (key + row).ravel(), value.ravel()).reshape(at.shape)


def hermite_by_rows(at: Floats, key: Floats, value: Floats, slope: Floats) -> Floats:
    """Cubic interpolation in every row from values and slopes; `at` (n, k), the others (n, m).

    `key` rises; beyond its ends the nearest value is carried on with the slope there.
    """
    n, m = key.shape
    top = key[:, -1:]
    row = 2.0 * np.arange(n)[:, None]
    inside = np.clip(at, key[:, :1], top)
    flat = (np.sqrt(key / top) + row).ravel()
    place = np.searchsorted(flat, (np.sqrt(inside / top) + row).ravel(), side="right") - 1
    place = np.clip(place.reshape(at.shape) - m * np.arange(n)[:, None], 0, m - 2)

    def pick(table: Floats, shift: int) -> Floats:
        return np.take_along_axis(table, place + shift, axis=1)

    low, high = pick(key, 0), pick(key, 1)
    run = high - low
    t = (inside - low) / run
    rise = pick(value, 1) - pick(value, 0)
    first, last = pick(slope, 0) * run - rise, rise - pick(slope, 1) * run
    cubic = pick(value, 0) + t * rise + t * (1.0 - t) * ((1.0 - t) * first + t * last)
    return np.asarray(cubic + (at - inside) * np.where(at > top, slope[:, -1:], slope[:, :1]))
