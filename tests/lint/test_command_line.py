"""The command line: reports, exit statuses, bad input."""

import io
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

SOUND = "C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"
BROKEN = SOUND.replace("0.5 0.55505", "O.5 0.55505")


def run(*arguments: str | Path, text: str | bytes = b"") -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-c", "from overlapse.lint.cli import main; main()"]
    data = text.encode() if isinstance(text, str) else text
    done = subprocess.run(
        [*command, *map(os.fspath, arguments)], input=data, capture_output=True, check=False
    )
    assert b"Traceback" not in done.stderr, done.stderr
    return subprocess.CompletedProcess(
        done.args, done.returncode, done.stdout.decode(), done.stderr.decode()
    )


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "sound.basis").write_text(SOUND)
    (tmp_path / "broken.basis").write_text(BROKEN)
    (tmp_path / "notes.txt").write_text("nothing here describes an element\n")
    (tmp_path / ".hidden").mkdir()
    (tmp_path / ".hidden" / "broken.basis").write_text(BROKEN)
    return tmp_path


def test_a_sound_file_gives_status_0(folder: Path) -> None:
    done = run("audit", folder / "sound.basis")
    assert done.returncode == 0
    assert done.stdout == "1 file; nothing found\n"


def test_a_finding_gives_status_1_and_shows_the_place(folder: Path) -> None:
    done = run("audit", folder / "broken.basis")
    assert done.returncode == 1
    line = next(line for line in done.stdout.split("\n") if line.lstrip().startswith("4 :"))
    pointer = done.stdout.split("\n")[done.stdout.split("\n").index(line) + 1]
    assert line[pointer.index("^") : pointer.rindex("^") + 1] == "O.5"
    assert "0.5 was probably meant" in done.stdout
    assert "\x1b" not in done.stdout


def test_a_folder_is_searched_by_content(folder: Path) -> None:
    done = run("audit", "--report", "lines", folder)
    assert done.returncode == 1
    (line,) = done.stdout.strip().split("\n")
    assert line.startswith(f"{folder / 'broken.basis'}:4:2: error: form.number: C s-1: ")


def test_standard_input_under_a_declared_name() -> None:
    done = run("audit", "-", "--named", "sent.basis", "--report", "lines", text=BROKEN)
    assert done.returncode == 1
    assert done.stdout.startswith("sent.basis:4:2: error: form.number")


def test_json(folder: Path) -> None:
    found = json.loads(run("audit", "--report", "json", folder / "broken.basis").stdout)
    (file,) = found["files"]
    assert file["layout"] == "stars"
    assert file["blocks"] == 1
    (finding,) = file["findings"]
    assert finding["rule"] == "form.number"
    assert (finding["line"], finding["column"]) == (4, 2)
    assert (finding["element"], finding["shell"]) == ("C", "s-1")
    assert (finding["measured"], finding["expected"]) == ("O.5", 0.5)


def test_the_report_goes_to_a_file(folder: Path, tmp_path: Path) -> None:
    out = tmp_path / "report.json"
    done = run("audit", "--report", "json", "--out", out, folder / "sound.basis")
    assert done.stdout == ""
    assert json.loads(out.read_text())["files"][0]["findings"] == []


def test_the_failing_level_and_the_least_level(folder: Path) -> None:
    unlabelled = folder / "own.basis"
    unlabelled.write_text("$basis\n*\nh own\n*\n 1 s\n 0.5 1.0\n*\n$end\n")
    assert run("audit", unlabelled).returncode == 0
    assert run("audit", "--fail-at", "note", unlabelled).returncode == 1
    assert "label.unknown" not in run("audit", "--least", "warning", unlabelled).stdout


def test_a_label_given_by_hand(folder: Path) -> None:
    done = run("audit", "--label", "6-31G", "--report", "lines", folder / "sound.basis")
    assert done.returncode == 1
    assert "label.split" in done.stdout and "the label you gave" in done.stdout


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (["audit"], "Missing argument"),
        (["audit", "--layout", "starry", "{}"], "'starry' is not one of"),
        (["audit", "--report", "picture", "{}"], "'picture' is not one of"),
        (["rules", "contraction.nrom"], "did you mean contraction.norm?"),
        (["nonsense"], "No such command"),
        (["audt", "{}"], "Did you mean audit?"),
    ],
)
def test_wrong_use_gives_status_2(folder: Path, arguments: list[str], told: str) -> None:
    done = run(*(word.replace("{}", str(folder / "sound.basis")) for word in arguments))
    assert done.returncode == 2
    assert told in done.stderr


def test_a_missing_file_gives_status_3_and_the_others_are_judged(folder: Path) -> None:
    done = run("audit", folder / "absent.basis", folder / "broken.basis")
    assert done.returncode == 3
    assert "absent.basis: No such file" in done.stdout
    assert "form.number" in done.stdout


@pytest.mark.skipif(os.name == "nt" or os.geteuid() == 0, reason="needs a user without all rights")
def test_a_folder_that_cannot_be_read_gives_status_3(folder: Path) -> None:
    closed = folder / "closed"
    closed.mkdir(mode=0)
    done = run("audit", closed)
    assert done.returncode == 3
    assert "closed" in done.stdout


