"""Every fault of a case file as one line: key, value given, what is allowed.

Turns the validator's list into our own words; what is allowed is said by the rules themselves.
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterator, Mapping
from typing import Any, get_args

from pydantic import ValidationError
from pydantic.fields import FieldInfo

from problems.rules import Foreign, Rule, nearest
from problems.schema import SCHEMAS, Case
from problems.tables import Table

_BARE = re.compile(r"[A-Za-z0-9_-]+")
_LONGEST = 100


def toml(value: object) -> str:
    """A value as it would stand in a TOML file."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007f")
    if isinstance(value, list | tuple):
        return f"[{', '.join(map(toml, value))}]"
    if isinstance(value, Mapping):
        inside = ", ".join(f"{key_text(key)} = {toml(item)}" for key, item in value.items())
        return f"{{ {inside} }}" if inside else "{}"
    return str(value)


def key_text(key: str) -> str:
    """A key as it would stand in a TOML file."""
    return key if _BARE.fullmatch(key) else toml(key)


def table_of(field: FieldInfo) -> type[Table] | None:
    """The table that a key holds, None where it holds a value."""
    for kind in (field.annotation, *get_args(field.annotation)):
        if isinstance(kind, type) and issubclass(kind, Table):
            return kind
    return None


def rule_of(field: FieldInfo) -> Rule | None:
    """The rule of a key that holds a value."""
    return next((m for m in field.metadata if isinstance(m, Rule)), None)


def keys_of(table: type[Table]) -> tuple[str, ...]:
    """The keys that a table may hold, without those that only other kinds have."""
    return tuple(
        key for key, field in table.model_fields.items() if not isinstance(rule_of(field), Foreign)
    )


def paths_of(table: type[Table], path: str = "") -> Iterator[str]:
    """The dotted path of every key of a case that holds a value."""
    for key in keys_of(table):
        inner = table_of(table.model_fields[key])
        if inner is None:
            yield path + key
        else:
            yield from paths_of(inner, f"{path}{key}.")


def lines(error: ValidationError, schema: type[Case], raw: Mapping[str, Any]) -> list[str]:
    """One line for each fault of the tables `raw`, in the order of the schema."""
    return [_line(entry, schema, raw) for entry in error.errors(include_url=False)]


def line(path: str, value: object, allowed: str) -> str:
    """One fault: what stands where, and what may stand there."""
    shown = toml(value) if value is not None else "missing"
    if len(shown) > _LONGEST:
        shown = f"{shown[:_LONGEST]} ..."
    return f"{path}: {shown} -- {allowed}"


def _line(entry: Any, schema: type[Case], raw: Any) -> str:
    loc, value, sort = entry["loc"], entry["input"], entry["type"]
    if value is None:  # lacking, or refused for what stands elsewhere
        for key in loc:
            raw = raw.get(key) if isinstance(raw, Mapping) else None
        value = raw
    path = ".".join(key_text(str(key)) for key in loc)
    if sort == "fault":
        return line(path, value, entry["ctx"]["allowed"])
    if sort == "extra_forbidden":
        return line(path, value, _unknown(loc, schema))
    return line(path, None if sort == "missing" else value, _wanted(loc, schema))


def _inner(loc: tuple[str, ...], schema: type[Case]) -> type[Table]:
    """The table that the key at `loc` stands in."""
    table: type[Table] = schema
    for key in loc[:-1]:
        table = table_of(table.model_fields[key]) or table
    return table


def _wanted(loc: tuple[str, ...], schema: type[Case]) -> str:
    """What may stand at `loc`, a known key."""
    field = (_inner((*loc, ""), schema) if not loc else _inner(loc, schema)).model_fields[loc[-1]]
    inner, rule = table_of(field), rule_of(field)
    if inner is not None:
        return f"a table with the keys {', '.join(keys_of(inner))}"
    return rule.allowed if rule else 'one of the kinds: "' + '", "'.join(SCHEMAS) + '"'


def _unknown(loc: tuple[str, ...], schema: type[Case]) -> str:
    """Where the unknown key at `loc` may have been meant to stand."""
    paths = [path for path in paths_of(schema) if not path.startswith("uncertain.")]
    elsewhere = [path for path in paths if path.split(".")[-1] == loc[-1]]
    if elsewhere:
        return f"unknown key here; it belongs to {' or '.join(elsewhere)}"
    return nearest(loc[-1], keys_of(_inner(loc, schema))).replace("unknown", "unknown key", 1)
