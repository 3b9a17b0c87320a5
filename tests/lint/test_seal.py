"""Seals: made, checked, and looked at by audits; the reference folder of the settings."""

import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text
from overlapse.lint.commands import command
from overlapse.lint.engine import Target, audit, audit_file
from overlapse.lint.settings import Settings, SettingsError
from overlapse.rules.finding import Finding

SET = (
    "****\nC 0\nS 3 1.00\n 40.5 0.15\n 7.25 0.5\n 2.0 0.45\nS 1 1.00\n 0.3 1.0\n"
    "P 2 1.00\n 3.5 0.6\n 0.7 0.45\n****\nN 0\nS 2 1.00\n 50.1 0.2\n 9.5 0.9\n"
    "P 1 1.00\n 0.9 1.0\n****\n"
)


def run(*arguments: object) -> tuple[int, str]:
    done = CliRunner().invoke(command("seal"), [str(argument) for argument in arguments])
    assert done.exception is None or isinstance(done.exception, SystemExit | SettingsError)
    return (2, str(done.exception)) if isinstance(done.exception, SettingsError) else (
        done.exit_code, done.output
    )  # fmt: skip


@pytest.fixture
def library(tmp_path: Path) -> Path:
    """A folder of two sets, sealed."""
    (tmp_path / "sets").mkdir()
    (tmp_path / "sets" / "own.basis").write_text(SET)
    (tmp_path / "sets" / "other.txt").write_text(SET.replace("40.5", "44.5"))
    (tmp_path / "notes.txt").write_text("nothing of the kind\n")
    status, out = run(tmp_path, "--write")
    assert status == 0
    assert "sealed 4 elements of 2 files in " in out
    assert "4 new, 0 changed, 0 gone" in out
    return tmp_path


def drifted(path: Path) -> list[Finding]:
    return [f for f in audit_file(Target(path, False)).findings if f.rule.startswith("drift")]


def test_the_seal_file_is_plain_and_stable(library: Path) -> None:
    place = library / "overlapse.seal.json"
    text = place.read_text()
    plain = json.loads(text)
    assert plain["version"] == 1
    assert list(plain["files"]) == ["sets/other.txt", "sets/own.basis"]
    (members,) = plain["files"]["sets/own.basis"]
    assert set(members["elements"]) == {"C", "N"}
    assert len(members["elements"]["C"]["digest"]) == 64
    assert members["elements"]["C"]["holds"] == "(4s,2p) -> [2s,1p]"
    assert run(library, "--write")[0] == 0
    assert place.read_text() == text


def test_what_is_as_sealed_passes(library: Path) -> None:
    status, out = run(library)
    assert (status, out.startswith("4 as sealed in ")) == (0, True)
    assert not drifted(library / "sets" / "own.basis")


@pytest.mark.parametrize("name", ["keyworded", "sets", "matrix", "commas", "schema", "slashes"])
def test_another_layout_keeps_the_seal(library: Path, name: str) -> None:
    own = library / "sets" / "own.basis"
    own.write_text(layouts()[name].write(read_text(SET)).text)
    assert run(library)[0] == 0
    assert not drifted(own)


def test_a_changed_digit_breaks_it_and_says_where(library: Path) -> None:
    own = library / "sets" / "own.basis"
    own.write_text(SET.replace("0.7 0.45", "0.7 0.46"))
    status, out = run(library / "sets")
    assert status == 1
    assert "sets/own.basis: C is not what was sealed: its p functions changed" in out
    assert "it was sealed as (4s,2p) -> [2s,1p]" in " ".join(out.split())
    assert "1 changed" in out and "3 as sealed" in out
    (finding,) = drifted(own)
    assert (finding.rule, finding.severity, finding.element) == ("drift.seal", "warning", "C")
    assert finding.line == 2
    assert "p functions changed" in finding.message
    assert "seal anew" in finding.remedy
    assert finding.measured != finding.limit


def test_a_lost_element_a_new_one_and_a_lost_file(library: Path) -> None:
    own = library / "sets" / "own.basis"
    own.write_text(SET.replace("N 0", "O 0"))
    status, out = run(library)
    assert status == 1
    assert "N was sealed as (2s,1p) -> [1s,1p] and is gone" in out
    assert "O is not sealed" in out
    (finding,) = drifted(own)
    assert finding.element == "N" and "gone" in finding.message
    own.unlink()
    status, out = run(library, "--report", "json")
    assert status == 1
    states = [(e["path"], e["element"], e["state"]) for e in json.loads(out)["elements"]]
    assert ("sets/own.basis", "C", "gone") in states


