"""A pool of worker processes that starts from anywhere: a notebook, standard input, a script without a main guard.

Workers are spawned, not forked, because a fork after a threaded kernel kills them; a spawned worker would import the caller's
`__main__`, so that is hidden while the pool lives. Workers run serial kernels: their thread counts are set in the environment.
An interruption is the parent's alone: workers never hear of it, and are ended at once when it comes.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
import sys
import threading
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import FIRST_COMPLETED, Executor, Future, ProcessPoolExecutor, wait
from contextlib import contextmanager
from typing import Any

SERIAL = {
    "NUMBA_NUM_THREADS": "1",
    "OMP_NUM_THREADS": "1",
    "OPENBLAS_NUM_THREADS": "1",
    "MKL_NUM_THREADS": "1",
}
# Tasks in flight per worker: enough that none waits, few enough that an interruption loses little.
WINDOW = 3


@contextmanager
def process_pool(
    workers: int, initializer: Callable[..., None], initargs: tuple[Any, ...]
) -> Iterator[Executor]:
    """An executor of spawned processes that need nothing from the caller's `__main__`."""
    with _serial_environment(), _hidden_main():
        pool = ProcessPoolExecutor(
            workers,
            multiprocessing.get_context("spawn"),
            initializer=_start,
            initargs=(initializer, initargs),
        )
        before = set(multiprocessing.active_children())
        try:
            with _deaf():  # a process keeps ignoring what was ignored when it was started
                for _ in range(workers):
                    pool.submit(int)
            yield pool
        except BaseException:
            with _deaf():  # a second interruption must not cut this short
                for worker in set(multiprocessing.active_children()) - before:
                    worker.terminate()
                pool.shutdown(wait=True, cancel_futures=True)
            raise
        pool.shutdown(wait=True, cancel_futures=True)


def results(pool: Executor, function: Callable[[Any], Any], tasks: Iterable[Any]) -> Iterator[Any]:
    """Results as they come, with a bounded number of tasks in flight."""
    size = WINDOW * getattr(pool, "_max_workers", 1)
    waiting: set[Future[Any]] = set()
    remaining = iter(tasks)
    while True:
        while len(waiting) < size and (task := next(remaining, None)) is not None:
            waiting.add(pool.submit(function, task))
        if not waiting:
            return
        done, waiting = wait(waiting, return_when=FIRST_COMPLETED)
        for future in done:
            yield future.result()


def _start(initializer: Callable[..., None], initargs: tuple[Any, ...]) -> None:
    """A worker that was started from another thread than the main one hears no interruptions from here on."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    initializer(*initargs)


@contextmanager
def _deaf() -> Iterator[None]:
    """Interruptions are ignored meanwhile; only the main thread may ask for that."""
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)


@contextmanager
def _serial_environment() -> Iterator[None]:
    before = {name: os.environ.get(name) for name in SERIAL}
    os.environ.update(SERIAL)
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


@contextmanager
def _hidden_main() -> Iterator[None]:
    main = sys.modules["__main__"]
    kept = {name: getattr(main, name) for name in ("__file__", "__spec__") if hasattr(main, name)}
    if "__file__" in kept:
        del main.__file__
    main.__spec__ = None
    try:
        yield
    finally:
        for name, value in kept.items():
            setattr(main, name, value)
