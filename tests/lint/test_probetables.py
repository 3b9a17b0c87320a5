"""Probe tables of settings: files are measured together, each gets its own findings."""

import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from overlapse.lint.cli import cli
from overlapse.lint.engine import FileAudit, Target, audit, audit_file
from overlapse.lint.probetables import Probing, Table
from overlapse.lint.settings import Settings
from overlapse.rules.measured.probing import Wanted

HYDROGEN = "H 0\nS 1 1.00\n 0.5 1.0\nS 1 1.00\n 0.05 1.0\nS 1 1.00\n 0.0502 1.0\n****\n"
OXYGEN = "O 0\nS 1 1.00\n 20.0 1.0\nS 1 1.00\n 1.0 1.0\nP 1 1.00\n 0.6 1.0\n****\n"
WATER = "3\nwater\nO 0 0 0.1173\nH 0 0.7572 -0.4692\nH 0 -0.7572 -0.4692\n"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "h.basis").write_text(HYDROGEN)
    (tmp_path / "o.basis").write_text(OXYGEN)
    (tmp_path / "water.xyz").write_text(WATER)
    return tmp_path


def _audits(folder: Path, *names: str) -> list[FileAudit]:
    return [audit_file(Target(folder / name, False), settings=Settings()) for name in names]


def _table(folder: Path, *names: str, wanted: Wanted = Wanted()) -> Table:  # noqa: B008
    return Table(tuple(folder / name for name in names), folder / "water.xyz", wanted)


def with_probes(audits: list[FileAudit], tables: list[Table]) -> list[FileAudit]:
    probing = Probing()
    for table in tables:
        audits = [probing.with_table(audit, table) for audit in audits]
    return audits + probing.of_geometries()


def test_each_file_gets_the_findings_about_its_own_shells(folder: Path) -> None:
    before = _audits(folder, "h.basis", "o.basis")
    after = with_probes(before, [_table(folder, "h.basis", "o.basis")])
    assert [audit.path for audit in after] == [audit.path for audit in before]
    added = [f.rule for f in after[0].findings if f not in before[0].findings]
    assert "overlap.molecule" in added
    assert after[0].fails
    assert after[1].findings == before[1].findings
    assert [probe.functions for probe in (p.spectrum for p in after[0].probes)] == [11]
    places = [(f.line, f.column) for f in after[0].findings]
    assert places == sorted(places)


def test_limits_of_a_table_hold(folder: Path) -> None:
    tables = [_table(folder, "h.basis", "o.basis", wanted=Wanted(threshold=1e-12))]
    (audit,) = with_probes(_audits(folder, "h.basis"), tables)
    found = {f.severity for f in audit.findings if f.rule == "overlap.molecule"}
    assert found == {"note"}


def test_a_table_without_an_audited_file_is_not_measured(folder: Path) -> None:
    audits = _audits(folder, "o.basis")
    assert with_probes(audits, [_table(folder, "h.basis")]) == audits


def test_what_cannot_be_measured_is_a_problem_of_the_geometry(folder: Path) -> None:
    audits = _audits(folder, "h.basis")
    absent = _table(folder, "h.basis")._replace(geometry=folder / "absent.xyz")
    assert "absent.xyz" in with_probes(audits, [absent])[-1].problem
    (folder / "bad.basis").write_text("nothing here\n")
    (*_, last) = with_probes(audits, [_table(folder, "h.basis", "bad.basis")])
    assert "bad.basis" in last.problem


def test_missing_elements_are_found_in_the_geometry(folder: Path) -> None:
    first, geometry = with_probes(_audits(folder, "h.basis"), [_table(folder, "h.basis")])
    assert not [f for f in first.findings if f.rule == "overlap.molecule"]
    (finding,) = geometry.findings
    assert finding.element == "O"
    assert finding.path == str(folder / "water.xyz")
    assert geometry.fails


def test_the_same_as_a_call(folder: Path) -> None:
    import overlapse

    screening = overlapse.screen(folder / "h.basis", folder / "o.basis", on=folder / "water.xyz")
    found = {audit.path: audit.findings for audit in screening.audits}
    assert set(found) == {str(folder / "h.basis"), str(folder / "o.basis")}
    assert found[str(folder / "h.basis")]
    assert not found[str(folder / "o.basis")]
    (probe,) = screening.probes
    assert probe.spectrum.functions == 11


def test_the_library_call_finds_what_the_command_finds(folder: Path) -> None:
    (folder / "overlapse.toml").write_text(
        "[[probe]]\nbasis = '*.basis'\ngeometry = 'water.xyz'\n"
        "[[accept]]\nrules = 'form.count'\npaths = '*.basis'\nbecause = 'of old'\n"
    )
    found = [(Path(f.path).name, f.rule) for f in audit(folder, energies=True)]
    assert ("h.basis", "overlap.molecule") in found
    assert found[-1] == ("overlapse.toml", "form.acceptance")
    done = CliRunner().invoke(cli, ["audit", "--report", "json", "--no-cache", str(folder)])
    files = json.loads(done.stdout)["files"]
    assert [(Path(f["path"]).name, each["rule"]) for f in files for each in f["findings"]] == found
    (folder / "water.xyz").unlink()
    with pytest.raises(OSError, match="water"):
        audit(folder)


def test_of_a_folder_of_geometries_all_but_the_unreadable_are_measured(folder: Path) -> None:
    (folder / "scan").mkdir()
    (folder / "scan" / "a.xyz").write_text("")
    (folder / "scan" / "b.xyz").write_text("2\nx\nH 0 0 0\nH 0 0 0.74\n")
    table = _table(folder, "h.basis")._replace(geometry=folder / "scan")
    first, told = with_probes(_audits(folder, "h.basis"), [table])
    assert [probe.formula for probe in first.probes] == ["H2"]
    assert told.problem == f"{folder / 'scan' / 'a.xyz'}: the file is empty"
    (folder / "scan" / "b.xyz").unlink()
    (folder / "scan" / "a.xyz").unlink()
    (*_, told) = with_probes(_audits(folder, "h.basis"), [table])
    assert "no geometry in" in told.problem
