"""Independent pieces of work side by side: in fresh processes, or one after another in this one."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from concurrent.futures import Executor, Future, ProcessPoolExecutor
from contextlib import contextmanager
from typing import Any, ParamSpec, TypeVar

P = ParamSpec("P")
T = TypeVar("T")

_THREAD_SETTINGS = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")


class InThisProcess(Executor):
    """Does each piece of work at once when it is handed in."""

    def submit(self, fn: Callable[P, T], /, *args: P.args, **kwargs: P.kwargs) -> Future[T]:
        """Do the work; what goes wrong is raised here and now."""
        future: Future[T] = Future()
        future.set_result(fn(*args, **kwargs))
        return future


@contextmanager
def open_pool(workers: int | None) -> Iterator[Executor]:
    """Yield an executor with so many processes, as many as there are processors when None.

    Work that has not begun is dropped when anything goes wrong.
    """
    count = workers if workers is not None else (os.cpu_count() or 1)
    if count <= 1:
        yield InThisProcess()
        return
    from multiprocessing import get_context

    # Fresh processes, since a forked copy of a process with threads may hang.
    with _one_thread_each():
        pool = ProcessPoolExecutor(count, mp_context=get_context("spawn"))
        try:
            yield pool
        except BaseException:
            pool.shutdown(wait=False, cancel_futures=True)
            raise
        pool.shutdown()


def count_done(futures: list[Future[Any]], tell: Callable[[int, int], None]) -> None:
    """Tell how many are done of how many, as they finish; the first fault is raised at once."""
    from concurrent.futures import as_completed

    for done, future in enumerate(as_completed(futures), start=1):
        future.result()
        tell(done, len(futures))


@contextmanager
def _one_thread_each() -> Iterator[None]:
    """Keep numeric libraries to one thread a process, so that they do not crowd each other."""
    before = {name: os.environ.get(name) for name in _THREAD_SETTINGS}
    os.environ.update(dict.fromkeys(_THREAD_SETTINGS, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value
