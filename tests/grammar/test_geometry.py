"""Geometries: XYZ and extended XYZ, units, ghosts, and what is said of broken ones."""

from pathlib import Path

import numpy as np
import pytest
from broken import MARK
from hypothesis import given, settings
from hypothesis import strategies as st

from overlapse.grammar.atomnames import Name, name_of
from overlapse.grammar.geometry import BOHR, Frame, Geometry, GeometryError, read, read_bytes

WATER = """3
water
O   0.000000   0.000000   0.117300
H   0.000000   0.757200  -0.469200
H   0.000000  -0.757200  -0.469200
"""


def _read(text: str) -> Geometry:
    return read_bytes(text.encode(), "sample.xyz")


def _angstrom(frame: Frame) -> list[list[float]]:
    return (np.array([atom.position for atom in frame.atoms]) * BOHR).round(9).tolist()


def test_bohr_radius() -> None:
    # CODATA 2022 as tabulated by SciPy; older tables differ in the tenth digit.
    constants = pytest.importorskip("scipy.constants")
    radius = constants.physical_constants["Bohr radius"][0] * 1e10
    assert pytest.approx(radius, rel=1e-9) == BOHR


def test_a_molecule() -> None:
    (frame,) = _read(WATER).frames
    assert [atom.symbol for atom in frame.atoms] == ["O", "H", "H"]
    assert _angstrom(frame)[1] == [0.0, 0.7572, -0.4692]
    assert frame.title == "water"
    assert frame.cell is None
    assert [(atom.line, atom.column) for atom in frame.atoms] == [(3, 1), (4, 1), (5, 1)]


@pytest.mark.parametrize(
    ("comment", "unit"),
    [
        ("water", "angstrom"),
        ("water, all lengths in bohr", "bohr"),
        ("water, Angstrom", "angstrom"),
        ("units=bohr", "bohr"),
        ('units="au"', "bohr"),
        ("a cluster of gold, Au", "angstrom"),
        ("the bohrium file", "angstrom"),
    ],
)
def test_the_comment_line_may_state_the_unit(comment: str, unit: str) -> None:
    geometry = _read(WATER.replace("water", comment))
    assert geometry.unit == unit
    scale = 1.0 if unit == "bohr" else 1.0 / BOHR
    assert geometry.frames[0].atoms[0].position[2] == pytest.approx(0.1173 * scale, rel=1e-12)


def test_the_option_wins_over_the_comment_and_says_so() -> None:
    text = WATER.replace("water", "water in bohr")
    geometry = read_bytes(text.encode(), "sample.xyz", unit="angstrom")
    assert geometry.unit == "angstrom"
    (fault,) = geometry.faults
    assert fault.severity == "warning"
    assert geometry.source.place(fault.span[0]).line == 2


@pytest.mark.parametrize(
    ("word", "name"),
    [
        ("H", Name(1)),
        ("cl", Name(17)),
        ("C12", Name(6)),
        ("FE_3", Name(26)),
        ("8", Name(8)),
        ("D", Name(1)),
        ("Gh(O)", Name(8, True)),
        ("@h", Name(1, True)),
        ("X-Cl", Name(17, True)),
        ("h_ghost", Name(1, True)),
        ("Zn-ghost", Name(30, True)),
        ("X", Name(0)),
        ("Qq", None),
        ("119", None),
        ("Gh(Qq)", None),
        ("", None),
    ],
)
def test_names(word: str, name: Name | None) -> None:
    assert name_of(word) == name


def test_several_frames_and_columns_of_other_things() -> None:
    second = WATER.replace("-0.469200", "-0.469200  0.1 0.2 0.3").replace("water", "later")
    frames = _read(WATER + "\n\n" + second).frames
    assert [frame.index for frame in frames] == [1, 2]
    assert frames[1].title == "later"
    assert frames[0].atoms[1].position == frames[1].atoms[1].position


