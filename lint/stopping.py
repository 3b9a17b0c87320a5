"""Ctrl-C: noted where it comes, heeded at the latest between two files."""

import signal
import threading
from typing import Any

_noted = False


class Stopped(BaseException):
    """Ctrl-C.  Not KeyboardInterrupt, of which the library for commands makes status 1."""


def _note(number: int, frame: object) -> None:
    global _noted
    _noted = True
    raise Stopped


def heed() -> None:
    """Raise Stopped if Ctrl-C was pressed: an exception gets lost where it comes up while Python
    tidies up behind the scenes.
    """
    if _noted:
        raise Stopped


def catching(handler: Any = _note) -> Any:
    """Let a handler take Ctrl-C and return the one before; elsewhere than in the main thread none
    can be set, and none is needed.
    """
    global _noted
    _noted = False
    if threading.current_thread() is not threading.main_thread():
        return None
    return signal.signal(signal.SIGINT, handler)
