"""Findings that are accepted, in the file or by settings, always with a reason."""

import io
import json
from pathlib import Path

import pytest

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import BasisSet, Block, Document, Shell
from overlapse.grammar.reading import read_text
from overlapse.grammar.source import Source
from overlapse.lint.engine import FileAudit, Target, audit_file, audit_text
from overlapse.lint.reports import writer
from overlapse.lint.settings import Settings
from overlapse.rules.acceptance import acceptances_in, parsed
from overlapse.rules.finding import Finding

BODY = "C 0\nS 2 1.00\n 4.0 0.6\n O.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n O.5 1.0\n****\n"
ACCEPT = "! overlapse: accept {} because our own readers take it\n"


def _audit(text: str) -> FileAudit:
    return audit_text(text, "own.basis", settings=Settings())


def _rules(audit: FileAudit) -> list[tuple[str, str | None]]:
    return [(f.rule, f.shell) for f in audit.findings]


@pytest.mark.parametrize(
    ("place", "left"),
    [
        ("form.number for C s-1", ["p-1"]),
        ("form.number for C", []),
        ("form.number for this file", []),
        ("form.number for B-N", []),
        ("form.number for H, C p-1", ["s-1"]),
        ("form.count, form.number for c", []),
    ],
)
def test_a_named_rule_at_a_stated_place(place: str, left: list[str]) -> None:
    audit = _audit(ACCEPT.format(place) + BODY)
    assert [shell for rule, shell in _rules(audit) if rule == "form.number"] == left
    assert len(audit.accepted) == 2 - len(left)
    assert {item.reason for item in audit.accepted} == {"our own readers take it"}
    assert {item.where for item in audit.accepted} == {"line 1"}
    assert audit.fails is bool(left)
    assert "form.acceptance" not in {f.rule for f in audit.findings}


@pytest.mark.parametrize(
    ("words", "told"),
    [
        ("accept form.number for C", "gives no reason"),
        ("accept form.number for C because", "gives no reason"),
        ("accept form.number because so", "names no place"),
        ("accept form.nummer for C because so", "did you mean form.number?"),
        ("accept all for C because so", "no rule is called 'all'"),
        ("accept form for C because so", "no rule is called 'form'"),
        ("accept form.number for Xx because so", "'Xx' names no element"),
        ("accept form.number for C s-1 s-2 because so", "is not understood"),
        ("allow form.number for C because so", "'allow' is not understood here"),
        ("", "'' is not understood here"),
    ],
)
def test_a_wrong_acceptance_accepts_nothing_and_is_told(words: str, told: str) -> None:
    audit = _audit(f"! overlapse: {words}\n" + BODY)
    assert not audit.accepted
    (finding,) = [f for f in audit.findings if f.rule == "form.acceptance"]
    assert (finding.line, finding.severity) == (1, "warning")
    assert told in finding.message


def test_an_unused_acceptance_is_told_as_a_note() -> None:
    for place in ("form.number for N", "form.number for C d-1", "form.count for C"):
        audit = _audit(ACCEPT.format(place) + BODY)
        (finding,) = [f for f in audit.findings if f.rule == "form.acceptance"]
        assert (finding.line, finding.severity) == (1, "note")
    quiet = Settings(severity={"form.count": "off"})
    audit = audit_text(ACCEPT.format("form.count for C") + BODY, "own.basis", settings=quiet)
    assert "form.acceptance" not in {f.rule for f in audit.findings}


def test_a_column_of_a_general_contraction_belongs_to_its_shell() -> None:
    accepted = parsed("accept contraction.norm for C s-1 because so", 1)
    finding = Finding("contraction.norm", "warning", "", "", 1, 1, element="C", shell="s-1/2")
    assert accepted.covers(finding)
    assert not parsed("accept contraction.norm for C s-1/1 because so", 1).covers(finding)
    assert not parsed("accept contraction.norm for C s because so", 1).covers(finding)


SIGNED = {name: layout for name, layout in layouts().items() if layout.comment}


