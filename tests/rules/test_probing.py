"""Measurements in real geometries: numbers, shares, what to drop, and what rules say of them."""

from dataclasses import replace

import numpy as np
import pytest
from probed import probed

from overlapse.grammar.reading import read_text
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.measured.probe import Probe
from overlapse.rules.measured.probing import Wanted
from overlapse.rules.registry import rules

# Invented: lone functions, the third s nearly the second.
TWINS = """H 0
S 1 1.00
  0.5 1.0
S 1 1.00
  0.0500 1.0
S 1 1.00
  0.0503 1.0
P 1 1.00
  0.8 1.0
****
"""
H2 = "2\nhydrogen, angstrom\nH 0 0 0\nH 0 0 0.74\n"


def _probes(text: str, geometry: str, wanted: Wanted = Wanted()) -> tuple[Probe, ...]:  # noqa: B008
    return probed(read_text(text), geometry, wanted).probes


def _found(case: Case, name: str) -> list[Finding]:
    return case.judge(rules()[name])


def test_the_table_of_szabo_and_ostlund_hydrogen() -> None:
    # A. Szabo, N. S. Ostlund, Modern Quantum Chemistry, section 3.5: S12 = 0.6593 in STO-3G at
    # 1.4 bohr, so the eigenvalues are 1 - S12 and 1 + S12.  Exponents from the same book.
    sto3g = "H 0\nS 3 1.24\n 2.227660584 0.154328967\n 0.405771156 0.535328142\n"
    sto3g += " 0.109818036 0.444634542\n****\n"
    (probe,) = _probes(sto3g, "2\nbohr\nH 0 0 0\nH 0 0 1.4\n")
    assert probe.smallest == pytest.approx(1 - 0.6593, abs=5e-5)
    assert probe.spectrum.largest == pytest.approx(1 + 0.6593, abs=5e-5)
    assert probe.kept == probe.spectrum.functions == 2
    assert probe.outlook.level == "safe"
    assert not probe.drop


def test_the_twin_is_blamed_and_dropped() -> None:
    (probe,) = _probes(TWINS, H2)
    assert probe.spectrum.functions == 12
    assert probe.smallest < 1e-6 < probe.blame[1].value
    assert probe.kept == 11
    blame = probe.blame[0]
    assert {share.function.shell for share in blame.kinds[:2]} == {"s-2", "s-3"}
    assert sum(share.weight for share in blame.kinds) == pytest.approx(1.0, abs=0.02)
    assert {share.atom for share in blame.shares} == {1, 2}
    # A function of both atoms' shares is the sum of the atoms'.
    by_atom = sum(s.weight for s in blame.shares if s.function.shell == "s-2")
    assert by_atom == pytest.approx(
        next(s.weight for s in blame.kinds if s.function.shell == "s-2"), abs=1e-9
    )


def test_what_is_dropped_is_a_shell_on_all_atoms_or_on_one() -> None:
    (whole,) = _probes(TWINS, H2, Wanted(tolerance=4e-6, per_atom=False))
    assert [(part.function.element, part.atom) for part in whole.drop] == [("H", 0)]
    assert whole.drop[0].function.shell in ("s-2", "s-3")
    assert whole.after is not None
    assert whole.after.functions == 10
    # What is left is a principal submatrix, so it cannot be worse; the choice makes it sound.
    assert whole.after.smallest > max(1e-5, whole.smallest)
    (single,) = _probes(TWINS, H2, Wanted(tolerance=4e-6))
    assert len(single.drop) == 1
    assert single.drop[0].atom in (1, 2)
    assert single.after is not None
    assert single.after.functions == 11


def test_nothing_is_dropped_above_the_tolerance() -> None:
    (probe,) = _probes(TWINS, H2, Wanted(tolerance=1e-9))
    assert probe.drop == ()
    assert probe.after is None


