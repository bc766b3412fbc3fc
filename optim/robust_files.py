"""What `robust` leaves beside a run: the table, the account and the pictures.

What is in them is made in `robust_account` and `robust_pictures`.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from optim.files import write_json, written_whole
from optim.robust import Study
from optim.robust_account import tables
from optim.runs import kept_clear

TABLE, ACCOUNT = "robust.csv", "robust.json"
PICTURES = ("robust-front.png", "robust-inputs.png", "robust-limits.png")


def opened(path: Path, *, force: bool) -> Path:
    """The folder at `path`, made if need be; see `runs.kept_clear`."""
    return kept_clear(path, (TABLE, ACCOUNT, *PICTURES), force=force)


def saved(study: Study, account: Mapping[str, Any], folder: Path) -> list[str]:
    """Leave table and pictures and at last the account in `folder`; returns their names."""
    from optim.robust_pictures import save_pictures

    for name in (ACCOUNT, *PICTURES):
        (folder / name).unlink(missing_ok=True)
    with written_whole(folder / TABLE) as stream:
        tables(study).to_csv(stream, index=False, lineterminator="\n")
    files = [TABLE, *(picture.name for picture in save_pictures(study, folder)), ACCOUNT]
    write_json(folder / ACCOUNT, {**account, "files": files})
    return files
