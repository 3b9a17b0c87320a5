"""Writing files so that a reader, or a crash, meets the old content or the new, never a part."""

import os
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import IO


def write_bytes(path: Path, data: bytes) -> None:
    """Put ``data`` in the place of a file's content.

    A symbolic link stays and its target is written; the mode of a file that exists is kept.  Raises
    OSError, and then the file is as it was.
    """
    with replacing(path) as stream:
        stream.write(data)


@contextmanager
def replacing(path: Path) -> Iterator[IO[bytes]]:
    """A stream for a file's new content, which takes the old one's place when all went well.

    The new content is written beside the file, forced to the disk and renamed; the folder is then
    forced as well, so that the rename survives a loss of power.
    """
    target = Path(os.path.realpath(path))
    if target.exists() and not target.is_file():  # a device or a pipe is written to as it is
        with open(target, "wb") as stream:
            yield stream
        return
    from tempfile import mkstemp  # costly to import, and needed by those alone who write

    handle, name = mkstemp(prefix=f".{target.name[:100]}.", suffix=".tmp", dir=target.parent)
    try:
        with os.fdopen(handle, "wb") as stream:
            yield stream
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(name, _mode(target))
        os.replace(name, target)
    except BaseException:
        with suppress(OSError):
            os.unlink(name)
        raise
    _force_folder(target.parent)


def _mode(target: Path) -> int:
    """The mode of a file, or what a new one gets under the user's mask."""
    with suppress(OSError):
        return os.stat(target).st_mode & 0o7777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask


def _force_folder(folder: Path) -> None:
    # Not all systems can open a folder, and not all file systems can force one.
    with suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
