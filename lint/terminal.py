"""What the terminal allows: how wide text may be, and whether it may be coloured."""

import os
import shutil
from textwrap import fill
from typing import TextIO

WIDTH = 96  # where nobody can tell
_NARROWEST, _WIDEST = 40, 120


def width(out: TextIO) -> int:
    """Columns for text on ``out``: the terminal's, within reason, or the variable COLUMNS."""
    told = os.environ.get("COLUMNS", "")
    if told.isdecimal() and int(told):
        columns = int(told)
    elif out.isatty():
        columns = shutil.get_terminal_size((WIDTH, 24)).columns
    else:
        return WIDTH
    return min(max(columns, _NARROWEST), _WIDEST)


def wrapped(text: str, columns: int, *, first: str = "", below: str = "  ") -> str:
    """Text in lines of so many columns; words are never broken.

    first, below: what the first line and those below it begin with.
    """
    return fill(
        text,
        columns,
        initial_indent=first,
        subsequent_indent=below,
        break_long_words=False,
        break_on_hyphens=False,
    )


def coloured(out: TextIO) -> bool:
    """Whether text on ``out`` may be coloured: a terminal that can, unless NO_COLOR is set.

    Source: the convention of https://no-color.org, set means present and not empty.
    """
    return out.isatty() and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"
