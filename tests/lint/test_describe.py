"""The command that says what a file contains: facts, label, exit statuses, picture."""

import io
import json
import os
import subprocess
import sys
import xml.etree.ElementTree as ElementTree
from importlib.resources import files
from pathlib import Path

import pytest

from overlapse.grammar.elements import number_of
from overlapse.grammar.reading import read, read_text
from overlapse.lint.describe import describe, write_json
from overlapse.lint.tables import write_text

PAIR = """! a set of our own
C 0
S 3 1.00
 40.0 0.2
 9.0 0.5
 3.0 0.4
SP 2 1.00
 2.0 0.3 0.5
 0.5 0.7 0.6
SP 1 1.00
 0.15 1.0 1.0
D 1 1.00
 0.7 1.0
****
N 0
S 3 1.00
 55.0 0.2
 12.0 0.5
 4.0 0.4
SP 2 1.00
 2.8 0.3 0.5
 0.7 0.7 0.6
SP 1 1.00
 0.2 1.0 1.0
****
"""
VALENCE = """basis "Na_own" SPHERICAL
Na S
 0.5 -0.2
 0.08 1.0
Na S
 0.03 1.0
Na P
 0.4 0.1
 0.05 1.0
end
ecp
Na nelec 10
Na ul
 1 30.0 -10.0
Na s
 2 8.0 6.0
 2 2.0 5.0
end
"""


def run(
    *arguments: str | Path, text: str = "", first: str = ""
) -> subprocess.CompletedProcess[str]:
    start = f"{first}from overlapse.lint.cli import main; main()"
    done = subprocess.run(
        [sys.executable, "-c", start, "describe", *map(os.fspath, arguments)],
        input=text.encode(),
        capture_output=True,
        check=False,
    )
    assert b"Traceback" not in done.stderr, done.stderr
    return subprocess.CompletedProcess(
        done.args, done.returncode, done.stdout.decode("utf-8"), done.stderr.decode("utf-8")
    )


def told(text: str, *symbols: str) -> str:
    out = io.StringIO()
    write_text(describe(read_text(text), [number_of(symbol) or 0 for symbol in symbols]), out)
    return out.getvalue()


@pytest.fixture
def pair(tmp_path: Path) -> Path:
    path = tmp_path / "pair.basis"
    path.write_text(PAIR)
    return path


def test_the_facts_as_json(pair: Path) -> None:
    done = run(pair, "--report", "json")
    assert done.returncode == 0
    found = json.loads(done.stdout)
    assert found["layout"] == "stars"
    carbon, nitrogen = found["elements"]
    assert (carbon["element"], carbon["atomic_number"], carbon["line"]) == ("C", 6, 2)
    assert carbon["notation"] == "(6s3p1d) -> [3s2p1d]"
    assert carbon["primitives"] == {"s": 6, "p": 3, "d": 1}
    assert carbon["contracted"] == {"s": 3, "p": 2, "d": 1}
    assert carbon["pattern"] == {"s": [3, 2, 1], "p": [2, 1], "d": [1]}
    assert carbon["functions"] == {"spherical": 14, "cartesian": 15, "stated": None}
    assert carbon["exponents"]["s"] == {"highest": 40.0, "lowest": 0.15}
    assert carbon["potential"] is None
    assert "3-21G" not in carbon["labels"]
    assert nitrogen["pattern"] == {"s": [3, 2, 1], "p": [2, 1]}
    assert "3-21G" in nitrogen["labels"]


def test_a_core_potential() -> None:
    description = describe(read_text(VALENCE))
    out = io.StringIO()
    write_json(description, out)
    (sodium,) = json.loads(out.getvalue())["elements"]
    assert sodium["potential"] == {
        "electrons": 10,
        "channels": [
            {"letter": "p", "local": True, "kind": "scalar", "terms": 1},
            {"letter": "s", "local": False, "kind": "scalar", "terms": 2},
        ],
    }
    assert sodium["functions"]["stated"] == "spherical"
    assert "Na                   10  p local (1), s (2)" in told(VALENCE)


