"""Work on many tasks, spread over the cores of the machine once it is worth it.

The answers come in the order of the tasks, so what is made of them does not depend on the number of
processes. The processes are started afresh, the same way on every system.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
from collections import deque
from concurrent.futures import Future, ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from itertools import chain, islice
from multiprocessing.reduction import ForkingPickler
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, TypeVar

from melodycoach.errors import MelodycoachError

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Iterator

PARALLEL_FROM = 50
"""More tasks than this are spread over processes; fewer are done before those have started."""

BATCH = 8
"""Tasks handed to a process at a time."""

Bench = TypeVar("Bench")
Task = TypeVar("Task")
Answer = TypeVar("Answer")


def n_cores() -> int:
    """Give the number of cores that this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def spread(
    bench: Bench, work: Callable[[Bench, Task], Answer], tasks: Iterable[Task], workers: int
) -> Iterator[Answer]:
    """Do the tasks, in this process or in several, and give the answers in the order of the tasks.

    Parameters
    ----------
    bench
        Handed to ``work`` with each task.
    work
        A function at the top of its module; its tasks and answers travel between processes.
    tasks
        Taken as they are needed: memory does not grow with their number.
    workers
        Processes at most.

    Raises
    ------
    MelodycoachError
        A process ended before its time.
    """
    coming = iter(tasks)
    first = list(islice(coming, PARALLEL_FROM + 1))
    if workers == 1 or len(first) <= PARALLEL_FROM:
        for task in chain(first, coming):
            yield work(bench, task)
        return
    coming = chain(first, coming)
    pool = ProcessPoolExecutor(
        workers,
        mp_context=multiprocessing.get_context("spawn"),
        initializer=_settle_in,
        initargs=(bench,),
    )
    waiting: deque[Future[list[Any]]] = deque()
    try:
        while True:
            while len(waiting) < 2 * workers and (batch := list(islice(coming, BATCH))):
                waiting.append(pool.submit(_do, work, batch))
            if not waiting:
                return
            yield from waiting.popleft().result()
    except BrokenProcessPool:
        raise MelodycoachError(
            "a helper process ended before its time, perhaps for want of memory; "
            "close other programs and measure again"
        ) from None
    finally:
        pool.shutdown(wait=True, cancel_futures=True)


_bench: Any = None


def _settle_in(bench: Any) -> None:
    """Prepare a helper process; Ctrl-C is the business of the one that started it."""
    global _bench
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    _bench = bench


def _do(work: Callable[[Any, Any], Any], batch: list[Any]) -> list[Any]:
    return [work(_bench, task) for task in batch]


def _plain(proxy: MappingProxyType[Any, Any]) -> tuple[Any, ...]:
    return _read_only, (dict(proxy),)


def _read_only(mapping: dict[Any, Any]) -> MappingProxyType[Any, Any]:
    return MappingProxyType(mapping)


ForkingPickler.register(MappingProxyType, _plain)  # read-only mappings do not travel by themselves
