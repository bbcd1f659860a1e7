"""A process of a pool ends with the one that started it, so that a killed interface leaves nothing running."""

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
