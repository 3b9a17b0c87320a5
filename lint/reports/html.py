"""One self-contained page to look at, search and print (extra: report)."""

from collections.abc import Iterable
from importlib.util import find_spec
from typing import TextIO

from overlapse.lint.engine import FileAudit

# Excerpts and drawings need more of a file than its findings.
DOCUMENTS = True


if not (find_spec("jinja2") and find_spec("matplotlib")):
    raise ImportError("the report html needs its libraries: pip install 'overlapse[report]'")


def write(audits: Iterable[FileAudit], out: TextIO, colour: bool) -> None:
    from overlapse.lint.webpage.facts import gathered
    from overlapse.lint.webpage.page import page

    out.write(page(gathered(audits)))
