"""The demo: every file of the scenario is read as its layout, and what is planted is found."""

from pathlib import Path

import click
import pytest

from overlapse.lint.demonstration import copy_to, demonstrate, scenario, screens
from overlapse.lint.engine import Target, audit_file
from overlapse.lint.screening import screen_files
from overlapse.lint.settings import Settings


@pytest.mark.parametrize("entry", scenario(), ids=lambda entry: entry["path"])
def test_what_is_planted_is_found(entry: dict[str, str], tmp_path: Path) -> None:
    copy_to(tmp_path)
    result = audit_file(Target(tmp_path / entry["path"], False), settings=Settings())
    assert result.document is not None
    assert result.document.layout == entry["layout"]
    loud = [finding for finding in result.findings if finding.severity != "note"]
    assert bool(loud) == bool(entry["rule"])
    if loud:
        assert entry["rule"] in {finding.rule for finding in loud}
        # One slip: whatever else is said is about the same element.
        assert len({finding.element for finding in loud}) == 1


def test_one_geometry_is_sound_and_one_goes_linearly_dependent(tmp_path: Path) -> None:
    copy_to(tmp_path)
    for entry in screens():
        basis, geometry = tmp_path / entry["basis"], tmp_path / entry["geometry"]
        (probe,) = screen_files([basis], geometry).probes
        assert probe.outlook.level == entry["outlook"]
        assert (probe.kept < probe.spectrum.functions) == (entry["outlook"] == "fails")
        assert bool(probe.drop) == (entry["outlook"] == "fails")
        if probe.after is not None:
            assert probe.after.smallest > 0.1
    assert {entry["outlook"] for entry in screens()} == {"safe", "fails"}


def test_the_scenario_has_a_file_of_every_layout_and_one_that_is_clean() -> None:
    from overlapse.grammar.layouts import layouts

    assert {entry["layout"] for entry in scenario()} == set(layouts())
    assert [entry["planted"] for entry in scenario()].count("") == 1


def test_it_runs_in_a_new_folder_only(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    import sys

    demonstrate(tmp_path / "new", sys.stdout, False)
    told = capsys.readouterr().out
    assert "Tarn lab" in told
    for entry in scenario():
        assert entry["path"] in told
    for entry in screens():
        assert entry["geometry"] in told
    with pytest.raises(click.UsageError, match="not an empty folder"):
        demonstrate(tmp_path / "new", sys.stdout, False)
