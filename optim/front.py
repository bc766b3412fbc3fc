"""A front: the designs that nothing beats, as a table with its case and where it came from.

Saves itself to a run folder and loads itself from one. Pictures and advice are made elsewhere.
"""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from optim.errors import RunError, RunExistsError
from optim.files import write_json, written_whole
from problems.problem import Bools, Evaluation, Floats, Problem

TEXTS = ("fan", "group", "outside", "cautions")
TABLE, PROVENANCE, CASE = "front.csv", "run.json", "case.toml"


@dataclass(frozen=True, eq=False)
class Front:
    """What a search found.

    `table` has a row for each design and a column for each setting, variable and outcome, named
    with its unit, then `group`, `outside` (laws outside their range, joined by "; ") and
    `cautions`. `provenance` is what run.json holds; `source` is the case exactly as given.
    """

    table: pd.DataFrame
    provenance: Mapping[str, Any]
    source: str

    def __len__(self) -> int:
        return len(self.table)

    def save(self, folder: str | os.PathLike[str], force: bool = False) -> Path:
        """Write front.csv, case.toml and run.json into `folder`, each whole or not at all.

        run.json comes last: a folder with it holds a whole run. Raises RunExistsError where the
        folder holds a run already and `force` is not set.
        """
        place = Path(folder)
        held = [name for name in (TABLE, PROVENANCE, CASE) if (place / name).exists()]
        if held and not force:
            raise RunExistsError(f"{place}: holds a run already ({', '.join(held)}); not replaced")
        if place.exists() and not place.is_dir():
            raise RunError(f"{place}: is a file; a run needs a folder")
        (place / PROVENANCE).unlink(missing_ok=True)
        with written_whole(place / TABLE) as stream:
            self.table.to_csv(stream, index=False, lineterminator="\n")
        with written_whole(place / CASE) as stream:
            stream.write(self.source)
        write_json(place / PROVENANCE, self.provenance)
        return place

    @classmethod
    def load(cls, folder: str | os.PathLike[str]) -> Front:
        """The front saved in `folder`.

        Raises RunError where the folder holds no run, or not a whole one.
        """
        place = Path(folder)
        if not place.is_dir():
            raise RunError(f"{place}: no such folder")
        missing = [name for name in (TABLE, PROVENANCE, CASE) if not (place / name).is_file()]
        if missing:
            raise RunError(f"{place}: holds no run ({', '.join(missing)} missing)")
        try:
            provenance = json.loads((place / PROVENANCE).read_text(encoding="utf-8"))
            table = _read_table(place / TABLE)
        except (ValueError, pd.errors.ParserError) as fault:
            raise RunError(f"{place}: holds a damaged run ({fault})") from fault
        with open(place / CASE, encoding="utf-8", newline="") as stream:
            return cls(table, provenance, stream.read())


def tabulated(problem: Problem, designs: Floats, given: Evaluation) -> pd.DataFrame:
    """The table of `designs` (n, number of variables) and what they give, in the given order."""
    columns: dict[str, Any] = {
        setting.column: given.settings[setting.name] for setting in problem.settings
    }
    for place, variable in enumerate(problem.variables):
        columns.setdefault(variable.column, designs[:, place])
    for outcome in problem.outcomes:
        columns[outcome.column] = given.outcomes[outcome.name]
    for name, texts in given.labels.items():
        columns[name] = _texts(texts.tolist())
    columns["group"] = _texts(given.group.tolist())
    columns["outside"] = _texts(_joined(given.outside, len(given)))
    columns["cautions"] = _texts(_joined(given.cautions, len(given)))
    return pd.DataFrame(columns)


def units(problem: Problem) -> dict[str, str]:
    """The unit of every column of figures in the table."""
    found = {variable.column: variable.unit for variable in problem.variables}
    return found | {named.column: named.unit for named in (*problem.settings, *problem.outcomes)}


def _texts(entries: list[str]) -> pd.Series:
    return pd.Series(entries, dtype="str")


def _joined(marks: Mapping[str, Bools], rows: int) -> list[str]:
    chosen = np.full(rows, "", dtype=object)
    for text, applies in marks.items():
        lead = np.where(chosen == "", "", "; ")
        chosen = np.where(applies, chosen + lead + text, chosen)
    return [str(entry) for entry in chosen]


def _read_table(path: Path) -> pd.DataFrame:
    """Read as text and turned into numbers afterwards, which gives every figure back exactly."""
    table = pd.read_csv(path, dtype="str", keep_default_na=False)
    figures = [name for name in table.columns if name not in TEXTS]
    exact = {name: table[name].to_numpy(dtype=object).astype(np.float64) for name in figures}
    return table.assign(**exact)