def _in_comment(name: str, text: str) -> str:
    """A text of a layout with an acceptance in a comment of its own."""
    sign = layouts()[name].comment[0]
    lines = text.split("\n")
    words = f"{sign} overlapse: accept shell.core for Sc because it is a test"
    for at in range(len(lines) + 1):
        new = "\n".join([*lines[:at], words, *lines[at:]])
        document = read_text(new, layout=name)
        if acceptances_in(document)[0] and not document.faults:
            return new
    raise AssertionError(f"no line of {name} can be a comment")


@pytest.mark.parametrize("name", SIGNED)
def test_every_layout_with_comments_can_accept(name: str) -> None:
    shells = (Shell((0,), [2.0, 0.5], [[0.5], [0.6]]), Shell((1,), [0.4], [[1.0]]))
    blocks = (Block(21, shells, None, "invented", "spherical"),)
    document = Document(Source(""), "", (BasisSet(blocks, "invented"),))
    text = _in_comment(name, layouts()[name].write(document).text)
    audit = audit_text(text, "own", layout=name, settings=Settings())
    assert {item.finding.rule for item in audit.accepted} == {"shell.core"}


def test_the_json_layout_accepts_in_its_description() -> None:
    shells = (Shell((0,), [2.0, 0.5], [[0.5], [0.6]]),)
    blocks = (Block(21, shells, None, "invented", "spherical"),)
    document = Document(Source(""), "", (BasisSet(blocks, "invented"),))
    table = json.loads(layouts()["schema"].write(document).text)
    table["description"] = "Invented.\noverlapse: accept shell.core for Sc because it is a test"
    audit = audit_text(json.dumps(table, indent=1), "own.json", settings=Settings())
    assert {item.finding.rule for item in audit.accepted} == {"shell.core"}
    assert "form.acceptance" not in {f.rule for f in audit.findings}


def test_settings_accept_by_path_and_element(tmp_path: Path) -> None:
    (tmp_path / "overlapse.toml").write_text(
        "[[accept]]\nrules = 'form.number'\npaths = 'old/'\nelements = ['C']\nshell = 'p-1'\n"
        "because = '''printed\n so'''\n"
    )
    paths = [tmp_path / "old" / "own.basis", tmp_path / "own.basis"]
    paths[0].parent.mkdir()
    for path in paths:
        path.write_text(BODY)
    old, new = (audit_file(Target(path, False)) for path in paths)
    (accepted,) = old.accepted
    assert accepted.finding.shell == "p-1"
    assert accepted.reason == "printed so"
    assert accepted.where == "overlapse.toml, accept 1"
    assert not new.accepted


def test_reports_count_and_show_what_is_accepted() -> None:
    audit = _audit(ACCEPT.format("form.number for C") + BODY)
    text, plain, sarif = io.StringIO(), io.StringIO(), io.StringIO()
    writer("text")([audit], text, False)
    writer("json")([audit], plain, False)
    writer("sarif")([audit], sarif, False)
    assert "2 accepted" in text.getvalue()
    assert "form.number: our own readers take it (line 1)" in text.getvalue()
    (file,) = json.loads(plain.getvalue())["files"]
    assert [item["reason"] for item in file["accepted"]] == ["our own readers take it"] * 2
    assert not file["findings"]
    results = json.loads(sarif.getvalue())["runs"][0]["results"]
    # SARIF 2.1.0, section 3.35: a suppression in the file is of the kind "inSource".
    assert [result["suppressions"] for result in results] == [
        [{"kind": "inSource", "status": "accepted", "justification": "our own readers take it"}]
    ] * 2


@pytest.mark.parametrize("rule", ["energy.bound", "drift.reference", "overlap.molecule"])
def test_a_rule_that_lacks_what_it_needs_leaves_its_acceptances_alone(rule: str) -> None:
    audit = _audit(ACCEPT.format(f"{rule} for C") + BODY)
    assert "form.acceptance" not in {f.rule for f in audit.findings}
    assert rule in audit.silent