def test_cartesian_functions_are_compared_with_spherical_ones() -> None:
    shells = "".join(f"S 1 1.0\n {a} 1.0\n" for a in (1.0, 0.5, 0.25, 0.12, 0.06))
    shells += "".join(f"D 1 1.0\n {a} 1.0\n" for a in (0.7, 0.35, 0.17, 0.09))
    document = read_text(f"H 0\n{shells}****\n")
    (members,) = document.sets
    blocks = tuple(replace(block, functions="cartesian") for block in members.blocks)
    case = probed(replace(document, sets=(replace(members, blocks=blocks),)), H2)
    (probe,) = case.probes
    assert probe.spherical is False
    assert probe.spectrum.functions == 2 * (5 + 4 * 6)
    assert probe.counterpart is not None
    assert probe.counterpart.functions == 2 * (5 + 4 * 5)
    assert probe.counterpart.smallest > 1e-4 > 1e-6 > probe.smallest
    (finding,) = _found(case, "overlap.cartesian")
    assert finding.severity == "warning"
    assert "spherical" in finding.remedy
    assert not probed(document, H2).judge(rules()["overlap.cartesian"])


def test_a_singular_matrix_is_judged_and_not_an_exception() -> None:
    # Two ghosts on one place: functions that are exactly given twice.
    (probe,) = _probes(TWINS, "3\nangstrom\nH 0 0 0\n@H 0 0 0\nH 0 0 0.74\n")
    assert abs(probe.smallest) < 1e-13
    assert probe.outlook.level == "fails"
    case = probed(read_text(TWINS), "3\nangstrom\nH 0 0 0\n@H 0 0 0\nH 0 0 0.74\n")
    (finding,) = _found(case, "overlap.molecule")
    assert finding.severity == "error"
    assert probe.formula == "H2 and ghosts H"


def test_findings_stand_at_the_culprit() -> None:
    case = probed(read_text(TWINS), H2)
    (finding,) = _found(case, "overlap.molecule")
    assert finding.severity == "warning"
    assert finding.element == "H"
    assert (finding.shell, finding.line) in (("s-2", 4), ("s-3", 6))
    assert finding.measured == pytest.approx(case.probes[0].smallest)
    assert finding.limit == 1e-6
    assert "1 function of 12 will be removed" in finding.message


def test_the_worst_frame_of_a_geometry_speaks_for_the_others() -> None:
    frames = "".join(H2.replace("0.74", str(d)) for d in (0.9, 0.6, 0.74))
    (finding,) = _found(probed(read_text(TWINS), frames), "overlap.molecule")
    assert "frame 2" in finding.message
    assert "2 more frames" in finding.message


def test_a_count_that_changes_along_a_path_is_told_once() -> None:
    frames = "".join(H2.replace("0.74", str(d)) for d in (0.5, 0.74, 1.2, 2.0, 3.0, 5.0))
    case = probed(read_text(TWINS), frames)
    kept = [probe.kept for probe in case.probes]
    assert len(set(kept)) > 1
    (finding,) = _found(case, "overlap.edge")
    assert finding.measured == min(kept)
    assert finding.limit == max(kept)
    assert "6 frames of H2" in finding.message


def test_an_eigenvalue_near_the_threshold_is_told() -> None:
    (probe,) = _probes(TWINS, H2)
    near = probed(read_text(TWINS), H2, Wanted(threshold=2.0 * probe.smallest))
    (finding,) = _found(near, "overlap.edge")
    assert finding.measured == pytest.approx(probe.smallest)
    far = probed(read_text(TWINS), H2, Wanted(threshold=1e-4))
    assert not _found(far, "overlap.edge")


def test_a_fitting_set_has_no_outlook() -> None:
    document = read_text(TWINS.replace("0.0503", "0.0500001"))
    (members,) = document.sets
    fitting = replace(document, sets=(replace(members, role="fitting"),))
    assert _found(probed(document, H2), "overlap.outlook")
    case = probed(fitting, H2)
    assert not _found(case, "overlap.outlook")
    assert _found(case, "overlap.molecule")


