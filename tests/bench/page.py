"""How large the page of a big audit is, what writing it costs, and how fast it opens.

    python tests/bench/page.py [--files 1000] [--times 1] [FOLDER]

Audits the files of FOLDER (else the demo's) once, repeats them under new names until there are as
many as asked for, and writes the page.  ``--times`` repeats the findings of each file, as in a
badly damaged library.  Writing is compared with auditing the same number of files (by the mean of
those audited), opening with opening a page that holds a word, in the same browser.
"""

import argparse
import io
import shutil
import tempfile
import time
from collections.abc import Sequence
from dataclasses import replace
from importlib.resources import files
from itertools import cycle, islice
from pathlib import Path
from statistics import median

from overlapse.lint.engine import FileAudit, audit_file, targets
from overlapse.lint.reports import writer
from overlapse.lint.settings import Settings

BROWSERS = ("chromium", "chromium-browser", "google-chrome")
EMPTY = "<!DOCTYPE html><title>x</title>word"


def audited(folder: Path) -> tuple[list[FileAudit], float]:
    """Audits of a folder's files, and the seconds that each took on average."""
    start = time.perf_counter()
    found = [audit_file(target, settings=Settings()) for target in targets([folder])]
    seconds = time.perf_counter() - start
    return [audit for audit in found if not audit.passed_over], seconds / len(found)


def written(audits: Sequence[FileAudit]) -> tuple[str, float]:
    """The page, and the seconds that it took."""
    out = io.StringIO()
    start = time.perf_counter()
    writer("html")(audits, out, False)
    return out.getvalue(), time.perf_counter() - start


def opened(pages: Sequence[Path], repeats: int = 5) -> list[float]:
    """Median of the seconds until each page has been laid out, runs interleaved."""
    from playwright.sync_api import sync_playwright

    browser = next(filter(None, map(shutil.which, BROWSERS)))
    took: dict[Path, list[float]] = {page: [] for page in pages}
    with sync_playwright() as engine:
        window = engine.chromium.launch(executable_path=browser, args=["--no-sandbox"])
        for _ in range(repeats):
            for path in pages:
                page = window.new_page()
                start = time.perf_counter()
                page.goto(path.as_uri())
                page.evaluate("new Promise(done => requestAnimationFrame(() => setTimeout(done)))")
                took[path].append(time.perf_counter() - start)
                page.close()
        window.close()
    return [median(times) for times in took.values()]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", nargs="?", type=Path)
    parser.add_argument("--files", type=int, default=1000)
    parser.add_argument("--times", type=int, default=1)
    asked = parser.parse_args()
    folder = asked.folder or Path(str(files("overlapse.lint").joinpath("demo")))
    some, each = audited(folder)
    many = [
        replace(audit, path=f"{k:05d}/{audit.path}", findings=audit.findings * asked.times)
        for k, audit in enumerate(islice(cycle(some), asked.files))
    ]
    page, seconds = written(many)
    count = sum(len(audit.findings) for audit in many)
    drawings = page.count("<figure>")
    print(f"{len(many)} files, {count} findings, {drawings} drawings")
    print(f"size: {len(page.encode()) / 1e6:.2f} MB")
    print(f"writing / auditing as many files: {seconds / (each * len(many)):.2f} ({seconds:.1f} s)")
    with tempfile.TemporaryDirectory() as scratch:
        paths = [Path(scratch, "page.html"), Path(scratch, "empty.html")]
        for path, text in zip(paths, (page, EMPTY), strict=True):
            path.write_text(text, "utf-8")
        try:
            whole, empty = opened(paths)
        except (ImportError, StopIteration):
            print("opening: not measured, there is no browser to drive")
            return
    print(f"opening: {whole:.2f} s, {whole / empty:.1f} times an empty page ({empty:.3f} s)")


if __name__ == "__main__":
    main()
