"""The engine's matrix products are small: threads inside one cost more than they save, and hinder our own."""

import threading
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from typing import Any

from threadpoolctl import ThreadpoolController

_LOCK = threading.Lock()
_UNDER_WAY: list[Any] = []  # one limit for all calls under way, lifted when the last of them ends
_CALLS = [0]


@cache
def _controller() -> ThreadpoolController:
    return ThreadpoolController()


@contextmanager
def one_blas_thread() -> Iterator[None]:
    """Matrix products on one thread inside; the caller's own setting holds again after the last call."""
    with _LOCK:
        _CALLS[0] += 1
        if _CALLS[0] == 1:
            _UNDER_WAY.append(_controller().limit(limits=1, user_api="blas"))
    try:
        yield
    finally:
        with _LOCK:
            _CALLS[0] -= 1
            if _CALLS[0] == 0:
                _UNDER_WAY.pop().restore_original_limits()
