"""The page in a real browser: search, filter, keyboard, harmless texts, time to open."""

import io
import shutil
from collections.abc import Iterator
from dataclasses import replace
from importlib.resources import files
from pathlib import Path
from typing import Any

import pytest

from overlapse.lint.engine import FileAudit, Target, audit_file, audit_text, targets
from overlapse.lint.settings import Settings

pytest.importorskip("matplotlib")
pytest.importorskip("jinja2")
playwright = pytest.importorskip("playwright.sync_api", reason="playwright is not installed")
BROWSER = next(
    filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), ""
)
pytestmark = pytest.mark.skipif(not BROWSER, reason="no browser is installed")

HOSTILE = '<img src=x onerror="window.harmed=1"><script>window.harmed=2</script>\'&quot;'
TEXT = (
    f"! {HOSTILE}\nC 0\nS 2 1.00\n 4.0 0.6\n O.5 0.5\n{HOSTILE}\nP 1 1.0\n 0.5 1.0\n****\n"
    "N 0\nS 1 1.0\n -1.0 1.0\nP 1 1.0\n 0.5 1.0\n****\n"
)


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    with playwright.sync_playwright() as engine:
        # Containers run as root without the kernel's means that the sandbox needs.
        opened = engine.chromium.launch(executable_path=BROWSER, args=["--no-sandbox"])
        yield opened
        opened.close()


@pytest.fixture
def visit(browser: Any, tmp_path: Path) -> Iterator[Any]:
    """Write a page, open it, and see at the end that nothing was complained of or fetched."""
    complaints: list[str] = []
    fetched: list[str] = []
    context = browser.new_context(viewport={"width": 1100, "height": 800})
    page = context.new_page()
    page.on("console", lambda message: complaints.append(message.text))
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.on("request", lambda request: fetched.append(request.url))

    def opened(audits: list[FileAudit]) -> Any:
        from overlapse.lint.reports import writer

        out = io.StringIO()
        writer("html")(audits, out, False)
        path = tmp_path / "page.html"
        path.write_text(out.getvalue(), "utf-8")
        page.goto(path.as_uri())
        playwright.expect(page.locator("#status")).to_contain_text("finding")
        return page

    yield opened
    address = page.url.split("#")[0]
    context.close()
    assert not complaints
    assert {url.split("#")[0] for url in fetched} <= {address, "about:blank"}


@pytest.fixture(scope="module")
def demo() -> list[FileAudit]:
    folder = Path(str(files("overlapse.lint").joinpath("demo")))
    found = [audit_file(t, settings=Settings()) for t in targets([folder])]
    return [audit for audit in found if not audit.passed_over]


def _shown(page: Any) -> int:
    return int(page.locator(".finding").count())


def test_search_and_filters_narrow_the_list(visit: Any, demo: list[FileAudit]) -> None:
    page = visit(demo)
    findings = [finding for audit in demo for finding in audit.findings]
    assert _shown(page) == len(findings)
    page.fill("#text", "NORM self-overlap")
    norms = sum(f.rule == "contraction.norm" for f in findings)
    playwright.expect(page.locator(".finding")).to_have_count(norms)
    page.click("#clear")
    playwright.expect(page.locator(".finding")).to_have_count(len(findings))
    page.click("[data-level=note]")
    assert _shown(page) == sum(f.severity != "note" for f in findings)
    page.click("[data-level=note]")
    page.select_option("#rule", "label.split")
    assert _shown(page) == sum(f.rule == "label.split" for f in findings)
    page.select_option("#rule", "")
    page.click(".map [data-element=C]")
    assert _shown(page) == sum(f.element == "C" for f in findings)
    assert page.locator(".map [data-element=C]").get_attribute("aria-pressed") == "true"
    assert page.input_value("#element") == "C"
    page.click(".map [data-element=C]")
    page.fill("#file", "fell/heather")
    one = sum("fell/heather" in f.path for f in findings)
    playwright.expect(page.locator(".finding")).to_have_count(one)
    assert page.locator("#status").inner_text() == f"{one} of {len(findings)} findings, in 1 file"


def test_the_choice_is_kept_in_the_address(visit: Any, demo: list[FileAudit]) -> None:
    page = visit(demo)
    page.select_option("#rule", "label.split")
    page.select_option("#order", "level")
    chosen = _shown(page)
    address = page.url
    assert "rule=label.split" in address
    page.goto("about:blank")
    page.goto(address)
    playwright.expect(page.locator("#status")).to_contain_text("finding")
    assert page.input_value("#rule") == "label.split"
    assert _shown(page) == chosen


