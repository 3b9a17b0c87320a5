"""The report for people: columns, width, colours; quiet and verbose."""

import io
import os
import pty
import re
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner

from overlapse.lint.cli import cli
from overlapse.lint.engine import audit_text
from overlapse.lint.reports import writer
from overlapse.lint.settings import Settings
from overlapse.lint.terminal import WIDTH, coloured, width
from overlapse.rules.finding import Finding

TEXT = "C 0\nS 2 1.00\n 4.0 0.6\n O.5 0.5\nP 1 1.0\n 0.5 1.0\n****\nN 0\nS 1 1.0\n -1.0 1.0\n****\n"
LONG = "C 0\nS 3 1.00\n" + " 4.0 0.6" + " " * 300 + "! much\n O.5 0.5" + " x" * 200 + "\n****\n"
SOUND = "C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"


def _report(text: str, colour: bool = False) -> str:
    out = io.StringIO()
    writer("text")([audit_text(text, "a.basis", settings=Settings())], out, colour)
    return out.getvalue()


def test_what_follows_the_level_stands_in_one_column() -> None:
    audit = audit_text(TEXT, "a.basis", settings=Settings())
    levels = ("error", "warning", "note")
    findings = tuple(Finding("x.y", l, "m", "a.basis", 1, 1, element="C") for l in levels)  # type: ignore[arg-type]
    out = io.StringIO()
    from dataclasses import replace

    for colour in (False, True):
        writer("text")([replace(audit, findings=findings)], out, colour)
    plain = re.sub(r"\x1b\[\d*m", "", out.getvalue())
    heads = [line for line in plain.split("\n") if line.startswith(levels)]
    assert len(heads) == 6
    assert {line.index("C  line 1") for line in heads} == {9}


@pytest.mark.parametrize("columns", [50, 80, 110])
def test_it_keeps_to_the_width(columns: int, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", str(columns))
    lines = _report(LONG).split("\n")[1:]  # the heading holds the path
    assert max(map(len, lines)) <= columns
    pointed = [k for k, line in enumerate(lines) if "^" in line]
    assert pointed
    for k in pointed:
        assert lines[k - 1][lines[k].index("^")] != " "


def test_the_width_of_a_file_is_fixed(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("COLUMNS", raising=False)
    assert width(io.StringIO()) == WIDTH
    monkeypatch.setenv("COLUMNS", "7")
    assert width(io.StringIO()) == 40


def _on_a_terminal(folder: Path, **environment: str) -> str:
    """What an audit shows on a terminal."""
    (folder / "a.basis").write_text(TEXT)
    master, slave = pty.openpty()
    command = "from overlapse.lint.cli import main; main()"
    subprocess.run(
        [sys.executable, "-c", command, "audit", folder / "a.basis"],
        stdout=slave,
        stderr=subprocess.DEVNULL,
        env={**os.environ, "TERM": "xterm", **environment},
        check=False,
    )
    os.close(slave)
    shown = b""
    try:
        while piece := os.read(master, 65536):
            shown += piece
    except OSError:
        pass  # so a terminal says that the other end is closed
    os.close(master)
    return shown.decode()


@pytest.mark.skipif(sys.platform == "win32", reason="no such terminals")
def test_colours_on_a_terminal_unless_no_color_is_set(tmp_path: Path) -> None:
    # https://no-color.org: present and not an empty string.
    assert "\x1b[31m" in _on_a_terminal(tmp_path, NO_COLOR="")
    assert "\x1b[" not in _on_a_terminal(tmp_path, NO_COLOR="1")
    assert "\x1b[" not in _on_a_terminal(tmp_path, TERM="dumb")
    assert not coloured(io.StringIO())


def _run(*arguments: str | Path) -> "subprocess.CompletedProcess[str]":
    command = [sys.executable, "-c", "from overlapse.lint.cli import main; main()", "audit"]
    return subprocess.run([*command, *arguments], capture_output=True, text=True, check=False)


def test_quiet_says_only_what_makes_it_fail(tmp_path: Path) -> None:
    sound, broken = tmp_path / "sound.basis", tmp_path / "broken.basis"
    sound.write_text(SOUND)
    broken.write_text(TEXT)
    done = _run("--quiet", sound)
    assert (done.returncode, done.stdout, done.stderr) == (0, "", "")
    odd = ("--label", "quite-unheard-of", "--report", "lines", broken)
    loud, quiet = _run(*odd), _run("-q", *odd)
    assert ": note: " in loud.stdout
    assert quiet.returncode == 1
    assert quiet.stdout.split("\n") == [l for l in loud.stdout.split("\n") if ": note: " not in l]
    assert _run("-q", "-v", sound).returncode == 2


def test_verbose_tells_how_each_file_was_taken(tmp_path: Path) -> None:
    (tmp_path / "overlapse.toml").write_text('fail-at = "error"\n')
    (tmp_path / "a.basis").write_text("! 6-31G\n" + SOUND)
    (tmp_path / "b.txt").write_text("nothing\n")
    done = _run("--verbose", "--report", "lines", tmp_path)
    first, second = done.stderr.strip().split("\n")
    assert first.startswith(f"{tmp_path / 'a.basis'}: layout stars (")
    assert "label 6-31G from the comment on line 1" in first
    assert f"settings of {tmp_path / 'overlapse.toml'}" in first
    assert second.startswith(f"{tmp_path / 'b.txt'}: passed over")


def test_the_last_lines_say_how_to_go_on(tmp_path: Path) -> None:
    text = "C 0\nS 2 1.00\n 4.0 0.6\n O.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"
    path = tmp_path / "a b.basis"
    path.write_text(text)

    def last(*words: str) -> list[str]:
        done = CliRunner().invoke(cli, ["audit", "--no-energies", *words], catch_exceptions=False)
        return done.stdout.splitlines()

    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(tmp_path)
        patch.setenv("COLUMNS", "100")
        assert [re.sub("  +", "  ", line) for line in last(path.name)[-5:]] == [
            "1 file; 1 error",
            "to go on:",
            "  overlapse rules form.number  what a rule finds, and why",
            "  overlapse mend 'a b.basis'  1 safe repair as a diff",
            "  overlapse audit --write-ledger 'a b.basis'  from then on only what is new counts",
        ]
        assert last("--quiet", path.name)[-1] == "1 file; 1 error"
        assert last("--recognised-only", path.name)[-1] == "1 file; 1 error"
        told, *_ = last("--write-ledger", path.name)
        assert told.startswith("overlapse.ledger.json holds 1 finding of 1 file; from now on only")
        path.write_text(text.replace("O.5", "0.5"))
        assert "1 file; nothing new found; 1 gone since" in last(path.name)
