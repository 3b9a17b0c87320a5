"""The ledger: findings of an inherited library that are known, so that only new ones count.

A JSON file, ``overlapse.ledger.json``.  Paths in it are relative to its own folder, and findings
are known again by their fingerprint, so that lines may move and the library with them.
"""

import json
import os
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from overlapse.lint import tree
from overlapse.lint.atomic import write_bytes
from overlapse.lint.engine import FileAudit, Target
from overlapse.lint.settings import Settings, SettingsError, nearest, settings_for
from overlapse.rules.finding import Finding

NAME = "overlapse.ledger.json"
VERSION = 1
_KEPT = ("rule", "severity", "element", "shell", "message", "fingerprint")
_NEEDED = ("rule", "severity", "message", "fingerprint")
Entry = Mapping[str, Any]


@dataclass
class Ledger:
    """Known findings by file (paths relative to the ledger's folder, with forward slashes).

    energies: whether the atoms of all files were computed when they were recorded.
    """

    path: Path
    files: dict[str, list[Entry]] = field(default_factory=dict)
    energies: bool = True

    def name_of(self, file: str) -> str:
        """How a file is called in this ledger."""
        return os.path.relpath(os.path.realpath(file), os.path.realpath(self.path.parent)).replace(
            os.sep, "/"
        )

    def sifted(self, audit: FileAudit) -> FileAudit:
        """The audit with known findings set apart, and those that are gone listed."""
        if audit.problem or not audit.is_basis:
            return audit
        entries = self.files.get(self.name_of(audit.path), [])
        left = {entry["fingerprint"]: entry for entry in entries}
        known: list[Finding] = []
        new: list[Finding] = []
        for finding in audit.findings:
            (new if left.pop(finding.fingerprint, None) is None else known).append(finding)
        # What was known and has been accepted since is not gone.
        for accepted in audit.accepted:
            left.pop(accepted.finding.fingerprint, None)
        gone = tuple(entry for entry in left.values() if entry["rule"] not in audit.silent)
        return replace(audit, findings=tuple(new), known=tuple(known), gone=gone)

    def take(self, audit: FileAudit) -> None:
        """Know all findings of an audit from now on."""
        name = self.name_of(audit.path)
        found = [_entry(finding) for finding in audit.findings]
        # What could not be looked for this time stays known.
        found += [entry for entry in self.files.pop(name, ()) if entry["rule"] in audit.silent]
        if found:
            self.files[name] = found

    def without_lost_files(self) -> list[str]:
        """Forget files that are no more; return their names."""
        lost = [name for name in self.files if not (self.path.parent / name).is_file()]
        for name in lost:
            del self.files[name]
        return lost

    def write(self) -> None:
        """Write the ledger, atomically and in an order that does not change by itself."""
        files = dict(sorted(self.files.items()))
        table = {"version": VERSION, "energies": self.energies, "files": files}
        text = json.dumps(table, indent=1, ensure_ascii=False)
        # What becomes of bytes in a name that are no text is an escape of JSON as well.
        write_bytes(self.path, (text + "\n").encode("utf-8", "backslashreplace"))

    @property
    def count(self) -> int:
        return sum(map(len, self.files.values()))


def _entry(finding: Finding) -> Entry:
    return {key: getattr(finding, key) for key in _KEPT if getattr(finding, key) is not None}


def read(path: Path) -> Ledger:
    """Read a ledger; raises SettingsError for a file that is none."""
    try:
        table = json.loads(tree.text(path))
        if table["version"] != VERSION:
            raise SettingsError(f"{path}: a ledger of version {table['version']}, not {VERSION}")
        files: dict[str, list[Entry]] = {
            str(name): [{**entry, **{key: str(entry[key]) for key in _NEEDED}} for entry in entries]
            for name, entries in table["files"].items()
        }
        energies = table.get("energies", True)
        if not isinstance(energies, bool):
            raise ValueError("energies is neither true nor false")
    except OSError as problem:
        raise SettingsError(f"{path}: {problem.strerror or problem}") from None
    except (ValueError, KeyError, TypeError, AttributeError) as problem:
        if isinstance(problem, SettingsError):
            raise
        raise SettingsError(
            f"{path}: this is no ledger ({type(problem).__name__}: {problem}); "
            "remove it, and `overlapse audit --write-ledger` makes a new one"
        ) from None
    return Ledger(path, files, energies)


