"""Many files at once: the same audits in the same order, however they are judged."""

import os
import re
import signal
import subprocess
import sys
import time
from dataclasses import replace
from io import StringIO
from pathlib import Path

import pytest

from overlapse.lint import bulk
from overlapse.lint.cache import Cache
from overlapse.lint.engine import FileAudit, Options, Target
from overlapse.lint.progress import progress

BODY = "C 0\nS 2 1.00\n 4.0 0.6\n {} 0.55505\nP 1 1.0\n 0.5 1.0\n****\n"


@pytest.fixture
def targets(tmp_path: Path) -> list[Target]:
    found = []
    folder = tmp_path / "sets"
    folder.mkdir()
    for number in range(90):
        path = folder / f"{number:02d}.basis"
        path.write_text(BODY.format("O.5" if number % 3 else f"0.{number + 1}"))
        found.append(Target(path, False))
    (folder / "00.basis").unlink()  # which no longer can be opened
    (folder / "01.basis").write_text("nothing of the kind\n")
    return [*found[:10], Target(folder / "01.basis", True), *found[10:]]


def _all(targets: list[Target], processes: int = 1, cache: Cache | None = None) -> list[FileAudit]:
    found = bulk.audits(targets, Options(), processes=processes, cache=cache)
    return [replace(audit, document=None) for audit in found]


def test_processes_and_kept_results_change_nothing(targets: list[Target], tmp_path: Path) -> None:
    plain = _all(targets)
    assert [audit.path for audit in plain] == [os.fspath(t.path) for t in targets]
    assert plain[0].problem and plain[10].passed_over
    assert _all(targets, 3) == plain
    assert _all(targets, 3, Cache(tmp_path)) == plain
    assert _all(targets, 3, Cache(tmp_path)) == plain
    assert _all(targets, 1, Cache(tmp_path)) == plain


def test_a_kept_result_is_used_and_a_changed_file_judged_anew(
    targets: list[Target], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    _all(targets, 1, Cache(tmp_path))
    judged: list[str] = []
    real = bulk.audit_bytes

    def noted(data: bytes, name: str, options: Options, *, searched: bool = False) -> FileAudit:
        judged.append(name)
        return real(data, name, options, searched=searched)

    monkeypatch.setattr(bulk, "audit_bytes", noted)
    targets[3].path.write_text(BODY.format("0.7"))
    found = _all(targets, 1, Cache(tmp_path))
    assert judged == [os.fspath(targets[3].path)]
    assert not [f for f in found[3].findings if f.rule == "form.number"]


def test_settings_that_change_are_seen(targets: list[Target], tmp_path: Path) -> None:
    def rules() -> set[str]:
        audits = _all(targets, 2, Cache(tmp_path))
        return {finding.rule for audit in audits for finding in audit.findings}

    assert "form.number" in rules()
    (tmp_path / "overlapse.toml").write_text("severity.form.number = 'off'\n")
    assert "form.number" not in rules()
    (tmp_path / "overlapse.toml").unlink()
    assert "form.number" in rules()


def test_documents_are_read_again_where_they_are_asked_for(
    targets: list[Target], tmp_path: Path
) -> None:
    for processes in (1, 2):
        found = list(
            bulk.audits(
                targets, Options(), processes=processes, cache=Cache(tmp_path), documents=True
            )
        )
        for audit in found[1:]:
            assert audit.document is not None
            assert len(audit.document.blocks) == audit.blocks


def test_progress_is_told_of_every_file(targets: list[Target]) -> None:
    sizes: list[int] = []
    list(bulk.audits(targets, Options(), processes=2, done=sizes.append))
    assert len(sizes) == len(targets)
    assert sum(sizes) == sum(bulk.size_of(target.path) for target in targets)


def test_few_audits_are_under_way_at_a_time(targets: list[Target]) -> None:
    taken = 0

    def counted() -> "list[Target]":
        nonlocal taken
        for target in targets * 20:
            taken += 1
            yield target

    stream = bulk.audits(counted(), Options(), processes=2)  # type: ignore[arg-type]
    next(stream)
    assert taken <= bulk.BATCH_FILES * bulk.AHEAD * 2 + bulk.BATCH_FILES
    stream.close()  # type: ignore[attr-defined]


class _Terminal(StringIO):
    def isatty(self) -> bool:
        return True


def test_a_bar_shows_rate_and_remaining_time(monkeypatch: pytest.MonkeyPatch) -> None:
    shown = _Terminal()
    monkeypatch.setattr("sys.stderr", shown)
    with progress(1000, 4, False) as done:
        for _ in range(4):
            time.sleep(0.45)  # the remaining time is told after a second
            done(250)
    assert "3/4 files" in shown.getvalue() and "a second" in shown.getvalue()
    assert re.search(r"\d\d:\d\d:\d\d  3/4", shown.getvalue())
    quiet = StringIO()
    monkeypatch.setattr("sys.stderr", quiet)
    with progress(1000, 4, False) as done:
        done(1000)
    assert quiet.getvalue() == ""


PROGRAM = "from overlapse.lint.cli import main; main()"


@pytest.mark.skipif(os.name == "nt", reason="signals differ there")
def test_ctrl_c_leaves_no_half_output(tmp_path: Path) -> None:
    folder, out = tmp_path / "sets", tmp_path / "reports" / "found.json"
    folder.mkdir()
    out.parent.mkdir()
    block = BODY.format("0.5")
    symbols = "B C N O F Ne Al Si P S Cl Ar".split()
    for number in range(400):
        text = "".join(block.replace("C 0", f"{s} 0", 1) for s in symbols)
        (folder / f"{number:03d}.basis").write_text(text)
    for more in (["--out", str(out)], []):
        command = [sys.executable, "-c", PROGRAM, "audit", "--report", "json", "--no-cache", "-v"]
        running = subprocess.Popen(
            [*command, "--processes", "2", *more, str(folder)],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            start_new_session=True,
        )
        assert running.stderr is not None
        assert running.stderr.readline()  # the first file is judged
        assert running.poll() is None, "it was over too soon"
        os.killpg(running.pid, signal.SIGINT)  # what a terminal does: all processes get it
        shown, told = running.communicate(timeout=60)
        assert running.returncode == 130
        assert b"stopped" in told and b"Traceback" not in told
        assert shown == b""
        assert not list(out.parent.iterdir())
