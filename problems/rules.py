"""How one value of a case file is read, and the words for what is allowed there.

A rule is both the check and its sentence, so that no message can drift from what is checked. Which
key follows which rule is for `schema`; units are for `units`.
"""

from __future__ import annotations

import difflib
import itertools
import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from pydantic import ValidationError
from pydantic_core import CoreSchema, InitErrorDetails, PydanticCustomError, core_schema

from problems.units import QuantityError, format_value, to_si


@dataclass(frozen=True)
class Span:
    """A fixed value (low equals high) or a range to be searched, in SI."""

    low: float
    high: float

    @property
    def fixed(self) -> bool:
        """Whether there is nothing to search."""
        return self.low == self.high


@dataclass(frozen=True)
class Position(Span):
    """Where a wire stands: a fraction of the length if `is_share`, metres otherwise."""

    is_share: bool = False


# path from the key that is being read, value given, what is allowed
Fault = tuple[tuple[str, ...], object, str]


def fault(allowed: str) -> PydanticCustomError:
    """An error that carries the sentence for the user."""
    return PydanticCustomError("fault", "{allowed}", {"allowed": allowed})


def faults(found: Sequence[Fault]) -> ValidationError:
    """Several faults below one key."""
    lines = [InitErrorDetails(type=fault(says), loc=loc, input=value) for loc, value, says in found]
    return ValidationError.from_exception_data("case", lines)


class Rule:
    """What one key may hold. `read` raises ValueError for anything else."""

    @property
    def allowed(self) -> str:
        """What may stand there, as the end of a message."""
        raise NotImplementedError

    def read(self, value: object) -> Any:
        """The value in SI."""
        raise NotImplementedError

    def _checked(self, value: object) -> Any:
        if value is None:  # a default: TOML has no such value
            return None
        try:
            return self.read(value)
        except ValidationError:
            raise
        except ValueError as error:
            raise fault(self.allowed) from error

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self._checked)


@dataclass(frozen=True)
class Number(Rule):
    """A quantity in the SI unit `unit` from `low` to `high`, without `low` itself if `open_low`."""

    what: str
    example: str
    unit: str = "1"
    low: float = -math.inf
    high: float = math.inf
    open_low: bool = False
    but: float | None = None  # the one value inside that makes no sense

    @property
    def allowed(self) -> str:
        return ", ".join((f"{self.what} such as {self.example}", *self.bounds()))

    def bounds(self) -> tuple[str, ...]:
        """The limits in words, none if there are none."""
        low = "0" if self.low == 0.0 else format_value(self.low, self.unit)
        parts = []
        if math.isfinite(self.low):
            parts.append(f"above {low}" if self.open_low else f"at least {low}")
        if math.isfinite(self.high):
            parts.append(f"at most {format_value(self.high, self.unit)}")
        if self.but is not None:
            parts.append(f"not {format_value(self.but, self.unit)}")
        return (" and ".join(parts),) if parts else ()

    def read(self, value: object) -> float:
        number = to_si(value, self.unit)
        too_low = number <= self.low if self.open_low else number < self.low
        if too_low or number > self.high or number == self.but:
            raise QuantityError(value)
        return number


@dataclass(frozen=True)
class Range(Rule):
    """One quantity, or two that bound a range."""

    number: Number
    example: str

    @property
    def allowed(self) -> str:
        one = f"{self.number.what} such as {self.number.example}"
        two = f"or a range {self.example} with low < high"
        return ", ".join((f"{one} {two}", *self.number.bounds()))

    def read(self, value: object) -> Span:
        if not isinstance(value, list | tuple):
            number = self.number.read(value)
            return Span(number, number)
        low, high = map(self.number.read, value)
        if not low < high:
            raise QuantityError(value)
        return Span(low, high)


@dataclass(frozen=True)
class Place(Rule):
    """A position along the plate: a share in percent, or a distance; both bounds alike."""

    share: Range
    distance: Range

    @property
    def allowed(self) -> str:
        return f"{self.share.allowed}; or {self.distance.allowed}; both bounds of the same sort"

    def read(self, value: object) -> Position:
        ends = value if isinstance(value, list | tuple) else [value]
        is_share = all(isinstance(end, str) and end.strip().endswith("%") for end in ends)
        span = (self.share if is_share else self.distance).read(value)
        return Position(span.low, span.high, is_share)


@dataclass(frozen=True)
class Series(Rule):
    """A list of quantities, each larger than the one before."""

    number: Number
    example: str

    @property
    def allowed(self) -> str:
        return f"a list of rising values such as {self.example}"

    def read(self, value: object) -> tuple[float, ...]:
        if not isinstance(value, list | tuple) or not value:
            raise QuantityError(value)
        sizes = tuple(self.number.read(size) for size in value)
        if any(high <= low for low, high in itertools.pairwise(sizes)):
            raise QuantityError(value)
        return sizes


@dataclass(frozen=True)
class Choice(Rule):
    """One of a few words or whole numbers."""

    options: tuple[str | int, ...]

    @property
    def allowed(self) -> str:
        words = [
            f'"{option}"' if isinstance(option, str) else str(option) for option in self.options
        ]
        return " or ".join((", ".join(words[:-1]), words[-1])) if words[1:] else words[0]

    def read(self, value: object) -> str | int:
        if isinstance(value, bool) or value not in self.options:
            raise ValueError(value)
        return next(option for option in self.options if option == value)


@dataclass(frozen=True)
class Text(Rule):
    """A line of text."""

    what: str

    @property
    def allowed(self) -> str:
        return f"{self.what}, one line of text in quotes"

    def read(self, value: object) -> str:
        if not isinstance(value, str) or not value.strip() or not value.strip().isprintable():
            raise ValueError(value)
        return value.strip()


@dataclass(frozen=True)
class Foreign(Rule):
    """A key that other kinds have and this one has not."""

    reason: str

    @property
    def allowed(self) -> str:
        return f"{self.reason}; take the line out"

    def read(self, value: object) -> None:
        raise ValueError(value)


def nearest(name: object, known: Iterable[str]) -> str:
    """That `name` is unknown, with the nearest of `known`, or all of them."""
    names = list(known)
    near = difflib.get_close_matches(str(name).casefold(), names, n=1, cutoff=0.6)
    return f'unknown; the nearest is "{near[0]}"' if near else f"unknown; known: {', '.join(names)}"
