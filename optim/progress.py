"""News of a search while it runs: a bar on a terminal, a few lines elsewhere."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, TextIO

if TYPE_CHECKING:
    from optim.search import Progress

_LINES = 5  # about so many, where there is no terminal
Told = Callable[["Progress"], None]


@contextmanager
def shown(stream: TextIO, one_aim: bool) -> Iterator[Told]:
    """What a search calls with its progress; writes to `stream` within this context."""
    if stream.isatty():
        with _bar(stream, one_aim) as told:
            yield told
    else:
        yield _lines(stream, one_aim)


@contextmanager
def counted(stream: TextIO, total: int, what: str) -> Iterator[Callable[[], None]]:
    """What a task of about `total` steps calls after each of them; writes to `stream`."""
    if stream.isatty():
        with _count_bar(stream, total, what) as told:
            yield told
    else:
        yield _count_lines(stream, total, what)


@contextmanager
def _count_bar(stream: TextIO, total: int, what: str) -> Iterator[Callable[[], None]]:
    from rich.console import Console
    from rich.progress import BarColumn, TextColumn, TimeRemainingColumn
    from rich.progress import Progress as Bar

    columns = (
        TextColumn(what),
        BarColumn(bar_width=24),
        TextColumn("{task.completed} of {task.total}"),
        TimeRemainingColumn(compact=True),
        TextColumn("left"),
    )
    console = Console(file=stream)
    with Bar(*columns, console=console, transient=True, redirect_stdout=False) as bar:
        task = bar.add_task(what, total=total)
        yield lambda: bar.advance(task)


def _count_lines(stream: TextIO, total: int, what: str) -> Callable[[], None]:
    """A line for every further fifth of the steps."""
    done = 0

    def told() -> None:
        nonlocal done
        done += 1
        if _LINES * done // total > _LINES * (done - 1) // total:
            stream.write(f"{what}: {done} of {total}\n")
            stream.flush()

    return told


@contextmanager
def _bar(stream: TextIO, one_aim: bool) -> Iterator[Told]:
    from rich.console import Console
    from rich.progress import BarColumn, TextColumn, TimeRemainingColumn
    from rich.progress import Progress as Bar

    figure = "best {task.fields[figure]}" if one_aim else "hypervolume {task.fields[figure]}"
    columns = (
        TextColumn("generation {task.fields[generation]}"),
        BarColumn(bar_width=24),
        TextColumn("{task.completed:,} of {task.total:,} evaluations"),
        TextColumn("front {task.fields[front]}"),
        TextColumn(figure),
        TextColumn("at most"),
        TimeRemainingColumn(compact=True),
    )
    console = Console(file=stream)
    with Bar(*columns, console=console, transient=True, redirect_stdout=False) as bar:
        task = bar.add_task("search", total=1, generation=0, front=0, figure="-")

        def told(news: Progress) -> None:
            bar.update(
                task,
                completed=news.evaluations,
                total=news.of,
                generation=news.generation,
                front=news.front_size,
                figure=_figure(news),
            )

        yield told


def _lines(stream: TextIO, one_aim: bool) -> Told:
    """A line for every further fifth of the evaluations."""
    name = "best" if one_aim else "hypervolume"
    passed = 0

    def told(news: Progress) -> None:
        nonlocal passed
        part = _LINES * news.evaluations // news.of
        if part > passed:
            passed = part
            stream.write(
                f"generation {news.generation}: {news.evaluations:,} of {news.of:,} evaluations, "
                f"front {news.front_size}, {name} {_figure(news)}\n"
            )
            stream.flush()

    return told


def _figure(news: Progress) -> str:
    return "-" if news.hypervolume is None else f"{news.hypervolume:.4g}"
