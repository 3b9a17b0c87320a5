"""Labels of basis sets, taken apart: what a name claims, before anybody asks whether it is true."""

import re
from collections.abc import Callable
from functools import cache

from lark import Lark, Token, Tree
from lark.exceptions import UnexpectedInput

from overlapse.grammar.compiled import grammar
from overlapse.grammar.designated import CARDINALS, LETTERS, Designation
from overlapse.grammar.names import Named, is_short, named

__all__ = ["Designation", "label_in_file_name", "label_in_words", "parse_label"]

# Cheap test that spares most words of a comment the parser.
_HOPEFUL = re.compile(
    r"sto-?_?[1-9]g|[1-9][-_]?[1-9]{2,3}[+pP]{0,2}g|[1-9]zapa"
    r"|((ccecp|sdb)[-_ ])?((heavy|[dtq])?[-_ ]?aug|maug|jul|jun|may|apr|mar|feb)?[-_ ]?"
    r"(cc[-_ ]?p|pc)"
    r"|[adt]?(w?c)?v\(?[dtq2-9]|(ma[-_ ]?)?(def|dhf|x2c)|ano|dyall[-_. ]",
    re.IGNORECASE,
)
# Ends that make another set of a label; none of them is the plain set.
_ENDINGS = re.compile(r"\.[A-Za-z0-9]{1,10}$")


@cache
def _parser() -> Lark:
    return grammar("designation")


@cache
def parse_label(label: str) -> Designation | None:
    """Take a label apart, or return None for one that is not understood.

    Letter case does not matter; "*" may be written "s" as file names have it.  A name that several
    sets share comes back with its readings.
    """
    words = label.strip()
    if (plain := named(words)) is not None:
        return _named(plain)
    return _spelled(words)


def _named(plain: Named) -> Designation:
    if not plain.ambiguous:
        return Designation(
            plain.family, name=plain.sets[0], fitting="fitting" if plain.fitting else ""
        )
    readings = tuple(r for name in plain.sets if (r := _reading(name)) is not None)
    return Designation("ambiguous", name=plain.family, readings=readings)


def _reading(name: str) -> Designation | None:
    plain = named(name)
    # "DZP" is the name of a series as well as an ambiguous name.
    if plain is not None and plain.ambiguous:
        return Designation("DZP series", name=name)
    return _named(plain) if plain else _spelled(name)


def _spelled(words: str) -> Designation | None:
    if not _HOPEFUL.match(words):
        return None
    try:
        tree = _parser().parse(words)
    except UnexpectedInput:
        return None
    node = tree.children[0]
    assert isinstance(node, Tree)
    return _READERS[str(node.data)](node)


def label_in_file_name(name: str) -> str | None:
    """The label that a file's name is, as it stands there, or None.

    ``6-31Gs.dat`` and ``6-31+G*`` are labels; a name with anything else in it is none, and neither
    is a short word that a file may be called by chance.
    """
    stem = _ENDINGS.sub("", name)
    return next(
        (text for text in (name, stem) if not is_short(text) and parse_label(text) is not None),
        None,
    )


def label_in_words(words: list[str], most: int = 5) -> str | None:
    """The label that a line of words begins with, the longest that is one, or None."""
    for count in range(min(most, len(words)), 0, -1):
        text = " ".join(words[:count])
        if not is_short(text) and parse_label(text) is not None:
            return text
    return None


# ---- from the parser's tree


def _words(node: Tree[Token]) -> dict[str, str]:
    """The tokens right below a node, by type, in lower case and without separators at the ends."""
    return {t.type: str(t).lower().strip("-_ ") for t in node.children if isinstance(t, Token)}


def _slater(node: Tree[Token]) -> Designation:
    stars = next((_stars(t) for t in node.children if isinstance(t, Tree)), 0)
    return Designation("STO-nG", int(_words(node)["DIGIT"]), stars=stars)


def _stars(node: Tree[Token]) -> int:
    return min(2, len(node.children))


def _split(node: Tree[Token]) -> Designation:
    words = _words(node)
    trees = {str(t.data): t for t in node.children if isinstance(t, Tree)}
    diffuse = min(2, len(trees["diffuse"].children)) if "diffuse" in trees else 0
    stars = _stars(trees["star"]) if "star" in trees else 0
    parts = [_counts(part) for part in trees["listed"].children] if "listed" in trees else []
    heavy = parts[0] if parts else (((2, 1),) if stars else ())
    light = parts[1] if len(parts) > 1 else (((1, 1),) if stars == 2 else ())
    valence = tuple(int(digit) for digit in words["VALENCE"])
    return Designation("N-MPG", int(words["DIGIT"]), valence, diffuse, heavy, light, stars)


def _counts(part: Token | Tree[Token]) -> tuple[tuple[int, int], ...]:
    """(l, count) for a list of terms such as 3df: three d functions and an f function."""
    assert isinstance(part, Tree)
    counts: dict[int, int] = {}
    for term in part.children:
        word = str(term).lower()
        l = LETTERS.index(word[-1])
        counts[l] = counts.get(l, 0) + (int(word[0]) if len(word) > 1 else 1)
    return tuple(sorted(counts.items()))


_AUGMENTED = {"heavyaug": "jul", "daug": "d-aug", "taug": "t-aug", "qaug": "q-aug"}
_SHORT = {"": "", "a": "aug", "d": "d-aug", "t": "t-aug"}
_CORES = {"": "", "c": "C", "wc": "wC"}
_RELATIVE = {"dk": "DK", "dkh": "DK", "dkh2": "DK", "dk3": "DK3", "nr": "NR"}


