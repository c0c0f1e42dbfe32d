"""Several processes for one long task: interrupted cleanly, and never left behind."""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
from collections.abc import Callable, Iterator
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing.connection import wait
from typing import TypeVar

T = TypeVar("T")


@contextmanager
def processes(number: int, begin: Callable[[T], None], task: T) -> Iterator[ProcessPoolExecutor]:
    """A pool whose processes each call ``begin`` with the task first; what still waits is dropped on an error."""
    for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(name, "1")  # one process for each core is enough
    context = multiprocessing.get_context("spawn")
    # Not as a context of its own: its way out takes the cancelling back.
    pool = ProcessPoolExecutor(number, context, _begin, (begin, task))
    try:
        yield pool
    except BaseException:
        pool.shutdown(cancel_futures=True)
        raise
    pool.shutdown()


def _begin(begin: Callable[[T], None], task: T) -> None:
    """Leave interrupts to the parent, end with it however it ends, and take the task over."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    assert parent is not None

    def end_with_parent() -> None:
        wait([parent.sentinel])
        os._exit(1)

    threading.Thread(target=end_with_parent, daemon=True).start()
    begin(task)
