"""What `robust` leaves beside a run: the table, the account and the pictures.

What is in them is made in `robust_account` and `robust_pictures`.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from optim.errors import RunExistsError
from optim.files import written_whole
from optim.robust import Study
from optim.robust_account import tables
from optim.runs import writable

TABLE, ACCOUNT = "robust.csv", "robust.json"
PICTURES = ("robust-front.png", "robust-inputs.png", "robust-limits.png")


def opened(path: Path, *, force: bool) -> Path:
    """The folder at `path`, made if need be.

    Raises RunExistsError where it holds such files and `force` is not given, RunError where it
    cannot be written to.
    """
    held = [name for name in (TABLE, ACCOUNT, *PICTURES) if (path / name).exists()]
    if held and not force:
        raise RunExistsError(
            f"{path}: holds {', '.join(held)} already; nothing is replaced without --force"
        )
    writable(path)
    return path


def saved(study: Study, account: Mapping[str, Any], folder: Path) -> list[str]:
    """Leave table and pictures and at last the account in `folder`; returns their names."""
    from optim.robust_pictures import save_pictures

    for name in (ACCOUNT, *PICTURES):
        (folder / name).unlink(missing_ok=True)
    with written_whole(folder / TABLE) as stream:
        tables(study).to_csv(stream, index=False, lineterminator="\n")
    files = [TABLE, *(picture.name for picture in save_pictures(study, folder)), ACCOUNT]
    with written_whole(folder / ACCOUNT) as stream:
        told = {**account, "files": files}
        json.dump(told, stream, indent=2, ensure_ascii=False, allow_nan=False)
        stream.write("\n")
    return files
