"""Tables that an engineer types in: CSV with a unit in each header, every fault told by its place.

Reads any table whose columns are stated as `Column`; what the columns mean together (a fan, a
motor) is for `catalogue` and `motors`.
"""

from __future__ import annotations

import csv
import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from problems import CaseError
from problems.problem import Floats
from problems.rules import nearest
from problems.units import QuantityError, to_si

_DELIMITERS = (";", "\t", ",")
_MOST_SHOWN = 50  # faults in one message

# units of the trade that the general reader of quantities does not know: SI unit -> unit -> factor
_TRADE = {
    "1/s": dict.fromkeys(("rpm", "1/min", "min-1", "r/min", "rev/min"), 1.0 / 60.0)
    | dict.fromkeys(("1/s", "s-1", "rps", "r/s", "rev/s", "hz"), 1.0),
    "Pa": dict.fromkeys(("mmh2o", "mmwc", "mm wc", "mmwg", "mm wg"), 9.80665)
    | dict.fromkeys(("inh2o", "in h2o", "inwc", "in wc", "inwg", "in wg"), 249.08891),
    "m3/s": {"cfm": 0.3048**3 / 60.0},
}
_EXAMPLE = {
    "1/s": "rpm",
    "Pa": "Pa",
    "m3/s": "m3/h",
    "W": "W",
    "kg/m3": "kg/m3",
    "m2": "m2",
    "m": "mm",
}


@dataclass(frozen=True)
class Column:
    """A column that a table may have: SI `unit` of its numbers, "" for text, "money" for a price.

    `fits` says which numbers, in SI, may stand in it, `allowed` says so in words.
    """

    name: str
    unit: str
    allowed: str
    fits: Callable[[float], bool] = lambda _: True


@dataclass(frozen=True)
class Row:
    """One line of a table: where it stands and what it says in SI, empty cells left out."""

    line: int
    values: dict[str, float | str]
    written: dict[str, str]

    def number(self, name: str) -> float | None:
        """The number of a column, None where there is none that can be used."""
        value = self.values.get(name)
        return value if isinstance(value, float) else None

    def text(self, name: str) -> str:
        """The text of a column, empty where there is none."""
        return str(self.values.get(name, ""))


@dataclass
class Sheet:
    """A table as read, with the faults found so far."""

    where: str
    width: int = 0
    headers: dict[str, str] = field(default_factory=dict)
    units: dict[str, str] = field(default_factory=dict)
    rows: list[Row] = field(default_factory=list)
    faults: list[tuple[int, str]] = field(default_factory=list)

    def fault(self, says: str, line: int = 0) -> None:
        """Note a fault of the whole table, or of a line."""
        place = f"row {line}" if line else ""
        self.faults.append((line, ", ".join(filter(None, (place, says)))))

    def wrong(self, row: Row, name: str, allowed: str) -> None:
        """Note that what stands in a cell is not `allowed`."""
        shown = row.written.get(name) or "empty"
        self.fault(f'column "{self.headers.get(name, name)}": {shown} -- {allowed}', row.line)

    def has(self, names: Iterable[str]) -> bool:
        """Whether all the columns are there; those that are not are noted."""
        lacking = [name for name in names if name not in self.headers]
        for name in lacking:
            self.fault(f'column "{name}": missing -- a column of this name with its unit')
        return not lacking

    def full(self, names: Iterable[str]) -> None:
        """Note every row in which one of the columns is empty."""
        for name in names:
            for row in self.rows:
                if not row.written.get(name):
                    self.wrong(row, name, "a value in every row")

    def numbers(self, name: str, rows: Sequence[Row] | None = None) -> Floats:
        """The numbers of a column, NaN where there is none."""
        found = [row.number(name) for row in (self.rows if rows is None else rows)]
        return np.array([math.nan if value is None else value for value in found])

    def rising(self, name: str, of: str, rows: Sequence[Row] | None = None) -> None:
        """Note every row in which a column does not rise."""
        before: Row | None = None
        for row in self.rows if rows is None else rows:
            value = row.number(name)
            if value is None:
                continue
            if before is not None and value <= (before.number(name) or 0.0):
                says = f"above {before.written[name]}, the value of row {before.line}{of}: it rises"
                self.wrong(row, name, says)
            before = row

    def message(self) -> str:
        """Every fault, the first line naming the file; empty where there is none."""
        if not self.faults:
            return ""
        count = "1 fault" if len(self.faults) == 1 else f"{len(self.faults)} faults"
        shown = [says for _, says in sorted(self.faults, key=lambda fault: fault[0])]
        more = len(shown) - _MOST_SHOWN
        rest = [f"... and {more} more"] if more > 0 else []
        return "\n  ".join((f"{self.where}: {count}", *shown[:_MOST_SHOWN], *rest))

    def finish(self) -> None:
        """Raise CaseError where there is any fault."""
        if self.faults:
            raise CaseError(self.message())


