"""What a settings file may say for some paths and elements, and where its mistakes are shown."""

import json
import re
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from overlapse.lint.cli import cli, main
from overlapse.lint.engine import Target, audit_file
from overlapse.lint.patterns import matches
from overlapse.lint.settings import SettingsError, settings_for
from overlapse.lint.settingsfile import read
from overlapse.lint.tomlplaces import places

TEXT = "H 0\nS 1 1.0\n 1.0 1.0\nS 1 1.0\n 0.2 1.0\n****\nSc 0\nS 1 1.0\n 1.0 1.0\n****\n"


def _file(folder: Path, settings: str, name: str = "own.basis", text: str = TEXT) -> Path:
    (folder / "overlapse.toml").write_bytes(settings.encode("utf-8", "surrogateescape"))
    path = folder / name
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text)
    return path


def _found(path: Path) -> list[tuple[str, str, str | None]]:
    return [(f.rule, f.severity, f.element) for f in audit_file(Target(path, False)).findings]


def test_places_of_keys() -> None:
    text = (
        "a.b = 1 # c\n"
        "[t]\r\n"
        "'x y' = [1,\n  {k = 2}]\n"
        '[[w."q.r"]]\nd = """\nx""" \n[[w."q.r"]]\n  e = 1979-05-27T07:32:00Z\n'
    )
    found = {key: (*where.key, *where.value) for key, where in places(text).items()}
    assert found["a.b"] == (1, 1, 1, 7)
    assert found["t.x y"] == (3, 1, 3, 9)
    assert found["t.x y.1.k"] == (4, 4, 4, 8)
    assert found["w.q.r.0.d"] == (6, 1, 6, 5)
    assert found["w.q.r.1.e"] == (9, 3, 9, 7)
    assert places("= nonsense") == {}


@pytest.mark.parametrize(
    ("path", "pattern", "fits"),
    [
        ("a/b/c.basis", "*.basis", True),
        ("a/b/c.basis", "c.*", True),
        ("a/b/c.basis", "a/*.basis", False),
        ("a/b/c.basis", "a/**/*.basis", True),
        ("a/c.basis", "a/**/*.basis", True),
        ("a/b/c.basis", "a/", True),
        ("ab/c.basis", "a/", False),
        ("a/b/c.basis", "./a/b/?.basis", True),
        ("c.basis", "[c].basis", False),
        ("b/a/x", "a/", False),
        ("b/a/x", "**/a/", True),
    ],
)
def test_patterns_of_paths(path: str, pattern: str, fits: bool) -> None:
    assert matches(path, pattern) is fits


def test_choices_for_some_paths(tmp_path: Path) -> None:
    settings = (
        "fail-at = 'error'\n[severity]\nshell.core = 'off'\n"
        "[[where]]\npaths = 'old/'\nfail-at = 'note'\nlabel = '6-31G'\nlayout = 'stars'\n"
        "severity.shell.core = 'note'\n"
    )
    new = _file(tmp_path, settings, "new/own.basis")
    old = _file(tmp_path, settings, "old/deep/own.basis")
    assert settings_for(new).fail_at == "error"
    assert settings_for(old).fail_at == "note"
    assert "shell.core" not in {rule for rule, _, _ in _found(new)}
    assert ("shell.core", "note", "Sc") in _found(old)
    claimed = audit_file(Target(old, False))
    assert claimed.label == "6-31G"
    assert claimed.fails


def test_choices_for_some_elements(tmp_path: Path) -> None:
    plain = _found(_file(tmp_path, ""))
    assert ("shell.core", "error", "Sc") in plain
    chosen = _found(
        _file(tmp_path, "[[where]]\nelements = ['Sc-Zn', 'Li']\nseverity.shell.core = 'note'\n")
    )
    assert ("shell.core", "note", "Sc") in chosen
    assert len(chosen) == len(plain)


