"""Staged content: what the next commit will hold, which the working files may have left behind.

git is asked through its own program, with arguments as a list and answers between NUL bytes, so
that no file name can be taken for anything else.
"""

import os
import subprocess
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import NamedTuple

from overlapse.lint.engine import Target, is_searched

_LINK, _PROJECT = "120000", "160000"  # modes of the index that stand for no content of a file
_AT_ONCE = 100  # contents that are held in memory


class StagedError(Exception):
    """Why there is no staged content, in words for the user."""


class Staged(NamedTuple):
    """A file as it is staged."""

    target: Target
    data: bytes


class _Entry(NamedTuple):
    path: str
    mode: str
    blob: str


def staged(paths: Sequence[Path]) -> Iterator[Staged]:
    """Staged content of files, and of the files in folders that a search would look at.

    Named files come first to last, those of a folder sorted by name.  Raises StagedError outside
    a repository, for a named file that is not staged or is in conflict, and where git fails.
    """
    wanted = [found for path in paths for found in _wanted(path)]
    for start in range(0, len(wanted), _AT_ONCE):
        some = wanted[start : start + _AT_ONCE]
        for (target, _), data in zip(some, _blobs([blob for _, blob in some]), strict=True):
            yield Staged(target, data)


def _wanted(path: Path) -> Iterator[tuple[Target, str]]:
    """What is to be judged at a path, with the names of the contents."""
    entries = _entries(path)
    insides = [Path(os.path.relpath(entry.path, path)) for entry in entries]
    folder = path.is_dir() or any(inside != Path(".") for inside in insides)
    if not entries and not folder:
        raise StagedError(f"{path} is not staged")
    for inside, entry in sorted(zip(insides, entries, strict=True)):
        if entry.mode not in (_LINK, _PROJECT) and (not folder or is_searched(inside)):
            yield Target(path / inside if folder else path, folder), entry.blob


def _entries(path: Path) -> list[_Entry]:
    """What the index holds at a path, which is taken as it is and not as a pattern."""
    # In an empty argument git would see no path at all.
    listing = _git("--literal-pathspecs", "ls-files", "--stage", "-z", "--", os.fspath(path) or ".")
    found = []
    for line in filter(None, listing.split(b"\0")):
        facts, _, name = line.partition(b"\t")
        mode, blob, stage = facts.decode().split(" ")
        entry = _Entry(os.fsdecode(name), mode, blob)
        if stage != "0":
            raise StagedError(f"{entry.path} is in conflict: settle it first")
        found.append(entry)
    return found


def _blobs(names: Sequence[str]) -> Iterator[bytes]:
    """Contents by their names in the index, from one process."""
    if not names:
        return
    answer = memoryview(_git("cat-file", "--batch", given="\n".join(names).encode() + b"\n"))
    at = 0
    for name in names:
        end = at + bytes(answer[at : at + 200]).index(b"\n")
        facts = bytes(answer[at:end]).decode().split(" ")
        if facts[-1] == "missing":
            raise StagedError(f"git has lost the content {name}")
        size = int(facts[2])
        yield bytes(answer[end + 1 : end + 1 + size])
        at = end + size + 2


def _git(*arguments: str, given: bytes = b"") -> bytes:
    try:
        done = subprocess.run(
            ["git", *arguments], input=given, capture_output=True, check=False, shell=False
        )
    except OSError as problem:
        raise StagedError(f"git cannot be run: {problem.strerror or problem}") from problem
    if done.returncode:
        told = done.stderr.decode("utf-8", "replace").strip().partition("\n")[0]
        raise StagedError(f"git says: {told or f'status {done.returncode}'}")
    return done.stdout
