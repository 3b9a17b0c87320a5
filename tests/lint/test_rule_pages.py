"""Pages of rules on the terminal and as Markdown; completion of command lines."""

import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner

from overlapse.grammar.layouts import names as layout_names
from overlapse.lint.cli import cli
from overlapse.lint.commands import names as command_names
from overlapse.lint.pages import markdown, page
from overlapse.rules.registry import rules


@pytest.mark.parametrize("name", sorted(rules()))
def test_a_page_says_all_that_the_rule_says(name: str) -> None:
    rule = rules()[name]
    told = " ".join(page(rule, 70).split())
    text = rule.explanation
    for words in (text.what, text.why, text.formula, text.source, text.limits, text.remedy):
        assert " ".join(words.split()) in told
    for sample in (text.bad, text.good, text.beside, text.geometry):
        assert " ".join(sample.split()) in told
    assert f"overlapse: accept {name} for C s-1 because" in told


@pytest.mark.parametrize("columns", [40, 72, 110])
def test_pages_keep_to_the_width_of_the_terminal(columns: int) -> None:
    for rule in rules().values():
        for line in page(rule, columns).split("\n"):
            # A long word, or a line of a sample, is not broken.
            assert len(line) <= columns or line.startswith("    ") or " " not in line.strip()


def _run(*arguments: str, **environment: str) -> tuple[int, str]:
    done = CliRunner().invoke(cli, arguments, env=environment, prog_name="overlapse")
    return done.exit_code, done.output


def test_the_list_is_as_wide_as_the_terminal() -> None:
    status, narrow = _run("rules", COLUMNS="60")
    assert status == 0
    assert max(map(len, narrow.split("\n"))) <= 60
    assert all(f"\n{name} " in f"\n{narrow}" for name in rules())


def test_a_group_is_listed_alone() -> None:
    status, told = _run("rules", "overlap")
    assert status == 0
    assert "overlap.centre" in told and "form.number" not in told


def test_an_unknown_rule_is_wrong_use_with_the_nearest_name() -> None:
    status, told = _run("rules", "form.nubmer")
    assert status == 2
    assert "did you mean form.number?" in told


def test_markdown_renders_to_what_the_rules_say(tmp_path: Path) -> None:
    reader = pytest.importorskip("markdown_it", reason="markdown-it-py is not installed")
    out = tmp_path / "rules.md"
    assert _run("rules", "--markdown", "--out", str(out)) == (0, "")
    text = out.read_text("utf-8")
    assert text == markdown(rules().values())
    tokens = reader.MarkdownIt("commonmark").parse(text)
    inline = [token.children for token in tokens if token.type == "inline"]
    shown = ["".join(part.content or "\n" for part in parts) for parts in inline]
    plain = " ".join(" ".join(shown).split())
    for rule in rules().values():
        for words in (rule.explanation.why, rule.explanation.formula, rule.explanation.source):
            assert " ".join(words.split()) in plain, rule.name
    samples = "".join(token.content for token in tokens if token.type == "code_block")
    for rule in rules().values():
        told = rule.explanation
        for sample in filter(None, (told.bad, told.good, told.beside, told.geometry)):
            # An empty line ends with its blanks in Markdown, and begins none.
            assert "".join(sample.split()) in "".join(samples.split()), rule.name
    # Links of the table of contents lead to headings, whose anchors leave the dots out.
    anchors = {re.sub(r"[^\w-]", "", line[4:]) for line in text.split("\n") if line[:4] == "### "}
    assert set(re.findall(r"\(#([\w-]+)\)", text)) == anchors
    assert len(anchors) == len(rules())


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_completion_lines_are_understood_by_the_shell(shell: str, tmp_path: Path) -> None:
    status, lines = _run("completion", shell)
    assert status == 0
    assert "_OVERLAPSE_COMPLETE" in lines
    if shutil.which(shell):
        file = tmp_path / "lines"
        file.write_text(lines)
        subprocess.run([shell, "-n", file], check=True)


def _completed(line: str) -> list[str]:
    """What bash would be offered after ``line``."""
    words = line.split(" ")
    done = subprocess.run(
        [sys.executable, "-c", "from overlapse.lint.cli import main; main()"],
        env={
            **dict(__import__("os").environ),
            "_OVERLAPSE_COMPLETE": "bash_complete",
            "COMP_WORDS": line,
            "COMP_CWORD": str(len(words) - 1),
        },
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.stderr == ""
    return [word.partition(",")[2] for word in done.stdout.split()]


def test_commands_rules_layouts_and_reports_are_completed() -> None:
    assert set(_completed("overlapse ")) == set(command_names())
    assert _completed("overlapse rules contraction.no") == ["contraction.norm"]
    assert _completed("overlapse audit --report sa") == ["sarif"]
    assert set(_completed("overlapse recast x --layout ")) == set(layout_names())


def test_every_command_tells_what_it_does_and_shows_examples() -> None:
    for name in command_names():
        status, told = _run(name, "--help", COLUMNS="80")
        assert status == 0
        assert re.search(r"Examples?[^\n]*:\n\s+overlapse " + name, told), name
        assert max(map(len, told.split("\n"))) <= 90


def test_a_page_says_how_to_mend_and_how_to_accept() -> None:
    told = {name: page(rule, 1000) for name, rule in rules().items()}
    assert "To mend it: overlapse mend FILE " in told["form.number"]
    assert "To mend it: overlapse mend --also contraction.norm FILE " in told["contraction.norm"]
    assert "To mend it" not in told["primitive.trend"]
    for name, text in told.items():
        assert f"overlapse: accept {name} for" in text
        assert "[[accept]] in the settings" in text