def test_extended_form() -> None:
    geometry = _read(
        "2\n"
        'Lattice="4 0 0 0 5 0 1 0 6" pbc="T F T" Properties=id:I:1:species:S:1:pos:R:3:q:R:1\n'
        "1 Na 0.0 0.0 0.0  0.9\n"
        "2 Cl 2.0 2.5 3.0 -0.9\n"
    )
    (frame,) = geometry.frames
    assert not geometry.faults
    assert frame.periodic == (True, False, True)
    assert frame.cell is not None
    assert (frame.cell * BOHR).round(9).tolist() == [[4, 0, 0], [0, 5, 0], [1, 0, 6]]
    assert [atom.symbol for atom in frame.atoms] == ["Na", "Cl"]
    assert _angstrom(frame)[1] == [2.0, 2.5, 3.0]


def test_a_lattice_without_a_word_on_periodicity_repeats_everywhere() -> None:
    # So the specification of extended XYZ: pbc is T T T where there is a Lattice.
    (frame,) = _read('1\nLattice="4 0 0 0 4 0 0 0 4"\nNa 0 0 0\n').frames
    assert frame.periodic == (True, True, True)


def test_against_an_independent_reader(tmp_path: Path) -> None:
    ase = pytest.importorskip("ase.io", reason="install the extra 'ase' to run this check")
    from ase.build import bulk, molecule

    path = tmp_path / "sample.xyz"
    images = [molecule("CH3CH2OH"), bulk("NaCl", "rocksalt", a=5.64)]
    ase.write(path, images, format="extxyz")
    geometry = read(path)
    assert not geometry.faults
    for frame, image in zip(geometry.frames, images, strict=True):
        assert [atom.atomic_number for atom in frame.atoms] == image.get_atomic_numbers().tolist()
        places = np.array([atom.position for atom in frame.atoms]) * BOHR
        assert np.abs(places - image.get_positions()).max() < 1e-7
        assert (frame.cell is not None) == bool(image.get_pbc().any())
        if frame.cell is not None:
            assert np.abs(frame.cell * BOHR - image.get_cell()[:]).max() < 1e-7


def test_other_kinds_are_read_by_the_library(tmp_path: Path) -> None:
    ase = pytest.importorskip("ase.io", reason="install the extra 'ase' to run this check")
    from ase.build import bulk

    path = tmp_path / "salt.cif"
    ase.write(path, bulk("NaCl", "rocksalt", a=5.64))
    (frame,) = read(path).frames
    assert sorted(atom.symbol for atom in frame.atoms) == ["Cl", "Na"]
    assert frame.periodic == (True, True, True)


@pytest.mark.parametrize(
    ("text", "rules"),
    [
        (f"{MARK}4\nx\nO 0 0 0\nH 0 0 1\n", ["form.count"]),
        (f"1\nx\nO 0 0 0\n{MARK}H 0 0 1\n", ["form.count"]),
        (f"{MARK}2\nO 0 0 0\nH 0 0 1\n", ["form.count"]),
        (f"{MARK}0\nnothing\n", ["form.count"]),
        (f"1\nx\nO 0 {MARK}0,5 0\n", ["form.number"]),
        (f"1\nx\nO 0 {MARK}O.5 0\n", ["form.number"]),
        (f"1\nx\nO 0 {MARK}nan {MARK}inf\n", ["form.number", "form.number"]),
        (f"1\nx\nO 0 {MARK}1_0 0\n", ["form.number"]),
        (f"1\nx\nO 0 {MARK}************ 0\n", ["form.number"]),
        (f"1\nx\n{MARK}Qq 0 0 0\n", ["form.element"]),
        (f"1\nx\n{MARK}O 0 0\n", ["form.syntax"]),
        (f"2\nx\nO 0 0 0\n{MARK}\nH 0 0 1\n", ["form.syntax"]),
        (f'1\nLattice="{MARK}4 0 0 0 4"\nO 0 0 0\n', ["form.count"]),
        (f'1\nLattice="{MARK}4 0 0 0 4 0 0 0 four"\nO 0 0 0\n', ["form.number"]),
        (f'1\nLattice="{MARK}4 0 0 8 0 0 0 0 4"\nO 0 0 0\n', ["form.syntax"]),
        (f'1\nLattice="4 0 0 0 4 0 0 0 4" pbc="{MARK}yes"\nO 0 0 0\n', ["form.syntax"]),
        (f'1\npbc="{MARK}T T T"\nO 0 0 0\n', ["form.syntax"]),
        (f"1\nProperties={MARK}species:S:1\nO 0 0 0\n", ["form.syntax"]),
        (f"1\nunits={MARK}nm\nO 0 0 0\n", ["form.syntax"]),
        (f"1\nin angstrom, not in {MARK}bohr\nO 0 0 0\n", ["form.syntax"]),
        (f"{MARK}99999999999999999999\nx\nO 0 0 0\n", ["form.count"]),
    ],
)
def test_broken_geometries(text: str, rules: list[str]) -> None:
    """Each mark is where a fault must be found, and there are no others."""
    places = []
    plain = ""
    for piece in text.split(MARK)[:-1]:
        plain += piece
        places.append((plain.count("\n") + 1, len(plain) - plain.rfind("\n")))
    geometry = _read(plain + text.split(MARK)[-1])
    found = [(*geometry.source.place(fault.span[0]), fault.rule) for fault in geometry.faults]
    assert found == [(*place, rule) for place, rule in zip(places, rules, strict=True)]
    for fault in geometry.faults:
        assert fault.message and fault.message[-1] not in ".!"
        assert fault.remedy or fault.expected is not None


