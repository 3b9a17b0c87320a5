"""Whether a family of sets is used with spherical or with Cartesian functions."""

from overlapse.grammar.designation import Designation
from overlapse.rules.families.counted import table


def usual_kind(label: Designation) -> str | None:
    """The kind of functions that a family is used with, None where it is not known."""
    if label.family == "N-MPG":
        name = f"{label.core}-{''.join(map(str, label.valence))}"
        found = table("pople")["sets"].get(name, {}).get("functions")
    else:
        found = table("functions")["families"].get(label.family)
    return None if found is None else str(found)
