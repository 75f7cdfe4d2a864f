"""How long work tells how far it is: one tells, another listens, neither knows the other."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar

# What is being done, the share of it that is done (0 to 1) and the seconds left; None where not known.
Listener = Callable[[str, float | None, float | None], None]

_listener: ContextVar[Listener | None] = ContextVar("listener", default=None)


@contextmanager
def listening(listener: Listener) -> Iterator[None]:
    """Let ``listener`` hear what is told in this block."""
    token = _listener.set(listener)
    try:
        yield
    finally:
        _listener.reset(token)


def tell(work: str, share: float | None = None, seconds_left: float | None = None) -> None:
    """Say how far the work is; costs nothing where nobody listens."""
    listener = _listener.get()
    if listener is not None:
        listener(work, share, seconds_left)
