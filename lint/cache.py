"""Results that are kept: what was found in a text of this content, by these rules, as they are.

A small database in the user's cache folder (platformdirs).  A key holds everything that a result
depends on, so that a stale one is never found: the file's name and bytes, what the caller and the
settings ask for, the files that settings point at, and the code of the program itself.  Where
nothing can be read or written, nothing is kept and nothing fails.
"""

import hashlib
import json
import os
import sqlite3
import sys
import time
from collections.abc import Iterable
from contextlib import suppress
from dataclasses import fields, replace
from functools import cache
from pathlib import Path
from typing import Any

from overlapse.lint.engine import Accepted, Excerpt, FileAudit, Options
from overlapse.lint.neighbours import looked_at
from overlapse.lint.settings import Settings
from overlapse.rules.finding import Edit, Finding

FILE = "results.sqlite"
MOST_BYTES = 400_000_000
_WAIT = 2.0  # seconds that a locked database is waited for


def folder() -> Path:
    """Where results are kept, by the platform's convention."""
    from platformdirs import user_cache_path

    return user_cache_path("overlapse", appauthor=False)


class Cache:
    """Results by key.  All failures are silent: a cache is for speed alone."""

    def __init__(self, place: Path | None = None) -> None:
        self.path = (folder() if place is None else place) / FILE
        self._connection: sqlite3.Connection | None = None
        self._broken = False

    def get(self, key: str, path: str, settings: Settings) -> FileAudit | None:
        """The result kept under a key, as that of the file at a path, or None."""
        try:
            found = self._open().execute("SELECT result FROM results WHERE key = ?", (key,))
            row = found.fetchone()
            return None if row is None else restored(json.loads(row[0]), path, settings)
        except (OSError, sqlite3.Error, ValueError, KeyError, TypeError, IndexError) as problem:
            self._give_up(problem)
            return None

    def put(self, results: Iterable[tuple[str, FileAudit]]) -> None:
        """Keep results, all of them or (where the process is killed meanwhile) none."""
        try:
            rows = [(key, int(time.time()), json.dumps(plain(audit))) for key, audit in results]
            if not rows:
                return
            with self._open() as transaction:
                transaction.executemany("INSERT OR REPLACE INTO results VALUES (?, ?, ?)", rows)
            self._trim()
        except (OSError, sqlite3.Error, TypeError) as problem:
            self._give_up(problem)

    def close(self) -> None:
        if self._connection is not None:
            with suppress(sqlite3.Error):
                self._connection.close()
        self._connection = None

    def _open(self) -> sqlite3.Connection:
        if self._broken:
            raise OSError("the cache cannot be used")
        if self._connection is None:
            self.path.parent.mkdir(parents=True, exist_ok=True)
            self._connection = sqlite3.connect(self.path, timeout=_WAIT)
            # What a loss of power takes away is judged again; only consistency matters.
            self._connection.execute("PRAGMA synchronous = OFF")
            self._connection.execute(
                "CREATE TABLE IF NOT EXISTS results "
                "(key TEXT PRIMARY KEY, made INTEGER, result TEXT) WITHOUT ROWID"
            )
        return self._connection

    def _give_up(self, problem: Exception) -> None:
        """Do without from now on; a damaged database makes room for a new one."""
        self.close()
        self._broken = True
        damaged = isinstance(problem, sqlite3.DatabaseError) and not isinstance(
            problem, sqlite3.OperationalError
        )
        if damaged or isinstance(problem, ValueError | KeyError | IndexError):
            with suppress(OSError):
                self.path.unlink()

    def _trim(self) -> None:
        """Forget the older half when the database has grown large."""
        if self.path.stat().st_size > MOST_BYTES and self._connection is not None:
            with self._connection as transaction:
                transaction.execute(
                    "DELETE FROM results WHERE made <= "
                    "(SELECT made FROM results ORDER BY made LIMIT 1 OFFSET "
                    "(SELECT COUNT(*) / 2 FROM results))"
                )
            self._connection.execute("VACUUM")


def clear(place: Path | None = None) -> int:
    """Remove all results; return the number of bytes set free.  Raises OSError."""
    freed = 0
    for path in sorted((folder() if place is None else place).glob(f"{FILE}*")):
        freed += path.stat().st_size
        path.unlink()
    return freed


# ---- keys


def key_of(data: bytes, name: str, options: Options, settings: Settings, searched: bool) -> str:
    """The key of a file's result: a digest of all that it depends on."""
    digest = hashlib.sha256(data)
    asked = repr((os.path.basename(name), replace(options, settings=None), searched))
    around = surroundings(looked_at(Path(name), settings, options.beside))
    for part in (asked, wishes(settings), code(), around):
        digest.update(b"\0" + hashlib.sha256(part.encode("utf-8", "surrogateescape")).digest())
    return digest.hexdigest()


