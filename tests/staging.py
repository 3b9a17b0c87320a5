"""Git repositories for tests, and audits in them as processes of their own."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

SOUND = "C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"
BROKEN = SOUND.replace("0.5 0.55505", "O.5 0.55505")


def git(*arguments: str | Path) -> str:
    """What git says; raises where it fails."""
    identity = ["-c", "user.name=t", "-c", "user.email=t@example.org"]
    done = subprocess.run(
        ["git", *identity, *arguments], check=True, capture_output=True, text=True
    )
    return done.stdout


def run(*arguments: str | Path) -> "subprocess.CompletedProcess[str]":
    """An `overlapse` process."""
    command = [sys.executable, "-c", "from overlapse.lint.cli import main; main()"]
    done = subprocess.run([*command, *arguments], capture_output=True, text=True, check=False)
    assert "Traceback" not in done.stderr
    return done


def new_repository(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Make a folder a repository, and the current folder."""
    for name in [name for name in os.environ if name.startswith("GIT_")]:
        monkeypatch.delenv(name)
    monkeypatch.chdir(folder)
    git("init", "-q")
