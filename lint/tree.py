"""The files that an audit looks at: those of the disk, or what git has staged in their place.

Settings, seals, ledgers, references, geometries and sets beside a file are all looked for here, so
that a commit can be judged by what it will hold, and not by what lies around it by chance.
"""

import os
import stat
from collections.abc import Hashable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Protocol

Name = str | os.PathLike[str]


class Stage(Hashable, Protocol):
    """Files that stand in the place of those of the disk."""

    def stamp(self, path: Name) -> Hashable | None:
        """What changes when the content of a file does; None where there is no file."""

    def content(self, path: Name) -> bytes:
        """The bytes of a file.  Raises OSError where there is none."""

    def is_folder(self, path: Name) -> bool:
        """Whether there is a folder of this name."""

    def below(self, folder: Name) -> Iterator[Path]:
        """The files in a folder and those in it, by their paths from there, sorted."""


_stage: Stage | None = None


def stage() -> Stage | None:
    """What stands in the place of the disk, or None."""
    return _stage


@contextmanager
def staged(chosen: Stage) -> Iterator[None]:
    """Let other files stand in the place of those of the disk for a while."""
    global _stage
    before, _stage = _stage, chosen
    try:
        yield
    finally:
        _stage = before


def stamp(path: Name) -> Hashable | None:
    """What changes when the content of a file does; None where there is no (regular) file."""
    if _stage is not None:
        return _stage.stamp(path)
    try:
        seen = os.stat(path)
    except (OSError, ValueError):
        return None
    return (seen.st_mtime_ns, seen.st_size) if stat.S_ISREG(seen.st_mode) else None


def content(path: Name, most: int = -1) -> bytes:
    """The bytes of a file, of them no more than ``most``.  Raises OSError."""
    if _stage is not None:
        data = _stage.content(path)
        return data if most < 0 else data[:most]
    with open(path, "rb") as stream:
        return stream.read(most)


def text(path: Name) -> str:
    """The text of a file, lines ended by LF, without a mark of the encoding.

    Raises OSError, and UnicodeDecodeError for what is no UTF-8.
    """
    return content(path).decode("utf-8-sig").replace("\r\n", "\n")


def is_file(path: Name) -> bool:
    """Whether there is a regular file of this name."""
    return stamp(path) is not None


def shown(path: Path) -> str:
    """A path as people write it: from the current folder where it lies below."""
    here = os.path.realpath(os.curdir)
    resolved = Path(os.path.realpath(path))
    return os.path.relpath(resolved, here) if resolved.is_relative_to(here) else str(path)


def is_special(path: Name) -> bool:
    """Whether a name of the disk stands for a pipe, a device or a socket, which may never end."""
    try:
        mode = os.stat(path).st_mode
    except OSError:
        return False
    return not (stat.S_ISREG(mode) or stat.S_ISDIR(mode))


def is_folder(path: Name) -> bool:
    """Whether there is a folder of this name."""
    return os.path.isdir(path) if _stage is None else _stage.is_folder(path)


def below(folder: Name) -> Iterator[Path]:
    """The regular files in a folder and in those in it, sorted."""
    if _stage is not None:
        yield from (Path(folder) / file for file in _stage.below(folder))
        return
    yield from sorted(path for path in Path(folder).rglob("*") if is_file(path))
