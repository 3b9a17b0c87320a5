"""How much memory there is, and how much a matrix needs."""

import os
import re
from math import log

# Of the dense matrix: itself, a factor of it, and what the two need on the way.
PEAK = 2.5
SHARE = 0.75  # of what is free may be used unless the user says otherwise
_SIZE = re.compile(r"(\d+(?:\.\d+)?)\s*([kmgt]?)i?b?", re.I)
_POWERS = {"": 0, "k": 1, "m": 2, "g": 3, "t": 4}


def needed(functions: int, *, wide: int = 1) -> int:
    """Bytes at the peak for a dense matrix; ``wide`` is 2 for a complex one."""
    return int(PEAK * 8 * wide * functions**2)


def allowed() -> int | None:
    """Three quarters of the free memory, in bytes; None where the system does not tell."""
    try:
        with open("/proc/meminfo", encoding="ascii") as lines:
            for line in lines:
                if line.startswith("MemAvailable:"):
                    return int(SHARE * 1024 * int(line.split()[1]))
    except (OSError, ValueError):
        pass
    try:
        return int(SHARE * os.sysconf("SC_AVPHYS_PAGES") * os.sysconf("SC_PAGE_SIZE"))
    except (AttributeError, ValueError, OSError):
        return None


def parsed_size(text: str) -> int:
    """Bytes of a size such as 800M, 4G, 1.5 GB.  Raises ValueError for anything else."""
    match = _SIZE.fullmatch(text.strip())
    if match is None:
        raise ValueError(f"{text!r} is no size; write 800M or 4G")
    return int(float(match[1]) * 1024 ** _POWERS[match[2].lower()])


def told(size: float) -> str:
    """A size in words: 812 kB, 3.4 GB."""
    units = ("bytes", "kB", "MB", "GB", "TB")
    power = min(len(units) - 1, int(log(max(size, 1.0), 1024)))
    return f"{size / 1024**power:.3g} {units[power]}"
