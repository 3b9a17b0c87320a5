"""The house itself: imports run one way, folders hold what they should, nothing is left out."""

import ast
import re
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
FOLDERS = ("grammar", "rules", "lint")


def _imports(path: Path) -> set[str]:
    found: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text("utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module:
            found.add(node.module)
    return found


@pytest.mark.parametrize("folder", FOLDERS)
def test_imports_run_one_way(folder: str) -> None:
    above = FOLDERS[FOLDERS.index(folder) + 1 :]
    for path in (ROOT / folder).rglob("*.py"):
        for name in _imports(path):
            assert name != "overlapse", f"{path} imports the package's root"
            assert not any(name.startswith(f"overlapse.{other}") for other in above), path


@pytest.mark.parametrize("folder", FOLDERS)
def test_a_folder_is_not_importable_by_its_own_name(folder: str) -> None:
    done = subprocess.run(
        [sys.executable, "-c", f"import {folder}"], cwd=ROOT, capture_output=True, text=True
    )
    assert done.returncode == 1
    assert f"installed as overlapse.{folder}" in done.stderr


def test_the_plain_audit_needs_neither_scipy_nor_a_report_library() -> None:
    code = (
        "import sys\n"
        "from overlapse.lint.engine import audit\n"
        "from overlapse.lint.engine import audit_text\n"
        "audit_text('C 0\\nS 1 1.0\\n 1.0 1.0\\n****\\n', 'x')\n"
        "print([m for m in ('scipy', 'matplotlib', 'jinja2', 'pydantic') if m in sys.modules])\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_the_wheel_carries_grammars_data_and_demo(tmp_path: Path) -> None:
    subprocess.run(
        [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", tmp_path, ROOT],
        check=True,
        capture_output=True,
    )
    (wheel,) = tmp_path.glob("*.whl")
    names = set(zipfile.ZipFile(wheel).namelist())
    for folder in FOLDERS:
        for path in (ROOT / folder).rglob("*"):
            if path.is_file() and "__pycache__" not in path.parts:
                assert f"overlapse/{path.relative_to(ROOT).as_posix()}" in names, path
    assert {"overlapse/__init__.py", "overlapse/py.typed"} <= names
    assert not {name.split("/")[0] for name in names} & {"lint", "grammar", "rules", "tests"}


def test_the_public_face() -> None:
    import overlapse

    for name in overlapse.__all__:
        assert getattr(overlapse, name) is not None
    with pytest.raises(AttributeError):
        overlapse.nothing  # noqa: B018


def test_the_tables_of_the_readme_are_fresh() -> None:
    sys.path.insert(0, str(ROOT / "tests" / "bench"))
    from tables import README, rewritten

    text = README.read_text("utf-8")
    assert rewritten(text) == text, "run python tests/bench/tables.py"


def test_every_piece_is_in_the_table_of_its_folder() -> None:
    folder = ROOT / "grammar" / "pieces"
    told = set(re.findall(r"\w+", (folder / "__init__.py").read_text()))
    for path in folder.glob("*.py"):
        assert path.stem == "__init__" or path.stem in told, path.stem
