"""``overlapse seal``: pin what the elements of a library hold, and check it."""

import json
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, TextIO

import click

from overlapse.lint.common import CLEAN, FOUND, UNREADABLE, Unreadable, output

if TYPE_CHECKING:
    from overlapse.grammar.model import Document
    from overlapse.lint.sealing import Checked, Entries, SealFile


@click.command()
@click.argument("paths", nargs=-1, required=True, type=click.Path(path_type=Path))
@click.option("--write", is_flag=True, help="Seal what the files hold now.")
@click.option(
    "--seal",
    "chosen",
    type=click.Path(dir_okay=False, path_type=Path),
    help="The seal file [the nearest overlapse.seal.json above the paths].",
)
@click.option("--report", type=click.Choice(["text", "json"]), default="text")
@click.option("--out", type=click.Path(path_type=Path), help="Write the report to this file.")
def seal(
    paths: tuple[Path, ...], write: bool, chosen: Path | None, report: str, out: Path | None
) -> None:
    """Check files and folders against their seal, or seal them (--write).

    A seal pins the numbers of each element: layout, order, spelling, letter case, labels and
    comments may change, the last digit of a number may not.  Once there is a seal file, audits
    warn of elements that changed (drift.seal).

    Exit status: 0 as sealed, or sealed now; 1 something changed, is gone or cannot be sealed; 2
    wrong use, or no seal yet; 3 a file could not be read.

    \b
    Examples:
      overlapse seal --write sets/
      overlapse seal sets/
    """
    from overlapse.lint import sealing
    from overlapse.lint.neighbours import SEAL

    place = chosen or sealing.common_seal(paths)
    if place is None and not write:
        raise click.UsageError(f"no {SEAL} above these paths; --write makes one")
    place = place or sealing.new_seal(paths)
    seals = sealing.load(place) if place.exists() or not write else sealing.SealFile(place, {})
    work = _Work(seals)
    for path in paths:
        work.take(path)
    if not (work.checked or work.refused or work.unread):
        raise Unreadable("no file with an element was found there, nor was one sealed")
    if write and (work.now or place.exists()):
        _write(seals, work)
    with output(out) as stream:
        (_write_json if report == "json" else _write_text)(stream, seals, work, write)
    sys.exit(work.status(write))


class _Work:
    """What was found: the state of each element, what is sealed now, and what went wrong."""

    def __init__(self, seals: "SealFile") -> None:
        self.seals = seals
        self.checked: list[Checked] = []
        self.now: dict[str, Entries | None] = {}  # None for a file that is gone
        self.unread: list[str] = []
        self.refused: list[str] = []

    def take(self, path: Path) -> None:
        """Look at a file, or at all files of a folder and those it should have."""
        from overlapse.lint.engine import targets

        if not path.exists() and self.seals.key(path) not in self.seals.files:
            self.unread.append(f"{path}: there is no such file or folder")
            return
        if path.exists():
            for target in targets([path], self.unread.append):
                self._file(target.path, target.searched)
        for name in self._lost(path):
            self._add(name, None)

    def _lost(self, path: Path) -> Iterator[str]:
        """Sealed files at or below a path that are there no more."""
        home = self.seals.path.resolve().parent
        for name in self.seals.files:
            file = home / name
            if name not in self.now and file.is_relative_to(path.resolve()) and not file.exists():
                yield name

    def _file(self, path: Path, searched: bool) -> None:
        from overlapse.grammar.reading import read

        name = self.seals.key(path)
        if name in self.now or (searched and path.resolve() == self.seals.path.resolve()):
            return
        try:
            document = read(path)
        except OSError as problem:
            self.unread.append(f"{path}: {problem.strerror or problem}")
            return
        if searched and not document.layout:
            return
        if name is None:
            self.refused.append(f"{path}: lies outside the folder of {self.seals.path}")
        elif faults := [fault for fault in document.faults if fault.severity == "error"]:
            at = document.source.place(faults[0].span[0])
            self.refused.append(
                f"{path}:{at.line}:{at.column}: {faults[0].message}; what is misread cannot be "
                f"sealed ({len(faults)} such fault{'s' * (len(faults) != 1)})"
            )
        else:
            self._add(name, document)

    def _add(self, name: str, document: "Document | None") -> None:
        from overlapse.lint.sealing import check, entries_of

        self.now[name] = entries_of(document) if document is not None else None
        self.checked += check(name, document, self.seals.files.get(name, ()))

    def status(self, write: bool) -> int:
        if self.unread:
            return UNREADABLE
        drifted = any(each.state in ("changed", "gone") for each in self.checked)
        return FOUND if self.refused or (drifted and not write) else CLEAN


def _write(seals: "SealFile", work: _Work) -> None:
    """Put what was found into the seal file; other files keep their seals."""
    from overlapse.lint.sealing import SealFile, put

    files = {name: entries for name, entries in seals.files.items() if name not in work.now}
    files |= {name: entries for name, entries in work.now.items() if entries}
    put(SealFile(seals.path, files))


# ---- reports


def _write_text(out: TextIO, seals: "SealFile", work: _Work, write: bool) -> None:

    from overlapse.lint.reports.lines import one_line
    from overlapse.lint.terminal import width, wrapped
    from overlapse.lint.tree import shown

    columns = width(out)

    def say(words: str) -> None:
        out.write(f"{wrapped(one_line(words), columns)}\n")

    for each in work.checked:
        if each.state != "as sealed" and not (write and each.state == "not sealed"):
            told = f"{each.path}: {each.element} {_told(each)}"
            say(f"{told}; sealed anew" if write else told)
    for trouble in (*work.refused, *work.unread):
        say(trouble)
    counts = {state: 0 for state in ("as sealed", "changed", "not sealed", "gone")}
    for each in work.checked:
        counts[each.state] += 1
    if write:
        total = _count(len(work.checked) - counts["gone"], "element")
        files = _count(sum(bool(entries) for entries in work.now.values()), "file")
        new = f"{counts['not sealed']} new, {counts['changed']} changed, {counts['gone']} gone"
        out.write(f"sealed {total} of {files} in {one_line(shown(seals.path))}: {new}\n")
    else:
        parts = [f"{count} {state}" for state, count in counts.items() if count]
        told = ", ".join(parts) or "nothing to check"
        out.write(f"{told} in {one_line(shown(seals.path))}\n")


def _count(count: int, noun: str) -> str:
    return f"{count} {noun}{'s' * (count != 1)}"


def _told(each: "Checked") -> str:
    if each.before is None:
        return "is not sealed"
    if each.now is None:
        return f"was sealed as {each.before.holds} and is gone"
    parts = [
        "core potential" if name == "potential" else f"{name} functions" for name in each.changed
    ]
    now = "" if each.now.holds == each.before.holds else f", and now {each.now.holds}"
    return (
        f"is not what was sealed: its {' and '.join(parts)} changed; it was sealed as "
        f"{each.before.holds}{now}"
    )


def _write_json(out: TextIO, seals: "SealFile", work: _Work, write: bool) -> None:
    plain = {
        "seal": str(seals.path),
        "written": write,
        "elements": [
            {
                "path": each.path,
                "label": each.label,
                "element": each.element,
                "state": each.state,
                "changed": each.changed if each.state == "changed" else [],
                "sealed": each.before.digest if each.before else None,
                "digest": each.now.digest if each.now else None,
            }
            for each in work.checked
        ],
        "refused": work.refused,
        "unread": work.unread,
    }
    json.dump(plain, out, indent=1, allow_nan=False)
    out.write("\n")
