"""Kept results: never stale, never fatal."""

import json
import os
import sqlite3
from dataclasses import replace
from pathlib import Path

import pytest

from overlapse.lint import bulk, cache
from overlapse.lint.cache import FILE, Cache, key_of, plain, restored
from overlapse.lint.engine import FileAudit, Options, Target, audit_text
from overlapse.lint.neighbours import SEAL, Beside
from overlapse.lint.settings import Elementwise, Probe, Settings

TEXT = "! overlapse: accept form.number for C because so\nC 0\nS 2 1.00\n 4.0 O.6\n 0.5 0.5\n****\n"


def _audit() -> FileAudit:
    return audit_text(TEXT + "N 0\nS 1 1.0\n l.5 1.0\n****\n", "own.basis", settings=Settings())


def _got(kept: Cache, key: str) -> FileAudit | None:
    return kept.get(key, "own.basis", Settings())


def test_a_result_comes_back_as_it_was(tmp_path: Path) -> None:
    audit = _audit()
    assert audit.findings and audit.accepted and any(f.edits for f in audit.findings)
    again = restored(json.loads(json.dumps(plain(audit))), audit.path, audit.settings)
    assert again == replace(audit, document=None)
    kept = Cache(tmp_path)
    kept.put([("key", audit)])
    kept.close()
    found = Cache(tmp_path).get("key", audit.path, audit.settings)
    assert found == replace(audit, document=None)
    assert _got(Cache(tmp_path), "another key") is None


def test_a_key_holds_all_that_a_result_depends_on(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    geometry, reference = tmp_path / "water.xyz", tmp_path / "reference"
    geometry.write_text("3 atoms")
    reference.mkdir()
    (reference / "a.basis").write_text(TEXT)
    plain_settings = Settings()
    probing = Settings(probes=(Probe(("*",), geometry),))
    comparing = Settings(reference=reference)

    def key(
        data: bytes = b"x",
        name: str = "a/own.basis",
        options: Options = Options(),  # noqa: B008
        settings: Settings = plain_settings,
        searched: bool = False,
    ) -> str:
        cache.begin()
        return key_of(data, name, options, settings, searched)

    keys = [
        key(),
        key(data=b"y"),
        key(name="a/sto-3g.basis"),
        key(options=Options(label="STO-3G")),
        key(options=Options(layout="stars")),
        key(searched=True),
        key(settings=Settings(severity={"form.count": "off"})),
        key(settings=Settings(limits={"contraction.norm": {"share": 0.5}})),
        key(settings=Settings(label="STO-3G")),
        key(settings=Settings(elementwise=(Elementwise(frozenset({6}), {"form.count": "off"}),))),
        key(settings=probing),
        key(settings=comparing),
    ]
    geometry.write_text("4 atoms")
    (reference / "a.basis").write_text(TEXT + "\n")
    keys += [key(settings=probing), key(settings=comparing)]
    (reference / "b.basis").write_text(TEXT)
    keys += [key(settings=comparing)]
    keys += [key(options=Options(energies=True))]
    seal = tmp_path / SEAL
    seal.write_text("{}")
    keys += [key(name=str(tmp_path / "own.basis"))]
    seal.write_text("[]")
    keys += [key(name=str(tmp_path / "own.basis"))]
    child, parent = tmp_path / "aug-cc-pvdz.basis", tmp_path / "cc-pvdz.basis"
    for text in ("1", "2"):
        parent.write_text(text)
        keys += [key(name=str(child), options=Options(beside=Beside([child, parent])))]
    monkeypatch.setattr(cache, "code", lambda: "another program")
    keys += [key()]
    assert len(set(keys)) == len(keys)


def test_a_key_does_not_change_with_what_does_not_matter() -> None:
    levels = {"form.count": "off", "form.number": "note"}
    one = Settings(severity=levels, elementwise=(Elementwise(frozenset({1, 200, 6})),))
    other = Settings(
        fail_at="note",
        severity=dict(reversed(levels.items())),
        origin=Path("x"),
        ledger=Path("y"),
        elementwise=(Elementwise(frozenset({200, 6, 1})),),
    )
    options = Options()
    found = {
        key_of(b"x", name, asked, settings, False)
        for name in ("own.basis", "a/own.basis")
        for asked in (options, replace(options, settings=other))
        for settings in (one, other)
    }
    assert len(found) == 1


def test_the_code_itself_is_a_part_of_the_key(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    cache.code.cache_clear()
    before = cache.code()
    added = tmp_path / "tarn_rules.py"
    added.write_text("x = 1\n")
    monkeypatch.setattr("overlapse.grammar.plugins.sources", lambda: [added])
    cache.code.cache_clear()
    with_other = cache.code()
    added.write_text("x = 2\n")
    cache.code.cache_clear()
    assert len({before, with_other, cache.code()}) == 3
    monkeypatch.undo()
    cache.code.cache_clear()
    assert cache.code() == before


@pytest.mark.parametrize("damage", [b"", b"nothing", b"SQLite format 3\x00" + b"\xff" * 5000])
def test_a_damaged_database_is_replaced(tmp_path: Path, damage: bytes) -> None:
    audit = _audit()
    (tmp_path / FILE).write_bytes(damage)
    first = Cache(tmp_path)
    assert _got(first, "key") is None
    first.put([("key", audit)])
    first.close()
    second = Cache(tmp_path)
    second.put([("key", audit)])
    assert _got(second, "key") is not None


def test_a_result_of_another_form_is_no_failure(tmp_path: Path) -> None:
    for text in ("{}", "[1]", '{"findings": 3}', "{"):
        Cache(tmp_path).put([("key", _audit())])
        connection = sqlite3.connect(tmp_path / FILE)
        with connection:
            connection.execute("UPDATE results SET result = ?", (text,))
        connection.close()
        assert _got(Cache(tmp_path), "key") is None


def test_a_place_that_cannot_be_written_is_no_failure(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    kept = Cache(tmp_path / "file" / "below")
    kept.put([("key", _audit())])
    assert _got(kept, "key") is None
    path = tmp_path / "own.basis"
    path.write_text(TEXT)
    (audit,) = bulk.audits([Target(path, False)], Options(), cache=kept)
    assert audit.accepted


@pytest.mark.skipif(os.name == "nt" or os.geteuid() == 0, reason="needs a user without all rights")
def test_a_folder_without_rights_is_no_failure(tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    kept = Cache(tmp_path / "below")
    kept.put([("key", _audit())])
    assert _got(kept, "key") is None


def test_a_large_database_forgets_the_older_half(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    kept = Cache(tmp_path)
    for made in range(10):
        monkeypatch.setattr("time.time", lambda made=made: 1000.0 + made)
        kept.put([(f"key {made}", _audit())])
    monkeypatch.setattr(cache, "MOST_BYTES", 1)
    monkeypatch.setattr("time.time", lambda: 2000.0)
    kept.put([("key 10", _audit())])
    assert _got(kept, "key 0") is None
    assert _got(kept, "key 10") is not None


def test_clearing(tmp_path: Path) -> None:
    Cache(tmp_path).put([("key", _audit())])
    assert cache.clear(tmp_path) > 0
    assert not list(tmp_path.iterdir())
    assert cache.clear(tmp_path) == 0
