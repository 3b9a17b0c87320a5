"""The command ``screen``: reports, the JSON contract, choices, scans, refusals."""

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

# Invented: lone functions, the third s of hydrogen nearly the second.
BASIS = """H 0
S 1 1.00
  0.5 1.0
S 1 1.00
  0.0500 1.0
S 1 1.00
  0.0502 1.0
****
O 0
S 1 1.00
  20.0 1.0
S 1 1.00
  1.0 1.0
P 1 1.00
  0.6 1.0
****
"""
SOUND = BASIS.replace("S 1 1.00\n  0.0502 1.0\n", "")
WATER = """3
water, angstrom
O   0.000000   0.000000   0.117300
H   0.000000   0.757200  -0.469200
H   0.000000  -0.757200  -0.469200
"""


def run(
    *arguments: str | Path, cwd: Path | None = None, text: str = ""
) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-c", "from overlapse.lint.cli import main; main()", "screen"]
    done = subprocess.run(
        [*command, *map(os.fspath, arguments)],
        capture_output=True,
        check=False,
        cwd=cwd,
        text=True,
        input=text,
    )
    assert "Traceback" not in done.stderr, done.stderr
    return done


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "twins.basis").write_text(BASIS)
    (tmp_path / "sound.basis").write_text(SOUND)
    (tmp_path / "water.xyz").write_text(WATER)
    (tmp_path / "scan").mkdir()
    for k, far in enumerate((0.6, 0.9, 0.75, 2.0, 1.2)):
        text = WATER.replace("0.757200", f"{far:.6f}")
        (tmp_path / "scan" / f"{k}.xyz").write_text(text)
    return tmp_path


def _screens(*arguments: str | Path) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = json.loads(run(*arguments, "--report", "json").stdout)["screens"]
    return found


def test_sound_functions_give_status_0(folder: Path) -> None:
    done = run(folder / "sound.basis", "--on", folder / "water.xyz")
    assert done.returncode == 0, done.stdout
    assert "H2O, 9 spherical functions" in done.stdout
    assert "nothing found" in done.stdout
    assert "\x1b" not in done.stdout


def test_twins_give_status_1_and_the_line(folder: Path) -> None:
    done = run(folder / "twins.basis", "--on", folder / "water.xyz", "--report", "lines")
    assert done.returncode == 1
    rules = {line.split(": ")[2] for line in done.stdout.splitlines()}
    assert "overlap.molecule" in rules
    for line in done.stdout.splitlines():
        assert line.startswith((f"{folder / 'twins.basis'}:4:", f"{folder / 'twins.basis'}:6:"))


def test_the_contract_of_the_object(folder: Path) -> None:
    (screen,) = _screens(folder / "twins.basis", "--on", folder / "water.xyz", "--prune", "1e-5")
    assert screen["geometry"] == str(folder / "water.xyz")
    assert screen["frame"] == 1
    assert screen["functions"] == 11
    assert screen["spherical"] is True
    assert 0 < screen["smallest"] < 1e-6 < 1 < screen["largest"]
    assert screen["condition"] == pytest.approx(screen["largest"] / screen["smallest"])
    assert screen["outlook"] in ("safe", "strained", "fails")
    assert list(screen["below"]) == ["1e-4", "1e-5", "1e-6", "1e-7", "1e-8"]
    counts = list(screen["below"].values())
    assert counts == sorted(counts, reverse=True)
    assert screen["removal"]["orbitals"] == 11 - screen["below"]["1e-6"]
    assert [dropped["atom"] for dropped in screen["drop"]] in ([2, 3], [3, 2])
    for dropped in screen["drop"]:
        assert dropped["element"] == "H"
        assert dropped["shell"] in ("s-2", "s-3")
        assert dropped["exponent"] in (0.05, 0.0502)
    assert screen["after"]["functions"] == 9
    assert screen["after"]["smallest"] > 1e-6
    assert screen["after"]["condition"] < screen["condition"]
    for small in screen["blame"]:
        assert small["eigenvalue"] < 1e-4
        assert sum(share["share"] for share in small["shares"]) <= 1 + 1e-9
        for share in small["shares"]:
            assert share["atom"] in (1, 2, 3)
            assert {"element", "shell", "exponent"} <= set(share)
    for finding in screen["findings"]:
        assert finding["rule"].startswith("overlap.")
        assert finding["path"] == str(folder / "twins.basis")
        assert finding["line"] in (4, 6)


