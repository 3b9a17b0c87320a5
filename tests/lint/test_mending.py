"""Repairs: what is safe leaves every number as it is, what is not is made only where named."""

import os
import random
import stat
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from generated import documents
from hypothesis import given, settings
from hypothesis import strategies as st

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import Document, Shell
from overlapse.grammar.numbers import NUMBER, plain
from overlapse.grammar.reading import read_bytes, read_text
from overlapse.lint.cli import cli
from overlapse.lint.diff import diff
from overlapse.lint.engine import judge
from overlapse.lint.mending import NUMERIC, SAFE, Mended, content, mend
from overlapse.lint.settings import Settings
from overlapse.rules.registry import rules
from overlapse.rules.repair import respelled

SOUND = "C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"


def _mended(text: str | bytes, *also: str) -> Mended:
    data = text.encode() if isinstance(text, str) else text
    return mend(data, "own.basis", Settings(), also)


def _rules(result: Mended) -> set[str]:
    return {repair.rule for repair in result.done}


def test_all_classes_are_rules() -> None:
    assert set(SAFE) | set(NUMERIC) <= set(rules())


def _with(words: str) -> str:
    return SOUND.replace("0.5 0", words)


SLIPS = {
    "a letter for a digit": (SOUND.replace("0.55505", "O.555O5"), SOUND),
    "a lost exponent letter": (_with("5.0-01 0"), _with("5.0E-01 0")),
    "a decimal comma": (SOUND.replace("0.3", "0,3"), SOUND),
    "a typographic minus": (SOUND.replace("0.6", "\u22120.6"), SOUND.replace("0.6", "-0.6")),
    "a blank that is none": (SOUND.replace("4.0 0", "4.0\u00a00"), SOUND),
    "mixed line ends": (SOUND.replace("\n", "\r\n", 3), SOUND),
    "lone carriage returns": (SOUND.replace("\n", "\r"), SOUND),
    "a byte-order mark": ("\ufeff" + SOUND, SOUND),
    "row numbers": (SOUND.replace(" 4.0", " 1 4.0").replace(" 0.5 0.5", " 2 0.5 0.5"), SOUND),
    "rows in no order": (
        SOUND.replace(" 0.5 0.55505", " 0.02  0.1\n 5.0e-1  0.55505").replace("S 2", "S 3"),
        SOUND.replace(" 0.5 0.55505", " 5.0e-1  0.55505\n 0.02  0.1").replace("S 2", "S 3"),
    ),
    "an element twice": (SOUND + "! here\n" + SOUND, SOUND + "! here\n"),
    "an element twice in between": (SOUND * 2 + "N" + SOUND[1:], SOUND + "N" + SOUND[1:]),
    "several at once": ("\ufeff" + SOUND.replace("\n", "\r\n", 1).replace("0.3", "O,3"), SOUND),
}  # fmt: skip


@pytest.mark.parametrize("slip", SLIPS)
def test_safe_repairs(slip: str) -> None:
    broken, wanted = SLIPS[slip]
    result = _mended(broken)
    assert result.data.decode() == wanted
    assert result.done and not result.refused
    assert _rules(result) <= set(SAFE)
    again = mend(result.data, "own.basis", Settings())
    assert again.data == result.data and not again.done


def test_comments_and_blanks_elsewhere_stay() -> None:
    text = "! O.5 and 1.5-03, as printed\n\n" + SOUND.replace(" 0.3 1.0", "\t O.3   1.0  ! l.0")
    assert _mended(text).data.decode() == text.replace("\t O.3", "\t 0.3")


@pytest.mark.parametrize(
    "text",
    [
        SOUND,
        "",
        "nothing of the kind\n",
        SOUND + SOUND.replace("4.0", "4.1"),  # an element twice, with other numbers
        SOUND.replace("0.6", "0.6O.5"),  # no guess is safe
        "! \u00e4\n" + SOUND,
    ],
)
def test_what_cannot_be_mended_safely_is_left_alone(text: str) -> None:
    result = _mended(text)
    assert result.data == text.encode()
    assert not result.done


def test_accepted_findings_are_left_alone() -> None:
    text = "! overlapse: accept form.number for C because our readers take it\n"
    text += SOUND.replace("0.3", "O.3")
    assert _mended(text).data.decode() == text