def _level(words: dict[str, str]) -> tuple[int, bool]:
    """Cardinal number, and whether it carries the tight d of (X+d)."""
    tight = words.get("TIGHT", "").strip("(_")
    cardinal = words.get("CARDINAL") or (tight if tight.startswith("10") else tight[0])
    at = CARDINALS.find(cardinal.upper())
    return (at + 2 if at >= 0 else int(cardinal)), bool(tight)


def _consistent(node: Tree[Token]) -> Designation:
    words = _words(node)
    for part in node.children:
        if isinstance(part, Tree):
            words |= _words(part)
    augmentation = _plain(words.get("AUGMENTED", ""))
    augmentation = _AUGMENTED.get(augmentation, augmentation)
    core = words.get("CORE", "")
    if "SHORT" in words:
        short = words["SHORT"].removesuffix("v")
        core = short.lstrip("adt")
        augmentation = _SHORT[short.removesuffix(core)]
    zeta, tight = _level(words)
    # The prime is a local way to write the set without diffuse functions on hydrogen.
    if "PRIME" in words and augmentation == "aug":
        augmentation = "jun"
    own = {"ccecp": "ccECP", "sdb": "SDB"}.get(words.get("PSEUDO", ""), "")
    return Designation(
        "cc-pVXZ",
        zeta=zeta,
        augmentation=augmentation,
        core_valence=_CORES[core],
        tight=tight,
        relativity=_RELATIVE.get(words.get("RELATIVE", ""), ""),
        potential=own or ("PP" if "PSEUDO_POTENTIAL" in words else ""),
        variant=_variant(words.get("SPECIAL", "")),
        fitting=_fitting(words.get("FITTING", "")),
    )


def _plain(word: str) -> str:
    return re.sub(r"[-_ ()]", "", word)


def _variant(word: str) -> str:
    plain = _plain(word)
    if plain.startswith(("fi", "pt")):
        return "(" + word.strip("()").replace("_", "/") + ")"
    if plain.startswith("seg"):
        return "(seg-opt)"
    return {"f12rev2": "F12rev2", "f12nz": "F12-nZ"}.get(plain, word.upper())


_FITTING = {
    "jkfit": "JKFIT", "jfit": "JFIT", "cfit": "JFIT", "coulombfitting": "JFIT", "xfit": "XFIT",
    "mp2fit": "RI", "mp2fitting": "RI", "ri": "RI", "optri": "OptRI", "fit": "fit2-1",
    "fit21": "fit2-1", "": "",
}  # fmt: skip


def _fitting(word: str) -> str:
    return _FITTING[_plain(word)]


def _karlsruhe(node: Tree[Token]) -> Designation:
    words = _words(node)
    revision, base = words["REVISION"], words["KARLSRUHE"]
    base = "SV(P)" if base in ("sv", "svp_", "sv_p") or "(" in base else base.upper()
    written = next(str(t).lower() for t in node.children if getattr(t, "type", "") == "KARLSRUHE")
    if written.strip("-") in ("svp_", "sv_p_"):
        base = "SV(P)"
    if written.startswith("m"):
        base = "m" + written[1:].upper()
    if written == "universal":
        base = written
    zeta = next((z for z, word in ((2, "SV"), (3, "TZ"), (4, "QZ")) if word in base), 0)
    name = f"{revision}-{base}"
    if "ALL" in words:
        name += words["ALL"].replace("all2c", "all-2c").replace("all_2c", "all-2c")
    return Designation(
        revision,
        name=name,
        zeta=zeta,
        augmentation="ma" if "MINIMALLY" in words else "",
        potential="ECP" if revision in ("def", "def2", "dhf") else "",
        fitting=_fitting(words.get("FITTING", "")),
    )


_JENSEN = {"pc": "pc", "pcseg": "pcseg", "pcsseg": "pcSseg", "pcx": "pcX", "pcj": "pcJ"}


def _jensen(node: Tree[Token]) -> Designation:
    words = _words(node)
    family, level = _JENSEN[_plain(words["JENSEN"])], words["LEVEL"]
    augmentation = _plain(words.get("AUGMENTED", ""))
    return Designation(
        f"{family}-n",
        name=f"{family}-{level}",
        # The number counts the polarization functions; the set with one of them is double zeta.
        zeta=int(level) + 1,
        augmentation=_AUGMENTED.get(augmentation, augmentation),
    )


def _natural(node: Tree[Token]) -> Designation:
    truncation = _words(node).get("TRUNCATION", "").upper()
    zeta = {"MB": 1, "VDZP": 2, "VTZP": 3, "VQZP": 4}.get(truncation, 0)
    name = f"ANO-RCC-{truncation}" if truncation else "ANO-RCC"
    return Designation("ANO-RCC", name=name, zeta=zeta, relativity="DK")


def _zapa(node: Tree[Token]) -> Designation:
    n = _words(node)["DIGIT"]
    return Designation("nZaPa-NR", name=f"{n}ZaPa-NR", zeta=int(n))


def _dyall(node: Tree[Token]) -> Designation:
    words = _words(node)
    n = words["DIGIT"]
    name = f"dyall-{words.get('DYALL_KIND', '')}{n}{words['DYALL_END']}"
    return Designation("dyall", name=name, zeta=int(n), relativity="DC")


_READERS: dict[str, Callable[[Tree[Token]], Designation]] = {
    "slater": _slater,
    "split": _split,
    "consistent": _consistent,
    "karlsruhe": _karlsruhe,
    "jensen": _jensen,
    "natural": _natural,
    "zapa": _zapa,
    "dyall": _dyall,
}