def test_what_goes_for_all_atoms_of_an_element(folder: Path) -> None:
    words = (folder / "twins.basis", "--on", folder / "water.xyz", "--prune", "1e-5")
    (screen,) = _screens(*words, "--per-element")
    (dropped,) = screen["drop"]
    assert (dropped["element"], dropped["atom"]) == ("H", None)
    assert screen["after"]["functions"] == 9


def test_sarif_carries_the_findings(folder: Path) -> None:
    done = run(folder / "twins.basis", "--on", folder / "water.xyz", "--report", "sarif")
    (sarif,) = json.loads(done.stdout)["runs"]
    result = next(r for r in sarif["results"] if r["ruleId"] == "overlap.molecule")
    assert result["properties"]["element"] == "H"
    assert result["locations"][0]["physicalLocation"]["region"]["startLine"] in (4, 6)


def test_missing_elements_are_a_finding_in_the_geometry(folder: Path) -> None:
    (folder / "odd.xyz").write_text(WATER.replace("\nO ", "\nS ") + WATER)
    done = run(
        folder / "sound.basis", "--on", folder / "odd.xyz", folder / "water.xyz", "--report", "json"
    )
    assert done.returncode == 1
    found = json.loads(done.stdout)
    # The other frames are measured all the same.
    assert [(Path(s["geometry"]).name, s["frame"]) for s in found["screens"]] == [
        ("odd.xyz", 2),
        ("water.xyz", 1),
    ]
    (finding,) = [f for file in found["files"] for f in file["findings"]]
    assert finding["path"] == str(folder / "odd.xyz")
    assert (finding["line"], finding["column"]) == (3, 1)
    assert finding["severity"] == "error"
    assert "no functions for S" in finding["message"]
    assert "--use S=FILE" in finding["remedy"]


def test_choices_by_hand(folder: Path) -> None:
    twins, sound, water = (folder / n for n in ("twins.basis", "sound.basis", "water.xyz"))
    assert _screens(sound, "--on", water)[0]["functions"] == 9
    assert _screens(sound, "--on", water, "--use", f"H={twins}")[0]["functions"] == 11
    (mixed,) = _screens(sound, "--on", water, "--use", f"3={twins}")
    assert mixed["functions"] == 10
    assert mixed["files"] == [str(sound), str(twins)]
    (alone,) = _screens("--use", f"1-3={sound}", "--on", water)
    assert alone["functions"] == 9
    # The later choice wins.
    both = _screens(sound, "--on", water, "--use", f"H={twins}", "--use", f"2={sound}")
    assert both[0]["functions"] == 10


def test_ghosts_have_functions(folder: Path) -> None:
    (folder / "ghost.xyz").write_text(WATER.replace("\nO ", "\n@O"))
    (screen,) = _screens(folder / "sound.basis", "--on", folder / "ghost.xyz")
    assert screen["functions"] == 9
    assert screen["formula"] == "H2 and ghosts O"


def test_units(folder: Path) -> None:
    water = folder / "water.xyz"
    (angstrom,) = _screens(folder / "sound.basis", "--on", water)
    (bohr,) = _screens(folder / "sound.basis", "--on", water, "--unit", "bohr")
    assert bohr["smallest"] < angstrom["smallest"]


