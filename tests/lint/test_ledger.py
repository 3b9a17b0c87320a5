"""The ledger: what is known does not count, what is new does, what is gone is listed."""

import io
import json
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from overlapse.lint.cli import cli
from overlapse.lint.engine import FileAudit, audit_text
from overlapse.lint.ledger import NAME, Ledger, Sieve, read, write
from overlapse.lint.reports import writer
from overlapse.lint.settings import Settings, SettingsError
from overlapse.rules.registry import rules

BODY = "C 0\nS 2 1.00\n 4.0 0.6\n O.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"
SECOND = BODY.replace("C 0", "N 0").replace("4.0", "5.l")


def _run(*arguments: str | Path) -> Result:
    words = list(map(str, arguments))
    return CliRunner().invoke(cli, words, catch_exceptions=False)


def _found(*paths: str | Path) -> list[dict[str, Any]]:
    files: list[dict[str, Any]] = json.loads(_run("audit", "--report", "json", *paths).stdout)[
        "files"
    ]
    return files


@pytest.fixture
def library(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    (tmp_path / "sets").mkdir()
    (tmp_path / "sets" / "a.basis").write_text(BODY)
    (tmp_path / "sets" / "b.basis").write_text(SECOND)
    monkeypatch.chdir(tmp_path)
    done = _run("audit", "--write-ledger", "sets")
    assert done.exit_code == 0
    assert "holds 3 findings of 2 files" in done.stdout
    return tmp_path


def test_what_is_known_does_not_count(library: Path) -> None:
    done = _run("audit", "sets")
    assert done.exit_code == 0
    assert done.stdout == "2 files; nothing new found; 3 known from the ledger\n"
    assert _run("audit", "--without-ledger", "sets").exit_code == 1


def test_lines_and_the_whole_library_may_move(library: Path) -> None:
    path = library / "sets" / "a.basis"
    path.write_text("! a remark\n\n" + SECOND.replace("l", "1").replace("O", "0") + BODY)
    library.joinpath("moved").mkdir()
    for name in ("sets", NAME):
        (library / name).rename(library / "moved" / name)
    assert _run("audit", "moved").exit_code == 0


def test_only_what_is_new_counts(library: Path) -> None:
    path = library / "sets" / "a.basis"
    path.write_text(BODY.replace(" 0.3 1.0", " O.3 1.0"))
    done = _run("audit", "--report", "lines", "sets")
    assert done.exit_code == 1
    (line,) = done.stdout.strip().split("\n")
    assert ":6:2: error: form.number: C s-2:" in line


def test_a_changed_number_at_the_same_place_is_new(library: Path) -> None:
    path = library / "sets" / "a.basis"
    path.write_text(BODY.replace("O.5", "O.7"))
    (file, _) = _found("sets")
    assert [f["measured"] for f in file["findings"]] == ["O.7"]
    assert len(file["gone"]) == 1


def test_what_is_gone_is_listed(library: Path) -> None:
    (library / "sets" / "a.basis").write_text(BODY.replace("O", "0"))
    (library / "sets" / "b.basis").unlink()
    done = _run("audit", "sets")
    assert done.exit_code == 0
    assert "gone  C s-1  form.number" in done.stdout
    assert "b.basis  (in the ledger only)" in done.stdout
    assert "3 gone since" in done.stdout
    recorded = _run("audit", "--write-ledger", "sets")
    assert "holds 0 findings of 0 files" in recorded.stdout
    assert "gone" not in _run("audit", "sets").stdout


def test_one_file_can_be_recorded_anew_without_the_others(library: Path) -> None:
    (library / "sets" / "a.basis").write_text(BODY.replace("O", "0"))
    _run("audit", "--write-ledger", "sets/a.basis")
    assert list(json.loads((library / NAME).read_text())["files"]) == ["sets/b.basis"]


def test_two_equal_findings_are_two(tmp_path: Path) -> None:
    text = "H 0\nS 2 1.0\n O.5 1.0\n 0.7 1.0\n****\n"
    once, twice = (
        audit_text(each, "x.basis", layout="stars", settings=Settings())
        for each in (text, text.replace("0.7", "O.5"))
    )
    assert len({f.fingerprint for f in twice.findings}) == len(twice.findings)
    ledger = Ledger(tmp_path / NAME)
    ledger.take(once)
    assert not ledger.sifted(once).findings
    assert "form.number" in {finding.rule for finding in ledger.sifted(twice).findings}


def test_settings_say_where_it_is(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "sets").mkdir()
    (tmp_path / "sets" / "a.basis").write_text(BODY)
    (tmp_path / "overlapse.toml").write_text("ledger = 'known/ours.json'\n")
    (tmp_path / "known").mkdir()
    assert _run("audit", "--write-ledger", "sets").exit_code == 0
    assert read(tmp_path / "known" / "ours.json").files.keys() == {"../sets/a.basis"}
    assert _run("audit", "sets/a.basis").exit_code == 0
    other = tmp_path / "other.json"
    write([audit_text(BODY, "else.basis", settings=Settings())], other)
    assert _run("audit", "--ledger", other, "sets").exit_code == 1


DAMAGED = [
    "",
    "[]",
    '{"version": 9, "files": {}}',
    '{"version": 1}',
    "{x",
    '{"version": 1, "files": {"sets/a.basis": [{"fingerprint": "x"}]}}',
    '{"version": 1, "files": {"sets/a.basis": [3]}}',
    '{"version": 1, "files": []}',
    "<<<<<<< ours\n{}\n=======\n{}\n>>>>>>> theirs\n",
    "\x00",
]


@pytest.mark.parametrize("text", DAMAGED)
def test_a_damaged_ledger_is_a_wrong_setting(library: Path, text: str) -> None:
    (library / NAME).write_text(text)
    with pytest.raises(SettingsError, match=NAME):
        _run("audit", "sets")


def test_what_was_known_and_is_accepted_now_is_not_gone(tmp_path: Path) -> None:
    def audited(text: str) -> FileAudit:
        return audit_text(text, str(tmp_path / "x.basis"), settings=Settings())

    write([audited(BODY)], tmp_path / NAME)
    accepted = audited("! overlapse: accept form.number for C because so\n" + BODY)
    sifted = Sieve().sifted(accepted)
    assert (len(sifted.accepted), sifted.known, sifted.gone) == (1, (), ())


def test_sarif_says_new_unchanged_or_absent(library: Path) -> None:
    (library / "sets" / "b.basis").write_text(SECOND.replace("5.l", "5.1").replace("0.3", "O.3"))
    out = io.StringIO()
    audits = [audit_text((library / "sets" / "b.basis").read_text(), "sets/b.basis")]
    writer("sarif")([Sieve().sifted(audit) for audit in audits], out, False)
    results = json.loads(out.getvalue())["runs"][0]["results"]
    # SARIF 2.1.0, section 3.27.24: "new", "unchanged" and "absent" are values of baselineState.
    assert sorted(result["baselineState"] for result in results) == ["absent", "new", "unchanged"]


def test_what_could_not_be_looked_for_is_not_gone(tmp_path: Path) -> None:
    path = str(tmp_path / "x.basis")
    quiet = Settings(severity={"form.number": "off"})
    loud, silenced = (audit_text(BODY, path, settings=each) for each in (Settings(), quiet))
    ledger = Ledger(tmp_path / NAME)
    ledger.take(loud)
    assert ledger.count == 1
    assert not ledger.sifted(silenced).gone
    ledger.take(silenced)
    assert ledger.count == 1
    mended = audit_text(BODY.replace("O", "0"), path, settings=Settings())
    assert {"energy.bound", "drift.seal"} <= mended.silent
    assert len(ledger.sifted(mended).gone) == 1
    ledger.take(mended)
    assert ledger.count == 0


# The sample on the rule's own page.
WRONG_ATOM = rules()["energy.bound"].explanation.bad


@pytest.fixture
def loose(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A folder with an atom whose energy tells of a slip."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "sets").mkdir()
    for name in ("a", "b"):
        (tmp_path / "sets" / f"{name}.basis").write_text(WRONG_ATOM)
    return tmp_path


def _energetic(*arguments: str) -> list[str]:
    files = _found("--no-cache", *arguments)
    return [f["rule"] for file in files for f in file["findings"] if "energy" in f["rule"]]


def test_a_ledger_without_energies_is_met_by_audits_without(loose: Path) -> None:
    assert _energetic("sets", "--without-ledger")
    told = _run("audit", "--no-energies", "--write-ledger", "sets").stdout
    assert "without energies, which later audits leave out as well" in told
    assert json.loads((loose / NAME).read_text())["energies"] is False
    for path in ("sets", "sets/a.basis"):
        done = _run("audit", path)
        assert done.exit_code == 0
        assert "nothing new found" in done.stdout
        assert "energies are left out, as the ledger was written without them" in done.stderr
    # Asked for, they are shown, and it is said why they count.
    done = _run("audit", "--energies", "sets/a.basis")
    assert done.exit_code == 1
    assert f"{NAME} was written without energies, so what energy.* found" in done.stdout


def test_energies_recorded_once_for_all_are_computed_from_then_on(loose: Path) -> None:
    _run("audit", "--no-energies", "--write-ledger", "sets")
    _run("audit", "--write-ledger", "sets/a.basis")  # of one file they are known now
    assert not _energetic("sets")
    assert not _energetic("--energies", "sets/a.basis")
    assert _energetic("--energies", "sets/b.basis")
    _run("audit", "--write-ledger", "sets")
    assert json.loads((loose / NAME).read_text())["energies"] is True
    assert not _energetic("sets")
    path = loose / "sets" / "c.basis"
    path.write_text(WRONG_ATOM)
    assert _energetic("sets")
    # What was known of energies stays known where they are not computed.
    _run("audit", "--no-energies", "--write-ledger", "sets")
    assert json.loads((loose / NAME).read_text())["energies"] is False
    assert not _energetic("--energies", "sets/a.basis")


def test_a_ledger_says_yes_or_no_of_energies(library: Path) -> None:
    table = json.loads((library / NAME).read_text())
    (library / NAME).write_text(json.dumps(table | {"energies": 1}))
    with pytest.raises(SettingsError, match="energies"):
        _run("audit", "sets")
    del table["energies"]  # as older ledgers have it
    (library / NAME).write_text(json.dumps(table))
    assert _run("audit", "sets").exit_code == 0


def test_a_name_that_is_no_text_is_known_again(library: Path) -> None:
    name = b"sets/\xff\n.basis"
    try:
        with open(name, "w") as file:
            file.write(BODY)
    except OSError:
        pytest.skip("this system knows no such names")
    assert "holds 4 findings of 3 files" in _run("audit", "--write-ledger", "sets").stdout
    assert _run("audit", "sets").exit_code == 0
