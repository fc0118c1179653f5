"""Executors for the long search: processes of this machine, or a cluster."""

from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import Executor, ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing import get_context

from tcplan.errors import InputError, Problem


@contextmanager
def executor_for(workers: int, scheduler: str | None) -> Iterator[Executor | None]:
    """Yield an executor: of a Dask scheduler, of ``workers`` processes, or None for this process.

    Raises
    ------
    InputError
        When the scheduler is asked for and Dask is missing or does not answer.
    """
    if scheduler is not None:
        with _cluster(scheduler) as executor:
            yield executor
    elif workers > 1:
        # Fresh interpreters: a forked one would inherit locks of libraries that run threads.
        with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
            yield pool
    else:
        yield None


@contextmanager
def _cluster(address: str) -> Iterator[Executor]:
    try:
        from distributed import Client
    except ImportError:
        raise InputError(
            Problem(
                where="--scheduler",
                found="no Dask on this machine",
                expected="the extra that brings it",
                todo='Install it: pip install "tcplan[cluster]".',
            )
        ) from None
    try:
        client = Client(address, timeout=10)
    except (OSError, ValueError, TimeoutError) as error:
        raise InputError(
            Problem(
                where="--scheduler",
                found=f"{address!r}, which does not answer ({type(error).__name__})",
                expected='the address of a Dask scheduler, such as "tcp://127.0.0.1:8786"',
            )
        ) from None
    try:
        yield client.get_executor()
    finally:
        client.close()
