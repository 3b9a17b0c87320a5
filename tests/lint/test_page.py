"""The page of the report html: what is in it, and that nothing in it can do harm."""

import base64
import hashlib
import io
import json
import re
import subprocess
import sys
import xml.etree.ElementTree as ElementTree
from collections.abc import Sequence
from dataclasses import replace
from html.parser import HTMLParser
from importlib.resources import files
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from probed import probed

from overlapse.grammar.reading import read_text
from overlapse.lint.engine import FileAudit, audit_text
from overlapse.lint.settings import Settings
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.measured.probing import Wanted

pytest.importorskip("matplotlib")
pytest.importorskip("jinja2")

ROW = "".join(
    f"{symbol} 0\nS 3 1.00\n {4.0 * z**2:.4f} 0.15\n {0.74 * z**2:.4f} 0.5\n {0.2 * z**2:.4f} 0.4\n"
    f"P 1 1.0\n {0.05 * z**1.5:.4f} 1.0\n****\n"
    for symbol, z in [("B", 5), ("C", 6), ("N", 7), ("O", 8), ("F", 9)]
)
HOSTILE = "</script><script>alert(1)</script><img src=x onerror=alert(2)>\u202e\x1b[31m\"'&"


def _page(audits: Sequence[FileAudit]) -> str:
    from overlapse.lint.reports import writer

    out = io.StringIO()
    writer("html")(audits, out, False)
    return out.getvalue()


def _audit(text: str, name: str = "a.basis") -> FileAudit:
    return audit_text(text, name, settings=Settings())


