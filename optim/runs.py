"""The folder a run is left in: what may be begun, gone on with, or replaced there.

What stands in the files of a run is for `front` and `plots`; the search's own state is in
`checkpoint`.
"""

from __future__ import annotations

import tempfile
from collections.abc import Iterable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from optim.errors import RunError, RunExistsError
from optim.files import written_whole

if TYPE_CHECKING:
    from optim.front import Front
    from problems.problem import Problem

CHECKPOINT = "checkpoint.npz"
PICTURES = ("front.png", "variables.png", "sketch.png")
_RUN = ("front.csv", "run.json", "case.toml")  # as `front` names them


@dataclass(frozen=True)
class RunFolder:
    """A folder that may be written to; `resume` where an unfinished search is gone on with."""

    path: Path
    resume: bool

    @property
    def checkpoint(self) -> Path:
        """Where the search keeps its state until it is done."""
        return self.path / CHECKPOINT


def opened(path: Path, *, resume: bool, force: bool) -> RunFolder:
    """The folder at `path`, made if need be, for a new search or to go on with one.

    Raises RunExistsError where a run or an unfinished search stands there and neither `force`
    nor, for the unfinished one, `resume` is given; RunError where the folder cannot be written to.
    """
    unfinished = (path / CHECKPOINT).exists()
    held = [name for name in _RUN if (path / name).exists()]
    if held and not force and not (resume and unfinished):
        why = "its search is finished" if resume else "nothing is replaced without --force"
        raise RunExistsError(f"{path}: holds a run already ({', '.join(held)}); {why}")
    if unfinished and not resume and not force:
        raise RunExistsError(
            f"{path}: holds an unfinished search; --resume goes on with it, --force begins anew"
        )
    writable(path)
    if unfinished and not resume:
        (path / CHECKPOINT).unlink()
    return RunFolder(path, resume and unfinished)


def saved(front: Front, problem: Problem, folder: RunFolder) -> list[str]:
    """Leave a run with its pictures in `folder`; returns the names of the files.

    Nothing is left of a search that found nothing. The checkpoint goes, unless the search was
    broken off and can be gone on with.
    """
    from optim.account import safety
    from optim.course import INTERRUPTED
    from optim.plots import save_pictures

    if front.provenance["stopped_because"] != INTERRUPTED:
        folder.checkpoint.unlink(missing_ok=True)
    if not len(front):
        _remove_if_empty(folder.path)
        return []
    for name in PICTURES:
        (folder.path / name).unlink(missing_ok=True)
    told = replace(front, provenance={**front.provenance, "safety": safety()})
    _copied(problem, folder.path)
    told.save(folder.path, force=True)
    pictures = save_pictures(front, problem, folder.path)
    return [*_RUN, *(picture.name for picture in pictures)]


def _copied(problem: Problem, folder: Path) -> None:
    """Copy what the case needs beside it, so that the run can be taken up again from its folder."""
    for name, place in problem.files:
        if place.resolve() != (folder / name).resolve():
            with written_whole(folder / name, "wb") as stream:
                stream.write(place.read_bytes())


def _remove_if_empty(path: Path) -> None:
    if not any(path.iterdir()):
        path.rmdir()


def free_name(folder: Path, stem: str, ending: str) -> Path:
    """A file in `folder` that is not there yet: stem.ending, stem-2.ending, ..."""
    path, number = folder / f"{stem}{ending}", 2
    while path.exists():
        path, number = folder / f"{stem}-{number}{ending}", number + 1
    return path


def kept_clear(path: Path, names: Iterable[str], *, force: bool) -> Path:
    """The folder at `path`, made if need be, for files called `names`.

    Raises RunExistsError where it holds some of them and `force` is not given, RunError where it
    cannot be written to.
    """
    held = [name for name in names if (path / name).exists()]
    if held and not force:
        raise RunExistsError(
            f"{path}: holds {', '.join(held)} already; nothing is replaced without --force"
        )
    writable(path)
    return path


def writable(path: Path) -> None:
    """Make the folder at `path` if need be; raises RunError where it cannot be written to."""
    try:
        path.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=path):
            pass
    except (FileExistsError, NotADirectoryError) as fault:
        raise RunError(f"{path}: a file stands where a folder is needed") from fault
    except OSError as fault:
        raise RunError(f"{path}: cannot be written to ({fault.strerror})") from fault
