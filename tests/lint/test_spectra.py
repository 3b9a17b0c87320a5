"""The picture of a screening: ladder, threshold, culprits; the same bytes every time."""

import xml.etree.ElementTree as ElementTree

import pytest
from probed import probed

from overlapse.grammar.reading import read_text
from overlapse.lint.picture import PictureError
from overlapse.rules.measured.probe import Probe
from overlapse.rules.measured.probing import Wanted

pytest.importorskip("matplotlib", reason="install the extra 'report' to run this check")
from overlapse.lint.spectra import spectra

TWINS = "H 0\nS 1 1.0\n 0.5 1.0\nS 1 1.0\n 0.05 1.0\nS 1 1.0\n 0.0502 1.0\n****\n"
FRAMES = "".join(f"2\n$x^2$\nH 0 0 0\nH 0 0 {far}\n" for far in (0.74, 1.0, 2.0))


def _probes(frames: str) -> tuple[Probe, ...]:
    return probed(read_text(TWINS), frames, Wanted(values=True)).probes


def _texts(drawn: bytes) -> set[str]:
    svg = ElementTree.fromstring(drawn.decode("utf-8"))
    return {"".join(node.itertext()).strip() for node in svg.iter() if node.tag.endswith("}text")}


def test_it_names_steps_counts_and_culprits() -> None:
    (probe,) = _probes("2\nx\nH 0 0 0\nH 0 0 0.74\n")
    told = _texts(spectra([probe], "svg"))
    for step, count in probe.spectrum.below.items():
        assert f"{count} below {step:.0e}".replace("e-0", "e-") in told
    assert {"H s-2 (0.05)", "H s-3 (0.0502)"} <= told
    assert f"eigenvalues of {len(probe.values)} functions, in falling order" in told
    assert f"{probe.blame[0].value:.1e}" in told
    assert len(probe.values) == probe.spectrum.functions
    assert probe.values[0] == pytest.approx(probe.smallest, rel=1e-6)


def test_a_scan_has_its_own_part() -> None:
    told = _texts(spectra(_probes(FRAMES), "svg"))
    assert "frames, in the order of the files" in told
    assert any("removal threshold 1e-6" in text for text in told)


def test_it_is_the_same_every_time() -> None:
    probes = _probes(FRAMES)
    assert spectra(probes, "svg") == spectra(probes, "svg")
    assert spectra(probes, "png").startswith(b"\x89PNG")
    assert spectra(probes, "pdf").startswith(b"%PDF")


def test_eigenvalues_that_are_not_positive_are_drawn() -> None:
    singular = "3\nx\nH 0 0 0\n@H 0 0 0\nH 0 0 0.74\n"
    assert "9 functions" in " ".join(_texts(spectra(_probes(singular), "svg")))


def test_without_a_frame_there_is_nothing_to_draw() -> None:
    with pytest.raises(PictureError, match="nothing to draw"):
        spectra([], "svg")
