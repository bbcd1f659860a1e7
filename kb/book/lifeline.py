"""Processes that work for another: they end with the one that started them, and keep to one core each.

A killed interface leaves nothing running.
"""

from __future__ import annotations

import os
import threading
from multiprocessing import parent_process


def end_with_parent() -> None:
    """End this process of a pool when the one that started it ends, killed or not."""
    parent = parent_process()
    if parent is None:
        return

    def wait() -> None:
        parent.join()
        os._exit(1)

    threading.Thread(target=wait, daemon=True).start()


def keep_to_one_core() -> None:
    """Keep linear algebra to one thread in this process; to be called before NumPy is loaded.

    The matrices of a check are small: threads of their own wait for each other and for the other processes, which takes
    a quarter of a replay (measured).
    """
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
