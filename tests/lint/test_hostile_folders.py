"""Folders as they are found: pipes, loops, odd names, what cannot be read, and no room to write."""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

PROGRAM = [sys.executable, "-c", "from overlapse.lint.cli import main; main()"]
SOUND = "C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"
BROKEN = SOUND.replace("0.5 0.55505", "O.5 0.55505")
POSIX = pytest.mark.skipif(os.name != "posix", reason="this system has no such files")


def _run(
    *arguments: str | bytes, folder: Path, words: str = ""
) -> "subprocess.CompletedProcess[str]":
    done = subprocess.run(
        [*PROGRAM, *arguments],
        cwd=folder,
        input=words,
        capture_output=True,
        text=True,
        errors="replace",
        check=False,
        timeout=100,
    )
    assert "Traceback" not in done.stderr
    assert "internal failure" not in done.stderr
    return done


@POSIX
def test_a_pipe_in_a_folder_is_not_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.basis")
    (tmp_path / "a.basis").write_text(BROKEN)
    assert _run("audit", ".", folder=tmp_path).returncode == 1
    assert _run("mend", ".", folder=tmp_path).returncode == 1


@POSIX
def test_a_pipe_that_is_named_is_read_once(tmp_path: Path) -> None:
    (tmp_path / "a.basis").write_text(SOUND)
    (tmp_path / "b.basis").write_text(BROKEN)
    reading, writing = os.pipe()
    os.write(writing, BROKEN.encode())
    os.close(writing)
    done = subprocess.run(
        [*PROGRAM, "audit", "--report", "lines", "a.basis", f"/dev/fd/{reading}"],
        cwd=tmp_path, pass_fds=(reading,), capture_output=True, text=True, check=False,
    )  # fmt: skip
    os.close(reading)
    assert done.stdout.startswith(f"/dev/fd/{reading}:4:2: error: form.number")


@POSIX
def test_links_that_lead_back_or_nowhere(tmp_path: Path) -> None:
    (tmp_path / "a.basis").write_text(SOUND)
    (tmp_path / "loop").mkdir()
    (tmp_path / "loop" / "up").symlink_to("..")
    (tmp_path / "self").symlink_to("self")
    (tmp_path / "gone.basis").symlink_to("nowhere")
    done = _run("audit", "--report", "lines", ".", folder=tmp_path)
    assert done.returncode == 3
    assert done.stdout.splitlines() == [
        "gone.basis: error: No such file or directory",
        "self: error: Too many levels of symbolic links",
    ]


@POSIX
@pytest.mark.skipif(os.name == "posix" and os.geteuid() == 0, reason="root may read everything")
def test_what_may_not_be_read_is_told(tmp_path: Path) -> None:
    (tmp_path / "a.basis").write_text(SOUND)
    (tmp_path / "a.basis").chmod(0)
    done = _run("audit", "--report", "lines", "a.basis", folder=tmp_path)
    assert (done.returncode, done.stdout) == (3, "a.basis: error: Permission denied\n")


NAMES = [b"-v.basis", b"a\nb.basis", "\N{OK HAND SIGN}.basis".encode(), b"\xff.basis", b"--help"]


@POSIX
@pytest.mark.parametrize("report", ["text", "lines", "json", "sarif"])
def test_names_of_any_kind(tmp_path: Path, report: str) -> None:
    for name in NAMES:
        with open(os.path.join(os.fsencode(tmp_path), name), "w") as file:
            file.write(BROKEN)
    done = _run("audit", "--report", report, "--", *NAMES, folder=tmp_path)
    assert done.returncode == 1
    assert done.stdout.count("form.number") >= len(NAMES)
    if report in ("json", "sarif"):
        json.loads(done.stdout)
    done = _run("mend", "--write", "--", *NAMES, folder=tmp_path)
    assert done.returncode == 0
    assert {path.read_bytes() for path in tmp_path.iterdir()} == {SOUND.encode()}


CONTENTS = {
    "empty": b"",
    "blank": b" \n\n",
    "zeros": bytes(10_000),
    "other width": BROKEN.encode("utf-16"),
    "no text": bytes(range(1, 256)) * 50,
    "zeros in the middle": SOUND.encode() + bytes(4) + SOUND.encode(),
    "one long line": b"C 0 " * 100_000,
    "marks of an end": BROKEN.encode() + b"\x1a",
}


@pytest.mark.parametrize("content", CONTENTS.values(), ids=CONTENTS)
def test_contents_of_any_kind(tmp_path: Path, content: bytes) -> None:
    (tmp_path / "a.basis").write_bytes(content)
    for words in (["audit", "a.basis"], ["audit", "."], ["mend", "--write", "."]):
        assert _run(*words, folder=tmp_path).returncode in (0, 1)
    for command in ("describe", "recast", "seal"):
        extra = {"recast": ["--layout", "stars"], "seal": ["--write"]}.get(command, [])
        assert _run(command, "a.basis", *extra, folder=tmp_path).returncode in (0, 1, 2, 3)


def test_who_stops_reading_early_is_no_trouble(tmp_path: Path) -> None:
    for number in range(200):
        (tmp_path / f"{number}.basis").write_text(BROKEN * 20)
    for command in ("audit", "mend"):
        running = subprocess.Popen(
            [*PROGRAM, command, "."], cwd=tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE
        )
        assert running.stdout is not None and running.stderr is not None
        running.stdout.read(100)
        running.stdout.close()
        told = running.stderr.read()
        running.stderr.close()
        assert running.wait() in (0, 1)
        assert told == b""


def test_audits_at_the_same_time_share_their_cache(tmp_path: Path) -> None:
    (tmp_path / "sets").mkdir()
    for number in range(60):
        (tmp_path / "sets" / f"{number}.basis").write_text(f"! {number}\n" + BROKEN * 30)
    environment = os.environ | {"XDG_CACHE_HOME": str(tmp_path / "cache")}
    words = [*PROGRAM, "audit", "--no-energies", "--report", "lines", "sets"]
    pipe = subprocess.PIPE
    running = [
        subprocess.Popen(words, cwd=tmp_path, env=environment, stdout=pipe, stderr=pipe)
        for _ in range(4)
    ]
    answers = {each.communicate() for each in running}
    assert len(answers) == 1
    assert {each.returncode for each in running} == {1}
    assert answers.pop()[1] == b""
