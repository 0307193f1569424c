"""Work handed out to several processes that all end at once when it is stopped."""

from __future__ import annotations

import contextlib
import functools
import os
import signal
import threading
from collections.abc import Callable, Iterable, Iterator, Sequence
from types import FrameType
from typing import TypeVar

__all__ = ["mapped"]

Given = TypeVar("Given")
Made = TypeVar("Made")


def mapped(work: Callable[[Given], Made], items: Sequence[Given], jobs: int) -> Iterable[Made]:
    """Yield what becomes of each item, in order, from this process or from several.

    Parameters
    ----------
    work : callable
        Of a module, so that another process can find it.
    items : sequence
        What to work on.
    jobs : int
        Processes; with 1 this process does everything.

    Raises
    ------
    KeyboardInterrupt
        When stopped from the keyboard; all processes have ended by then, and what they had half done is cleared away.
    """
    if jobs == 1:
        yield from map(work, items)
        return
    from concurrent.futures import ProcessPoolExecutor
    from multiprocessing import active_children, get_context

    others = active_children()
    # a fresh interpreter: threads of the numeric libraries do not survive a fork
    pool = ProcessPoolExecutor(min(jobs, len(items)), mp_context=get_context("spawn"), initializer=_end_when_told)
    with pool:
        with _interrupts_left_to_us():
            results = pool.map(functools.partial(_to_the_end, work), items)
        ours = [process for process in active_children() if process not in others]
        try:
            yield from results
        except BaseException:
            for process in ours:
                process.terminate()
            pool.shutdown(cancel_futures=True)
            raise


@contextlib.contextmanager
def _interrupts_left_to_us() -> Iterator[None]:
    """Processes started here ignore interrupts from the keyboard; the one that hands out the work ends them."""
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)


def _end_when_told() -> None:
    """Leave off the work of this process when it is told to end, so that what is half done is cleared away."""
    signal.signal(signal.SIGTERM, _leave)


def _leave(number: int, frame: FrameType | None) -> None:
    signal.signal(number, signal.SIG_IGN)  # the pool tells it once more
    raise SystemExit(128 + number)


def _to_the_end(work: Callable[[Given], Made], item: Given) -> Made:
    """Work on one item; a process that left it off begins no other one, though the pool has handed it out already."""
    try:
        return work(item)
    except SystemExit as told:
        os._exit(told.code if isinstance(told.code, int) else 1)