def test_a_plain_audit_has_no_measurements_and_no_such_findings() -> None:
    case = Case(read_text(TWINS))
    for name in ("molecule", "lattice", "cartesian", "edge", "outlook"):
        assert not _found(case, f"overlap.{name}")


# ---- cells

CHAIN = '1\nLattice="0 0 1.5 10 0 0 0 10 0" pbc="T F F"\nH 0 0 0\n'


def test_a_chain_against_the_sum_written_out() -> None:
    # s functions of exponent a at distance R: exp(-a R^2 / 2); S(k) is the sum with phases.
    text = "H 0\nS 1 1.00\n 0.4 1.0\n****\n"
    case = probed(read_text(text), CHAIN, Wanted(mesh=(2, 1, 1)))
    (probe,) = case.probes
    assert probe.lattice is not None
    spacing = 1.5 / 0.529177210544
    images = np.arange(-60, 61)
    terms = np.exp(-0.4 * (images * spacing) ** 2 / 2)
    for point in probe.lattice.points:
        expected = float((terms * np.cos(2 * np.pi * point.k[0] * images)).sum())
        assert point.smallest == pytest.approx(expected, abs=1e-12)
    assert [point.k[0] for point in probe.lattice.points] == [0.0, 0.25]
    assert probe.smallest == pytest.approx(min(p.smallest for p in probe.lattice.points))


def test_set_and_truncated_sums_are_told_apart() -> None:
    loose = "H 0\nS 1 1.0\n 0.5 1.0\nS 1 1.0\n 0.1 1.0\nS 1 1.0\n 0.04 1.0\n****\n"
    cube = '1\nLattice="1.5 0 0 0 1.5 0 0 0 1.5"\nH 0 0 0\n'
    case = probed(read_text(loose), cube)
    first, listed = _found(case, "overlap.lattice")
    assert first.severity == "warning"
    assert "comes from the set" in first.message
    assert listed.severity == "note"
    assert listed.measured == 0.04
    assert "below 0.1" in listed.message
    (probe,) = case.probes
    assert probe.lattice is not None
    assert probe.lattice.bound < 1e-10
    assert probe.drop
    assert probe.after is not None
    assert probe.after.smallest > 1e-8
    sound = probed(read_text("H 0\nS 1 1.00\n 0.5 1.0\n****\n"), cube)
    assert not _found(sound, "overlap.lattice")
    # What a cut makes of it depends on where it is; here it is set.
    (finding,) = _found(_cut(case, -1e-7), "overlap.lattice")[:1]
    assert "make a negative eigenvalue of it" in finding.message
    (finding,) = _found(_cut(sound, -1e-3), "overlap.lattice")
    assert finding.severity == "note"
    assert "the set is sound" in finding.message
    assert finding.measured == -1e-3


def _cut(case: Case, value: float) -> Case:
    (probe,) = case.probes
    assert probe.lattice is not None
    return Case(case.document, probes=[replace(probe, lattice=replace(probe.lattice, cut=value))])


def test_an_acceptance_of_what_only_a_geometry_shows_is_not_idle_without_one() -> None:
    from overlapse.lint.engine import audit_text
    from overlapse.lint.settings import Settings

    accepted = "! overlapse: accept overlap.molecule for H because the twins are wanted\n"
    found = audit_text(accepted + TWINS, "made.basis", settings=Settings())
    assert not [f for f in found.findings if f.rule == "form.acceptance"]


