"""The built-in scenario: an invented group inherits basis files, each with a fault of its own."""

import json
import shutil
import tempfile
from importlib.resources import as_file, files
from pathlib import Path
from textwrap import fill
from typing import Any, TextIO

import click

from overlapse.lint.engine import FileAudit, audit_file, targets
from overlapse.lint.reports import text
from overlapse.lint.screening import screen_files
from overlapse.lint.settings import Settings
from overlapse.lint.terminal import width

_STORY = (
    "The Tarn lab takes over the basis files of three finished projects, Fell, Beck and Moss: one "
    "set in each text layout, every number invented. One file is clean; each of the others carries "
    "one slip of the kind that people really make. This is what an audit of the folder says."
)


def demonstrate(folder: Path | None, out: TextIO, colour: bool) -> None:
    """Copy the scenario into ``folder`` (or a new temporary one), audit it, and explain.

    Raises click.UsageError if the folder exists and is not empty.
    """
    if folder is None:
        folder = Path(tempfile.mkdtemp(prefix="tarn-"))
    elif folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise click.UsageError(f"{folder} exists and is not an empty folder")
    copy_to(folder)
    audits = [audit_file(target, settings=Settings()) for target in targets([folder])]
    columns = width(out)
    out.write(fill(_STORY, columns) + "\n\n")
    out.write(_table(folder, audits, columns) + "\n")
    shown = [audit for audit in audits if audit.findings][:2]
    out.write("Two of these files in full:\n\n")
    text.write(shown, out, colour)
    out.write("\n" + _screens(folder, columns) + "\n")
    out.write(f"The files are in {folder}. To go on:\n")
    steps = {
        f"overlapse audit {folder}": "the whole report",
        "overlapse rules contraction.norm": "what a rule looks for, and why",
        "overlapse audit YOUR-FILES": "the same for your own files",
        "overlapse screen BASIS --on XYZ": "the same for your own molecules",
    }
    longest = max(map(len, steps))
    out.writelines(f"  {step:<{longest}}  {what}\n" for step, what in steps.items())


def copy_to(folder: Path) -> None:
    """Write the scenario's files into a folder."""
    with as_file(files("overlapse.lint").joinpath("demo")) as source:
        paths = [entry["path"] for entry in scenario()]
        for path in [*paths, *(entry["geometry"] for entry in screens())]:
            target = folder / path
            target.parent.mkdir(parents=True, exist_ok=True)
            shutil.copyfile(source / path, target)


def scenario() -> list[dict[str, Any]]:
    """The files of the scenario: path, layout, what is planted, and the rule that finds it."""
    return _data("scenario.json")


def screens() -> list[dict[str, Any]]:
    """The geometries of the scenario, each with a basis file and the outlook it gives."""
    return _data("screens.json")


def _data(name: str) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = json.loads(
        files("overlapse.lint").joinpath("demo", name).read_text("utf-8")
    )
    return found


def _screens(folder: Path, columns: int) -> str:
    """What the basis files become in the scenario's geometries, one line each."""
    from overlapse.rules.measured.overlap_words import dropped, plain

    told = "Two molecules of the lab, screened before a field is solved:\n\n"
    for entry in screens():
        basis, geometry = folder / entry["basis"], folder / entry["geometry"]
        for probe in screen_files([basis], geometry).probes:
            what = f"smallest eigenvalue {plain(probe.smallest)}, outlook {probe.outlook.level}"
            if probe.drop:
                what += f"; to drop: {dropped(probe.drop)}"
            line = f"{entry['geometry']}  {entry['basis']}  {what}"
            told += fill(line, columns, subsequent_indent="  ") + "\n"
    return told


def _table(folder: Path, audits: list[FileAudit], columns: int) -> str:
    by_path = {Path(audit.path): audit for audit in audits}
    rows = [("file", "layout", "planted", "found")]
    for entry in scenario():
        audit = by_path[folder / entry["path"]]
        loud = [f for f in audit.findings if f.severity != "note"]
        loud.sort(key=lambda f: f.rule != entry["rule"])
        found = f"{loud[0].rule}, line {loud[0].line}" if loud else "nothing"
        rows.append((entry["path"], entry["layout"], entry["planted"] or "nothing", found))
    widths = [max(len(row[k]) for row in rows) for k in range(3)]
    lines = [
        "  ".join([*(cell.ljust(room) for cell, room in zip(row, widths, strict=False)), row[3]])
        for row in rows
    ]
    if max(map(len, lines)) > columns:
        lines = [
            f"{file} ({layout})\n  planted: {what}\n  found:   {found}"
            for file, layout, what, found in rows[1:]
        ]
    return "".join(f"{line}\n" for line in lines)
