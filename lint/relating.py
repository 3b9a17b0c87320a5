"""Two files, or two folders of them, compared element by element."""

import os
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path, PurePath
from typing import NamedTuple

from overlapse.grammar.designation import Designation, label_in_file_name, parse_label
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read
from overlapse.lint.engine import targets
from overlapse.rules.compare.canonical import digest_of, elements_of
from overlapse.rules.compare.relation import EQUAL, Relation, Verdict, relate_documents

# Which verdicts count as equal, by what the user calls equal.
LEVELS: dict[str, tuple[Verdict, ...]] = {
    level: EQUAL[: EQUAL.index(last) + 1]
    for level, last in (
        ("numbers", "equal numbers"),
        ("rounding", "equal to rounding"),
        ("span", "equal span"),
    )
}
# Files of other names belong together if they share at least this part of their elements.
_ALIKE = 0.5


class Compared(NamedTuple):
    """A file that was compared: faults of form that may have cost something, its elements."""

    path: str
    layout: str
    faults: int
    elements: tuple[int, ...]


@dataclass(frozen=True)
class SetRelation:
    """Two sets that belong together, by their names ("" for no partner), and their elements."""

    left: str
    right: str
    elements: tuple[Relation, ...]


@dataclass(frozen=True)
class FileRelation:
    """Two files that belong together, or one that has no partner.

    Holds none of the texts, so that large folders can be compared.
    """

    left: Compared | None
    right: Compared | None
    sets: tuple[SetRelation, ...] = ()

    @property
    def elements(self) -> tuple[Relation, ...]:
        """Relations of all sets."""
        return tuple(relation for pair in self.sets for relation in pair.elements)

    def is_equal(self, level: str) -> bool:
        """Whether both files are there, whole, and equal in all elements at a level."""
        if self.left is None or self.right is None or self.left.faults or self.right.faults:
            return False
        return all(relation.verdict in LEVELS[level] for relation in self.elements)


def relate_files(left: Document, right: Document) -> FileRelation:
    """Compare two documents."""
    return FileRelation(
        _compared(left),
        _compared(right),
        tuple(
            SetRelation(_name(left, i), _name(right, j), tuple(found))
            for i, j, found in relate_documents(left, right)
        ),
    )


def _compared(document: Document) -> Compared:
    return Compared(
        document.path,
        document.layout,
        sum(fault.severity == "error" for fault in document.faults),
        tuple(sorted({block.atomic_number for block in document.blocks})),
    )


def _name(document: Document, index: int) -> str:
    if index < 0:
        return ""
    members = document.sets[index]
    return members.label or f"of line {members.line}"


def relate_paths(
    left: Path, right: Path, *, trouble: Callable[[str], None] | None = None
) -> Iterator[FileRelation]:
    """Compare two folders file by file, or a file with its namesake in a folder.

    Files belong together by their path within the folder, their name without its ending, the label
    their name is, or the content of their elements, in this order.  Texts without any element are
    passed over.  Documents are read when they are needed and not kept.  ``trouble`` is told of what
    cannot be opened; without it that raises OSError.
    """
    mine, theirs = _files(left, trouble), _files(right, trouble)
    pairs = _by_name(mine, theirs)
    taken = [{pair[side] for pair in pairs} for side in (0, 1)]
    rest = [
        _whole(path for path in paths if path not in used)
        for paths, used in zip((mine, theirs), taken, strict=True)
    ]
    alike, lonely_mine, lonely_theirs = _by_content(*rest)
    for one, other in sorted([*pairs, *alike]):
        documents = read(one), read(other)
        if any(document.blocks for document in documents):
            yield relate_files(*documents)
    # A single file that is looked up in a folder leaves the rest of the folder alone.
    if right.is_dir():
        yield from (FileRelation(_compared(read(path)), None) for path in lonely_mine)
    if left.is_dir():
        yield from (FileRelation(None, _compared(read(path))) for path in lonely_theirs)


def _files(path: Path, trouble: Callable[[str], None] | None) -> dict[Path, PurePath]:
    """Files of a folder, each with its path within the folder."""
    if not path.is_dir():
        return {path: PurePath(path.name)}
    return {
        target.path: PurePath(os.path.relpath(target.path, path))
        for target in targets([path], trouble)
    }


def _by_name(mine: dict[Path, PurePath], theirs: dict[Path, PurePath]) -> list[tuple[Path, Path]]:
    """Pairs by name; a name that several files of one folder have decides nothing."""
    pairs: list[tuple[Path, Path]] = []
    for key in (_within, _within_stem, _stem, _label):
        left = _unique(mine, key, {one for one, _ in pairs})
        right = _unique(theirs, key, {other for _, other in pairs})
        pairs += [(left[name], right[name]) for name in left if name in right]
    return pairs


Key = Callable[[PurePath], str | Designation | None]


def _unique(
    files: dict[Path, PurePath], key: Key, taken: set[Path]
) -> dict[str | Designation, Path]:
    found: dict[str | Designation, list[Path]] = {}
    for path, within in files.items():
        if path not in taken and (name := key(within)):
            found.setdefault(name, []).append(path)
    return {name: paths[0] for name, paths in found.items() if len(paths) == 1}


def _within(path: PurePath) -> str:
    return path.as_posix().casefold()


def _within_stem(path: PurePath) -> str:
    return path.with_suffix("").as_posix().casefold()


def _stem(path: PurePath) -> str:
    return path.stem.casefold()


def _label(path: PurePath) -> Designation | None:
    label = label_in_file_name(path.name)
    return parse_label(label) if label else None


Content = frozenset[str]


def _whole(paths: Iterator[Path]) -> dict[Path, Content]:
    """Digests of the elements of those files that have any."""
    found = {}
    for path in paths:
        document = read(path)
        if document.blocks:
            found[path] = frozenset(
                digest_of(block).whole
                for members in document.sets
                for block in elements_of(members).values()
            )
    return found


def _by_content(
    mine: dict[Path, Content], theirs: dict[Path, Content]
) -> tuple[list[tuple[Path, Path]], list[Path], list[Path]]:
    """Pairs of files that share most of their elements, and the files left over."""
    shared = sorted(
        (
            (-len(a & b) / max(len(a), len(b)), one, other)
            for one, a in mine.items()
            for other, b in theirs.items()
            if a & b
        ),
    )
    pairs: dict[Path, Path] = {}
    for likeness, one, other in shared:
        if -likeness >= _ALIKE and one not in pairs and other not in pairs.values():
            pairs[one] = other
    lonely = [path for path in mine if path not in pairs]
    others = set(pairs.values())
    return list(pairs.items()), lonely, [path for path in theirs if path not in others]