def test_limits_for_some_elements(tmp_path: Path) -> None:
    text = "H 0\nS 1 1.0\n 1.0 1.0\nS 1 1.0\n 0.2 1.0\n****\n"
    text += text.replace("H", "He")
    settings = "[[where]]\nelements = 'He'\nlimits.primitive.crowded.near_twin = 0.9\n"
    found = _found(_file(tmp_path, settings, text=text))
    assert [element for rule, _, element in found if rule == "primitive.crowded"] == ["He"]


def test_probes_reference_seal_and_ledger(tmp_path: Path) -> None:
    path = _file(
        tmp_path,
        "reference = 'ref'\nseal = 'our.seal'\nledger = 'known.json'\n"
        "[[probe]]\nbasis = ['*.basis']\ngeometry = 'water.xyz'\nremoval-threshold = 1e-6\n"
        "cartesian = true\nmesh = [2, 2, 1]\n"
        "[[probe]]\nbasis = ['other/*']\ngeometry = 'else.xyz'\n",
    )
    found = settings_for(path)
    assert found.reference == tmp_path / "ref"
    assert found.seal == tmp_path / "our.seal"
    assert found.ledger == tmp_path / "known.json"
    (probe,) = found.probes
    assert probe.geometry == tmp_path / "water.xyz"
    assert (probe.removal_threshold, probe.cartesian, probe.mesh) == (1e-6, True, (2, 2, 1))
    assert len(read(tmp_path / "overlapse.toml", ()).probes_of()) == 2


WRONG = [
    ("x = 1\nfail_at = 'error'", "2:1: no key is called 'fail_at'; did you mean fail-at?"),
    ("severity.contraction.nrom = 'off'", "1:1: no rule is called 'contraction.nrom'; did you"),
    ("[severity]\n'label.unknown' = 'of'", "2:19: severity.label.unknown = 'of': it is one of"),
    (
        "[limits.'primitive.crowded']\nnear_twin = 1\nneartwin = 2",
        "3:1: no limit of primitive.crowded is called 'neartwin'; did you mean near_twin?",
    ),
    ("limits.primitive.crowded.near_twin = true", "1:38: limits.primitive.crowded.near_twin"),
    ("limits.primitive.crowded.near_twin = nan", "1:38: limits.primitive.crowded.near_twin"),
    ("[[where]]\npath = 'x'\nelements = 'C'", "2:1: no key is called 'path'; did you mean paths?"),
    ("[[where]]\nlabel = 'x'", "1:3: it says neither paths nor elements"),
    ("[[where]]\nelements = 'C'\nlabel = 'x'", "1:3: fail-at, label and layout are for whole"),
    ("[[where]]\nelements = ['C', 'Zn-Sc']", "2:18: where.0.elements.1 = 'Zn-Sc': 'Zn-Sc' runs"),
    ("layout = 'starz'", "1:10: layout = 'starz': no layout is called 'starz'; did you mean stars"),
    ("[[accept]]\nrules = 'form.count'\npaths = 'x'", "1:3: 'because' is missing here"),
    ("[[accept]]\nrules = []\npaths = 'x'\nbecause = 'y'", "2:9: accept.0.rules = []: it must"),
    ("[[probe]]\nbasis = 'x'\ngeometry = 'y'\nmesh = [0, 1, 1]", "4:9: probe.0.mesh.0 = 0: it"),
    ("[[probe]]\nbasis = 'x'\ngeometry = ''", "3:12: probe.0.geometry = '': it must not be empty"),
    ("reference = 3", "1:13: reference = 3: it should be a text, in quotes"),
    ("reference = true", "1:13: reference = true: it should be a text, in quotes"),
    ("severity = 'off'", "1:12: severity = 'off': it should be a table"),
    ("[accept]\nrules = 'x'", "1:2: accept = a table: write [[accept]] above it, in two brackets"),
    ("[[accept]]\nrules='form.count'\npaths='x'\nbecause=' '", "4:9: accept.0.because = ' ': it"),
    ("x = [1\n y", "2:2: this is no TOML: "),
    ("a = 1\nfail-at = [1", "2:1: this is no TOML: "),
    ("a = 1\n# caf\udce9", "2:1: this is no text in UTF-8"),
    ("severity = 'off'", "1:12: severity = 'off'"),
]


