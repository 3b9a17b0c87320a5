"""Pruned basis files: which file is made for which atoms, their names, and words about them.

What is dropped on every atom of an element goes from the file itself.  Atoms that lose functions
which their like keep get a variant of it, to be chosen for them by number (``--use 3=FILE``).
"""

import os
from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import NamedTuple

from overlapse.grammar.model import Document
from overlapse.lint.atomic import write_bytes
from overlapse.lint.choices import Shelf
from overlapse.lint.pruned import PruneError, encoded, pruned_text
from overlapse.lint.screening import Task
from overlapse.rules.measured.overlap_words import HARMLESS, dropped, worth
from overlapse.rules.measured.probe import Dropped, Function, Probe


class Made(NamedTuple):
    """A file without some functions.

    path: of the file it is made of.  atoms: those it is for, counted from 1; none where it serves
    every atom.  drops: what is not in it.  losses: what else of the file could not be kept.
    """

    path: str
    atoms: tuple[int, ...]
    drops: tuple[Dropped, ...]
    data: bytes
    losses: tuple[str, ...]


def pruned_files(shelf: Shelf, tasks: Sequence[Task], probes: Sequence[Probe]) -> list[Made]:
    """The files without what the probes of some tasks drop, and variants of them for some atoms.

    What any frame drops goes, so that the files serve all of them.  What is dropped on every atom
    that a block serves goes from the file itself; for atoms that lose more there is a variant of
    it.  Raises PruneError as `pruned_text` does, and where atoms have no numbers in common.
    """
    parts = dict.fromkeys(part for probe in probes for part in probe.drop)
    blocks: dict[tuple[str, int], list[int]] = {}
    if any(part.atom for part in parts):
        blocks = _blocks(shelf, tasks)
    always, single = _shared(parts, blocks)
    made = []
    for document in shelf.originals:
        common = [part for part in always if part.function.path == document.path]
        if common:
            made.append(_made(document, (), common))
        groups: dict[frozenset[Function], list[int]] = {}
        for atom, functions in sorted(single.get(document.path, {}).items()):
            groups.setdefault(frozenset(functions), []).append(atom)
        for gone, atoms in groups.items():
            more = [part for part in parts if part.function in gone and part.atom == atoms[0]]
            made.append(_made(document, tuple(atoms), [*common, *more]))
    return made


def _blocks(shelf: Shelf, tasks: Sequence[Task]) -> dict[tuple[str, int], list[int]]:
    """Atoms by the block that serves them: path of its file and line."""
    found: list[tuple[tuple[str, int], ...]] = []
    for task in tasks:
        sites, _ = shelf.sites(task.frame)
        found.append(tuple((site.path, site.block.line) for site in sites))
    if len(set(found)) > 1:
        raise PruneError(
            "the frames hold different molecules, and what an atom of one loses means nothing in "
            "the others: write with --per-element, or screen one molecule at a time"
        )
    blocks: dict[tuple[str, int], list[int]] = {}
    for atom, key in enumerate(found[0], 1):
        blocks.setdefault(key, []).append(atom)
    return blocks


def _shared(
    parts: Iterable[Dropped], blocks: dict[tuple[str, int], list[int]]
) -> tuple[list[Dropped], dict[str, dict[int, set[Function]]]]:
    """What goes from files as a whole, and by file and atom what else goes."""
    on: dict[Function, set[int]] = {}
    for part in parts:
        on.setdefault(part.function, set()).add(part.atom)
    always: list[Dropped] = []
    single: dict[str, dict[int, set[Function]]] = {}
    for function, atoms in on.items():
        everywhere = (set(served) for key, served in blocks.items() if key[0] == function.path)
        if 0 in atoms or atoms in everywhere:
            always.append(Dropped(function))
            continue
        for atom in sorted(atoms):
            single.setdefault(function.path, {}).setdefault(atom, set()).add(function)
    return always, single


def _made(document: Document, atoms: tuple[int, ...], drops: Sequence[Dropped]) -> Made:
    functions = (part.function for part in drops)
    marked = frozenset((f.element, f.line, f.shell, f.column) for f in functions)
    text, losses = pruned_text(document, marked)
    return Made(document.path, atoms, tuple(drops), encoded(document, text), losses)


def write_files(folder: Path, files: Sequence[Made], inputs: Iterable[str]) -> list[Path]:
    """Write files into a folder, under the names of those they are made of.

    Variants for some atoms get a number beside it.  Each appears only when it is complete.  Raises
    OSError, and PruneError where one would replace a file of the ``inputs``, or two have one name.
    """
    folder.mkdir(parents=True, exist_ok=True)
    targets: list[Path] = []
    variants: Counter[str] = Counter()
    for made in files:
        name = Path(made.path)
        if made.atoms:
            variants[made.path] += 1
            name = name.with_name(f"{name.stem}-variant-{variants[made.path]}{name.suffix}")
        targets.append(folder / name.name)
    held = [path for path in inputs if os.path.exists(path)]
    for target in targets:
        if target.exists() and any(os.path.samefile(path, target) for path in held):
            raise PruneError(f"{target} is a file of this run itself; name another folder")
    if len(set(targets)) < len(targets):
        raise PruneError("two of the files have the same name; prune them one after the other")
    for made, target in zip(files, targets, strict=True):
        write_bytes(target, made.data)
    return targets


def told(files: Sequence[Made], paths: Sequence[Path], probes: Sequence[Probe]) -> Iterator[str]:
    """Lines about the files that were written: for which atoms, without what, at which price."""
    if not files:
        yield "nothing to drop: no file was written"
        return
    for made, path in zip(files, paths, strict=True):
        who = f" for atom{'s' * (len(made.atoms) > 1)} {spans(made.atoms)}" if made.atoms else ""
        gone = [Dropped(part.function) for part in made.drops]
        yield f"written: {path}{who}, without {dropped(gone, 20)}"
        yield from (f"not kept in {path}: {loss}" for loss in made.losses)
    uses = [
        f"--use {spans(made.atoms)}={path}"
        for made, path in zip(files, paths, strict=True)
        if made.atoms
    ]
    if uses:
        yield f"to screen again with them: {' '.join(uses)}"
    losses = [probe.after.loss for probe in probes if probe.after is not None]
    known = [loss for loss in losses if loss is not None]
    if len(known) < len(losses):
        yield "what they are worth is not known: compare an energy before they are left out"
    elif max(known) > HARMLESS:
        yield f"leaving them out costs {worth(max(known))}: compare an energy first"
    else:
        yield f"leaving them out costs {worth(max(known))}"


def spans(atoms: Sequence[int]) -> str:
    """Rising numbers as --use takes them: 1-4,7."""
    parts: list[list[int]] = []
    for atom in atoms:
        if parts and atom == parts[-1][-1] + 1:
            parts[-1].append(atom)
        else:
            parts.append([atom])
    return ",".join(f"{p[0]}-{p[-1]}" if len(p) > 1 else f"{p[0]}" for p in parts)
