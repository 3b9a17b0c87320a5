"""The command that compares files and folders."""

import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text
from overlapse.lint.commands import command
from overlapse.lint.relating import relate_files, relate_paths

SET = (
    "****\nC 0\nS 3 1.00\n 40.5 0.15\n 7.25 0.5\n 2.0 0.45\nS 1 1.00\n 0.3 1.0\n"
    "P 2 1.00\n 3.5 0.6\n 0.7 0.45\n****\nN 0\nS 2 1.00\n 50.1 0.2\n 9.5 0.9\n"
    "P 1 1.00\n 0.9 1.0\n****\n"
)
# Carbon with its loosest primitive taken out of the first contraction (what Davidson, Chem. Phys.
# Lett. 260, 514 (1996), does) where that primitive also stands alone.
ORIGINAL = "****\nC 0\nS 3 1.00\n 40.5 0.15\n 7.25 0.5\n 0.3 0.25\nS 1 1.00\n 0.3 1.0\n****\n"
OPTIMISED = "****\nC 0\nS 2 1.00\n 40.5 0.15\n 7.25 0.5\nS 1 1.00\n 0.3 1.0\n****\n"


def run(*arguments: object, text: str | None = None) -> tuple[int, str]:
    done = CliRunner().invoke(
        command("relate"), [str(argument) for argument in arguments], input=text
    )
    assert done.exception is None or isinstance(done.exception, SystemExit), done.exception
    return done.exit_code, done.output


def put(folder: Path, name: str, text: str) -> Path:
    path = folder / name
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text)
    return path


def recast(text: str, layout: str) -> str:
    return layouts()[layout].write(read_text(text)).text


EIGHT = "keyworded dollar at-blocks atomblocks slashes sets matrix commas".split()


@pytest.mark.parametrize("name", EIGHT)
def test_the_same_set_in_eight_layouts(tmp_path: Path, name: str) -> None:
    one, other = put(tmp_path, "a.txt", SET), put(tmp_path, "b.txt", recast(SET, name))
    status, out = run(one, other, "--report", "json")
    assert status == 0
    found = json.loads(out)
    assert [e["verdict"] for e in found["elements"]] == ["equal numbers"] * 2
    assert {pair["second"]["layout"] for pair in found["pairs"]} == {name}


@pytest.mark.parametrize("name", [*EIGHT, "schema", "deck"])
def test_one_digit_changed_is_placed_in_both_files(tmp_path: Path, name: str) -> None:
    text = recast(SET, name)
    one, other = put(tmp_path, "a.txt", SET), put(tmp_path, "b.txt", text.replace("7.25", "7.35"))
    status, out = run(one, other, "--report", "json", "--equal", "span")
    assert status == 1
    carbon, nitrogen = json.loads(out)["elements"]
    assert (carbon["verdict"], carbon["differences"]) == ("different", 1)
    assert (nitrogen["verdict"], nitrogen["first_difference"]) == ("equal numbers", None)
    first = carbon["first_difference"]
    assert first["what"] == "exponent"
    assert (first["first"]["line"], first["first"]["column"]) == (5, 2)
    at = text.index("7.25")
    assert first["second"]["line"] == text.count("\n", 0, at) + 1
    assert first["second"]["column"] == at - text.rfind("\n", 0, at)
    assert (first["first"]["spelling"], first["second"]["spelling"]) == ("7.25", "7.35")
    assert first["difference"] == pytest.approx(0.1)


def test_the_text_shows_the_place_the_spelling_and_the_difference(tmp_path: Path) -> None:
    one = put(tmp_path, "a.txt", SET)
    other = put(tmp_path, "b.txt", SET.replace("2.0 0.45", "2.0 0.54"))
    status, out = run(one, other)
    assert status == 1
    told = " ".join(out.split())
    assert "different: C" in told and "equal text: N" in told
    assert f"0.45 at {one}:6:6" in told and f"0.54 at {other}:6:6" in told
    assert "difference +0.09 (+20 %)" in told


