"""What a process of the pool does first, and what its surroundings say. Imports little: it is imported before all."""

import multiprocessing
import os
import signal
import threading

FEW_THREADS = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS")


def start() -> None:
    """Leave Ctrl-C to the server, and end when the server is gone, however it went."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_end_with, args=(parent,), daemon=True).start()
    import levels.grid  # noqa: F401 - so that the first piece does not wait for it


def _end_with(parent: multiprocessing.process.BaseProcess) -> None:
    parent.join()
    os._exit(1)