def test_what_does_not_fit_is_judged_by_its_diffuse_functions(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    from overlapse.grammar.geometry import read_bytes
    from overlapse.lint.choices import shelf
    from overlapse.lint.screening import measure, tasks
    from overlapse.rules.physics import blocks

    monkeypatch.setattr(blocks, "WORKING", 2**20)  # buffers count little in a large molecule
    text = "H 0\nS 1 1.0\n 1.5 1.0\nS 1 1.0\n 0.4 1.0\nS 1 1.0\n 0.08 1.0\n****\n"
    rows = [f"H {2.0 * x:.2f} {2.0 * y:.2f} 0" for x in range(31) for y in range(30)]
    geometry = f"{len(rows)}\nlayer\n" + "\n".join(rows) + "\n"
    made = shelf([read_text(text)])
    (task,), _ = tasks(made, [read_bytes(geometry.encode(), "layer.xyz")])
    whole = measure(task, made, Wanted())
    # So little that the dense matrix of 2790 functions does not fit, nor does that of all atoms.
    bound = measure(task, made, Wanted(), 140 * 2**20)
    assert bound.spectrum.functions == whole.spectrum.functions == 2790
    assert "bounds from the 1915 most diffuse" in bound.spectrum.method
    # A part of the matrix: its smallest eigenvalue can only be larger, its counts smaller.
    assert whole.smallest <= bound.smallest * (1 + 1e-6) <= 3 * whole.smallest
    for step, count in bound.spectrum.below.items():
        assert count <= whole.spectrum.below[step]
    assert bound.spectrum.largest == pytest.approx(whole.spectrum.largest, rel=1e-4)
    assert bound.culprit == whole.culprit


@pytest.mark.parametrize(
    ("kind", "cell", "per_atom", "peak"),
    [
        ("spherical", "", True, 2.5),
        ("spherical", "", False, 2.5),
        ("cartesian", "", True, 2.5),
        # Two of the three are complex, twice as wide.
        ("cartesian", 'Lattice="41 0 0 0 41 0 0 0 60"', True, 5.0),
    ],
)
def test_no_more_memory_than_is_told_on_any_path(
    kind: str, cell: str, per_atom: bool, peak: float, monkeypatch: pytest.MonkeyPatch
) -> None:
    """From the matrix to eigenvalues, shares, what to drop and the spherical counterpart."""
    import tracemalloc

    from overlapse.rules.measured import probing
    from overlapse.rules.physics import integrals, lattice, spectrum

    monkeypatch.setattr(spectrum, "SMALL", 200)  # the ways of large matrices
    monkeypatch.setattr(spectrum, "MIDDLE", 200)
    monkeypatch.setattr(probing, "affordable", lambda *_: False)
    monkeypatch.setattr(lattice, "IMAGES", 10_000)  # buffers count little where much is done
    monkeypatch.setattr(integrals, "BATCH", 50_000)
    shells = "".join(f"S 1 1.0\n {a} 1.0\n" for a in (1.0, 0.4, 0.16, 0.06))
    shells += "".join(f"{l} 1 1.0\n {a} 1.0\n" for l in "PD" for a in (0.8, 0.2))
    document = read_text(f"H 0\n{shells}****\n")
    (members,) = document.sets
    blocks = tuple(replace(block, functions=kind) for block in members.blocks)
    document = replace(document, sets=(replace(members, blocks=blocks),))
    rows = [f"H {1.7 * x:.2f} {1.7 * y:.2f} 0" for x in range(7) for y in range(7)]
    geometry = f"{len(rows)}\n{cell or 'layer'}\n" + "\n".join(rows) + "\n"
    wanted = Wanted(tolerance=1e-4, per_atom=per_atom, mesh=(2, 1, 1), values=True)
    small = f"2\n{cell or 'layer'}\n" + "\n".join(rows[:2]) + "\n"
    probed(document, small, wanted)  # tables that stay
    tracemalloc.start()
    (probe,) = probed(document, geometry, wanted).probes
    found = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert probe.drop
    assert (probe.counterpart is None) == (kind == "spherical")
    size = probe.spectrum.functions
    assert found < peak * 8 * size**2, found / 8 / size**2
