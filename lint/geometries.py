"""Geometry files of a run: which there are, what they hold, and whether options fit that."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from pathlib import Path

from overlapse.grammar.elements import symbol_of
from overlapse.grammar.geometry import Frame, Geometry, GeometryError, Unit, read_bytes
from overlapse.lint import tree
from overlapse.lint.choices import Shelf
from overlapse.lint.engine import FileAudit

_SUFFIXES = (".xyz", ".extxyz")


def geometry_files(paths: Iterable[Path]) -> Iterator[Path]:
    """Files named, and in named folders the XYZ files, by name."""
    for path in paths:
        if not tree.is_folder(path):
            yield path
            continue
        yield from (file for file in tree.below(path) if file.suffix.lower() in _SUFFIXES)


def read_all(
    paths: Iterable[Path], unit: Unit | None, texts: Mapping[Path, tuple[str, bytes]]
) -> tuple[list[Geometry], list[FileAudit]]:
    """All geometries that can be read, and the files that cannot, with the reason.

    texts: name and content of paths that are no files.  Raises GeometryError where nothing can be
    read.
    """
    paths = list(paths)
    found: list[Geometry] = []
    unread: list[FileAudit] = []
    for path in geometry_files(paths):
        try:
            name, data = texts[path] if path in texts else (str(path), tree.content(path))
            found.append(read_bytes(data, name, unit=unit))
        except OSError as problem:
            unread.append(FileAudit(str(path), problem=f"{path}: {problem.strerror or problem}"))
        except GeometryError as problem:
            unread.append(FileAudit(str(path), problem=str(problem)))
    if not found:
        told = "\n".join(audit.problem for audit in unread)
        named = ", ".join(map(str, paths))
        raise GeometryError(told or f"no geometry in {named}: folders hold .xyz files")
    return found, unread


def unmet(shelf: Shelf, read: Sequence[Geometry]) -> str | None:
    """Which choice by hand no atom of any frame meets, in words."""
    frames = [frame for geometry in read for frame in geometry.frames]
    for use, _ in shelf.uses:
        if frames and not any(
            use.meets(number, atom)
            for frame in frames
            for number, atom in enumerate(frame.atoms, 1)
        ):
            who = symbol_of(use.element) if use.element else f"atom {use.atoms.start}"
            return f"--use for {who} ({use.path}): no frame has such an atom"
    return None


def impossible(shelf: Shelf, frame: Frame, charge: int, unpaired: int | None) -> str | None:
    """Why a frame cannot have such a charge or so many unpaired electrons, in words."""
    sites, _ = shelf.sites(frame)
    cores = (site.block.potential for site in sites if not site.atom.ghost)
    count = sum(site.atom.atomic_number for site in sites if not site.atom.ghost)
    count -= charge + sum(core.electrons for core in cores if core is not None)
    if count < 0:
        return f"{count + charge} electrons cannot leave a charge of {charge} (--charge)"
    if unpaired is not None and (unpaired > count or (count - unpaired) % 2):
        return f"{count} electrons cannot leave {unpaired} unpaired (--unpaired)"
    return None