def read_sheet(path: str | Path, columns: Sequence[Column], text: str | None = None) -> Sheet:
    """The table of a CSV file, or of `text`, with its faults noted; nothing is raised for those.

    Comma, semicolon or tab between the cells; with the latter two a decimal comma is understood.
    Empty lines and lines that begin with # are passed over.

    Raises CaseError where the file cannot be read at all.
    """
    sheet = Sheet(str(path))
    lines = (_text(Path(path)) if text is None else text).splitlines()
    kept = [(i, line) for i, line in enumerate(lines, 1) if line.strip(" ;,\t") and line[0] != "#"]
    if not kept:
        raise CaseError(f"{path}: empty -- a line of headers, then one row for each point")
    delimiter = max(_DELIMITERS, key=kept[0][1].count)
    cells = [(i, next(csv.reader([line], delimiter=delimiter))) for i, line in kept]
    sheet.width = len(cells[0][1])
    places = _headers(sheet, [cell.strip() for cell in cells[0][1]], columns)
    for number, row in cells[1:]:
        sheet.rows.append(_row(sheet, number, [cell.strip() for cell in row], places, delimiter))
    if not sheet.rows:
        sheet.fault("no rows -- one row for each tested point below the headers")
    return sheet


def _text(path: Path) -> str:
    try:
        return path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise CaseError(f"{path}: not UTF-8 text (byte {error.start + 1})") from error
    except FileNotFoundError as error:
        raise CaseError(f"{path}: no such file") from error
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not a file name"
        raise CaseError(f"{path!s}: cannot be read ({reason})") from error


Place = tuple[int, Column, float]  # where a column stands, and the factor to SI


def _headers(sheet: Sheet, headers: Sequence[str], columns: Sequence[Column]) -> list[Place]:
    """The columns of a table, faults noted for those that cannot be used."""
    places = []
    for place, header in enumerate(headers):
        said = f'column "{header}"' if header else f"column {place + 1}, without a header"
        plain = " ".join(header.replace("_", " ").split())
        fitting = [
            c for c in columns if f"{plain.casefold()} ".startswith((f"{c.name} ", f"{c.name}["))
        ]
        if not fitting:
            names = [column.name for column in columns]
            sheet.fault(f"{said}: {nearest(_words(plain), names)}")
            continue
        column = max(fitting, key=lambda c: len(c.name))
        unit = plain[len(column.name) :].strip().strip("[]()").strip()
        if column.name in sheet.headers:
            sheet.fault(f'{said}: the same as "{sheet.headers[column.name]}" -- give one')
            continue
        sheet.headers[column.name], sheet.units[column.name] = header, unit
        try:
            places.append((place, column, _factor(unit, column.unit)))
        except QuantityError:
            example = f"{column.name} {_EXAMPLE.get(column.unit, '%')}"
            given = f"unit {unit} not understood" if unit else "no unit"
            sheet.fault(f'{said}: {given} -- such as "{example}"')
    return places


def _words(header: str) -> str:
    """A header without its last word where there are several: that will be the unit."""
    words = header.split()
    return " ".join(words[:-1] if len(words) > 1 else words)


def _factor(unit: str, si: str) -> float:
    """What takes a number in `unit` to the SI unit `si`. Raises QuantityError."""
    if si in ("", "money"):
        return 1.0
    if not unit:
        if si != "1":
            raise QuantityError(unit)
        return 1.0
    known = _TRADE.get(si, {}).get(unit.casefold().replace(".", ""))
    if known is None and si == "1/s":
        raise QuantityError(unit)
    return known if known is not None else to_si(f"1 {unit}", si)


def _row(sheet: Sheet, line: int, cells: Sequence[str], places: Sequence[Place], by: str) -> Row:
    """One line, faults noted for cells that cannot be used."""
    row = Row(line, {}, {})
    if any(cells[sheet.width :]):
        sheet.fault(f"cells: {len(cells)} -- {sheet.width}, one for each header", line)
    for place, column, factor in places:
        text = cells[place] if place < len(cells) else ""
        row.written[column.name] = text
        if not text:
            continue
        value = text if column.unit == "" else _number(text, by)
        if isinstance(value, float):
            value *= factor
        if value is None or (isinstance(value, float) and not column.fits(value)):
            sheet.wrong(row, column.name, column.allowed)
        else:
            row.values[column.name] = value
    return row


def _number(text: str, delimiter: str) -> float | None:
    """A plain finite number, None for anything else."""
    if delimiter != "," and "." not in text:
        text = text.replace(",", ".")
    if not set(text) <= set("0123456789.+-eE"):
        return None
    try:
        value = float(text)
    except ValueError:
        return None
    return value if math.isfinite(value) else None