def test_something_new_alone_is_no_drift(library: Path) -> None:
    (library / "sets" / "new.txt").write_text(SET)
    status, out = run(library)
    assert status == 0
    assert "2 not sealed" in out


def test_sealing_a_part_keeps_the_rest(library: Path) -> None:
    own, other = library / "sets" / "own.basis", library / "sets" / "other.txt"
    own.write_text(SET.replace("40.5", "41.5"))
    other.write_text(SET.replace("40.5", "45.5"))
    status, out = run(own, "--write")
    assert status == 0
    assert "0 new, 1 changed, 0 gone" in out
    assert not drifted(own)
    assert drifted(other)


def test_a_label_may_change_and_a_set_be_moved(tmp_path: Path) -> None:
    one, two = SET, SET.replace("40.5", "44.5")
    path = tmp_path / "both.basis"
    path.write_text(one + two)
    assert run(path, "--write", "--seal", tmp_path / "overlapse.seal.json")[0] == 0
    path.write_text("! label: new\n" + one + two)
    assert run(path)[0] == 0
    path.write_text(one)
    status, out = run(path)
    assert status == 1 and "gone" in out


def test_the_settings_may_name_the_seal_file(tmp_path: Path) -> None:
    (tmp_path / "overlapse.toml").write_text('seal = "pinned.json"\n')
    path = tmp_path / "own.basis"
    path.write_text(SET)
    assert run(path, "--write")[0] == 0
    assert not (tmp_path / "overlapse.seal.json").exists()
    assert "own.basis" in json.loads((tmp_path / "pinned.json").read_text())["files"]
    path.write_text(SET.replace("40.5", "41.5"))
    assert run(path)[0] == 1
    assert drifted(path)


def test_a_file_with_faults_is_not_sealed(library: Path) -> None:
    own = library / "sets" / "own.basis"
    own.write_text(SET.replace("40.5", "4O.5"))
    status, out = run(library, "--write")
    assert status == 1
    assert "own.basis:4:2:" in out and "cannot be sealed" in out
    # What was sealed before stays.
    plain = json.loads((library / "overlapse.seal.json").read_text())
    assert "sets/own.basis" in plain["files"]


def test_wrong_use(tmp_path: Path) -> None:
    path = tmp_path / "own.basis"
    path.write_text(SET)
    assert run(path)[0] == 2
    assert run(tmp_path / "none", "--write")[0] == 3
    (tmp_path / "prose").mkdir()
    (tmp_path / "prose" / "notes.txt").write_text("nothing of the kind\n")
    assert run(tmp_path / "prose", "--write")[0] == 3
    broken = tmp_path / "overlapse.seal.json"
    for text in ("{", "[]", '{"version": 99}', '{"version": 1, "files": {"a": [3]}}'):
        broken.write_text(text)
        status, out = run(path, "--seal", broken)
        assert status == 2
        assert "overlapse.seal.json" in out


def test_a_broken_seal_file_stops_an_audit_with_a_message(library: Path) -> None:
    (library / "overlapse.seal.json").write_text("{")
    with pytest.raises(SettingsError, match="not a seal file"):
        audit(library)


# ---- the reference folder


def test_audits_compare_with_the_namesake_in_the_reference(tmp_path: Path) -> None:
    reference, own = tmp_path / "reference", tmp_path / "own.basis"
    reference.mkdir()
    (reference / "own.dat").write_text(layouts()["keyworded"].write(read_text(SET)).text)
    (tmp_path / "overlapse.toml").write_text('reference = "reference"\n')
    own.write_text(SET)
    assert not drifted(own)
    own.write_text(SET.replace("7.25", "7.52"))
    (finding,) = drifted(own)
    assert (finding.rule, finding.severity) == ("drift.reference", "warning")
    assert (finding.element, finding.shell) == ("C", "s-1")
    assert (finding.line, finding.column, finding.length) == (5, 2, 4)
    assert (finding.measured, finding.expected) == (7.52, 7.25)
    assert "exponent 7.52 here, 7.25 there" in finding.message
    assert str(reference / "own.dat") in finding.message
    # The reference itself is not held against itself.
    assert not drifted(reference / "own.dat")


def test_rounding_and_another_contraction_are_notes(tmp_path: Path) -> None:
    reference = tmp_path / "reference"
    reference.mkdir()
    (reference / "own.basis").write_text(SET.replace("40.5", "40.512"))
    settings = Settings(reference=reference)
    path = tmp_path / "copy" / "own.basis"
    path.parent.mkdir()
    for text in (
        SET.replace("40.5", "40.51"),
        SET.replace("40.5", "40.512").replace("0.9 1.0", "0.9 2.0"),
    ):
        path.write_text(text)
        found = [
            f
            for f in audit_file(Target(path, False), settings=settings).findings
            if f.rule == "drift.reference"
        ]
        assert [f.severity for f in found] == ["note"]


