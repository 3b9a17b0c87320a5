"""Overlapse judges Gaussian basis-set files before cluster time is spent on them.

The public face is small: `read` turns a file into a `Document`, `audit` judges one and returns
`Finding` objects, `screen` measures its overlap in real geometries.  All are loaded on first use,
so that importing the package stays cheap.
"""

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from overlapse.grammar.model import Document
    from overlapse.grammar.reading import read
    from overlapse.lint.engine import audit
    from overlapse.lint.screening import screen
    from overlapse.rules.finding import Finding

__all__ = ["Document", "Finding", "audit", "read", "screen"]

_HOME = {
    "Document": "overlapse.grammar.model",
    "read": "overlapse.grammar.reading",
    "audit": "overlapse.lint.engine",
    "screen": "overlapse.lint.screening",
    "Finding": "overlapse.rules.finding",
}


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'overlapse' has no attribute {name!r}")
    from importlib import import_module

    return getattr(import_module(_HOME[name]), name)
