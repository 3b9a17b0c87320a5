"""Staged content, tried for real on git repositories."""

import os
import shutil
import subprocess
from pathlib import Path

import pytest
from staging import BROKEN, SOUND, git, new_repository, run

from overlapse.lint.staged import StagedError, staged

pytestmark = pytest.mark.skipif(shutil.which("git") is None, reason="git is not installed")


@pytest.fixture
def repository(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    new_repository(tmp_path, monkeypatch)
    return tmp_path


def _audit(*arguments: str | Path) -> "subprocess.CompletedProcess[str]":
    return run("audit", *arguments)


def test_the_index_counts_and_not_the_working_file(repository: Path) -> None:
    file = repository / "a.basis"
    file.write_text(BROKEN)
    git("add", "a.basis")
    file.write_text(SOUND)  # mended, but not staged
    assert _audit("--report", "lines", "a.basis").stdout == ""
    done = _audit("--staged", "--report", "lines", "a.basis")
    assert done.returncode == 1
    assert done.stdout.startswith("a.basis:4:2: error: form.number: C s-1: ")
    git("add", "a.basis")
    file.write_text(BROKEN)
    assert _audit("--staged", "a.basis").returncode == 0
    file.unlink()
    assert _audit("--staged", "a.basis").returncode == 0


def test_a_folder_is_searched_in_the_index(repository: Path) -> None:
    for name in ("b.basis", "a.basis", ".hidden.basis", "notes.md", "deep/c.basis"):
        path = repository / "sets" / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(SOUND)
    (repository / "sets" / "link.basis").symlink_to("a.basis")
    git("add", ".")
    (repository / "sets" / "new.basis").write_text(SOUND)
    found = [each.target for each in staged([Path("sets")])]
    assert [str(target.path) for target in found] == [
        "sets/a.basis",
        "sets/b.basis",
        "sets/deep/c.basis",
    ]
    assert all(target.searched for target in found)
    absolute = [each.target.path for each in staged([repository / "sets"])]
    assert absolute == [repository / target.path for target in found]
    os.chdir(repository / "sets" / "deep")
    assert str(next(staged([Path("..")])).target.path) == "../a.basis"
    assert len(list(staged([Path(".")]))) == 1


ODD = [
    "two words.basis",
    "-v.basis",
    "$(touch harm).basis",
    "*.basis",
    ":(top)x.basis",
    "ü\n\t.basis",
]


@pytest.mark.parametrize("name", ODD)
def test_odd_names_are_taken_as_they_are(repository: Path, name: str) -> None:
    (repository / name).write_text(SOUND)
    (repository / "other.basis").write_text(BROKEN)
    git("add", ".")
    (found,) = staged([Path(name)])
    assert found.target.path == Path(name)
    assert found.data == SOUND.encode()
    assert not (repository / "harm").exists()


def test_contents_of_any_bytes_come_back(repository: Path) -> None:
    contents = [b"", b"\n", b"\x00\xff\r\n", b"blob missing\n" * 1000]
    paths = []
    for k, data in enumerate(contents * 60):  # more than are read at once
        path = Path(f"{k:03d}.basis")
        path.write_bytes(data + str(k).encode() * (k % 3))
        paths.append(path)
    git("-c", "core.autocrlf=false", "add", ".")
    assert [each.data for each in staged(paths)] == [path.read_bytes() for path in paths]


def test_what_is_not_staged_is_wrong_use(repository: Path, tmp_path: Path) -> None:
    (repository / "a.basis").write_text(SOUND)
    done = _audit("--staged", "a.basis")
    assert done.returncode == 2
    assert "a.basis is not staged" in done.stderr
    assert _audit("--staged", "-").returncode == 2
    (repository / "empty").mkdir()
    assert _audit("--staged", "empty").stdout == "0 files; nothing found\n"


def test_a_conflict_is_said(repository: Path) -> None:
    file = repository / "a.basis"
    file.write_text(SOUND)
    git("add", ".")
    git("commit", "-qm", "first")
    git("checkout", "-qb", "other")
    file.write_text(SOUND.replace("4.0", "5.0"))
    git("commit", "-qam", "second")
    git("checkout", "-q", "-")
    file.write_text(SOUND.replace("4.0", "6.0"))
    git("commit", "-qam", "third")
    subprocess.run(["git", "merge", "-q", "other"], capture_output=True, check=False)
    with pytest.raises(StagedError, match="in conflict"):
        list(staged([Path("a.basis")]))


def test_outside_a_repository_it_says_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("GIT_CEILING_DIRECTORIES", str(tmp_path.parent))
    (tmp_path / "a.basis").write_text(SOUND)
    with pytest.raises(StagedError, match=r"git says: .*repository"):
        list(staged([Path("a.basis")]))
    monkeypatch.setenv("PATH", str(tmp_path))
    with pytest.raises(StagedError, match="git cannot be run"):
        list(staged([Path("a.basis")]))