_NOT_JUDGED_BY = ("fail_at", "origin", "ledger")


def wishes(settings: Settings) -> str:
    """What of the settings a result depends on."""
    found = []
    for each in fields(settings):
        if each.name not in _NOT_JUDGED_BY:
            value = getattr(settings, each.name)
            found.append(f"{each.name}={_ordered(value)}")
    return "\n".join(found)


def _ordered(value: object) -> str:
    """A text of a value that does not depend on the order in which its parts were made."""
    if isinstance(value, dict):
        return repr(sorted((str(k), _ordered(v)) for k, v in value.items()))
    if isinstance(value, set | frozenset):
        return repr(sorted(map(_ordered, value)))
    if hasattr(value, "__dataclass_fields__"):
        return repr([(f.name, _ordered(getattr(value, f.name))) for f in fields(value)])  # type: ignore[arg-type]
    if isinstance(value, tuple | list):
        return repr([_ordered(each) for each in value])
    return repr(value)


@cache
def _stamped(path: Path) -> str:
    """The content of a file or folder that settings point at, as a digest."""
    digest = hashlib.sha256()
    files = sorted(p for p in path.rglob("*") if p.is_file()) if path.is_dir() else [path]
    for each in files:
        digest.update(os.fsencode(each) + b"\0")
        with suppress(OSError):
            digest.update(hashlib.sha256(each.read_bytes()).digest())
    return digest.hexdigest()


def surroundings(places: Iterable[Path]) -> str:
    """Digests of the files and folders that a result depends on besides its own file."""
    return " ".join(map(_stamped, places))


def begin() -> None:
    """Look anew at the files that results depend on; to be called before a run, and before other
    processes are started, which then need not read the program's code for themselves.
    """
    _stamped.cache_clear()
    code()


@cache
def code() -> str:
    """A digest of everything that judges: this program, its rules and layouts from elsewhere."""
    from importlib.metadata import PackageNotFoundError, version

    from overlapse.grammar import plugins

    digest = hashlib.sha256()
    home = Path(__file__).parents[1]
    roots = [Path(os.path.realpath(home / part)) for part in ("grammar", "rules", "lint")]
    for root in [*roots, *plugins.sources()]:
        for path in sorted(root.rglob("*")) if root.is_dir() else [root]:
            if path.suffix in (".py", ".json", ".lark"):
                digest.update(os.fsencode(path.relative_to(root.parent)) + b"\0")
                digest.update(path.read_bytes())
    for name in ("numpy", "lark", "scipy"):
        with suppress(PackageNotFoundError):
            digest.update(f"{name} {version(name)}\n".encode())
    digest.update(sys.version.encode())
    return digest.hexdigest()


# ---- results as plain data


def plain(audit: FileAudit) -> dict[str, Any]:
    """An audit as data for JSON, without its document, settings and path."""
    return {
        "findings": [_small(finding) for finding in audit.findings],
        "accepted": [[_small(finding), reason, where] for finding, reason, where in audit.accepted],
        "label": audit.label,
        "label_from": audit.label_from,
        "passed_over": audit.passed_over,
        "silent": sorted(audit.silent),
        "layout": audit.layout,
        "elements": audit.elements,
        "blocks": audit.blocks,
        "excerpts": [[*place, *excerpt] for place, excerpt in audit.excerpts.items()],
    }


_FIELDS = tuple(each.name for each in fields(Finding) if each.name not in ("path", "edits"))


def _small(finding: Finding) -> dict[str, Any]:
    found = {name: getattr(finding, name) for name in _FIELDS}
    found = {name: value for name, value in found.items() if value not in (None, (), "")}
    if finding.edits:
        found["edits"] = [[*edit.span, edit.replacement] for edit in finding.edits]
    return found


def restored(data: dict[str, Any], path: str, settings: Settings) -> FileAudit:
    """The audit that `plain` made data of, as that of the file at a path."""
    return FileAudit(
        path,
        settings=settings,
        findings=tuple(_finding(each, path) for each in data["findings"]),
        accepted=tuple(
            Accepted(_finding(each, path), why, where) for each, why, where in data["accepted"]
        ),
        label=data["label"],
        label_from=data["label_from"],
        passed_over=data["passed_over"],
        silent=frozenset(data["silent"]),
        layout=data["layout"],
        elements=data["elements"],
        blocks=data["blocks"],
        excerpts={(line, column): Excerpt(t, s) for line, column, t, s in data["excerpts"]},
    )


def _finding(data: dict[str, Any], path: str) -> Finding:
    edits = tuple(Edit((start, end), words) for start, end, words in data.pop("edits", ()))
    witnesses = tuple(data.pop("witnesses", ()))
    return Finding(path=path, witnesses=witnesses, edits=edits, **data)