@pytest.mark.parametrize(
    ("unit", "factor", "severity"),
    [("bohr", 1.0, "warning"), ("angstrom", 1.8897, "note"), ("angstrom", 1.0, None)],
)
def test_a_wrong_unit_is_suspected(
    folder: Path, unit: str, factor: float, severity: str | None
) -> None:
    rows = [line.split() for line in WATER.splitlines()[2:]]
    text = "".join(f"{s} {' '.join(str(factor * float(x)) for x in r)}\n" for s, *r in rows)
    (folder / "scaled.xyz").write_text(f"3\nx\n{text}" * 2)
    arguments = [folder / "sound.basis", "--on", folder / "scaled.xyz", "--unit", unit]
    found = json.loads(run(*arguments, "--report", "json").stdout)["files"]
    findings = [f for file in found for f in file["findings"] if "unit" in f["message"]]
    assert [f["severity"] for f in findings] == ([severity] if severity else [])
    for finding in findings:
        assert finding["path"] == str(folder / "scaled.xyz")
        assert finding["line"] in (3, 4, 5)
        assert "suspect" in finding["message"]


def test_two_nuclei_in_one_place_are_an_error(folder: Path) -> None:
    (folder / "twice.xyz").write_text(WATER.replace("3\n", "4\n") + "H 0 0.7572 -0.4692\n")
    done = run(folder / "sound.basis", "--on", folder / "twice.xyz", "--report", "lines")
    assert done.returncode == 1
    assert (
        f"{folder / 'twice.xyz'}:6:1: error: overlap.molecule: H: H 4 stands where" in done.stdout
    )


def test_a_folder_is_a_scan_whose_order_does_not_depend_on_the_processes(folder: Path) -> None:
    one = run(folder / "twins.basis", "--on", folder / "scan", "--report", "json", "--jobs", "1")
    two = run(folder / "twins.basis", "--on", folder / "scan", "--report", "json", "--jobs", "2")
    first, second = json.loads(one.stdout), json.loads(two.stdout)
    assert [Path(s["geometry"]).name for s in first["screens"]] == [f"{k}.xyz" for k in range(5)]
    for a, b in zip(first["screens"], second["screens"], strict=True):
        assert (a["geometry"], a["functions"], a["below"]) == (
            b["geometry"], b["functions"], b["below"],
        )  # fmt: skip
        assert a["smallest"] == pytest.approx(b["smallest"], rel=1e-6)
    kept = {s["removal"]["orbitals"] for s in first["screens"]}
    findings = [f for file in first["files"] for f in file["findings"]]
    assert (len(kept) > 1) == any("frames of H2O" in f["message"] for f in findings)
    text = run(folder / "twins.basis", "--on", folder / "scan").stdout
    assert text.count(".xyz") >= 5
    assert "The frame with the smallest eigenvalue" in text


def test_pruned_files_are_written_and_sound(folder: Path) -> None:
    arguments = [folder / "twins.basis", "--on", folder / "water.xyz", "--prune", "1e-5"]
    done = run(*arguments, "--write", folder / "pruned")
    assert done.returncode == 1
    written = folder / "pruned" / "twins.basis"
    assert [path.name for path in written.parent.iterdir()] == ["twins.basis"]  # of both atoms
    assert f"written: {written}, without H s-" in done.stderr
    assert "hartree" in done.stderr
    lines = written.read_text().splitlines()
    assert len(lines) == len(BASIS.splitlines()) - 2
    (screen,) = _screens(written, "--on", folder / "water.xyz")
    assert screen["functions"] == 9
    assert screen["smallest"] > 1e-6
    assert (folder / "twins.basis").read_text() == BASIS
    again = run(*arguments, "--write", folder)
    assert again.returncode == 1
    assert "another folder" in again.stderr
    assert (folder / "twins.basis").read_text() == BASIS


def test_too_little_memory_is_refused_with_the_amount(folder: Path) -> None:
    done = run(folder / "sound.basis", "--on", folder / "water.xyz", "--memory", "1k")
    assert done.returncode == 1
    assert "9 functions need about" in done.stderr
    assert "--memory allows more" in done.stderr


