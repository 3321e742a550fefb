"""Pieces of one sum side by side in threads, each with a BLAS of one thread."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from functools import cache
from typing import Any, TypeVar

from pyscf import lib
from threadpoolctl import ThreadpoolController

T = TypeVar("T")
R = TypeVar("R")


def thread_count() -> int:
    """Threads that this calculation may use: OMP_NUM_THREADS, else the cores that it may run on."""
    return int(lib.num_threads())


def side_by_side(work: Callable[[T], R], items: Sequence[T]) -> list[R]:
    """`work` of every item, in order. NumPy lets go of the interpreter lock in its loops and products."""
    threads = min(thread_count(), len(items))
    if threads <= 1:
        return [work(item) for item in items]
    with (
        _libraries(os.getpid()).limit(limits=1, user_api="blas"),
        ThreadPoolExecutor(threads, initializer=lib.num_threads, initargs=(1,)) as pool,
    ):
        return list(pool.map(work, items))


@cache
def _libraries(_process: int) -> Any:
    """The BLAS libraries of this process."""
    return ThreadpoolController()
