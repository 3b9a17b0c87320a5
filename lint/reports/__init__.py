"""Reports: one module each, with ``write(audits, out, colour)``; found by presence.

``audits`` may be passed through once only: a report of thousands of files is written while they
are judged.  A module that says ``DOCUMENTS = True`` gets audits that hold their document; others
get them without where the file was judged in another process or at another time.
"""

from collections.abc import Callable, Iterable
from functools import cache
from importlib import import_module
from importlib.resources import files
from typing import TextIO

from overlapse.lint.engine import FileAudit

Writer = Callable[[Iterable[FileAudit], TextIO, bool], None]


@cache
def names() -> tuple[str, ...]:
    """Names of all reports, in alphabetical order."""
    entries = (entry.name for entry in files(__name__).iterdir())
    return tuple(
        sorted(
            name.removesuffix(".py")
            for name in entries
            if name.endswith(".py") and name != "__init__.py"
        )
    )


def writer(name: str) -> Writer:
    """The writer of a report; only its own module is imported."""
    write: Writer = import_module(f"{__name__}.{name}").write
    return write


def needs_documents(name: str) -> bool:
    """Whether a report shows more of a file than its findings."""
    return bool(getattr(import_module(f"{__name__}.{name}"), "DOCUMENTS", False))
