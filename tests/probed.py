"""Cases with measurements: a basis text in a geometry text, as rules about geometries see it."""

from overlapse.grammar.geometry import read_bytes
from overlapse.grammar.model import Document
from overlapse.lint.choices import shelf
from overlapse.lint.screening import measure, tasks
from overlapse.rules.case import Case
from overlapse.rules.measured.probing import Wanted


def probed(document: Document, geometry: str, wanted: Wanted = Wanted()) -> Case:  # noqa: B008
    """The case of a document with what was measured of it in all frames of a geometry."""
    made = shelf([document])
    found, _ = tasks(made, [read_bytes(geometry.encode(), "geometry.xyz")])
    return Case(document, probes=[measure(task, made, wanted) for task in found])
