"""Staged content: what the next commit will hold, which the working files may have left behind.

git is asked through its own program, with arguments as a list and answers between NUL bytes, so
that no file name can be taken for anything else.
"""

import os
import subprocess
from collections.abc import Hashable, Iterator, Sequence
from functools import lru_cache
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
    stage: str = "0"


class Index:
    """The tree of files as the next commit will leave it (see `overlapse.lint.tree.Stage`).

    What git does not know, in the repository or elsewhere, is as it is on the disk; what is staged
    to be deleted is not there.  Raises StagedError outside a repository, and where git fails.
    """

    def __init__(self) -> None:
        top = os.path.realpath(os.fsdecode(_git("rev-parse", "--show-toplevel").rstrip(b"\r\n")))
        # Of a file in conflict there is no staged content; the commit cannot be made anyway.
        self._entries = {
            os.path.join(top, entry.path): entry
            for entry in _listed("ls-files", "--stage", "-z", folder=top)
            if entry.stage == "0" and entry.mode != _PROJECT
        }
        gone = ("diff", "--cached", "--no-renames", "--diff-filter=D", "--name-only", "-z")
        names = filter(None, _git(*gone, folder=top).split(b"\0"))
        self._gone = frozenset(os.path.join(top, os.fsdecode(name)) for name in names)
        self._folders = {parent for name in self._entries for parent in _folders_of(name, top)}

    def stamp(self, path: str | os.PathLike[str]) -> Hashable | None:
        place, entry = self._at(path)
        if entry is not None:
            return entry.blob
        if place in self._gone or not os.path.isfile(place):
            return None
        seen = os.stat(place)
        return seen.st_mtime_ns, seen.st_size

    def content(self, path: str | os.PathLike[str]) -> bytes:
        place, entry = self._at(path)
        if entry is not None:
            return _blob(entry.blob)
        if place in self._gone:
            raise FileNotFoundError(2, "it is staged to be deleted", os.fspath(path))
        with open(place, "rb") as stream:
            return stream.read()

    def is_folder(self, path: str | os.PathLike[str]) -> bool:
        place = os.path.realpath(path)
        return place in self._folders or os.path.isdir(place)

    def below(self, folder: str | os.PathLike[str]) -> Iterator[Path]:
        root = os.path.realpath(folder)
        found = {name for name in self._entries if name.startswith(os.path.join(root, ""))}
        for inside, _, names in os.walk(root):
            found.update(os.path.join(inside, name) for name in names)
        yield from sorted(Path(name).relative_to(root) for name in found - self._gone)

    def _at(self, path: str | os.PathLike[str]) -> tuple[str, _Entry | None]:
        """Where a file is, and what the index holds there; links are followed."""
        folder, name = os.path.split(os.fspath(path))
        place = os.path.join(os.path.realpath(folder), name)
        entry = self._entries.get(place)
        if entry is None or entry.mode == _LINK:
            place = os.path.realpath(path)
            entry = self._entries.get(place)
        return place, None if entry is None or entry.mode == _LINK else entry


def _folders_of(name: str, top: str) -> Iterator[str]:
    """The folders that a file lies in, from its own up to the repository's."""
    while name != top:
        name = os.path.dirname(name)
        yield name


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


def staged_targets(paths: Sequence[Path]) -> list[Target]:
    """The files that `staged` gives the content of, and raises the same errors for."""
    return [target for path in paths for target, _ in _wanted(path)]


def _wanted(path: Path) -> Iterator[tuple[Target, str]]:
    """What is to be judged at a path, with the names of the contents."""
    # The path is taken as it is and not as a pattern; in an empty one git would see no path at all.
    place = os.fspath(path) or "."
    entries = _listed("--literal-pathspecs", "ls-files", "--stage", "-z", "--", place)
    for entry in entries:
        if entry.stage != "0":
            raise StagedError(f"{entry.path} is in conflict: settle it first")
    insides = [Path(os.path.relpath(entry.path, path)) for entry in entries]
    folder = path.is_dir() or any(inside != Path(".") for inside in insides)
    if not entries and not folder:
        raise StagedError(f"{path} is not staged")
    for inside, entry in sorted(zip(insides, entries, strict=True)):
        if entry.mode not in (_LINK, _PROJECT) and (not folder or is_searched(inside)):
            yield Target(path / inside if folder else path, folder), entry.blob


def _listed(*arguments: str, folder: str | None = None) -> list[_Entry]:
    """What the index holds, by a command that lists it."""
    found = []
    for line in filter(None, _git(*arguments, folder=folder).split(b"\0")):
        facts, _, name = line.partition(b"\t")
        mode, blob, stage = facts.decode().split(" ")
        found.append(_Entry(os.fsdecode(name), mode, blob, stage))
    return found


@lru_cache(maxsize=32)
def _blob(name: str) -> bytes:
    (data,) = _blobs([name])
    return data


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


def _git(*arguments: str, given: bytes = b"", folder: str | None = None) -> bytes:
    """What git answers, asked in a folder (the current one for None)."""
    try:
        done = subprocess.run(
            ["git", *arguments],
            input=given,
            capture_output=True,
            check=False,
            shell=False,
            cwd=folder,
        )
    except OSError as problem:
        raise StagedError(f"git cannot be run: {problem.strerror or problem}") from problem
    if done.returncode:
        told = done.stderr.decode("utf-8", "replace").strip().partition("\n")[0]
        raise StagedError(f"git says: {told or f'status {done.returncode}'}")
    return done.stdout
