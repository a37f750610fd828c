"""Say so where the kernels are being compiled, as on the first run on a machine."""

from __future__ import annotations

import threading
from collections.abc import Callable
from typing import TypeVar

T = TypeVar("T")

_PATIENCE_S = 3.0


def said_if_compiling(
    work: Callable[[], T], message: str = "compiling the kernels for this machine (once, under a minute) …"
) -> T:
    """Do what may have to compile kernels first; say so where it takes a while."""
    from porkgrid import terminal

    timer = threading.Timer(_PATIENCE_S, terminal.say, [message])
    timer.start()
    try:
        return work()
    finally:
        timer.cancel()
