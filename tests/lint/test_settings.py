"""Settings: found upwards from the checked file, and checked themselves."""

from pathlib import Path

import pytest

from overlapse.lint.engine import Target, audit_file
from overlapse.lint.settings import Settings, SettingsError, settings_for

TEXT = "$basis\n*\nh own\n*\n 1 s\n 0.5 1.0\n*\n$end\n"


def _file(folder: Path, settings: str = "", name: str = "overlapse.toml") -> Path:
    folder.mkdir(exist_ok=True, parents=True)
    if settings:
        (folder / name).write_text(settings)
    path = folder / "own.basis"
    path.write_text(TEXT)
    return path


def test_the_nearest_file_upwards_holds(tmp_path: Path) -> None:
    _file(tmp_path, 'fail-at = "note"')
    inner = _file(tmp_path / "a" / "b")
    assert settings_for(inner).fail_at == "note"
    nearer = _file(tmp_path / "c", '[tool.overlapse]\nfail-at = "error"', "pyproject.toml")
    assert settings_for(nearer).fail_at == "error"
    other = _file(tmp_path / "d", "[tool.other]\nx = 1", "pyproject.toml")
    assert settings_for(other).fail_at == "note"


def test_severity_and_off(tmp_path: Path) -> None:
    loud = _file(tmp_path / "loud", '[severity]\n"label.unknown" = "error"')
    result = audit_file(Target(loud, False))
    assert [finding.severity for finding in result.findings] == ["error"]
    assert result.fails
    quiet = _file(tmp_path / "quiet", '[severity]\n"label.unknown" = "off"')
    assert not audit_file(Target(quiet, False)).findings


def test_limits_reach_their_rule(tmp_path: Path) -> None:
    path = _file(tmp_path, '[limits."primitive.crowded"]\nnear-twin = 0.9')
    with pytest.raises(SettingsError, match="did you mean near_twin"):
        audit_file(Target(path, False))
    (tmp_path / "x").mkdir()
    path = _file(tmp_path / "x", '[limits."primitive.crowded"]\nnear_twin = 0.9')
    path.write_text("H 0\nS 1 1.0\n 1.0 1.0\nS 1 1.0\n 0.2 1.0\n****\n")
    assert [f.rule for f in audit_file(Target(path, False)).findings] == ["primitive.crowded"]
    assert not audit_file(Target(path, False), settings=Settings()).findings


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("fail_at = 'note'", "did you mean fail-at"),
        ("fail-at = 'sometimes'", "one of error, warning, note"),
        ("[severity]\n'contraction.nrom' = 'note'", "did you mean contraction.norm"),
        ("[severity]\n'contraction.norm' = 'loud'", "off"),
        ("[limits.'contraction.norm']\nshare = 'all'", "it is a number"),
        ("fail-at = \nx", "toml:1:11: this is no TOML"),
    ],
)
def test_a_wrong_key_or_value_is_named(tmp_path: Path, text: str, told: str) -> None:
    path = _file(tmp_path, text)
    with pytest.raises(SettingsError, match=told) as raised:
        settings_for(path)
    assert "overlapse.toml" in str(raised.value)
