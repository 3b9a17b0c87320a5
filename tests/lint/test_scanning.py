"""Many frames on several processes: number of them, order, interrupts."""

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from overlapse.grammar.geometry import read_bytes
from overlapse.grammar.reading import read_text
from overlapse.lint import memory
from overlapse.lint.choices import ChoiceError, parsed_use, shelf
from overlapse.lint.scanning import measure_all, workers
from overlapse.lint.screening import Task, tasks
from overlapse.rules.measured.probing import Wanted

BASIS = "H 0\nS 1 1.0\n 0.5 1.0\nS 1 1.0\n 0.05 1.0\n****\n"
FRAMES = "".join(f"2\nframe {k}\nH 0 0 0\nH 0 0 {0.7 + 0.1 * k}\n" for k in range(7))


def _tasks() -> list[Task]:
    found, audits = tasks(shelf([read_text(BASIS)]), [read_bytes(FRAMES.encode(), "f.xyz")])
    assert not audits
    return found


def test_results_come_in_the_order_of_the_frames() -> None:
    made = shelf([read_text(BASIS)])
    told: list[int] = []
    one = measure_all(_tasks(), made, Wanted(), jobs=1, done=told.append)
    two = measure_all(_tasks(), made, Wanted(), jobs=2)
    assert [probe.title for probe in one] == [f"frame {k}" for k in range(7)]
    assert [(p.frame, p.smallest) for p in two] == [
        (p.frame, pytest.approx(p.smallest, rel=1e-9)) for p in one
    ]
    assert told == [4] * 7


def test_environment_is_as_before(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("OMP_NUM_THREADS", "3")
    monkeypatch.delenv("MKL_NUM_THREADS", raising=False)
    measure_all(_tasks()[:2], shelf([read_text(BASIS)]), Wanted(), jobs=2)
    assert os.environ["OMP_NUM_THREADS"] == "3"
    assert "MKL_NUM_THREADS" not in os.environ


def test_processes_are_as_many_as_are_worth_it_and_have_room() -> None:
    task = _tasks()[0]
    assert workers([task] * 5, None, None) == 1  # done before a second process is up
    heavy = [task._replace(functions=3000)] * 5
    assert workers(heavy, 3, None) == 3
    assert workers(heavy, 9, None) == 5
    assert workers(heavy, 4, 2 * memory.needed(3000, wide=2)) == 2
    assert workers(heavy, 4, 1) == 1


@pytest.mark.skipif(sys.platform == "win32", reason="there, interrupts are sent in another way")
def test_an_interrupt_ends_it_at_once_and_without_a_traceback(tmp_path: Path) -> None:
    (tmp_path / "h.basis").write_text(BASIS)
    atoms = "".join(f"H {x} {y} {z}\n" for x in range(9) for y in range(9) for z in range(9))
    (tmp_path / "large.xyz").write_text(f"729\nlarge\n{atoms}" * 40)
    command = [sys.executable, "-c", "from overlapse.lint.cli import main; main()", "screen"]
    arguments = ["h.basis", "--on", "large.xyz", "--jobs", "2"]
    process = subprocess.Popen(
        [*command, *arguments], cwd=tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    time.sleep(6.0)
    assert process.poll() is None
    process.send_signal(signal.SIGINT)
    _, told = process.communicate(timeout=60)
    assert process.returncode not in (0, 70)
    assert b"Traceback" not in told, told


def test_sizes() -> None:
    assert memory.parsed_size("800M") == 800 * 2**20
    assert memory.parsed_size("1.5 GB") == 1.5 * 2**30
    assert memory.parsed_size("17") == 17
    for wrong in ("much", "-1G", "", "G", "1e9"):
        with pytest.raises(ValueError, match="no size"):
            memory.parsed_size(wrong)
    assert memory.told(999) == "999 bytes"
    assert memory.told(3.4 * 2**30) == "3.4 GB"
    free = memory.allowed()
    assert free is None or free > 2**20
    # The peak is 2.5 times the dense matrix of doubles.
    assert memory.needed(1000) == 20_000_000


def test_uses() -> None:
    (by_element,) = parsed_use("c=x/y=z.basis")
    assert by_element.element == 6
    assert by_element.path == Path("x/y=z.basis")
    first, second = parsed_use("1-4,7=a.basis")
    assert [n for n in range(1, 9) if n in first.atoms or n in second.atoms] == [1, 2, 3, 4, 7]
    for wrong in ("C", "=a", "C=", "4-1=a", "0=a", "Xq=a"):
        with pytest.raises(ChoiceError):
            parsed_use(wrong)


TWO = """basis "C_cc-pVDZ" SPHERICAL
C S
 2.0 1.0
end
basis "C_6-31G" CARTESIAN
C S
 1.0 1.0
C D
 1.0 1.0
end
"""


def test_a_set_of_several_is_taken_by_its_label_or_the_first_that_covers() -> None:
    document = read_text(TWO + 'basis "H_6-31G" CARTESIAN\nH S\n 1.0 1.0\nend\n')
    (carbon,) = read_bytes(b"1\nx\nC 0 0 0\n", "c.xyz").frames
    sites, lacking = shelf([document]).sites(carbon)
    assert not lacking
    wanted, _ = shelf([document], wanted="6-31g").sites(carbon)
    assert len(wanted[0].block.shells) == 2
    assert wanted[0].spherical is False
    with pytest.raises(ChoiceError, match="no set is called"):
        shelf([document], wanted="def2-SVP")
    assert sites[0].atom == carbon.atoms[0]
    (methylidyne,) = read_bytes(b"2\nx\nC 0 0 0\nH 0 0 1.1\n", "ch.xyz").frames
    both, lacking = shelf([document]).sites(methylidyne)
    assert not lacking
    assert [len(site.block.shells) for site in both] == [2, 1]  # of the set that has both