def place_for(path: str, settings: Settings) -> Path | None:
    """The ledger that holds for a file: the one its settings name, else the nearest above it."""
    if settings.ledger is not None:
        return settings.ledger
    return nearest(NAME, path)


class Sieve:
    """Sets apart what ledgers know, audit by audit.  given: a ledger to use for all files."""

    def __init__(self, given: Path | None = None) -> None:
        self.given = given
        self._used: dict[Path, Ledger] = {}

    def sifted(self, audit: FileAudit) -> FileAudit:
        """The audit less what the ledger that holds for its file knows."""
        ledger = self._ledger(self.given or place_for(audit.path, audit.settings))
        return audit if ledger is None else ledger.sifted(audit)

    def without_energies(self, targets: Iterable[Target]) -> bool:
        """Whether a file's ledger was written without computing the atoms.

        What they would show may have been there all along, and is not new.
        """
        for target in targets:
            # What comes by standard input has no ledger yet; its name is told later.
            if target.path == Path("-"):
                continue
            path = os.fspath(target.path)
            ledger = self._ledger(self.given or place_for(path, settings_for(path)))
            if ledger is not None and not ledger.energies:
                return True
        return False

    @property
    def ledgers(self) -> tuple[Ledger, ...]:
        """Those that were used."""
        return tuple(self._used.values())

    def absent(self, folders: Iterable[Path]) -> Iterator[FileAudit]:
        """One audit for each file below the folders that a ledger knows and that is no more."""
        roots = [os.path.realpath(folder) + os.sep for folder in folders]
        for root in roots:
            self._ledger(self.given or nearest(NAME, root + NAME))
        for ledger in self._used.values():
            for name, entries in ledger.files.items():
                path = ledger.path.parent / name
                below = os.path.realpath(path).startswith(tuple(roots))
                if below and not tree.is_file(path):
                    yield FileAudit(str(path), absent=True, gone=tuple(entries))

    def _ledger(self, place: Path | None) -> Ledger | None:
        if place is None or not (place == self.given or tree.is_file(place)):
            return None
        if place not in self._used:
            self._used[place] = read(place)
        return self._used[place]


def write(
    audits: Iterable[FileAudit], given: Path | None = None, *, energies: bool = True
) -> list[Ledger]:
    """Record all findings in the ledgers that hold for their files, ``given`` or new ones.

    A new ledger is made beside the settings file, or where there is none in the current folder.
    energies: whether the atoms were computed.  Raises OSError where one cannot be written.
    """
    ledgers: dict[Path, Ledger] = {}
    left: dict[Path, set[str]] = {}  # what they held of files that are not recorded anew
    for audit in audits:
        if audit.problem or audit.path == "<stdin>" or not audit.is_basis:
            continue
        place = given or place_for(audit.path, audit.settings)
        if place is None:
            origin = audit.settings.origin
            place = (origin.parent if origin is not None else Path.cwd()) / NAME
        if place not in ledgers:
            ledgers[place] = read(place) if place.is_file() else Ledger(place)
            left[place] = set(ledgers[place].files)
        ledgers[place].take(audit)
        left[place].discard(ledgers[place].name_of(audit.path))
    for place, ledger in ledgers.items():
        left[place].difference_update(ledger.without_lost_files())
        ledger.energies = energies and (ledger.energies or not left[place])
        ledger.write()
    return list(ledgers.values())
