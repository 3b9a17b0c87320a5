"""Modules that are found by lying in a folder: commands and reports."""

from functools import cache
from importlib.resources import files


@cache
def modules_of(package: str) -> tuple[str, ...]:
    """Names of the modules of a package, in alphabetical order."""
    entries = (entry.name for entry in files(package).iterdir())
    return tuple(
        sorted(
            name.removesuffix(".py")
            for name in entries
            if name.endswith(".py") and name != "__init__.py"
        )
    )
