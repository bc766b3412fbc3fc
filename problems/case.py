"""From the name of a case or a file to a checked `Case`; every fault told in one message.

What a case may say is in `schema`, how one value is read in `rules`, the words of the messages in
`faults`.
"""

from __future__ import annotations

import difflib
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from importlib.resources import files
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from problems import CaseError
from problems.faults import line, lines, paths_of, toml
from problems.overrides import overridden, written
from problems.rules import Position, Span
from problems.schema import SCHEMAS, Case, PlateCase, StackCase

__all__ = [
    "Case",
    "CaseError",
    "PlateCase",
    "Position",
    "ReadyMade",
    "Span",
    "StackCase",
    "load_case",
    "parse_case",
    "ready_made",
    "ready_made_text",
]

Overrides = Mapping[str, str | float]


@dataclass(frozen=True)
class ReadyMade:
    """A case that comes with the program."""

    name: str
    kind: str
    title: str


def ready_made() -> list[ReadyMade]:
    """The cases that come with the program, by name."""
    found = []
    for name in _names():
        raw = tomllib.loads(ready_made_text(name))
        found.append(ReadyMade(name, raw["kind"], raw["title"]))
    return found


def ready_made_text(name: str) -> str:
    """The text of a ready-made case, to copy."""
    return (files("problems.cases") / f"{name}.toml").read_text(encoding="utf-8")


def _names() -> list[str]:
    entries = (entry.name for entry in files("problems.cases").iterdir())
    return sorted(name.removesuffix(".toml") for name in entries if name.endswith(".toml"))


def load_case(name_or_path: str | Path, overrides: Overrides | None = None) -> Case:
    """The case of a ready-made name or of a file, with `overrides` laid over it.

    `overrides` takes short names ("length", "trip_height") or dotted paths ("plates.length") to
    values as in the file, or "3 mm..40 mm" for a range.

    Raises CaseError with one line for every fault.
    """
    name = str(name_or_path)
    if name in _names():
        return parse_case(ready_made_text(name), name, overrides)
    path = Path(name)
    return parse_case(_text(path), path.stem, overrides, where=name, folder=str(path.parent))


def _text(path: Path) -> str:
    """The text of a case file."""
    try:
        return path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise CaseError(f"{path}: not UTF-8 text (byte {error.start + 1})") from error
    except IsADirectoryError as error:
        inside = path / "case.toml"
        hint = f"; {inside} is one" if inside.is_file() else ""
        raise CaseError(
            f"{path}: a folder -- give a case file or a ready-made case{hint}"
        ) from error
    except (FileNotFoundError, NotADirectoryError) as error:
        raise CaseError(f"{path}: no such file or ready-made case -- {_near(path)}") from error
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not a file name"
        raise CaseError(f"{path!s}: cannot be read ({reason})") from error


def _near(path: Path) -> str:
    """What may have been meant instead of `path`."""
    beside = [str(found) for found in sorted(path.parent.glob("*.toml"))[:500]]
    names = [*_names(), *beside]
    near = difflib.get_close_matches(str(path), names, n=3, cutoff=0.6)
    near += [name for name in _names() if path.stem and path.stem in name and name not in near]
    return f"nearest: {', '.join(near)}" if near else f"ready-made: {', '.join(_names())}"


def parse_case(
    text: str,
    name: str,
    overrides: Overrides | None = None,
    where: str | None = None,
    folder: str = ".",
) -> Case:
    """The case that `text` states; `where` is how messages call it, `folder` where it lies.

    Raises CaseError with one line for every fault.
    """
    where = where or name
    raw = _tables(text, where)
    if overrides:
        raw, wrong = overridden(raw, overrides, paths_of(SCHEMAS.get(_kind(raw), StackCase)))
        if wrong:
            raise _error("values set by hand", wrong)
        text = f"# {where} with values set by hand\n\n{written(raw)}"
    schema = SCHEMAS.get(_kind(raw))
    if schema is None:
        raise _error(where, _faults_of_any_kind(raw))
    try:
        return schema.read(raw, name, text, folder)
    except ValidationError as error:
        raise _error(where, lines(error, schema, raw)) from None


def _kind(raw: Mapping[str, Any]) -> str:
    return str(raw.get("kind"))


def _faults_of_any_kind(raw: Mapping[str, Any]) -> list[str]:
    """That the kind is unknown, and the faults that the case would have as any of the kinds."""
    found: list[list[str]] = []
    for kind, schema in SCHEMAS.items():
        try:
            schema.model_validate({**raw, "kind": kind})
            found.append([])
        except ValidationError as error:
            found.append(lines(error, schema, raw))
    allowed = f"one of the kinds {toml(list(SCHEMAS))[1:-1]}"
    return [line("kind", raw.get("kind"), allowed)] + [
        fault for fault in found[0] if all(fault in others for others in found[1:])
    ]


def _tables(text: str, where: str) -> dict[str, Any]:
    """The tables of a TOML text."""
    try:
        raw = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise CaseError(f"{where}: not TOML -- {_place(str(error), text)}") from error
    except (ValueError, RecursionError) as error:
        raise CaseError(f"{where}: not TOML -- a number too long or tables too deep") from error
    if not raw:
        raise CaseError(f"{where}: empty -- a case begins with title and kind")
    return raw


def _place(message: str, text: str) -> str:
    """Line and column first, then what is wrong there."""
    reason, _, place = message.partition(" (at ")
    numbers = re.findall(r"\d+", place)
    if len(numbers) != 2:  # at the end of the text
        last = text.splitlines() or [""]
        numbers = [str(len(last)), str(len(last[-1]) + 1)]
    return f"line {numbers[0]}, column {numbers[1]}: {reason[:1].lower()}{reason[1:]}"


def _error(where: str, found: list[str]) -> CaseError:
    count = "1 fault" if len(found) == 1 else f"{len(found)} faults"
    return CaseError("\n  ".join((f"{where}: {count}", *found)))
