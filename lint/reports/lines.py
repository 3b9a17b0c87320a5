"""One line for each finding: path, line, column, level, rule, where, message.

Of a file that could not be read, a line tells why.
"""

from collections.abc import Iterable
from typing import TextIO

from overlapse.lint.engine import FileAudit


def write(audits: Iterable[FileAudit], out: TextIO, colour: bool) -> None:
    for audit in audits:
        if audit.problem:
            reason = audit.problem.removeprefix(f"{audit.path}: ")
            out.write(f"{one_line(audit.path)}: error: {one_line(reason)}\n")
        for f in audit.findings:
            where = " ".join(filter(None, (f.element, f.shell)))
            prefix = f"{one_line(f.path)}:{f.line}:{f.column}: {f.severity}: {f.rule}: "
            out.write(prefix + (f"{where}: " if where else "") + one_line(f.message) + "\n")


def one_line(text: str) -> str:
    """Text without line ends and control characters, so that a hostile file stays on its line."""
    if text.isprintable():
        return text
    return "".join(c if c.isprintable() else "\N{REPLACEMENT CHARACTER}" for c in text)
