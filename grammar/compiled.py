"""Grammars, compiled once per machine where that is possible.

Compiling a grammar takes longer than most audits.  lark can keep the compiled tables in a file; it
checks them against the grammar's text and its own version, and compiles anew where they differ.
The file lies in the user's cache folder; where that cannot be written, nothing is kept and nothing
fails.
"""

import os
import sys
from contextlib import suppress
from pathlib import Path
from typing import Any
from zlib import crc32

from lark import Lark

_FOLDER = Path(__file__).parent


def grammar(name: str, **options: Any) -> Lark:
    """The LALR parser of a grammar file below this folder, ``name`` without its ending."""
    text = _FOLDER.joinpath(f"{name}.lark").read_text("utf-8")
    kept = _kept(name, text)
    with suppress(OSError):
        return Lark(text, parser="lalr", maybe_placeholders=False, cache=kept or False, **options)
    return Lark(text, parser="lalr", maybe_placeholders=False, **options)


def _kept(name: str, text: str) -> str | None:
    """Where the compiled grammar is kept, or None where no cache folder can be made.

    The name holds a sum of the text, so that two versions do not push each other out.
    """
    version = f"{sys.version_info.major}.{sys.version_info.minor}"
    with suppress(OSError):
        folder = cache_folder() / f"grammars-{version}"
        folder.mkdir(parents=True, exist_ok=True)
        if os.access(folder, os.W_OK):
            return str(folder / f"{name.replace('/', '-')}-{crc32(text.encode()):08x}.tables")
    return None


def cache_folder() -> Path:
    """The folder for what can be made again, by the platform's convention.

    XDG Base Directory Specification on Linux and the like, ``Library/Caches`` on macOS,
    ``LOCALAPPDATA`` on Windows.
    """
    if sys.platform == "win32":
        base = os.environ.get("LOCALAPPDATA") or str(Path.home() / "AppData" / "Local")
    elif sys.platform == "darwin":
        base = str(Path.home() / "Library" / "Caches")
    else:
        base = os.environ.get("XDG_CACHE_HOME") or str(Path.home() / ".cache")
    return Path(base) / "overlapse"