def test_the_table() -> None:
    lines = told(PAIR).split("\n")
    row = next(line for line in lines if line.startswith("C "))
    assert row.split() == "C (6s3p1d) -> [3s2p1d] 14 15 s 3,2,1; p 2,1; d 1".split()
    exponents = next(line for line in lines if line.startswith("N ") and "->" not in line)
    assert exponents.split() == "N 55.00 0.2000 2.800 0.2000".split()


def test_only_some_elements_while_the_label_is_that_of_all() -> None:
    path = str(files("overlapse.lint").joinpath("demo", "fell", "heather.basis"))
    done = run(path, "--element", "n", "--element", "H")
    assert done.returncode == 0
    assert "2 elements: H, N" in done.stdout
    assert "label: 4-21G fits 7 of 7" in done.stdout


def test_what_speaks_for_and_against_a_label() -> None:
    demo = Path(str(files("overlapse.lint").joinpath("demo")))
    out = io.StringIO()
    write_text(describe(read(demo / "fell" / "tormentil.basis")), out)
    text = out.getvalue()
    assert "label: 4-21G fits 7 of 7" in text
    assert "against: the heading on line 3 says '4-31G'" in text
    assert "claimed: 4-31G fits 0 of 7" in text
    assert "against: H has s (2,1) where it promises s (3,1)" in text