def test_an_element_twice_with_another_potential_is_refused() -> None:
    with_core = SOUND.replace("C 0", "Ag 0")
    potential = "\nAG 0\nAG-ECP 1 28\np potential\n 1\n2 1.0 {}\ns-p potential\n 1\n2 1.0 0.0\n"
    text = with_core + with_core + potential.format("3.0")
    result = _mended(text)
    after = read_bytes(result.data, "x")
    assert content(after) == content(read_text(text)) or result.data.decode() == text


def _normalised_but_one() -> str:
    """Six contractions with self-overlap one, of which the last is then scaled by 1.1."""
    text = "C 0\n"
    for k, l in enumerate((0, 0, 0, 1, 1, 1)):
        shell = Shell((l,), [9.1 + k, 2.3, 0.6 / (k + 1)], [[0.15], [0.5], [0.4]])
        factor = 1.1 if k == 5 else 1.0
        rows = zip(shell.exponents, factor * shell.normalised()[:, 0], strict=True)
        text += f"{'sp'[l]} 3 1.00\n" + "".join(f"  {a:.4f} {c:.7f}\n" for a, c in rows)
    return text + "****\n"


def test_renormalising_is_done_only_when_named() -> None:
    text = _normalised_but_one()
    assert "contraction.norm" in {f.rule for f in _mended(text).audit.findings}
    assert _mended(text).data.decode() == text
    result = _mended(text, "contraction.norm")
    assert _rules(result) == {"contraction.norm"}
    before, after = read_text(text).blocks[0], read_bytes(result.data, "x").blocks[0]
    (*others, last), (*same, mended) = before.shells, after.shells
    # Half a unit of the last of the seven decimals that the coefficients have.
    assert mended.coefficients == pytest.approx(last.normalised(), abs=5.1e-8)
    assert (mended.exponents == last.exponents).all()
    for old, new in zip(others, same, strict=True):
        assert (old.coefficients == new.coefficients).all()
    lines = zip(text.split("\n"), result.data.decode().split("\n"), strict=True)
    assert [old for old, new in lines if old != new] == text.split("\n")[-5:-2]


def test_an_idle_primitive_is_dropped_only_when_named() -> None:
    text = SOUND.replace("S 2 1.00\n 4.0 0.6\n", "S 3 1.00\n 4.0 0.6\n 1.0 0.0\n")
    assert _mended(text).data.decode() == text
    assert _mended(text, "contraction.idle").data.decode() == SOUND


def test_a_remark_on_the_composition_is_corrected_only_when_named() -> None:
    text = "! (3s,1p) -> [2s,2p]\n" + SOUND
    assert _mended(text).data.decode() == text
    assert _mended(text, "label.composition").data.decode() == ("! (3s,1p) -> [2s,1p]\n" + SOUND)


def test_a_label_is_corrected_only_when_named() -> None:
    text = "$basis\n*\nh {0}\n*\n  3  s\n 3.42525091 0.15432897\n 0.62391373 0.53532814\n"
    text += " 0.16885540 0.44463454\n*\nhe {0}\n*\n 3 s\n 6.36242139 0.15432897\n"
    text += " 1.15892300 0.53532814\n 0.31364979 0.44463454\n*\n$end\n"
    wrong = text.format("STO-4G")
    assert _mended(wrong).data.decode() == wrong
    assert _mended(wrong, "label.split").data.decode() == text.format("STO-3G")


# ---- every layout: slips planted into invented files


def _slipped(text: str, document: Document, dice: random.Random) -> str:
    """A text in which some exponents are misspelt in ways that have one likely reading."""
    for block in document.blocks:
        for shell in block.shells:
            for row, value in enumerate(shell.exponents.tolist()):
                word = shell.spelling(row)
                if dice.random() < 0.3 and "0" in word and text.count(word) == 1:
                    new = word.replace("0", "O", 1)
                    if float(word) == value and NUMBER.fullmatch(word):
                        text = text.replace(word, new)
    return text


@pytest.mark.parametrize("name", layouts())
@settings(max_examples=15, deadline=None)
@given(document=documents(highest=3, with_potentials=False), seed=st.integers(0, 10**6))
def test_safe_repairs_leave_every_number(name: str, document: Document, seed: int) -> None:
    text = layouts()[name].write(document).text
    whole = read_text(text, layout=name)
    broken = _slipped(text, whole, random.Random(seed))
    if random.Random(seed).random() < 0.5:
        broken = broken.replace("\n", "\r\n", 1)
    before = content(read_text(broken, layout=name))
    result = mend(broken.encode(), "own", Settings(layout=name))
    after = read_bytes(result.data, "own", layout=name)
    assert content(after) == before
    assert not [f for f in judge(after, settings=Settings()).findings if f.rule == "form.ending"]
    assert _rules(result) <= set(SAFE)


