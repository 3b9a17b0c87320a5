"""Staged content is judged among what is staged with it: seal, reference, parents, settings."""

import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
from staging import BROKEN, SOUND, git, new_repository, run

from overlapse.lint import tree
from overlapse.lint.engine import targets
from overlapse.lint.staged import Index

pytestmark = pytest.mark.skipif(shutil.which("git") is None, reason="git is not installed")

OTHER = SOUND.replace(" 0.3 1.0", " 0.31 1.0")


def _found(*arguments: str | Path) -> list[str]:
    done = run("audit", "--staged", "--report", "lines", *arguments)
    assert done.returncode in (0, 1), done.stderr
    return done.stdout.splitlines()


@pytest.fixture
def repository(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    new_repository(tmp_path, monkeypatch)
    (tmp_path / "sets").mkdir()
    (tmp_path / "sets" / "a.basis").write_text(SOUND)
    return tmp_path


def test_the_seal_that_is_staged_counts(repository: Path) -> None:
    file = repository / "sets" / "a.basis"
    assert run("seal", "--write", "sets").returncode == 0
    git("add", ".")
    file.write_text(OTHER)
    assert not _found("sets")  # the change is not staged
    git("add", "sets")
    (line,) = _found("sets/a.basis")
    assert ": drift.seal: " in line
    # Sealed anew, but the seal is not staged yet.
    assert run("seal", "--write", "sets").returncode == 0
    assert len(_found("sets")) == 1
    git("add", ".")
    assert not _found("sets")
    assert run("audit", "--report", "lines", "sets").stdout == ""


def test_the_reference_that_is_staged_counts(repository: Path) -> None:
    (repository / "overlapse.toml").write_text("reference = 'published'\n")
    published = repository / "published" / "a.basis"
    published.parent.mkdir()
    published.write_text(OTHER)
    git("add", ".")
    published.write_text(SOUND)
    (line,) = _found("sets")
    assert ": drift.reference: " in line
    git("add", ".")
    assert not _found("sets")
    # Its working file is gone, what is staged is not; then that is gone as well.
    published.unlink()
    (repository / "sets" / "a.basis").write_text(OTHER)
    git("add", "sets")
    assert len(_found("sets")) == 1
    git("rm", "-q", "--cached", "published/a.basis")
    assert not _found("sets/a.basis")


def test_a_reference_that_git_does_not_know_is_taken_from_the_disk(repository: Path) -> None:
    outside = repository.parent / f"{repository.name}-published"
    outside.mkdir()
    (outside / "a.basis").write_text(OTHER)
    (repository / "overlapse.toml").write_text(f"reference = '{outside}'\n")
    git("add", ".")
    assert len(_found("sets")) == 1


def test_a_parent_is_read_as_it_is_staged(repository: Path) -> None:
    (repository / "sets" / "a.basis").unlink()
    small, large = (repository / "sets" / f"{name}.basis" for name in ("6-31g", "6-31gs"))
    plain = "C 0\nS 2 1.00\n 40.0 0.6\n 5.0 0.5\nSP 1 1.00\n 0.3 1.0 1.0\n****\n"
    small.write_text("! 6-31G\n" + plain)
    decorated = plain.replace("****", "D 1 1.00\n 0.8 1.0\n****")
    large.write_text("! 6-31G*\n" + decorated)
    git("add", ".")
    small.write_text("! 6-31G\n" + plain.replace("40.0", "41.0"))

    def contained() -> list[str]:
        return [line for line in _found("sets") if "label.contains" in line]

    assert not contained()
    git("add", ".")
    assert len(contained()) == 1


def test_settings_and_ledger_are_those_that_are_staged(repository: Path) -> None:
    (repository / "sets" / "a.basis").write_text(BROKEN)
    settings = repository / "overlapse.toml"
    settings.write_text('severity."form.number" = "note"\n')
    git("add", ".")
    settings.write_text('severity."form.number" = "off"\n')
    (line,) = _found("sets")
    assert ": note: form.number: " in line
    settings.unlink()
    assert _found("sets") == [line]
    git("rm", "-q", "--cached", "overlapse.toml")
    assert ": error: form.number: " in _found("sets")[0]
    assert run("audit", "--write-ledger", "sets").returncode == 0
    assert not _found("sets")  # git does not know the ledger: it is taken from the disk
    git("add", ".")
    (repository / "overlapse.ledger.json").write_text("{}")
    assert not _found("sets")
    assert run("audit", "sets").returncode == 2


def test_wrong_settings_are_told_as_staged(repository: Path) -> None:
    settings = repository / "overlapse.toml"
    settings.write_text("fail-att = 'note'\n")
    git("add", ".")
    settings.write_text("fail-at = 'note'\n")
    done = run("audit", "--staged", "sets")
    assert done.returncode == 2
    assert "overlapse.toml:1:1: " in done.stderr
    assert "(as it is staged)" in done.stderr
    assert run("audit", "--staged", "--write-ledger", "sets").returncode == 2


@pytest.mark.parametrize("named", ["xyz/two.xyz", "xyz"])
def test_a_probe_measures_what_is_staged(repository: Path, named: str) -> None:
    (repository / "overlapse.toml").write_text(
        f"[[probe]]\nbasis = ['sets/*.basis']\ngeometry = '{named}'\n"
    )
    geometry = repository / "xyz" / "two.xyz"
    geometry.parent.mkdir()
    geometry.write_text("2\ninvented\nC 0 0 0\nC 0 0 1.3\n")
    crowded = SOUND.replace("P 1", "S 1 1.00\n 0.3000001 1.0\nP 1")
    (repository / "sets" / "a.basis").write_text(crowded)
    git("add", ".")
    (repository / "sets" / "a.basis").write_text(SOUND)
    if named == "xyz":
        geometry.unlink()
    else:
        geometry.write_text("no geometry\n")
    assert [line for line in _found("sets") if "overlap.molecule" in line]


def test_the_tree_is_the_index_over_the_disk(repository: Path) -> None:
    (repository / "notes").write_text("of the disk")
    (repository / "link.basis").symlink_to("sets/a.basis")
    git("add", "sets", "link.basis")
    git("commit", "-qm", "first")
    (repository / "sets" / "a.basis").write_text(OTHER)
    (repository / "sets" / "b.basis").write_text(OTHER)
    with tree.staged(Index()):
        assert tree.content("sets/a.basis") == SOUND.encode()
        assert tree.content(repository / "link.basis", 3) == b"C 0"
        assert tree.text("notes") == "of the disk"
        assert tree.is_folder("sets") and not tree.is_folder("sets/a.basis")
        assert [str(t.path) for t in targets([Path("sets")])] == ["sets/a.basis", "sets/b.basis"]
        before = tree.stamp("sets/a.basis")
    git("rm", "-q", "--cached", "sets/a.basis")
    with tree.staged(Index()):
        assert tree.stamp("sets/a.basis") is None
        with pytest.raises(FileNotFoundError, match="staged to be deleted"):
            tree.content("sets/a.basis")
        assert [str(t.path) for t in targets([Path("sets")])] == ["sets/b.basis"]
    git("add", ".")
    with tree.staged(Index()):
        assert tree.stamp("sets/a.basis") != before
    assert tree.content("sets/a.basis") == OTHER.encode()


def test_from_a_folder_inside_and_without_a_first_commit(repository: Path) -> None:
    git("add", ".")
    os.chdir(repository / "sets")
    (repository / "sets" / "a.basis").unlink()
    found = json.loads(run("audit", "--staged", "--report", "json", ".").stdout)
    assert [file["path"] for file in found["files"]] == ["a.basis"]


def test_as_a_hook_it_judges_what_each_commit_will_hold(repository: Path) -> None:
    other = repository / "sets" / "b.basis"
    other.write_text(SOUND)
    hook = repository / ".git" / "hooks" / "pre-commit"
    hook.parent.mkdir(exist_ok=True)
    program = f'"{sys.executable}" -c "from overlapse.lint.cli import main; main()"'
    hook.write_text(f"#!/bin/sh\nexec {program} audit --staged --quiet sets\n")
    hook.chmod(0o755)
    git("add", ".")
    git("commit", "-qm", "sound")
    (repository / "sets" / "a.basis").write_text(BROKEN)
    other.write_text(OTHER)
    with pytest.raises(subprocess.CalledProcessError):
        git("commit", "-qam", "both")  # from an index of its own
    git("commit", "-qm", "the sound one alone", "sets/b.basis")
    with pytest.raises(subprocess.CalledProcessError):
        git("commit", "-qm", "the broken one alone", "sets/a.basis")