def test_the_sample_in_the_readme_is_real(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(str(files("overlapse.lint").joinpath("demo")))
    out = io.StringIO()
    write_text(describe(read("fell/tormentil.basis")), out)
    assert f"```\n{out.getvalue()}```\n" in (Path(__file__).parents[2] / "README.md").read_text(
        "utf-8"
    )


def test_contents_that_fit_several_labels_say_so() -> None:
    text = told("H 0\nS 3 1.0\n 20.0 0.1\n 3.0 0.4\n 0.6 0.6\nS 1 1.0\n 0.16 1.0\n****\n")
    assert "against: these elements fit " in text
    assert "just as well" in text


def test_a_set_that_fits_no_label() -> None:
    text = told("C 0\nS 9 1.0\n" + "".join(f" {3.0**k} 0.2\n" for k in range(9)) + "****\n")
    assert "no known label fits most of these elements" in text


@pytest.mark.parametrize(
    ("arguments", "status", "message"),
    [
        (["absent.basis"], 3, "absent.basis: No such file"),
        (["{}", "--element", "Xx"], 2, "'Xx' is not the symbol of an element"),
        (["{}", "--element", "Ne"], 2, "no such element; it holds C-N"),
        (["{}", "--layout", "starry"], 2, "'starry' is not one of"),
        (["{}", "--report", "sarif"], 2, "sarif"),
        (["{}", "--out", "absent/there.txt"], 2, "No such file or directory"),
        (["{}", "--picture", "ladder.gif"], 2, "a picture's name ends in .svg, .png, .pdf"),
    ],
)
def test_wrong_use_and_missing_files(
    pair: Path, arguments: list[str], status: int, message: str
) -> None:
    done = run(*(str(pair) if word == "{}" else word for word in arguments))
    assert done.returncode == status
    assert message in done.stderr
    assert done.stdout == ""


def test_standard_input_under_a_declared_name() -> None:
    done = run("-", "--named", "sent.basis", text=PAIR)
    assert done.returncode == 0
    assert done.stdout.startswith("sent.basis  (layout stars)")


def test_text_in_which_nothing_is_found_gives_status_3() -> None:
    done = run("-", text="It was a dark and stormy night.\n")
    assert done.returncode == 3
    assert "no known layout" in done.stderr


def test_faults_of_form_are_told_and_give_status_1() -> None:
    done = run("-", text=PAIR.replace(" 9.0 0.5", " 9.O 0.5"))
    assert done.returncode == 1
    assert "1 fault of form" in done.stdout


def test_the_report_goes_to_a_file(pair: Path, tmp_path: Path) -> None:
    out = tmp_path / "told.json"
    assert run(pair, "--report", "json", "--out", out).stdout == ""
    assert len(json.loads(out.read_text("utf-8"))["elements"]) == 2


def test_hostile_labels_stay_on_their_line() -> None:
    text = told("$basis\n*\nh \x1b[31mred\n*\n 1 s\n 0.5 1.0\n*\n$end\n")
    assert "\x1b" not in text


def test_tables_of_many_elements_keep_within_100_columns() -> None:
    pyscf = pytest.importorskip("pyscf", reason="published sets are read from its wheel")
    folder = Path(pyscf.__file__).parent / "gto" / "basis"
    for name in ("ano.dat", "def2-svp.dat", "pople-basis/6-31Gs.dat"):
        out = io.StringIO()
        write_text(describe(read(folder / name)), out)
        _, *lines = out.getvalue().split("\n")  # the first line is the path
        assert max(map(len, lines)) <= 100, name
        assert len(lines) > 80


# ---- the picture


def test_a_picture_without_its_library_is_wrong_use(pair: Path, tmp_path: Path) -> None:
    blocked = "import sys; sys.modules['matplotlib'] = None; "
    done = run(pair, "--picture", tmp_path / "a.svg", first=blocked)
    assert done.returncode == 2
    assert "pip install 'overlapse[report]'" in done.stderr
    assert not (tmp_path / "a.svg").exists()
    assert run(pair, first=blocked).returncode == 0


def drawn(text: str, *symbols: str) -> str:
    pytest.importorskip("matplotlib", reason="of the extra `report`")
    from overlapse.lint.picture import picture

    numbers = [number_of(symbol) or 0 for symbol in symbols]
    return picture(describe(read_text(text, "own.basis"), numbers), "svg").decode("utf-8")


def test_the_picture_names_elements_letters_and_units() -> None:
    svg = ElementTree.fromstring(drawn(PAIR))
    words = {"".join(node.itertext()).strip() for node in svg.iter() if node.tag.endswith("text")}
    assert {"C", "N", "s", "p", "d", "exponent (bohr⁻²)", "lone primitive"} <= words
    assert any("exponents of the primitives" in word for word in words)


def test_neighbours_of_the_row_are_grey() -> None:
    assert "#a6a6a6" in drawn(PAIR, "C")
    alone = PAIR[: PAIR.index("N 0")]
    assert "#a6a6a6" not in drawn(alone)


def test_labels_are_no_formulas() -> None:
    text = "$basis\n*\nh b$\\frac{1$\n*\n 1 s\n 0.5 1.0\n*\n$end\n"
    assert "b$\\frac{1$: exponents of the primitives" in drawn(text)


def test_the_same_picture_has_the_same_bytes() -> None:
    assert drawn(PAIR) == drawn(PAIR)


def test_a_file_of_potentials_alone_has_no_picture(tmp_path: Path) -> None:
    pytest.importorskip("matplotlib", reason="of the extra `report`")
    done = run("-", "--picture", tmp_path / "a.svg", text=VALENCE[VALENCE.index("ecp") :])
    assert done.returncode == 2
    assert "no element of this file has a function" in done.stderr


@pytest.mark.parametrize("kind", ["svg", "png", "pdf"])
def test_kinds_of_pictures(pair: Path, tmp_path: Path, kind: str) -> None:
    pytest.importorskip("matplotlib", reason="of the extra `report`")
    path = tmp_path / f"ladder.{kind}"
    done = run(pair, "--picture", path)
    assert done.returncode == 0
    assert done.stdout.startswith(str(pair))
    mark = {"svg": b"<?xml", "png": b"\x89PNG", "pdf": b"%PDF"}[kind]
    assert path.read_bytes().startswith(mark)
