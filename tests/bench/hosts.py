"""Self-consistent fields without and with removal of overlap eigenvectors, by PySCF.

PySCF itself drops eigenvectors of S below 1e-6 before the first cycle, so that its own choice has
to be replaced.  Without removal stands for two kinds of program: one that hands F and S to the
generalised eigenvalue solver (a Cholesky factor of S), one that makes X = U s**-1/2 of all
eigenvectors.  Both are run, and both once more with the molecule turned, which moves every
rounding error: where the four disagree a host's noise decides.  The run with removal is repeated
with the molecule turned as well: where these two disagree the field has several solutions (a
degenerate level that is partly filled), and the system says nothing about linear dependence.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
from builders import System
from pyscf import scf

REMOVAL = 1e-7
TOLERANCE = 1e-9  # hartree
CYCLES = 60
ELSEWHERE = 1e-4  # hartree


@dataclass
class Run:
    """How one SCF ended: cycles used, energy in hartree (NaN where the solver gave up)."""

    converged: bool
    cycles: int
    energy: float

    def failed(self, highest: float, lowest: float) -> bool:
        """Whether it did not converge, or landed outside what is to be expected (hartree)."""
        return not (self.converged and lowest <= self.energy <= highest)


@dataclass
class Truth:
    """What a system met: the runs with removal, those without, and what removal explains.

    explained: second-order estimate of the energy that the removed directions are worth, hartree;
    orbitals: number that removal leaves.
    """

    removed: Run
    removed_turned: Run
    orbitals: int
    explained: float
    runs: dict[str, Run]

    @property
    def settled(self) -> bool:
        """Whether the field with removal has one solution, so that it can serve as a reference."""
        both = self.removed.converged and self.removed_turned.converged
        return both and abs(self.removed.energy - self.removed_turned.energy) <= ELSEWHERE

    @property
    def failures(self) -> dict[str, bool]:
        # The removed directions can only lower the energy; second order may fall short by a factor.
        highest = self.removed.energy + ELSEWHERE
        lowest = self.removed.energy - ELSEWHERE - 5.0 * self.explained
        return {name: run.failed(highest, lowest) for name, run in self.runs.items()}

    @property
    def laboured(self) -> bool:
        """Whether a run converged with clearly more cycles than the one with removal."""
        most = max((run.cycles for run in self.runs.values() if run.converged), default=0)
        return most > 1.5 * self.removed.cycles + 2


def field_of(system: System, molecule: Any, eri: Any) -> Any:
    """A field of the oracle over integrals made before; tolerance and cycles as stated here."""
    field = scf.UHF(molecule) if system.spin else scf.RHF(molecule)
    field.verbose, field.conv_tol, field.max_cycle, field.chkfile = 0, TOLERANCE, CYCLES, None
    field._eri = eri
    return field


def solved(field: Any) -> Run:
    """Solve a field; one that runs away until a solver gives up has not converged."""
    cycles = 0

    def count(_: dict[str, Any]) -> None:
        nonlocal cycles
        cycles += 1

    field.callback = count
    try:
        with np.errstate(all="ignore"):
            field.kernel()
    # A field that has run away ends in numbers that the solvers or the mixing refuse.
    except (ValueError, np.linalg.LinAlgError, AttributeError):
        return Run(False, cycles, float("nan"))
    return Run(bool(field.converged), cycles, float(field.e_tot))


def general(system: System, molecule: Any, eri: Any) -> Run:
    """Without removal: F C = S C e as it stands."""
    field = field_of(system, molecule, eri)
    field.check_linear_dependency = lambda *_, **__: None
    field._eigh = lambda f, s, *_, **__: scipy.linalg.eigh(f, s)
    return solved(field)


def canonical(system: System, molecule: Any, eri: Any) -> Run:
    """Without removal: all eigenvectors of S, whatever their eigenvalues."""
    field = field_of(system, molecule, eri)
    values, vectors = scipy.linalg.eigh(field.get_ovlp())
    with np.errstate(all="ignore"):
        x = vectors / np.sqrt(values)
    field.check_linear_dependency = lambda *_, **__: x
    return solved(field)


def removed(system: System, molecule: Any, eri: Any) -> tuple[Run, int, float]:
    """With eigenvectors below 1e-7 removed; also the orbitals left, and what the others are worth.

    The worth of a removed direction f is that of second-order perturbation, the sum of
    F_fi**2 / (F_ff - e_i) over occupied spin orbitals i.
    """
    field = field_of(system, molecule, eri)
    values, vectors = scipy.linalg.eigh(field.get_ovlp())
    kept = values > REMOVAL
    x = vectors[:, kept] / np.sqrt(values[kept])
    field.check_linear_dependency = lambda *_, **__: x
    run = solved(field)
    out = vectors[:, ~kept] / np.sqrt(np.abs(values[~kept]))
    if not run.converged or not out.shape[1]:
        return run, int(kept.sum()), 0.0
    fock, orbitals = np.asarray(field.get_fock()), np.asarray(field.mo_coeff)
    energies, numbers = np.asarray(field.mo_energy), np.asarray(field.mo_occ)
    if fock.ndim == 2:
        fock, orbitals, energies, numbers = (
            fock[None],
            orbitals[None],
            energies[None],
            numbers[None],
        )
    worth = 0.0
    for f, c, e, n in zip(fock, orbitals, energies, numbers, strict=True):
        inside = out.T @ f @ out
        level, turn = np.linalg.eigh(inside)
        coupling = turn.T @ out.T @ f @ c[:, n > 0]
        gap = np.maximum(level[:, None] - e[n > 0][None, :], 0.1)
        worth += float((n[n > 0] * coupling**2 / gap).sum())
    return run, int(kept.sum()), worth


def truth_of(system: System) -> Truth:
    """Run a system through all hosts."""
    runs: dict[str, Run] = {}
    molecule = system.molecule()
    eri = molecule.intor("int2e", aosym="s8")
    reference, orbitals, explained = removed(system, molecule, eri)
    runs["general"] = general(system, molecule, eri)
    runs["canonical"] = canonical(system, molecule, eri)
    molecule = system.molecule(turned=True)
    eri = molecule.intor("int2e", aosym="s8")
    runs["general, turned"] = general(system, molecule, eri)
    runs["canonical, turned"] = canonical(system, molecule, eri)
    again = removed(system, molecule, eri)[0]
    return Truth(reference, again, orbitals, explained, runs)
