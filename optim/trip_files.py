"""The folder that `trips` leaves: the table, the account, the case and the pictures.

What is in them is made in `trip_account` and `trip_pictures`.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from optim.errors import RunExistsError
from optim.files import written_whole
from optim.runs import writable
from optim.trip_account import rows
from optim.trip_study import TripStudy

TABLE, ACCOUNT, CASE = "trips.csv", "trips.json", "case.toml"
PICTURES = ("strategies.png", "gain.png", "map.png", "wire.png")


def opened(path: Path, *, force: bool) -> Path:
    """The folder at `path`, made if need be.

    Raises RunExistsError where it holds such files and `force` is not given, RunError where it
    cannot be written to.
    """
    held = [name for name in (TABLE, ACCOUNT, CASE, *PICTURES) if (path / name).exists()]
    if held and not force:
        raise RunExistsError(
            f"{path}: holds {', '.join(held)} already; nothing is replaced without --force"
        )
    writable(path)
    return path


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
    with written_whole(folder / ACCOUNT) as stream:
        told = {**account, "files": files}
        json.dump(told, stream, indent=2, ensure_ascii=False, allow_nan=False)
        stream.write("\n")
    return files