# ---- spelling of new numbers


@pytest.mark.parametrize(
    ("word", "value", "wanted"),
    [
        ("0.1543290", 0.25, "0.2500000"),
        ("-0.15", 0.256, "0.26"),
        (".15", 0.256, ".26"),
        ("-.15", -0.256, "-.26"),
        ("+0.15", 0.256, "+0.26"),
        ("1.50D-01", 25.6, "2.56D01"),
        ("1.50D+01", 0.0256, "2.56D-02"),
        ("1.5e+00", 25.6, "2.6e+01"),
        ("1", 0.25, "0.25000000"),
    ],
)
def test_a_new_number_is_spelled_like_the_old_one(word: str, value: float, wanted: str) -> None:
    assert respelled(word, value) == wanted


@given(
    st.from_regex(NUMBER, fullmatch=True).filter(lambda w: w.isascii() and len(w) < 30),
    st.floats(-1e6, 1e6).filter(lambda v: v == 0.0 or abs(v) > 1e-6),
)
def test_a_new_number_is_a_number(word: str, value: float) -> None:
    assert plain(respelled(word, value)) == pytest.approx(value, abs=max(0.51, 0.06 * abs(value)))


# ---- the command


def _run(*arguments: str | Path, text: str | None = None) -> Result:
    words = ["mend", *map(str, arguments)]
    return CliRunner().invoke(cli, words, input=text, catch_exceptions=False)


@pytest.fixture
def path(tmp_path: Path) -> Path:
    path = tmp_path / "own.basis"
    path.write_text(SOUND.replace("0.3", "O.3"))
    return path


def test_a_diff_is_shown_and_nothing_written(path: Path) -> None:
    before = path.read_bytes()
    done = _run(path)
    assert done.exit_code == 1
    assert done.stdout.split("\n")[:2] == [f"--- a/{path}", f"+++ b/{path}"]
    assert "- O.3 1.0\n+ 0.3 1.0\n" in done.stdout
    assert path.read_bytes() == before


def test_write_replaces_the_file_and_keeps_its_mode(path: Path) -> None:
    path.chmod(0o640)
    (path.parent / "sound.basis").write_text(SOUND)
    (path.parent / "notes.txt").write_text("nothing\n")
    done = _run("--write", path.parent)
    assert done.exit_code == 0
    assert done.stdout == f"{path}: 1 repair (form.number 1)\n"
    assert path.read_text() == SOUND
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
    assert {p.name for p in path.parent.iterdir()} == {"own.basis", "sound.basis", "notes.txt"}


@pytest.mark.skipif(os.name == "nt", reason="links need rights there")
def test_a_link_is_followed_and_said(path: Path) -> None:
    link = path.parent / "link.basis"
    link.symlink_to(path.name)
    done = _run("--write", link)
    assert f"{link} is a link; the file that was written is {path}" in done.stdout
    assert link.is_symlink() and path.read_text() == SOUND


def test_standard_input(path: Path) -> None:
    assert "+ 0.3 1.0" in _run("-", "--named", "x", text=path.read_text()).stdout
    assert _run("-", "--write", text=path.read_text()).stdout == SOUND


def test_wrong_use_and_missing_files(path: Path) -> None:
    assert _run("--also", "form.count", path).exit_code == 2
    done = _run("--write", path.parent / "absent", path)
    assert done.exit_code == 3
    assert path.read_text() == SOUND


def test_the_diff_is_one_that_git_applies(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import shutil
    import subprocess

    if shutil.which("git") is None:
        pytest.skip("git is not installed")
    monkeypatch.chdir(tmp_path)
    # The comment's name is in Latin-1.
    sound = b"! M\xfcller\n" + SOUND.rstrip("\n").encode()
    broken = sound.replace(b"0.3", b"O.3").replace(b"\n", b"\r\n", 2)
    path = Path("own.basis")
    path.write_bytes(broken)
    shown = _run(path).stdout_bytes
    subprocess.run(["git", "apply", "-"], input=shown, check=True)
    assert path.read_bytes() == sound


def test_a_diff_on_a_terminal_shows_what_cannot_be_seen() -> None:
    shown = diff(b"a\x0b \xfc\r\nb\x1b[0m\n", b"a\nb\n", "x", for_terminal=True)
    assert "-a<0b> <fc><0d>" in shown
    assert "-b<1b>[0m" in shown
    assert shown.count("\n") == 7
    assert diff(b"a", b"a", "x", for_terminal=True) == ""
