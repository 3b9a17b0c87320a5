"""Patterns that choose files."""

import re
from functools import cache


@cache
def _expression(pattern: str) -> re.Pattern[str]:
    if "/" not in pattern:
        pattern = f"**/{pattern}"
    found = ""
    for part in re.split(r"(\*\*/|\*\*|\*|\?)", pattern.removeprefix("./").removeprefix("/")):
        found += {"**/": "(?:.*/)?", "**": ".*", "*": "[^/]*", "?": "[^/]"}.get(
            part, re.escape(part)
        )
    return re.compile(found + ("" if not pattern.endswith("/") else ".*"))


def matches(path: str, pattern: str) -> bool:
    """Whether a path (with forward slashes, below the settings' folder) fits a pattern.

    ``*`` and ``?`` stand for anything but a slash, ``**`` for any folders; a pattern without a
    slash fits names in all folders, one that ends in a slash everything in that folder.
    """
    return _expression(pattern).fullmatch(path) is not None