def test_an_opened_finding_shows_the_place_and_the_drawings(
    visit: Any, demo: list[FileAudit]
) -> None:
    page = visit(demo)
    page.fill("#text", "form.number")
    playwright.expect(page.locator(".finding")).to_have_count(1)
    page.click(".finding summary")
    finding = next(f for audit in demo for f in audit.findings if f.rule == "form.number")
    assert page.locator("mark").inner_text() == finding.measured == "O.15432897"
    assert page.locator("pre .at").inner_text().startswith(str(finding.line))
    assert page.locator(".finding figure svg").count() == 2
    mark = page.locator("svg .s-suspect").first.evaluate("e => getComputedStyle(e).stroke")
    assert mark == page.evaluate(
        "() => { const e = document.body.appendChild(document.createElement('i'));"
        " e.className = 'problem'; return getComputedStyle(e).color }"
    )
    page.click("text=what this rule looks for")
    assert page.locator("[id='rule-form.number']").get_attribute("open") is not None


def test_everything_can_be_reached_by_keys(visit: Any, demo: list[FileAudit]) -> None:
    page = visit(demo)
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.className") == "skip"
    page.keyboard.press("Enter")
    assert page.evaluate("document.activeElement.id") == "findings"
    page.keyboard.press("/")
    page.keyboard.type("contraction.norm")
    playwright.expect(page.locator(".finding")).to_have_count(2)
    page.keyboard.press("ArrowDown")
    page.keyboard.press("Enter")
    assert page.locator(".finding").nth(0).get_attribute("open") is not None
    page.keyboard.press("ArrowDown")
    page.keyboard.press("Space")
    assert page.locator(".finding").nth(1).get_attribute("open") is not None
    page.keyboard.press("ArrowUp")
    page.keyboard.press("ArrowUp")
    page.keyboard.press("Escape")
    assert page.input_value("#text") == ""
    assert _shown(page) > 2
    page.locator(".map [data-element=N]").focus()
    page.keyboard.press("Enter")
    assert page.input_value("#element") == "N"
    assert page.evaluate("document.activeElement.id") == "findings"


def test_hostile_names_and_comments_do_not_run(visit: Any, tmp_path: Path) -> None:
    page = visit([audit_text(TEXT, HOSTILE + ".basis", settings=Settings())])
    for summary in page.locator(".finding summary").all():
        summary.click()
    page.wait_for_timeout(200)
    assert page.evaluate("window.harmed") is None
    assert page.locator("img").count() == 0
    assert HOSTILE in page.locator("h3").inner_text()
    assert HOSTILE in page.locator("pre").first.inner_text()


def test_it_fits_a_phone_in_light_and_dark(
    browser: Any, tmp_path: Path, demo: list[FileAudit]
) -> None:
    from overlapse.lint.reports import writer

    path = tmp_path / "page.html"
    with path.open("w", encoding="utf-8") as out:
        writer("html")(demo, out, False)
    grounds = set()
    for scheme in ("light", "dark"):
        context = browser.new_context(viewport={"width": 360, "height": 700}, color_scheme=scheme)
        page = context.new_page()
        page.goto(path.as_uri())
        playwright.expect(page.locator("#status")).to_contain_text("finding")
        for summary in page.locator(".finding summary").all():
            summary.click()
        assert page.evaluate("document.documentElement.scrollWidth") <= 360
        grounds.add(page.evaluate("getComputedStyle(document.body).backgroundColor"))
        context.close()
    assert len(grounds) == 2


def test_on_paper_everything_that_fits_the_choice_is_shown(visit: Any) -> None:
    audit = audit_text(TEXT, "a.basis", settings=Settings())
    many = [replace(audit, path=f"{k}.basis") for k in range(70)]
    page = visit(many)
    assert _shown(page) == 60
    assert page.locator("#more").is_visible()
    page.evaluate("window.dispatchEvent(new Event('beforeprint'))")
    assert _shown(page) == sum(len(audit.findings) for audit in many)
    page.emulate_media(media="print")
    assert not page.locator("#filter").is_visible()


def test_a_page_of_a_thousand_files_is_small_and_opens(visit: Any) -> None:
    """Bars: 20 MB, two seconds.  Time is no matter of a test, so that limit is ten times wider."""
    audit = audit_text(TEXT, "a.basis", settings=Settings())
    page_of = [replace(audit, path=f"folder/{k:04d}.basis") for k in range(1000)]
    # As many findings as a badly damaged file has.
    page_of = [replace(item, findings=item.findings * 8) for item in page_of]
    page = visit(page_of)
    size = len(page.content().encode())
    opened = page.evaluate("performance.getEntriesByType('navigation')[0].domContentLoadedEventEnd")
    print(f"{size / 1e6:.1f} MB, open after {opened / 1e3:.2f} s")
    assert size < 20e6
    assert opened < 20e3
    page.click("#more-files")
    assert page.locator("#files tbody tr").count() == 1000


def test_the_command_writes_it_to_a_file(tmp_path: Path) -> None:
    from click.testing import CliRunner

    from overlapse.lint.cli import cli

    (tmp_path / "a.basis").write_text(TEXT, "utf-8")
    out = tmp_path / "page.html"
    done = CliRunner().invoke(
        cli, ["audit", str(tmp_path / "a.basis"), "--report", "html", "--out", str(out)]
    )
    assert done.exit_code == 1
    assert done.output == ""
    assert out.read_text("utf-8").startswith("<!DOCTYPE html>")
    assert audit_file(Target(tmp_path / "a.basis", False)).findings
