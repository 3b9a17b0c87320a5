"""Files are replaced whole, or not at all."""

import os
import random
import stat
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "bench"))

from overlapse.lint.atomic import replacing, write_bytes


def test_a_failure_leaves_the_old_content(tmp_path: Path) -> None:
    path = tmp_path / "own.basis"
    path.write_text("old")
    with pytest.raises(RuntimeError), replacing(path) as stream:
        stream.write(b"new")
        raise RuntimeError("planted")
    assert path.read_text() == "old"
    assert [p.name for p in tmp_path.iterdir()] == ["own.basis"]


@pytest.mark.skipif(os.name == "nt", reason="modes differ there")
def test_mode_and_link_are_kept(tmp_path: Path) -> None:
    path, link = tmp_path / "own.basis", tmp_path / "link"
    path.write_text("old")
    path.chmod(0o604)
    link.symlink_to(path)
    write_bytes(link, b"new")
    assert link.is_symlink()
    assert path.read_text() == "new"
    assert stat.S_IMODE(path.stat().st_mode) == 0o604


@pytest.mark.skipif(os.name == "nt", reason="modes differ there")
def test_a_new_file_has_the_usual_mode(tmp_path: Path) -> None:
    before = os.umask(0o027)
    try:
        write_bytes(tmp_path / "new", b"new")
    finally:
        os.umask(before)
    assert stat.S_IMODE((tmp_path / "new").stat().st_mode) == 0o640


@pytest.mark.skipif(not Path("/dev/null").exists(), reason="there is no null device")
def test_a_device_is_written_to_and_stays() -> None:
    write_bytes(Path("/dev/null"), b"new")
    assert not Path("/dev/null").is_file()


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
def test_kills_at_random_moments_harm_nothing(tmp_path: Path) -> None:
    from kills import keeping, mending

    dice = random.Random(20)
    tolls = []
    for name in ("whole", "writing", "results"):
        (tmp_path / name).mkdir()
    tolls.append(mending(60, dice, tmp_path / "whole", True))
    tolls.append(mending(120, dice, tmp_path / "writing", False))
    tolls.append(keeping(120, dice, tmp_path / "results"))
    for toll in tolls:
        assert not toll.harm
    assert sum(toll.caught for toll in tolls) > 0
