"""The garbage collector, paused while a big sheet is read: millions of small objects, and no circle."""

import gc
from collections.abc import Iterator
from contextlib import contextmanager


@contextmanager
def paused_collector() -> Iterator[None]:
    """Looking for circles where none are takes a fifth of the time; afterwards all is as it was before."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()
