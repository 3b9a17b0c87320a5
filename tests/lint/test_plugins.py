"""Rules and layouts of other packages: used where they work, told of where they do not."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

RULES = '''
from overlapse.rules.registry import rule

@rule("tarn.heavy")
def heavy(case):
    """An element is heavier than the Tarn lab can afford."""
    for block in case.document.blocks:
        if block.atomic_number > 20:
            yield case.at_line(block.line, "note", "too heavy", element=block.symbol, remedy="none")

@rule("tarn.broken")
def broken(case):
    """Fails."""
    raise RuntimeError("planted in a rule")
'''
TAKEN = '''
from overlapse.rules.registry import rule

@rule("form.count")
def count(case):
    """Takes the place of another."""
    raise RuntimeError("must not be used")
'''
LAYOUTS = """
from overlapse.grammar.layout import Evidence, Layout, Written
from overlapse.grammar.model import BasisSet, Block, Document, Shell

def recognise(source):
    return Evidence(99, "it says so") if source.text.startswith("TARN") else None

def read(source):
    if "fail" in source.text:
        raise RuntimeError("planted in a reader")
    shell = Shell((0,), [1.0], [[1.0]])
    return Document(source, "tarn", (BasisSet((Block(1, (shell,)),)),))

def write(document):
    return Written("TARN", ())

def odd(source):
    raise RuntimeError("planted in a recogniser")

TARN = Layout("tarn", "of the Tarn lab", "TARN", "", recognise, read, write)
ODD = Layout("odd", "of the Tarn lab", "", "", odd, read, write)
STARS = Layout("stars", "of the Tarn lab", "", "", odd, read, write)
NONE = 3
"""
PROGRAM = "from overlapse.lint.cli import main; main()"


@pytest.fixture
def place(tmp_path: Path) -> Path:
    """A folder with an installed package, as an installer leaves it behind."""
    place = tmp_path / "site"
    place.mkdir()
    info = place / "tarn-1.0.dist-info"
    info.mkdir()
    (info / "METADATA").write_text("Metadata-Version: 2.1\nName: tarn\nVersion: 1.0\n")
    (place / "tarn_rules.py").write_text(RULES)
    (place / "tarn_taken.py").write_text(TAKEN)
    (place / "tarn_layouts.py").write_text(LAYOUTS)
    (place / "tarn_wrong.py").write_text("raise ValueError('planted in a module')\n")
    return place


def _entries(place: Path, text: str) -> None:
    (place / "tarn-1.0.dist-info" / "entry_points.txt").write_text(text)


def _run(place: Path, *arguments: str | Path) -> subprocess.CompletedProcess[str]:
    path = os.pathsep.join([str(place), os.environ.get("PYTHONPATH", "")])
    return subprocess.run(
        [sys.executable, "-c", PROGRAM, *map(str, arguments)],
        env={**os.environ, "PYTHONPATH": path},
        capture_output=True,
        text=True,
        check=False,
    )


def test_a_rule_of_another_package(place: Path) -> None:
    _entries(place, "[overlapse.rules]\ntarn = tarn_rules\n")
    path = place.parent / "own.basis"
    path.write_text("Sc 0\nS 2 1.0\n 1.0 1.0\n****\n")
    done = _run(place, "audit", "--report", "lines", path)
    assert ":1:1: note: tarn.heavy: Sc: too heavy" in done.stdout
    assert "form.count" in done.stdout
    assert done.returncode == 1
    assert "warning: rule 'tarn.broken' fails: RuntimeError: planted in a rule" in done.stderr
    assert "heavier than the Tarn lab" in _run(place, "rules", "tarn.heavy").stdout
    (place.parent / "overlapse.toml").write_text("severity.tarn.heavy = 'off'\n")
    assert "tarn.heavy" not in _run(place, "audit", path).stdout


def test_broken_entries_are_told_of_and_the_rest_works(place: Path) -> None:
    _entries(
        place,
        "[overlapse.rules]\nabsent = tarn_absent\ntaken = tarn_taken\ntarn = tarn_rules\n"
        "wrong = tarn_wrong\n[overlapse.layouts]\nnone = tarn_layouts:NONE\n"
        "nothing = tarn_layouts:NOTHING\nstars = tarn_layouts:STARS\n",
    )
    path = place.parent / "own.basis"
    path.write_text("Sc 0\nS 2 1.0\n 1.0 1.0\n****\n")
    done = _run(place, "audit", "--report", "lines", path)
    assert "form.count" in done.stdout and "tarn.heavy" in done.stdout
    for told in (
        "overlapse.rules 'absent' of tarn is left out: ModuleNotFoundError",
        "overlapse.rules 'wrong' of tarn is left out: ValueError: planted in a module",
        "overlapse.rules 'taken' of tarn is left out: the rule form.count is there already",
        "overlapse.layouts 'none' of tarn is left out: it is no Layout",
        "overlapse.layouts 'nothing' of tarn is left out: AttributeError",
        "overlapse.layouts 'stars' of tarn is left out: the name is taken",
    ):
        assert f"warning: {told}" in done.stderr
    assert "overlapse.rules 'tarn' of" not in done.stderr
    assert done.returncode == 1


def test_a_layout_of_another_package(place: Path) -> None:
    _entries(place, "[overlapse.layouts]\ntarn = tarn_layouts:TARN\nodd = tarn_layouts:ODD\n")
    path = place.parent / "own.basis"
    path.write_text("TARN\n")
    done = _run(place, "audit", path)
    assert done.returncode == 0, done.stdout
    assert "layout 'odd' fails to recognise: RuntimeError: planted" in done.stderr
    path.write_text("TARN fail\n")
    done = _run(place, "audit", path)
    assert done.returncode == 1
    assert "the reader of the layout 'tarn' failed here: RuntimeError: planted" in done.stdout
    assert "Traceback" not in done.stderr


def test_processes_tell_of_what_fails_in_them(place: Path) -> None:
    _entries(place, "[overlapse.rules]\ntarn = tarn_rules\n")
    folder = place.parent / "sets"
    folder.mkdir()
    for number in range(40):
        (folder / f"{number}.basis").write_text(f"Sc 0\nS 1 1.0\n {number + 1}.0 1.0\n****\n")
    done = _run(place, "audit", "--processes", "2", "--report", "lines", folder)
    assert done.stdout.count("tarn.heavy") == 40
    assert done.stderr.count("rule 'tarn.broken' fails") == 1


def test_the_library_that_reads_entries_is_not_imported_for_none() -> None:
    code = (
        "import sys\n"
        "from overlapse.lint.engine import audit_text\n"
        "from overlapse.lint.settings import Settings\n"
        "before = 'importlib.metadata' in sys.modules\n"
        "audit_text('C 0\\nS 1 1.0\\n 1.0 1.0\\n****\\n', 'x', settings=Settings())\n"
        "print(before or 'importlib.metadata' not in sys.modules)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "True"