def test_files_with_faults_are_not_measured(folder: Path) -> None:
    (folder / "broken.basis").write_text(BASIS.replace("0.0500", "O.0500"))
    done = run(folder / "broken.basis", "--on", folder / "water.xyz")
    assert done.returncode == 1
    assert f"{folder / 'broken.basis'}:5:3:" in done.stderr
    (folder / "zero.basis").write_text(BASIS.replace("0.0500", "-0.0500"))
    done = run(folder / "zero.basis", "--on", folder / "water.xyz")
    assert done.returncode == 1
    assert "cannot be normalised" in done.stderr


@pytest.mark.parametrize(
    ("arguments", "status", "told"),
    [
        (["sound.basis", "--on", "absent.xyz"], 3, "absent.xyz"),
        (["absent.basis", "--on", "water.xyz"], 3, "absent.basis"),
        (["water.xyz", "--on", "water.xyz"], 3, "water.xyz"),
        (["sound.basis", "--on", "sound.basis"], 3, "sound.basis"),
        (["--on", "water.xyz"], 2, "name a basis file"),
        (["sound.basis"], 2, "--on"),
        (["sound.basis", "--on", "water.xyz", "--use", "Qq=sound.basis"], 2, "Qq"),
        (["sound.basis", "--on", "water.xyz", "--use", "0=sound.basis"], 2, "from 1"),
        (["sound.basis", "--on", "water.xyz", "--use", "sound.basis"], 2, "write an element"),
        (["sound.basis", "--on", "water.xyz", "--mesh", "2,2"], 2, "three numbers"),
        (["sound.basis", "--on", "water.xyz", "--prune", "7"], 2, "between 0 and 1"),
        (["sound.basis", "--on", "water.xyz", "--memory", "much"], 2, "no size"),
        (["sound.basis", "--on", "water.xyz", "--set", "cc-pVDZ"], 2, "cc-pVDZ"),
        (["sound.basis", "--on", "water.xyz", "--picture", "x.doc"], 2, ".svg"),
        (["sound.basis", "--on", "empty"], 3, "no geometry"),
    ],
)
def test_wrong_use(folder: Path, arguments: list[str], status: int, told: str) -> None:
    (folder / "empty").mkdir()
    done = run(*arguments, cwd=folder)
    assert done.returncode == status, done.stderr
    assert told in done.stderr


def test_standard_input_stands_for_a_basis_or_a_geometry(folder: Path) -> None:
    done = run(
        "-", "--on", folder / "water.xyz", "--named", "sent", "--report", "lines", text=BASIS
    )
    assert done.returncode == 1
    assert done.stdout.startswith("sent:")
    done = run(folder / "sound.basis", "--on", "-", "--named", "sent", text=WATER)
    assert done.returncode == 0
    assert done.stdout.startswith("sent, frame 1: H2O")
    assert run("-", "--on", "-").returncode == 2


def test_all_words_behind_on_are_geometries(folder: Path) -> None:
    files = sorted((folder / "scan").glob("*.xyz"))
    found = _screens(folder / "sound.basis", "--on", *files, "--removal-threshold", "1e-5")
    assert [screen["geometry"] for screen in found] == list(map(str, files))
    assert {screen["removal"]["threshold"] for screen in found} == {1e-5}


def test_settings_hold(folder: Path) -> None:
    quiet = "".join(f'"overlap.{name}" = "off"\n' for name in ("molecule", "outlook", "edge"))
    (folder / "overlapse.toml").write_text(f"[severity]\n{quiet}")
    done = run(folder / "twins.basis", "--on", folder / "water.xyz")
    assert done.returncode == 0
    assert "nothing found" in done.stdout


def test_kinds_of_functions(folder: Path) -> None:
    (folder / "d.basis").write_text(BASIS.replace("P 1 1.00", "D 1 1.00"))
    water = folder / "water.xyz"
    (spherical,) = _screens(folder / "d.basis", "--on", water)
    (cartesian,) = _screens(folder / "d.basis", "--on", water, "--cartesian")
    assert (spherical["spherical"], cartesian["spherical"]) == (True, False)
    assert cartesian["functions"] == spherical["functions"] + 1
    assert spherical["counterpart"] is None
    assert cartesian["counterpart"]["functions"] == spherical["functions"]
    assert cartesian["counterpart"]["smallest"] == pytest.approx(spherical["smallest"])


