"""Reports: one module each, with ``write(audits, out, colour)``; found by presence.

``audits`` may be passed through once only: a report of thousands of files is written while they
are judged.  A module that says ``DOCUMENTS = True`` gets audits that hold their document; others
get them without where the file was judged in another process or at another time.
"""

from collections.abc import Callable, Iterable
from importlib import import_module
from typing import TextIO

from overlapse.lint.engine import FileAudit
from overlapse.lint.presence import modules_of

Writer = Callable[[Iterable[FileAudit], TextIO, bool], None]


def names() -> tuple[str, ...]:
    """Names of all reports, in alphabetical order."""
    return modules_of(__name__)


def writer(name: str) -> Writer:
    """The writer of a report; only its own module is imported."""
    write: Writer = import_module(f"{__name__}.{name}").write
    return write


def needs_documents(name: str) -> bool:
    """Whether a report shows more of a file than its findings."""
    return bool(getattr(import_module(f"{__name__}.{name}"), "DOCUMENTS", False))
