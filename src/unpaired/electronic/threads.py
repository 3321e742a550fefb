"""Pieces of one sum side by side in threads, each with a BLAS of one thread."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from functools import cache
from typing import Any, TypeVar

from pyscf import lib
from threadpoolctl import ThreadpoolController

T = TypeVar("T")
R = TypeVar("R")

SEVERAL_THREADS_FROM = 300
"""Basis functions from which several BLAS threads are allowed."""


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


@contextmanager
def suited_to(functions: int) -> Iterator[None]:
    """One BLAS thread for a molecule of few basis functions, all that are allowed for a larger one.

    NumPy, SciPy and PySCF bring a BLAS each, and PySCF its own OpenMP threads: on small matrices they wait for
    one another in busy loops. CH2OH in pcH-1 (83 functions) took 19 s with two threads each and 7 s so; benzyl
    (245 functions) 22 s and 18 s.
    """
    if functions >= SEVERAL_THREADS_FROM:
        yield
        return
    with _libraries(os.getpid()).limit(limits=1, user_api="blas"):
        yield


@cache
def _libraries(_process: int) -> Any:
    """The BLAS libraries of this process."""
    return ThreadpoolController()
