"""Work on a case shared among processes: each makes the problem from the text of the case once.

With one worker everything is done here. What the work is, is for the caller.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

from optim.bands import Bands, Block, Each, in_turn
from optim.errors import RunError
from problems import build

if TYPE_CHECKING:
    from problems.case import Case
    from problems.problem import Problem

Work = Callable[["Problem", Block], Bands]
_HERE: dict[str, Problem] = {}  # the problem of a worker process


@contextmanager
def crew(case: Case, problem: Problem, workers: int) -> Iterator[Each]:
    """What shares blocks of work among `workers` processes, in order, within this context.

    Raises RunError where a process ends before its work is done.
    """
    if workers < 2:
        yield in_turn(problem)
        return
    from concurrent.futures import BrokenExecutor, ProcessPoolExecutor
    from multiprocessing import get_context

    facts = (case.source, case.name, case.folder)
    pool = ProcessPoolExecutor(
        workers, mp_context=get_context("spawn"), initializer=_ready, initargs=facts
    )

    def each(work: Work, blocks: Iterable[Block]) -> Iterator[Bands]:
        return pool.map(_worked, *zip(*((work, block) for block in blocks), strict=True))

    try:
        with _unheard():
            for _ in range(workers):  # each starts one
                pool.submit(_nothing)
        yield each
    except BrokenExecutor as fault:
        raise RunError("a worker ended before its work was done; try --workers 1") from fault
    finally:
        pool.shutdown(cancel_futures=True)


@contextmanager
def _unheard() -> Iterator[None]:
    """Processes started within this context do not hear Ctrl-C; whoever started them ends them."""
    import signal
    import threading

    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)


def _nothing() -> None:
    """Work for a process that is to start."""


def _ready(source: str, name: str, folder: str) -> None:
    from problems.case import parse_case

    _HERE["problem"] = build(parse_case(source, name, folder=folder))


def _worked(work: Work, block: Block) -> Bands:
    return work(_HERE["problem"], block)