def test_a_frame_with_a_lost_row_is_marked_and_the_next_is_read() -> None:
    frames = _read("3\nx\nO 0 0 0\nH 0 0 1\n" + WATER).frames
    assert [frame.complete for frame in frames] == [False, True]
    assert len(frames[1].atoms) == 3


def test_a_point_without_an_element_is_left_out() -> None:
    geometry = _read("2\nx\nX 0 0 0\nH 0 0 1\n")
    assert [atom.symbol for atom in geometry.frames[0].atoms] == ["H"]
    assert [fault.severity for fault in geometry.faults] == ["note"]


@pytest.mark.parametrize("data", [b"", b"  \n", b"\x00\x01\x02", b"water\nO 0 0 0\n"])
def test_what_is_no_geometry(data: bytes, tmp_path: Path) -> None:
    path = tmp_path / "sample.xyz"
    path.write_bytes(data)
    with pytest.raises(GeometryError, match="sample"):
        read(path)


def test_line_ends_of_other_systems() -> None:
    assert _read(WATER.replace("\n", "\r\n")).frames == _read(WATER).frames


def test_a_flood_of_faults_is_cut_off() -> None:
    rows = "".join(f"Qq {k} 0 0\n" for k in range(500))
    geometry = _read(f"500\nx\n{rows}")
    assert len(geometry.faults) < 30


CELL = 'Lattice="4 0 0 0 4 0 0 0 4" pbc="T T F" Properties=species:S:1:pos:R:3 units=bohr'


@settings(deadline=None, max_examples=300)
@given(
    st.lists(
        st.tuples(
            st.integers(0, 10**6),
            st.sampled_from(
                ["", " ", "\n", "\t", '"', "=", ":", "9", "-", "e", "H", "\u2212", "\x00"]
            ),
            st.integers(0, 12),
        ),
        max_size=8,
    )
)
def test_damaged_geometries_never_raise_anything_else(cuts: list[tuple[int, str, int]]) -> None:
    """Pieces of a sound file are replaced; reading it finds faults, or says that it is none."""
    text = WATER + "\n" + WATER.replace("water", CELL)
    for at, piece, length in cuts:
        at %= len(text) + 1
        text = text[:at] + piece + text[at + length :]
    try:
        geometry = read_bytes(text.encode(), "sample.xyz")
    except GeometryError:
        return
    for fault in geometry.faults:
        assert 0 <= fault.span[0] <= len(text)
        assert fault.message
    for frame in geometry.frames:
        assert frame.atoms
        assert np.isfinite([atom.position for atom in frame.atoms]).all()