class _Parts(HTMLParser):
    """Elements with their attributes, and the text of those that hold none but text."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.texts: dict[str, list[str]] = {"style": [], "script": []}
        self.feed(page)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        if self.tags and self.tags[-1][0] in self.texts and self.cdata_elem:
            self.texts[self.tags[-1][0]].append(data)

    def data(self) -> dict[str, Any]:
        return json.loads("".join(self.texts["script"][:-1]))  # type: ignore[no-any-return]


def _parts(page: str) -> _Parts:
    parts = _Parts(page)
    # The parser hands over long texts in pieces; the script comes last.
    joined = "".join(parts.texts["script"])
    cut = joined.rindex('"use strict";')
    parts.texts["script"] = [joined[:cut], joined[cut:]]
    return parts


def test_the_page_holds_summary_findings_and_excerpts() -> None:
    audit = _audit("! two words\n" + ROW.replace(" 0.15", " O.15", 1))
    page = _page([audit])
    found = _parts(page).data()
    assert [file["path"] for file in found["files"]] == ["a.basis"]
    assert len(found["findings"]) == len(audit.findings) > 0
    number = next(f for f in found["findings"] if f["rule"] == "form.number")
    row, start, end = number["excerpt"]["mark"]
    assert number["excerpt"]["lines"][row][start:end] == "O.15"
    assert number["excerpt"]["first"] + row == number["line"] == 4
    assert (number["element"], number["shell"], number["expected"]) == ("B", "s-1", "0.15")
    assert 'data-element="B"' in page
    assert 'id="rule-form.number"' in page


def test_the_policy_names_the_very_style_and_script() -> None:
    parts = _parts(_page([_audit(ROW)]))
    policy = next(
        a["content"] for t, a in parts.tags if a.get("http-equiv") == "Content-Security-Policy"
    )
    assert policy is not None and policy.startswith("default-src 'none';")
    assert "unsafe" not in policy
    for kind, texts in (("style", parts.texts["style"]), ("script", parts.texts["script"][-1:])):
        digest = base64.b64encode(hashlib.sha256("".join(texts).encode()).digest()).decode()
        assert f"{kind}-src 'sha256-{digest}'" in policy
    for tag, attributes in parts.tags:
        assert "style" not in attributes, tag
        assert not [name for name in attributes if name.startswith("on")], tag
        assert "src" not in attributes, tag
        assert (attributes.get("href") or "#").startswith("#"), tag


def test_texts_of_files_stay_texts() -> None:
    text = ROW.replace("C 0", f"! {HOSTILE}\nC 0").replace("P 1 1.0", f"{HOSTILE} 1 1.0", 1)
    page = _page([_audit(text, HOSTILE + ".basis"), FileAudit("gone", problem=HOSTILE)])
    parts = _parts(page)
    assert sum(tag == "script" for tag, _ in parts.tags) == 2
    assert not any(tag == "img" for tag, _ in parts.tags)
    assert "\x1b" not in page and "\u202e" not in page
    assert parts.data()["files"][0]["path"].startswith("</script><script>alert(1)")


def test_drawings_are_clean_pieces_of_vector_graphics() -> None:
    page = _page([_audit(ROW)])
    drawings = re.findall(r"<svg viewBox.*?</svg>", page, re.DOTALL)
    assert len(drawings) >= 2
    names: list[str] = []
    for drawing in drawings:
        root = ElementTree.fromstring(drawing)
        assert root.get("role") == "img" and root.get("aria-label")
        own = [element.get("id") for element in root.iter() if element.get("id")]
        names += [name for name in own if name]
        for element in root.iter():
            assert element.get("style") is None
            target = element.get("href") or element.get("clip-path")
            assert target is None or target.strip("url(#)") in own
    assert len(names) == len(set(names))
    assert max(map(len, drawings)) < 20_000


def test_the_suspect_exponent_is_found_and_drawn_with_the_proposed_number() -> None:
    from overlapse.lint.webpage.gallery import spot_of

    text = files("overlapse.lint").joinpath("demo/beck/alder.basis").read_text("utf-8")
    document = read_text(text, "a.basis")
    block = next(block for block in document.blocks if block.symbol == "O")
    index = block.names.index("d-1")
    # In this file of the demo the point of this exponent has slipped.
    finding = Case(document).at_shell(
        block, index, "warning", "suspect", row=0, measured=4.843, expected=0.4847
    )
    audit = replace(_audit(text), findings=(replace(finding, rule="primitive.trend"),))
    spot = spot_of(block, finding)
    assert spot is not None and spot.exponent and spot.row is not None
    shell = block.shells[spot.shell]
    assert block.names[spot.shell] == finding.shell
    assert shell.exponents[spot.row] == finding.measured
    assert spot.proposed == finding.expected
    page = _page([audit])
    assert "s-suspect" in page and "s-proposed" in page
    assert "grey ticks: " in page


@pytest.mark.filterwarnings("error")
@pytest.mark.parametrize("odd", ["1e300", "1e-100", "-1.0", "0.0", "1e18", "1e-12"])
def test_impossible_numbers_spoil_no_drawing(odd: str) -> None:
    shells = f"S 2 1.00\n {odd} 0.5\n 1.0 {odd}\nSP 1 1.0\n {odd} 1.0 1.0\nG 1 1.0\n {odd} 1.0\n"
    audit = _audit(f"C 0\nS 1 1.0\n 3.0 1.0\n{shells}****\n")
    findings = tuple(
        Finding("overlap.centre", "note", "m", "a", line, 2, element="C", shell=s, expected=e)
        for s in ("s-1", "s-2", "sp-1", "g-1")
        for line in range(2, 12)
        for e in (float(odd), 2.0)
    )
    page = _page([replace(audit, findings=findings)])
    assert page.count("<figure>") >= 2
    assert ("impossible exponents are left out" in page) == (odd not in ("1e18", "1e-12"))


def test_a_finding_without_a_number_is_no_spot_in_the_shell() -> None:
    from overlapse.lint.webpage.gallery import spot_of

    block = read_text(ROW, "a.basis").blocks[0]
    whole = Finding("x.y", "note", "m", "a.basis", 2, 1, element="B", shell="s-1")
    assert spot_of(block, whole) is not None
    assert spot_of(block, whole).row is None  # type: ignore[union-attr]
    none = Finding("x.y", "note", "m", "a.basis", 2, 1, element="B", shell="d-1")
    assert spot_of(block, none) is None


def test_probes_of_an_audit_are_drawn_beside_what_is_found_about_overlap() -> None:
    twice = "S 2 1.0\n 4.0 0.6\n 0.5 0.5\n" + "S 2 1.0\n 4.0 0.6\n 0.5 0.5005\n"
    text = f"C 0\n{twice}P 1 1.0\n 0.5 1.0\n****\n"

    plain = _audit(text)
    assert any(finding.rule == "overlap.centre" for finding in plain.findings)
    assert "functions on one centre" in _page([plain])
    assert plain.document is not None
    frames = "2\n<pair>\nC 0 0 0\nC 0 0 1.4\n"
    for values in (True, False):
        measured = probed(plain.document, frames, Wanted(values=values)).probes
        page = _page([replace(plain, probes=measured)])
        more = page.count("<svg viewBox") - _page([plain]).count("<svg viewBox")
        assert more == values  # they are there only where they were asked for
        assert ("overlap in geometries (1: " in page) == values


def test_what_has_no_room_is_counted_and_said() -> None:
    from overlapse.lint.webpage.facts import gathered
    from overlapse.lint.webpage.page import page

    findings = tuple(
        Finding("form.syntax", level, f"{level} {k}", "a.basis", 1, 1)  # type: ignore[arg-type]
        for k in range(50)
        for level in ("note", "error", "warning")
    )
    audit = _audit(ROW)
    facts = gathered([FileAudit("a.basis", audit.document, findings)], room=15_000)
    listed = [finding["severity"] for finding in json.loads(facts.data())["findings"]]
    assert 60 < len(listed) < 150
    assert listed.count("error") == 50
    assert facts.levels == {"note": 50, "warning": 50, "error": 50}
    assert facts.unlisted.total() == 150 - len(listed)
    assert f"{facts.unlisted['note']} notes" in page(facts)


def test_elements_stand_where_the_table_has_them() -> None:
    from overlapse.grammar.elements import number_of
    from overlapse.lint.webpage.table import cell_of

    # IUPAC Periodic Table of the Elements, 4 May 2022: period and group.
    known = {
        "H": (1, 1), "He": (1, 18), "Li": (2, 1), "Be": (2, 2), "B": (2, 13), "Ne": (2, 18),
        "Mg": (3, 2), "Al": (3, 13), "K": (4, 1), "Sc": (4, 3), "Zn": (4, 12), "Ga": (4, 13),
        "Y": (5, 3), "Xe": (5, 18), "Ba": (6, 2), "Hf": (6, 4), "Hg": (6, 12), "Tl": (6, 13),
        "Rn": (6, 18), "Ra": (7, 2), "Rf": (7, 4), "Og": (7, 18),
    }  # fmt: skip
    for symbol, place in known.items():
        assert cell_of(number_of(symbol) or 0) == place, symbol
    places = [cell_of(z) for z in range(1, 119)]
    assert len(set(places)) == 118
    assert cell_of(57) == (9, 4) and cell_of(103) == (10, 18)


def test_the_square_of_a_radial_function_integrates_to_its_self_overlap() -> None:
    from overlapse.lint.webpage.drawings import radial_function
    from overlapse.rules.physics.onecentre import self_overlap

    exponents, coefficients = np.array([40.0, 9.0, 0.3]), np.array([0.2, -0.5, 0.8])
    r = np.linspace(1e-6, 20.0, 400_001)
    for l in range(5):
        curve = radial_function(exponents, coefficients, l, r)
        integral = float(np.sum(curve**2) * (r[1] - r[0]))
        assert integral == pytest.approx(self_overlap(exponents, coefficients, l), rel=1e-6)


def test_what_does_not_count_is_said_with_its_reason() -> None:
    text = ROW.replace(" 0.15", " O.15", 1)
    text = f"! overlapse: accept form.number for B s-1 because <they> print it so\n{text}"
    audit = _audit(text)
    assert len(audit.accepted) == 1
    entry = {"rule": "form.count", "severity": "error", "message": "gone", "fingerprint": "x"}
    lost = FileAudit("lost.basis", gone=(entry,), absent=True)
    page = _page([replace(audit, gone=(entry,), known=audit.findings, findings=()), lost])
    assert "1 accepted" in page and "2 gone since" in page
    assert f"{len(audit.findings)} known from the ledger" in page
    assert "&lt;they&gt; print it so" in page
    found = _parts(page).data()
    assert found["findings"] == []
    assert [file["path"] for file in found["files"]] == ["a.basis"]


def test_an_empty_audit_gives_a_page_too() -> None:
    page = _page([])
    assert "Audit of 0 basis-set files" in page
    assert "Nothing was found." in page


def test_without_its_libraries_the_report_says_how_to_get_them(tmp_path: Path) -> None:
    file = tmp_path / "a.basis"
    file.write_text(ROW)
    code = (
        "import importlib.util as u, sys; real = u.find_spec\n"
        "u.find_spec = lambda name, *rest: None if name == 'jinja2' else real(name, *rest)\n"
        "sys.argv = ['overlapse', 'audit', '--report', 'html', sys.argv[1]]\n"
        "from overlapse.lint.cli import main; main()"
    )
    done = subprocess.run([sys.executable, "-c", code, file], capture_output=True, text=True)
    assert done.returncode == 2
    assert "pip install 'overlapse[report]'" in done.stderr
    assert done.stdout == ""
