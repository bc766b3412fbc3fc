"""Values set by hand over a case file: short names, dotted paths and ranges, before any check.

Works on the tables as read from TOML; whether a value makes sense is for the schema.
"""

from __future__ import annotations

import copy
import difflib
from collections.abc import Iterable, Mapping
from typing import Any

from problems.faults import key_text, line, toml
from problems.tables import EITHER

_OTHERS = {one: other for pair in EITHER.items() for one, other in (pair, pair[::-1])}
_LISTS = ("aims.most", "aims.least")


def overridden(
    raw: Mapping[str, Any], overrides: Mapping[str, str | float], paths: Iterable[str]
) -> tuple[dict[str, Any], list[str]]:
    """`raw` with `overrides` laid over it, and one line for every name that fits no key.

    `paths` are the dotted paths of all keys of the kind. Of two keys that exclude each other the
    one set here replaces the other.
    """
    known = [*(path for path in paths if not path.startswith(("aims", "limits"))), *_LISTS]
    result, wrong = copy.deepcopy(dict(raw)), []
    places = {name: _path(name, known) for name in overrides}
    said: dict[str, str] = {}
    for name, value in overrides.items():
        path, problem = places[name]
        if path is None:
            wrong.append(line(name, value, problem))
            continue
        if path in said:
            wrong.append(line(name, value, f"the same as {said[path]}, already set: give one"))
            continue
        said[path] = name
        other = _OTHERS.get(path)
        if other and other not in [place for place, _ in places.values()]:
            _drop(result, other.split("."))
        if not _put(result, path.split("."), _value(path, value)):
            wrong.append(line(name, value, f"{path.rsplit('.', 1)[0]} is no table in this case"))
    return result, wrong


def _path(name: str, known: list[str]) -> tuple[str | None, str]:
    """The dotted path that `name` means; None and the reason where it means none or several."""
    parts = name.split(".")
    if name in known or (parts[0] == "limits" and parts[2:] in (["at_least"], ["at_most"])):
        return name, ""
    short = [path for path in known if not path.startswith("uncertain.")]
    fitting = [path for path in short if name in (path.split(".")[-1], _joined(path))]
    if len(fitting) == 1:
        return fitting[0], ""
    if fitting:
        return None, f"could be {' or '.join(fitting)}; give one of these"
    names = {alias: path for path in short for alias in (path.split(".")[-1], _joined(path))}
    names |= {path: path for path in known}
    near = difflib.get_close_matches(name, list(names), n=1, cutoff=0.5)
    if near:
        return None, f'unknown; the nearest is "{near[0]}" ({names[near[0]]})'
    return None, f"unknown; known: {', '.join(known)}"


def _joined(path: str) -> str:
    """The last two parts in one word: "trip.height" -> "trip_height"."""
    return "_".join(path.split(".")[-2:])


def _value(path: str, value: str | float) -> Any:
    """The value as TOML would have it: a range as a list, a bare number as a number."""
    if not isinstance(value, str):
        return value
    if path in _LISTS:
        return [name.strip() for name in value.split(",") if name.strip()]
    ends = [_number(end.strip()) for end in value.split("..")]
    return ends if len(ends) == 2 else _number(value)


def _number(text: str) -> str | int | float:
    for kind in (int, float):
        try:
            return kind(text)
        except ValueError:
            continue
    return text


def _put(table: dict[str, Any], parts: list[str], value: Any) -> bool:
    """Sets a value at a path, making tables on the way; false where a value stands in the way."""
    inner: Any = table
    for part in parts[:-1]:
        inner = inner.setdefault(part, {})
        if not isinstance(inner, dict):
            return False
    inner[parts[-1]] = value
    return True


def _drop(table: Any, parts: list[str]) -> None:
    """Takes the key at a path out, if it is there."""
    for part in parts[:-1]:
        table = table.get(part) if isinstance(table, dict) else None
    if isinstance(table, dict):
        table.pop(parts[-1], None)


def written(raw: Mapping[str, Any]) -> str:
    """The tables as TOML again: values first, then a section for each table."""
    plain = {key: value for key, value in raw.items() if not isinstance(value, Mapping)}
    sections = ["".join(_rows(plain))]
    for key, value in raw.items():
        if isinstance(value, Mapping):
            sections.append(f"[{key_text(key)}]\n" + "".join(_rows(value)))
    return "\n".join(section for section in sections if section)


def _rows(table: Mapping[str, Any]) -> Iterable[str]:
    return (f"{key_text(key)} = {toml(value)}\n" for key, value in table.items())