def test_a_geometry_that_cannot_be_read_does_not_stop_the_others(folder: Path) -> None:
    (folder / "scan" / "2.xyz").write_text("")
    done = run(folder / "sound.basis", "--on", folder / "scan", "--report", "json")
    assert done.returncode == 3
    found = json.loads(done.stdout)
    assert len(found["screens"]) == 4
    assert [file["problem"] for file in found["files"] if file["problem"]] == [
        f"{folder / 'scan' / '2.xyz'}: the file is empty"
    ]
    done = run(folder / "sound.basis", "--on", folder / "scan", "--report", "lines")
    assert f"{folder / 'scan' / '2.xyz'}: error: the file is empty\n" in done.stdout


@pytest.mark.parametrize(
    ("options", "told"),
    [
        (["--use", "4=sound.basis"], "--use for atom 4 (sound.basis): no frame has such an atom"),
        (["--use", "C=sound.basis"], "--use for C (sound.basis): no frame has such an atom"),
        (["--charge", "11"], "frame 1: 10 electrons cannot leave a charge of 11"),
        (["--unpaired", "3"], "frame 1: 10 electrons cannot leave 3 unpaired"),
        (["--unpaired", "12"], "frame 1: 10 electrons cannot leave 12 unpaired"),
    ],
)
def test_options_that_do_not_fit_the_molecule(folder: Path, options: list[str], told: str) -> None:
    done = run("sound.basis", "--on", "water.xyz", *options, cwd=folder)
    assert done.returncode == 2
    assert told in done.stderr


def test_all_electrons_may_go_and_as_many_as_there_are_may_be_unpaired(folder: Path) -> None:
    for options in (["--charge", "10"], ["--unpaired", "10"], ["--charge", "1", "--unpaired", "1"]):
        assert run(folder / "sound.basis", "--on", folder / "water.xyz", *options).returncode == 0


ODD = {
    "nan": (WATER.replace("0.117300", "nan"), 1, "form.number"),
    "infinite": (WATER.replace("0.117300", "1e999"), 1, "form.number"),
    "none": ("0\nnothing\n", 1, "a frame of no atoms"),
    "short": ("3\nx\nH 0 0 0\n", 1, "form.count"),
    "far": (WATER.replace("0.757200", "1e300"), 0, ""),
    "alone": ("1\nx\nH 0 0 0\n", 0, ""),
    "element": ("1\nx\nQq 0 0 0\n", 1, "form.element"),
    "flat": ('1\nLattice="2 0 0 4 0 0 0 0 2"\nH 0 0 0\n', 1, "lie in one plane"),
    "wide": ('1\nLattice="1e200 0 0 0 1e200 0 0 0 1e200"\nH 0 0 0\n', 1, "out of range"),
    "tiny": ('1\nLattice="0.01 0 0 0 0.01 0 0 0 0.01"\nH 0 0 0\n', 1, "is the cell right"),
    "twice": (
        '2\nLattice="2 0 0 0 2 0 0 0 2"\nH 0 0 0\nH 2 0 0\n', 1, "H 1 stands where an image of H 2"
    ),
    "small": ('1\nLattice="0.3 0 0 0 9 0 0 0 9"\nH 0 0 0\n', 1, "its own image are 0.3 angstrom"),
}  # fmt: skip


@pytest.mark.parametrize("name", ODD)
def test_odd_geometries_give_findings_or_messages(folder: Path, name: str) -> None:
    text, status, told = ODD[name]
    (folder / "odd.xyz").write_text(text)
    done = run(folder / "sound.basis", "--on", folder / "odd.xyz", "--report", "lines")
    assert done.returncode == status, done.stdout + done.stderr
    assert "Warning" not in done.stderr
    assert told in done.stdout + done.stderr