@pytest.mark.parametrize(("text", "told"), WRONG)
def test_a_mistake_is_told_with_its_place(tmp_path: Path, text: str, told: str) -> None:
    path = _file(tmp_path, text)
    with pytest.raises(SettingsError) as raised:
        settings_for(path)
    assert f"{tmp_path / 'overlapse.toml'}:{told}" in str(raised.value)


def test_a_mark_of_the_encoding_and_other_line_ends_do_no_harm(tmp_path: Path) -> None:
    path = _file(tmp_path, "\ufefffail-at = 'error'\r\n[severity]\r\nlabel.unknown = 'off'\r\n")
    assert settings_for(path).fail_at == "error"
    path = _file(tmp_path, "\ufefffail-at = 'error'\r\n[severty]\r\n")
    with pytest.raises(SettingsError, match="2:2: no key is called 'severty'"):
        settings_for(path)


def test_all_mistakes_are_told_in_the_order_of_the_file(tmp_path: Path) -> None:
    (tmp_path / "pyproject.toml").write_text(
        "[project]\nname = 'x'\n[tool.overlapse]\nlabel = 1\nsea = ''\nfail-at = 'no'\n"
    )
    with pytest.raises(SettingsError) as raised:
        settings_for(tmp_path / "own.basis")
    lines = str(raised.value).split("\n")
    assert [re.sub(r".*pyproject.toml:", "", line)[:3] for line in lines] == ["4:9", "5:1", "6:1"]


def test_a_wrong_settings_file_gives_status_2(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    path = _file(tmp_path, "fail_at = 1")
    monkeypatch.setattr("sys.argv", ["overlapse", "audit", str(path)])
    with pytest.raises(SystemExit) as stopped:
        main()
    assert stopped.value.code == 2
    assert "overlapse.toml:1:1: no key is called 'fail_at'" in capsys.readouterr().err


def _settings(*arguments: str) -> Result:
    return CliRunner().invoke(cli, ["settings", *arguments], catch_exceptions=False)


def test_the_command_prints_values_and_where_they_came_from(tmp_path: Path) -> None:
    path = _file(
        tmp_path,
        "\nfail-at = 'error'\n[severity]\nlabel.unknown = 'off'\n"
        "[[where]]\npaths = '*.basis'\nfail-at = 'note'\n"
        "[[where]]\npaths = 'else'\nlabel = 'x'\n"
        "[[accept]]\nrules = 'form.count'\npaths = '*'\nelements = 'C'\nbecause = 'so'\n",
    )
    lines = [re.split(r"  +", line) for line in _settings(str(path)).stdout.strip().split("\n")]
    found = {line[0]: line[1:] for line in lines}
    origin = str(tmp_path / "overlapse.toml")
    assert found["fail-at"] == ["note", f"{origin}:7"]
    assert found["severity.label.unknown"] == ["off", f"{origin}:4"]
    assert found["accept for C"] == ["form.count because so", f"{origin}:11"]
    assert found["label"] == ["not set", "default"]
    assert found["limits.contraction.norm.share"] == ["0.9", "default"]
    changed = _settings("--changed", "--report", "json", str(path)).stdout
    assert [one["name"] for one in json.loads(changed)["settings"]] == [
        "fail-at",
        "accept",
        "severity.label.unknown",
    ]


def test_what_holds_by_its_name_is_printed_too(tmp_path: Path) -> None:
    path = _file(tmp_path, "[[where]]\nelements = ['C-F', 'H']\nseverity.shell.core = 'note'\n")
    for name in ("overlapse.seal.json", "overlapse.ledger.json"):
        (tmp_path / name).write_text("{}")
    lines = [
        re.split(r"  +", line) for line in _settings("--changed", str(path)).stdout.split("\n")
    ]
    found = {line[0]: line[1:] for line in lines}
    assert found["seal"] == [str(tmp_path / "overlapse.seal.json"), "the nearest above"]
    assert found["ledger"] == [str(tmp_path / "overlapse.ledger.json"), "the nearest above"]
    assert found["severity.shell.core for H, C-F"] == ["note", f"{tmp_path}/overlapse.toml:3"]
