"""Kernels on several threads: ranges of independent work handed to a few Python threads, which kernels let run at once.

numba's own parallel loops take a third longer to compile, need a threading layer that aborts when two threads enter it, and kill
the children of a fork; a kernel that is called with a range of rows needs none of that. How many threads: what numba was
given (NUMBA_NUM_THREADS), by default all the cores.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from typing import Any

# Blocks per thread: rows and rays differ in what they cost, and whoever is done takes the next.
BLOCKS = 8


def in_blocks(work: Callable[[int, int], object], count: int, *, least: int) -> None:
    """Call `work(start, stop)` on ranges that cover 0 to `count`, of at least so many each, on several threads.

    What a range yields must not depend on the others; then nothing depends on how many threads there are.
    """
    import numba

    settings: Any = numba.config
    threads = int(settings.NUMBA_NUM_THREADS)
    blocks = min(BLOCKS * threads, count // least)
    if threads == 1 or blocks < 2:
        work(0, count)
        return
    ends = [count * block // blocks for block in range(blocks + 1)]
    with ThreadPoolExecutor(threads) as pool:
        for done in [pool.submit(work, *ends[i : i + 2]) for i in range(blocks)]:
            done.result()
