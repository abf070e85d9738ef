"""One callback at a time: notebooks hand clicks to a kernel over several threads."""

from __future__ import annotations

import threading
from collections.abc import Callable
from functools import wraps
from typing import Any

__all__ = ["Turns", "in_turn"]

Turns = threading.RLock
"""What panels that change one another share."""


def in_turn(turns: Any, call: Callable[..., None]) -> Callable[..., None]:
    """The same callback, waiting until the one before it is done.

    Parameters
    ----------
    turns : Turns
    call : callable

    Returns
    -------
    callable
    """

    @wraps(call)
    def waiting(*args: Any, **more: Any) -> None:
        with turns:
            call(*args, **more)

    return waiting