def test_what_counts_as_equal_is_chosen(tmp_path: Path) -> None:
    one, other = put(tmp_path, "a.txt", ORIGINAL), put(tmp_path, "b.txt", OPTIMISED)
    assert run(one, other)[0] == 1
    assert run(one, other, "--equal", "rounding")[0] == 1
    assert run(one, other, "--equal", "span")[0] == 0
    fewer = put(tmp_path, "c.txt", ORIGINAL.replace("40.5", "40.5012"))
    coarse = put(tmp_path, "d.txt", ORIGINAL.replace("40.5", "40.501"))
    assert run(fewer, coarse)[0] == 1
    assert run(fewer, coarse, "--equal", "rounding")[0] == 0


def test_missing_elements_are_listed_and_differ(tmp_path: Path) -> None:
    one, other = put(tmp_path, "a.txt", SET), put(tmp_path, "b.txt", SET[: SET.index("N 0")])
    status, out = run(one, other, "--equal", "span")
    assert status == 1
    assert "only in first: N" in out


def test_faults_of_form_are_told_and_never_count_as_equal(tmp_path: Path) -> None:
    one = put(tmp_path, "a.txt", SET.replace("40.5", "4O.5"))
    status, out = run(one, one)
    assert status == 1
    assert "1 fault of form may hide something" in out


def test_unreadable_and_wrong_use(tmp_path: Path) -> None:
    one = put(tmp_path, "a.txt", SET)
    assert run(one, tmp_path / "none.txt")[0] == 3
    assert run(one, put(tmp_path, "empty.txt", ""))[0] == 3
    assert run(one, put(tmp_path, "prose.txt", "nothing of the kind\n"))[0] == 3
    assert run(one, one, "--equal", "half")[0] == 2
    assert run("-", "-")[0] == 2


def test_standard_input_may_be_one_of_the_two(tmp_path: Path) -> None:
    one = put(tmp_path, "a.txt", SET)
    status, out = run(one, "-", "--named", "sent.txt", text=SET)
    assert status == 0
    assert "sent.txt" in out


def test_folders_are_paired_by_name_label_and_content(tmp_path: Path) -> None:
    left, right = tmp_path / "left", tmp_path / "right"
    other = SET.replace("C 0", "O 0")
    put(left, "sub/own.basis", SET)
    put(right, "sub/OWN.dat", recast(SET, "keyworded"))
    put(left, "6-31Gs.txt", other)
    put(right, "6-31Gs.d", recast(other, "dollar"))
    put(left, "first-name.txt", SET.replace("C 0", "B 0"))
    put(right, "second-name.txt", recast(SET.replace("C 0", "B 0"), "matrix"))
    put(left, "lonely.txt", SET.replace("N 0", "F 0").replace("C 0", "Ne 0"))
    put(left, "notes.txt", "nothing of the kind\n")
    found = list(relate_paths(left, right))
    paired = {
        (Path(f.left.path).name, Path(f.right.path).name) for f in found if f.left and f.right
    }
    assert paired == {
        ("own.basis", "OWN.dat"), ("6-31Gs.txt", "6-31Gs.d"), ("first-name.txt", "second-name.txt"),
    }  # fmt: skip
    assert [Path(f.left.path).name for f in found if f.left and not f.right] == ["lonely.txt"]
    assert all(f.is_equal("numbers") for f in found if f.left and f.right)
    status, out = run(left, right)
    assert status == 1
    assert "lonely.txt only in the first: F-Ne" in " ".join(out.split())
    status, out = run(left, right, "--report", "json")
    assert [Path(path).name for path in json.loads(out)["only_in_first"]] == ["lonely.txt"]


def test_a_file_finds_its_namesake_in_a_folder(tmp_path: Path) -> None:
    one = put(tmp_path, "own.txt", SET)
    put(tmp_path / "reference", "own.dat", SET)
    put(tmp_path / "reference", "other.dat", ORIGINAL)
    status, out = run(one, tmp_path / "reference")
    assert status == 0
    assert "1 pair of files; 2 equal text" in out


def test_sets_of_one_file_find_their_partners(tmp_path: Path) -> None:
    first = read_text(SET + SET.replace("40.5", "44.5"))
    second = read_text(SET.replace("40.5", "44.5") + SET)
    assert len(first.sets) == len(second.sets) == 2
    relation = relate_files(first, second)
    assert {r.verdict for r in relation.elements} == {"equal text"}
