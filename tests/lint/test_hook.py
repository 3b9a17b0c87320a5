"""The commit hook, tried for real on a repository with one good and one bad file."""

import shutil
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
GOOD = "C 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.55505\nS 1 1.00\n 0.3 1.0\nP 1 1.0\n 0.5 1.0\n****\n"


def _git(*arguments: str, folder: Path) -> None:
    subprocess.run(
        ["git", "-c", "user.name=t", "-c", "user.email=t@example.org", *arguments],
        cwd=folder,
        check=True,
        capture_output=True,
    )


@pytest.mark.skipif(shutil.which("git") is None, reason="git is not installed")
@pytest.mark.skipif(not (ROOT / ".git").exists(), reason="the project is no git checkout here")
def test_it_fails_the_bad_file_and_passes_the_good_one(tmp_path: Path) -> None:
    _git("init", "-q", folder=tmp_path)
    (tmp_path / "good.basis").write_text(GOOD)
    (tmp_path / "bad.basis").write_text(GOOD.replace("0.5 0.55505", "O.5 0.55505"))
    (tmp_path / "notes.txt").write_text("not a basis set\n")
    _git("add", ".", folder=tmp_path)

    def hook(*files: str) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "pre_commit", "try-repo", ROOT, "overlapse", "--files", *files],
            cwd=tmp_path,
            capture_output=True,
            text=True,
            check=False,
        )

    failed = hook("good.basis", "bad.basis", "notes.txt")
    assert failed.returncode == 1, failed.stdout + failed.stderr
    assert "bad.basis" in failed.stdout and "form.number" in failed.stdout
    assert "good.basis" not in failed.stdout
    passed = hook("good.basis", "notes.txt")
    assert passed.returncode == 0, passed.stdout + passed.stderr
