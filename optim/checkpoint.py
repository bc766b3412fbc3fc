"""A search written down so that it can be taken up again, exactly, after a kill.

The file is numpy's own archive of plain arrays and text, read without unpickling anything, so a
checkpoint from elsewhere can be refused but never run.
"""

from __future__ import annotations

import hashlib
import json
import os
import zipfile
from pathlib import Path
from typing import Any

import numpy as np

from optim.errors import CheckpointError
from optim.files import written_whole
from optim.steps import Mark, State
from problems.problem import Problem

_FORMAT = "platewright checkpoint 1"
_ARRAYS = (
    "ranked_units",
    "ranked_aims",
    "ranked_violation",
    "kept_units",
    "kept_aims",
    "scales",
)
_MARKED = ("generation", "evaluations", "size", "violation")


def fingerprint(problem: Problem) -> str:
    """A digest of everything about `problem` that decides the course of a search."""
    facts = (problem.kind, problem.source, problem.variables, problem.aims, problem.limits)
    return hashlib.sha256(repr(facts).encode()).hexdigest()


def write(path: str | os.PathLike[str], problem: Problem, seed: int, state: State) -> None:
    """Write `state` to `path`, whole or not at all."""
    header = {
        "format": _FORMAT,
        "case": fingerprint(problem),
        "title": problem.title,
        "seed": seed,
        "generation": state.generation,
        "evaluations": state.evaluations,
        "trail": [{name: getattr(mark, name) for name in _MARKED} for mark in state.trail],
        "lengths": [len(mark.front) for mark in state.trail],
        "rng": state.rng,
    }
    arrays: dict[str, Any] = {name: getattr(state, name) for name in _ARRAYS}
    arrays["fronts"] = np.concatenate([mark.front for mark in state.trail])
    with written_whole(Path(path), "wb") as stream:
        np.savez(stream, header=np.array(json.dumps(header)), **arrays)


def read(path: str | os.PathLike[str], problem: Problem, seed: int) -> State:
    """The state in the checkpoint at `path`.

    Raises CheckpointError where the file is not a checkpoint, or is one of another case or seed.
    """
    header, arrays = _opened(Path(path))
    if header["case"] != fingerprint(problem):
        raise CheckpointError(
            f"{path}: this checkpoint belongs to another case ({header['title']!r}, or the same "
            f"case since changed), not to {problem.title!r}; start anew with another file"
        )
    if header["seed"] != seed:
        raise CheckpointError(f"{path}: this checkpoint has seed {header['seed']}, not {seed}")
    fronts = np.split(arrays["fronts"], np.cumsum(header["lengths"])[:-1])
    return State(
        generation=header["generation"],
        evaluations=header["evaluations"],
        **{name: arrays[name] for name in _ARRAYS},
        trail=tuple(
            Mark(**mark, front=front) for mark, front in zip(header["trail"], fronts, strict=True)
        ),
        rng=header["rng"],
    )


def guard(path: str | os.PathLike[str], problem: Problem) -> None:
    """Raise CheckpointError where writing to `path` would destroy something that is not ours."""
    if not Path(path).exists():
        return
    header, _ = _opened(Path(path))
    if header["case"] != fingerprint(problem):
        raise CheckpointError(
            f"{path}: holds a checkpoint of another case ({header['title']!r}); "
            "remove it or name another file"
        )


def _opened(path: Path) -> tuple[dict[str, Any], dict[str, Any]]:
    try:
        with np.load(path, allow_pickle=False) as held:
            arrays = {name: held[name] for name in held.files}
        header = json.loads(str(arrays.pop("header")))
        known = header["format"] == _FORMAT and arrays.keys() == {*_ARRAYS, "fronts"}
    except (OSError, ValueError, KeyError, TypeError, EOFError, zipfile.BadZipFile) as fault:
        raise CheckpointError(f"{path}: not a checkpoint, or a damaged one ({fault})") from fault
    if not known:
        raise CheckpointError(f"{path}: written by another version; start anew")
    return header, arrays
