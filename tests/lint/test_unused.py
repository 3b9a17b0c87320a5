"""Acceptances of settings files that accept nothing any more are told, where that can be known."""

import json
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from overlapse.lint.cli import cli
from overlapse.lint.engine import audit

SOUND = "C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"
BROKEN = SOUND.replace("0.5 0.55505", "O.5 0.55505")
ACCEPT = "[[accept]]\nrules = {}\npaths = {}\nbecause = 'our own readers take it'\n"


def _run(*arguments: str) -> Result:
    return CliRunner().invoke(cli, ["audit", *arguments], catch_exceptions=False)


def _lines(*arguments: str) -> list[str]:
    return _run("--report", "lines", "--no-cache", *arguments).stdout.splitlines()


@pytest.fixture
def library(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    for name, text in (("old/a.basis", BROKEN), ("old/b.basis", SOUND), ("new/c.basis", SOUND)):
        path = tmp_path / name
        path.parent.mkdir(exist_ok=True)
        path.write_text(text)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def _settings(folder: Path, *accepts: tuple[Any, Any], more: str = "") -> None:
    tables = (ACCEPT.format(json.dumps(rules), json.dumps(paths)) for rules, paths in accepts)
    (folder / "overlapse.toml").write_text(more + "\n".join(tables))


def test_the_line_of_the_settings_is_told(library: Path) -> None:
    _settings(library, ("form.number", "old/*.basis"), ("form.count", "old/*.basis"))
    (line,) = _lines("old")
    assert line.startswith("overlapse.toml:6:3: note: form.acceptance: form.count found nothing")
    done = _run("old")
    assert "overlapse.toml  (settings)" in done.stdout
    assert "6 : [[accept]]" in done.stdout
    assert "2 files; 1 note; 1 accepted" in done.stdout
    assert done.exit_code == 0
    (found,) = [f for f in audit("old") if f.rule == "form.acceptance"]
    assert (found.path, found.line) == ("overlapse.toml", 6)


def test_an_audit_of_other_files_or_of_some_does_not_complain(library: Path) -> None:
    _settings(library, ("form.count", "old/*.basis"), ("form.number", "*.basis"))
    assert len(_lines("old")) == 1  # of the other no word: new/ was not looked at
    assert not _lines("new", "old/b.basis")
    assert len(_lines("old/a.basis", "old/b.basis", "--least", "note")) == 1
    (library / "old" / "a.basis").write_text(SOUND)
    assert len(_lines("old", "new")) == 2
    assert len(_lines(".")) == 2


def test_one_that_is_for_no_file_is_told_where_the_file_would_be(library: Path) -> None:
    _settings(library, ("form.number", "old/gone.basis"))
    assert not _lines("new/c.basis")
    assert not _lines("old/b.basis")
    (line,) = [line for line in _lines("old") if "acceptance" in line]
    assert "no file is called old/gone.basis" in line
    # It was needed once; the file is back.
    (library / "old" / "gone.basis").write_text(BROKEN)
    assert not [line for line in _lines("old") if "acceptance" in line]


def test_what_could_not_be_looked_for_is_left_alone(library: Path) -> None:
    _settings(
        library,
        ("energy.bound", "old/"),
        ("drift.reference", "old/"),
        (["form.count", "overlap.molecule"], "old/"),
    )
    assert not [line for line in _lines("--no-energies", "old") if "acceptance" in line]
    (line,) = [line for line in _lines("--energies", "old") if "acceptance" in line]
    assert "energy.bound found nothing" in line


def test_a_finding_that_the_file_accepts_itself_is_covered_all_the_same(library: Path) -> None:
    own = "! overlapse: accept form.number for C because it is our own\n"
    (library / "old" / "a.basis").write_text(own + BROKEN)
    _settings(library, ("form.number", "old/"))
    assert not _lines("old")


def test_its_level_is_that_of_the_rule(library: Path) -> None:
    _settings(library, ("form.count", "old/b.basis"), more='severity."form.acceptance" = "error"\n')
    done = _run("--quiet", "old/b.basis")
    assert done.exit_code == 1
    assert "overlapse.toml" in done.stdout
    _settings(library, ("form.count", "old/b.basis"), more='severity."form.acceptance" = "off"\n')
    assert not _lines("old/b.basis")


def test_files_below_other_settings_are_not_waited_for(library: Path) -> None:
    _settings(library, ("form.count", "*.basis"))
    (library / "new" / "overlapse.toml").write_text("fail-at = 'error'\n")
    assert len([line for line in _lines("old") if "acceptance" in line]) == 1


def test_reports_take_it_and_a_ledger_does_not(library: Path) -> None:
    _settings(library, ("form.count", "old/"))
    (*_, last) = json.loads(_run("--report", "json", "old").stdout)["files"]
    assert (last["path"], last["layout"]) == ("overlapse.toml", None)
    assert [f["rule"] for f in last["findings"]] == ["form.acceptance"]
    run = json.loads(_run("--report", "sarif", "old").stdout)["runs"][0]
    (result,) = [r for r in run["results"] if r["ruleId"] == "form.acceptance"]
    place = result["locations"][0]["physicalLocation"]
    assert place["artifactLocation"]["uri"] == "overlapse.toml"
    assert place["region"]["startLine"] == 1
    assert "holds 1 finding of 1 file" in _run("--write-ledger", "old").stdout
    assert "1 new note" in _run("old").stdout


def test_in_a_file_every_rule_of_an_acceptance_must_have_been_looked_for(library: Path) -> None:
    own = "! overlapse: accept form.count, energy.bound for C because so\n"
    (library / "old" / "b.basis").write_text(own + SOUND)
    assert not _lines("--no-energies", "old/b.basis")
    assert len(_lines("--energies", "old/b.basis")) == 1
