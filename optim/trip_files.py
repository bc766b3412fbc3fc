"""The folder that `trips` leaves: the table, the account, the case and the pictures.

What is in them is made in `trip_account` and `trip_pictures`.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from optim.files import write_json, written_whole
from optim.runs import kept_clear
from optim.trip_account import rows
from optim.trip_study import TripStudy

TABLE, ACCOUNT, CASE = "trips.csv", "trips.json", "case.toml"
PICTURES = ("strategies.png", "gain.png", "map.png", "wire.png")


def opened(path: Path, *, force: bool) -> Path:
    """The folder at `path`, made if need be; see `runs.kept_clear`."""
    return kept_clear(path, (TABLE, ACCOUNT, CASE, *PICTURES), force=force)


def saved(study: TripStudy, account: Mapping[str, Any], folder: Path) -> list[str]:
    """Leave table, case and pictures and at last the account in `folder`; returns their names.

    Nothing is left where there is no answer.
    """
    import pandas as pd

    from optim.trip_pictures import save_pictures

    if not account["answered"]:
        if not any(folder.iterdir()):
            folder.rmdir()
        return []
    for name in (ACCOUNT, *PICTURES):
        (folder / name).unlink(missing_ok=True)
    with written_whole(folder / TABLE) as stream:
        pd.DataFrame(list(rows(study))).to_csv(stream, index=False, lineterminator="\n")
    with written_whole(folder / CASE) as stream:
        stream.write(study.case.source)
    drawn = [picture.name for picture in save_pictures(study, folder)]
    files = [TABLE, CASE, *drawn, ACCOUNT]
    write_json(folder / ACCOUNT, {**account, "files": files})
    return files
