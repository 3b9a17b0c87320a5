"""Pruned files of a run: which is for which atoms, their names, and what is said of them."""

from pathlib import Path

import pytest

from overlapse.grammar.geometry import read_bytes
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_text
from overlapse.lint.choices import parsed_use, shelf
from overlapse.lint.pruned import PruneError
from overlapse.lint.screening import measure, tasks
from overlapse.lint.variants import Made, pruned_files, spans, told, write_files
from overlapse.rules.measured.probe import Probe
from overlapse.rules.measured.probing import Wanted

# Invented: lone functions; in a chain the loosest ones are one too many.
LOOSE = """! a chain of these goes linearly dependent
H 0
S 1 1.00
  0.5 1.0
S 1 1.00
  0.1 1.0
S 1 1.00
  0.0300 1.0
P 1 1.00
  0.8 1.0
****
He 0
S 1 1.00
  1.0 1.0
****
"""


def _chain(count: int, step: float) -> str:
    atoms = "".join(f"H 0 0 {step * k}\n" for k in range(count))
    return f"{count}\nchain\n{atoms}"


def _made(geometry: str, text: str = LOOSE, **wanted: object) -> tuple[list[Made], list[Probe]]:
    made = shelf([read_text(text, "loose.basis")])
    found, _ = tasks(made, [read_bytes(geometry.encode(), "chain.xyz")])
    asked = Wanted()._replace(**wanted)
    probes = [measure(task, made, asked) for task in found]
    return pruned_files(made, found, probes), probes


def _functions(document: Document) -> list[tuple[int, list[float]]]:
    return [(f.l, f.exponents.tolist()) for _, f in document.blocks[0].contracted]


def test_an_atom_that_loses_more_than_its_like_gets_a_variant(tmp_path: Path) -> None:
    made, (probe,) = _made(_chain(10, 0.8))
    assert probe.drop
    assert {part.atom for part in probe.drop} < set(range(1, 11))
    assert {atom for each in made for atom in each.atoms} == {part.atom for part in probe.drop}
    whole = read_text(LOOSE)
    for each in made:
        assert each.losses == ()
        left = read_text(each.data.decode())
        gone = [f for f in _functions(whole) if f not in _functions(left)]
        assert gone == [(0, [part.function.exponent]) for part in each.drops]
        assert _functions(left) == [f for f in _functions(whole) if f not in gone]
        assert b"! a chain of these" in each.data
        assert left.blocks[1].symbol == "He"
    # With the variants chosen for their atoms, what was promised is what is found.
    uses = []
    for each, path in zip(made, write_files(tmp_path, made, ["loose.basis"]), strict=True):
        assert path.name.startswith("loose-variant-")
        uses.append(f"{spans(each.atoms)}={path}")
    chosen = [(use, read_text(use.path.read_text())) for text in uses for use in parsed_use(text)]
    again = shelf([read_text(LOOSE, "loose.basis")], chosen)
    (task,), _ = tasks(again, [read_bytes(_chain(10, 0.8).encode(), "chain.xyz")])
    after = measure(task, again, Wanted())
    assert probe.after is not None
    assert after.spectrum.functions == probe.after.functions
    assert after.smallest == pytest.approx(probe.after.smallest, rel=1e-3)
    assert not after.drop


def test_what_all_atoms_lose_goes_from_the_file_itself() -> None:
    made, (probe,) = _made(_chain(10, 0.8), per_atom=False)
    assert {part.atom for part in probe.drop} == {0}
    (one,) = made
    assert one.atoms == ()
    assert [part.function for part in one.drops] == [part.function for part in probe.drop]


def test_what_goes_from_every_atom_one_by_one_goes_from_the_file(tmp_path: Path) -> None:
    twins = LOOSE.replace("S 1 1.00\n  0.0300 1.0", "S 1 1.00\n  0.1000001 1.0")
    made, (probe,) = _made(_chain(1, 1.0), twins)
    assert [part.atom for part in probe.drop] == [1]
    (one,) = made
    assert one.atoms == ()
    (path,) = write_files(tmp_path, made, [])
    assert path.name == "loose.basis"


def test_frames_of_one_molecule_share_their_variants() -> None:
    made, probes = _made(_chain(10, 0.8) + _chain(10, 0.9) + _chain(10, 2.5))
    assert not probes[2].drop
    lost = {(part.atom, part.function.shell) for probe in probes for part in probe.drop}
    held = {
        (atom, part.function.shell) for each in made for atom in each.atoms for part in each.drops
    }
    assert held == lost


def test_different_molecules_have_no_atoms_in_common() -> None:
    with pytest.raises(PruneError, match="--per-element"):
        _made(_chain(10, 0.8) + _chain(9, 0.8))
    made, _ = _made(_chain(10, 0.8) + _chain(9, 0.8), per_atom=False)
    assert [each.atoms for each in made] == [()]


def test_files_are_never_written_over_those_of_the_run(tmp_path: Path) -> None:
    original = tmp_path / "c.basis"
    original.write_text("x")

    def file(path: str, *atoms: int) -> Made:
        return Made(path, atoms, (), b"y", ())

    with pytest.raises(PruneError, match="another folder"):
        write_files(tmp_path, [file(str(original))], [str(original)])
    (tmp_path / "c-variant-1.basis").write_text("z")
    with pytest.raises(PruneError, match="another folder"):
        write_files(
            tmp_path, [file(str(original), 3)], [str(original), str(tmp_path / "c-variant-1.basis")]
        )
    with pytest.raises(PruneError, match="same name"):
        write_files(tmp_path / "new", [file("a/c.basis"), file("b/c.basis")], [])
    assert original.read_text() == "x"
    one, two = write_files(
        tmp_path / "new", [file(str(original), 3), file(str(original), 4)], [str(original)]
    )
    assert (one.name, two.name) == ("c-variant-1.basis", "c-variant-2.basis")
    assert one.read_bytes() == b"y"


def test_what_is_said_of_them(tmp_path: Path) -> None:
    made, probes = _made(_chain(10, 0.8))
    paths = write_files(tmp_path, made, [])
    lines = list(told(made, paths, probes))
    for each, path, line in zip(made, paths, lines, strict=False):
        assert line.startswith(f"written: {path} for atom")
        assert f"{spans(each.atoms)}, without H s-" in line
    assert lines[len(made)].count("--use") == len(made)
    assert "hartree" in lines[-1]
    assert list(told([], [], [])) == ["nothing to drop: no file was written"]
    (probe,) = probes
    assert probe.after is not None
    unknown = Probe(**{**vars(probe), "after": probe.after._replace(loss=None)})
    assert "not known" in list(told(made, paths, [unknown]))[-1]
    dear = Probe(**{**vars(probe), "after": probe.after._replace(loss=3e-3)})
    assert "3e-3 hartree" in list(told(made, paths, [dear]))[-1]
    assert "compare an energy" in list(told(made, paths, [dear]))[-1]


def test_atoms_as_a_choice_by_hand_takes_them() -> None:
    assert spans([3]) == "3"
    assert spans([1, 2, 3, 7, 9, 10]) == "1-3,7,9-10"