BAD = {
    "an empty file": (b"", "the file is empty"),
    "blanks alone": (b" \n\t\n", "the file is empty"),
    "a binary file": (bytes(range(256)) * 10, "binary"),
    "prose": (b"It was a dark and stormy night.\n", "no known layout"),
    "one line of a megabyte": (b"1.0 " * 250_000, "1,000,000 characters"),
    "a huge announced count": (b"C 0\nS 999999999999 1.00\n 1.0 1.0\n****\n", "999999999999"),
    "a shell of absurd length": (
        b"C 0\nS 3000 1.00\n" + b" 1.0 1.0\n" * 3000 + b"****\n",
        "no basis set has so many",
    ),
    "an element of absurd size": (
        b"C 0\n" + b"S 1 1.00\n 1.0 1.0\n" * 3000 + b"****\n",
        "no basis set has so many",
    ),
    "not UTF-8": (b"! \xff\xfe\nC 0\nS 2 1.0\n 1.0 1.0\n****\n", "announces 2 rows"),
    "a shell without end": (b"C 0\nS 2 1.00\n 1.0", "1 number in this row"),
    "a heading without end": (b"C 0\nS 1 1.0\n 1.0 1.0\n****\nN 0\nS 1", "no rows"),
}


@pytest.mark.parametrize("kind", BAD)
def test_bad_input_is_a_finding(kind: str, tmp_path: Path) -> None:
    data, told = BAD[kind]
    path = tmp_path / "bad.basis"
    path.write_bytes(data)
    done = run("audit", path)
    assert done.returncode == 1
    assert told in done.stdout


@pytest.mark.parametrize("kind", BAD)
def test_bad_input_read_as_a_given_layout(kind: str, tmp_path: Path) -> None:
    path = tmp_path / "bad.basis"
    path.write_bytes(BAD[kind][0])
    for layout in ("stars", "keyworded", "dollar"):
        assert run("audit", "--layout", layout, path).returncode in (0, 1)


def test_files_that_show_no_layout_may_be_passed_over(folder: Path) -> None:
    assert run("audit", folder / "notes.txt").returncode == 1
    done = run("audit", "--recognised-only", folder / "notes.txt", folder / "sound.basis")
    assert done.returncode == 0
    assert "1 passed over" in done.stdout


def test_hostile_names_and_comments_stay_on_their_line(tmp_path: Path) -> None:
    path = tmp_path / "a\x1b[31mb.basis"
    path.write_text("C 0\nS 1 1.0\n 1.0 \x1b[2J\n****\n")
    for report in ("text", "lines"):
        assert "\x1b" not in run("audit", "--report", report, path).stdout


def test_rules_are_listed_and_explained() -> None:
    listed = run("rules").stdout
    assert "contraction.norm" in listed
    told = run("rules", "contraction.norm").stdout
    for word in ("Formula:", "Source:", "Remedy:", "Found in:"):
        assert word in told


def test_an_internal_failure_has_its_own_status(monkeypatch: pytest.MonkeyPatch) -> None:
    from overlapse.lint import cli

    def fail() -> None:
        raise RuntimeError("planted")

    monkeypatch.setattr(cli, "cli", fail)
    with pytest.raises(SystemExit) as stopped:
        cli.main()
    assert stopped.value.code == 70


def test_recast(folder: Path) -> None:
    done = run("recast", folder / "sound.basis", "--layout", "dollar")
    assert done.returncode == 0
    assert done.stdout.startswith("$basis\n*\nc unnamed\n*\n   2  s\n")
    refused = run("recast", folder / "broken.basis", "--layout", "dollar")
    assert refused.returncode == 1
    assert "broken.basis:4:2:" in refused.stderr


def test_it_is_told_that_energies_were_left_out(folder: Path) -> None:
    large = folder / "large.basis"
    large.write_text(SOUND + f"! {1000 * 'x'}\n" * 1200)
    assert "energies are left out, as 1.2 MB of files" in run("audit", large).stderr
    for arguments in (("--energies",), ("--no-energies",), ("--quiet",)):
        assert "energies" not in run("audit", *arguments, large).stderr
    assert "energies" not in run("audit", folder / "sound.basis").stderr


def test_colour_is_for_terminals_only(folder: Path) -> None:
    from overlapse.lint.engine import Target, audit_file
    from overlapse.lint.reports import writer

    audits = [audit_file(Target(folder / "broken.basis", False))]
    plain, painted = io.StringIO(), io.StringIO()
    writer("text")(audits, plain, False)
    writer("text")(audits, painted, True)
    assert "\x1b" not in plain.getvalue()
    assert "\x1b[31merror" in painted.getvalue()


NARROW = [
    ["demo"],
    ["audit", "sets"],
    ["seal", "--write", "sets"],
    ["relate", "sets/a long name of a file.basis", "sets/another long name of a file.basis"],
    ["rules", "contraction.norm"],
    ["rules"],
    ["mend", "--help"],
    ["audit", "--help"],
]


@pytest.mark.parametrize("words", NARROW, ids=" ".join)
def test_nothing_is_wider_than_a_terminal(
    words: list[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("COLUMNS", "80")
    (tmp_path / "sets").mkdir()
    text = "! 6-31G**, as a program of old times wrote it\n" + BROKEN
    for name, content in (("a", text), ("another", text.replace("4.0", "4.1"))):
        (tmp_path / "sets" / f"{name} long name of a file.basis").write_text(content)
    done = run(*words)
    assert done.stdout
    assert [line for line in done.stdout.splitlines() if len(line) > 80] == []