def test_what_only_the_reference_has_is_a_note(tmp_path: Path) -> None:
    reference = tmp_path / "reference"
    reference.mkdir()
    (reference / "own.basis").write_text(SET)
    path = tmp_path / "own.basis"
    path.write_text(SET[: SET.index("N 0")])
    found = audit_file(Target(path, False), settings=Settings(reference=reference)).findings
    (note,) = [f for f in found if f.rule == "drift.reference"]
    assert (note.severity, note.element) == ("note", "N")


def test_of_several_namesakes_that_in_the_same_folder_counts(tmp_path: Path) -> None:
    reference, path = tmp_path / "reference", tmp_path / "work" / "beck" / "own.basis"
    for folder, text in (("beck", SET), ("fell", SET.replace("40.5", "41.5"))):
        (reference / folder).mkdir(parents=True)
        (reference / folder / "own.basis").write_text(text)
    path.parent.mkdir(parents=True)
    path.write_text(SET)
    settings = Settings(reference=reference)
    assert not [
        f
        for f in audit_file(Target(path, False), settings=settings).findings
        if f.rule == "drift.reference"
    ]


def test_a_reference_must_be_a_folder(tmp_path: Path) -> None:
    (tmp_path / "overlapse.toml").write_text('reference = "nowhere"\n')
    (tmp_path / "own.basis").write_text(SET)
    with pytest.raises(SettingsError, match="reference"):
        audit(tmp_path / "own.basis")


# ---- sets that contain others

SMALL = (
    "! label: 6-31G\nH 0\nS 3 1.00\n 18.0 0.03\n 2.8 0.23\n 0.6 0.81\nS 1 1.00\n 0.16 1.0\n****\n"
)
LARGE = SMALL.replace("6-31G", "6-31G**").replace("****\n", "P 1 1.00\n 1.1 1.0\n****\n")


def lacking(*paths: Path) -> list[Finding]:
    return [f for f in audit(*paths, settings=Settings()) if f.rule == "label.contains"]


def test_a_decorated_set_beside_its_parent_must_contain_it(tmp_path: Path) -> None:
    (tmp_path / "small.basis").write_text(SMALL)
    large = tmp_path / "large.basis"
    large.write_text(LARGE)
    assert not lacking(tmp_path)
    large.write_text(LARGE.replace("0.23", "0.32"))
    (finding,) = lacking(tmp_path)
    assert (finding.severity, finding.element, finding.shell) == ("warning", "H", "s-1")
    assert (finding.line, finding.expected) == (5, 0.23)
    assert "a function of 6-31G, which 6-31G** contains: s-1 (" in finding.message
    assert "small.basis:4)" in finding.message
    # Alone, or with its parent in no audit, it is not judged.
    assert not lacking(large)


def test_a_lost_shell_is_named(tmp_path: Path) -> None:
    (tmp_path / "6-31G.txt").write_text(SMALL)
    (tmp_path / "6-31Gss.txt").write_text(LARGE.replace("S 1 1.00\n 0.16 1.0\n", ""))
    (finding,) = lacking(tmp_path)
    assert "6-31G** contains: s-2 (" in finding.message


def test_another_layout_and_normalisation_of_the_parent_do_not_matter(tmp_path: Path) -> None:
    scaled = SMALL.replace("0.03", "0.06").replace("0.23", "0.46").replace("0.81", "1.62")
    other = layouts()["keyworded"].write(read_text(scaled)).text
    (tmp_path / "6-31G").write_text(other)
    (tmp_path / "6-31Gss.txt").write_text(LARGE)
    assert not lacking(tmp_path)


def test_of_several_parents_that_of_the_same_folder_counts(tmp_path: Path) -> None:
    for name, text in (("a", SMALL), ("b", SMALL.replace("0.16", "0.19"))):
        (tmp_path / name).mkdir()
        (tmp_path / name / "6-31G").write_text(text)
    (tmp_path / "b" / "6-31Gss.txt").write_text(LARGE.replace("0.16", "0.19"))
    assert not lacking(tmp_path)


def test_added_functions_alone_are_no_set(tmp_path: Path) -> None:
    (tmp_path / "6-31G").write_text(SMALL)
    (tmp_path / "6-31Gss.txt").write_text("! label: 6-31G**\nH 0\nP 1 1.00\n 1.1 1.0\n****\n")
    assert not lacking(tmp_path)
