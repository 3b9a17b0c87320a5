"""The keys that a settings file may have, and what is wrong with one that has others."""

from collections.abc import Iterator
from difflib import get_close_matches
from typing import Annotated, Any, Literal, NamedTuple

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    ValidationError,
    model_validator,
)
from pydantic_core import ErrorDetails

from overlapse.grammar.layouts import names as layout_names
from overlapse.rules.acceptance import check_rule, elements_of
from overlapse.rules.registry import rules

Table = dict[str, Any]


def _flat(table: Any, is_leaf: Any) -> Any:
    """A table whose rule names may be split at their points (``label.split = "off"``), joined."""
    if not isinstance(table, dict):
        return table
    found: Table = {}
    for name, value in table.items():
        if isinstance(value, dict) and not is_leaf(value):
            found.update({f"{name}.{rest}": v for rest, v in _flat(value, is_leaf).items()})
        else:
            found[name] = value
    return found


def _flat_severity(table: Any) -> Any:
    return _flat(table, lambda value: False)


def _flat_limits(table: Any) -> Any:
    return _flat(table, lambda value: not any(isinstance(v, dict) for v in value.values()))


def _rule(name: str) -> str:
    check_rule(name)
    return name


def _layout(name: str) -> str:
    if name not in layout_names():
        raise ValueError(_unknown("layout", name, layout_names()))
    return name


def _elements(words: str) -> str:
    elements_of(words)
    return words


def _limits(limits: dict[str, dict[str, float]]) -> dict[str, dict[str, float]]:
    for rule, values in limits.items():
        for name in values:
            if name not in rules()[rule].limits:
                known = tuple(rules()[rule].limits)
                raise ValueError(_unknown(f"limit of {rule}", name, known))
    return limits


def _reason(words: str) -> str:
    if not words.strip():
        raise ValueError("it gives no reason")
    return words


def _list(value: Any) -> Any:
    return [value] if isinstance(value, str) else value


def _unknown(what: str, name: str, known: tuple[str, ...]) -> str:
    near = get_close_matches(name, known, 1)
    hint = f"; did you mean {near[0]}?" if near else f"; known: {', '.join(known) or 'none'}"
    return f"no {what} is called {name!r}{hint}"


Rule = Annotated[str, AfterValidator(_rule)]
Strings = Annotated[list[str], BeforeValidator(_list), Field(min_length=1)]
Elements = Annotated[list[Annotated[str, AfterValidator(_elements)]], BeforeValidator(_list)]
Level = Literal["error", "warning", "note"]
Number = Annotated[float, Field(allow_inf_nan=False)]


class _Model(BaseModel):
    model_config = ConfigDict(
        extra="forbid",
        strict=True,
        frozen=True,
        alias_generator=lambda name: name.replace("_", "-"),
    )


class Choices(_Model):
    """What may be chosen for all files, or for some."""

    fail_at: Level | None = None
    severity: Annotated[
        dict[Rule, Literal["error", "warning", "note", "off"]], BeforeValidator(_flat_severity)
    ] = {}
    limits: Annotated[
        dict[Rule, dict[str, Number]], BeforeValidator(_flat_limits), AfterValidator(_limits)
    ] = {}
    label: str | None = None
    layout: Annotated[str, AfterValidator(_layout)] | None = None


class Where(Choices):
    """Choices for some paths, or some elements, or both."""

    paths: Strings | None = None
    elements: Elements = []

    @property
    def numbers(self) -> frozenset[int]:
        return frozenset[int]().union(*map(elements_of, self.elements))

    @model_validator(mode="after")
    def _chooses(self) -> "Where":
        if self.paths is None and not self.elements:
            raise ValueError("it says neither paths nor elements that it is for")
        if self.elements and (self.fail_at or self.label or self.layout):
            raise ValueError("fail-at, label and layout are for whole files, not for elements")
        return self


class Accept(_Model):
    """Findings that are accepted."""

    rules: Annotated[list[Rule], BeforeValidator(_list), Field(min_length=1)]
    paths: Strings
    elements: Elements = []
    shell: str | None = None
    because: Annotated[str, AfterValidator(_reason)]

    @property
    def numbers(self) -> frozenset[int]:
        return frozenset[int]().union(*map(elements_of, self.elements))


class Probe(_Model):
    """A geometry on which basis files are to be tried."""

    basis: Strings
    geometry: Annotated[str, Field(min_length=1)]
    removal_threshold: Annotated[float, Field(gt=0.0, lt=1.0)] | None = None
    cartesian: bool | None = None
    mesh: Annotated[list[Annotated[int, Field(gt=0)]], Field(min_length=3, max_length=3)] | None = (
        None
    )


class Keys(Choices):
    """The whole file."""

    where: list[Where] = []
    accept: list[Accept] = []
    probe: list[Probe] = []
    reference: str | None = None
    seal: str | None = None
    ledger: str | None = None


class Told(NamedTuple):
    """What is wrong: dotted path of the key, the words, and whether the key or its value is."""

    at: str
    problem: str
    is_key: bool


def told(wrong: ValidationError, table: Table) -> Iterator[Told]:
    """The mistakes of a file in words, each with the nearest right key where there is one."""
    for error in wrong.errors(include_url=False):
        path = [str(part) for part in error["loc"] if part != "[key]"]
        at = ".".join(path)
        kind = error["type"]
        if kind == "extra_forbidden":
            yield Told(at, _unknown("key", path[-1], _known(path[:-1])), True)
        elif kind == "missing":
            yield Told(at, f"{path[-1]!r} is missing here", True)
        elif "[key]" in error["loc"]:
            yield Told(at, _words(error), True)
        elif kind == "value_error" and isinstance(error["input"], dict):
            yield Told(_culprit(at, error), _words(error), True)
        else:
            yield Told(at, f"{at} = {_shown(error['input'])}: {_words(error)}", False)


_KINDS = {
    "string_type": "a text, in quotes",
    "list_type": "a list",
    "dict_type": "a table",
    "model_type": "a table",
    "bool_type": "true or false",
    "int_type": "a whole number",
}


def _shown(value: Any) -> str:
    """A value as a settings file has it."""
    if isinstance(value, bool):
        return str(value).lower()
    return "a table" if isinstance(value, dict) else repr(value)


def _words(error: ErrorDetails) -> str:
    kind, context = error["type"], error.get("ctx", {})
    if kind == "value_error":
        return str(context["error"])
    if kind == "literal_error":
        return "it is one of " + str(context["expected"]).replace("'", "").replace(" or ", ", ")
    if kind in ("float_type", "finite_number"):
        return "it is a number"
    if kind == "string_too_short" or (kind == "too_short" and not context["actual_length"]):
        return "it must not be empty"
    if kind in ("too_short", "too_long"):
        return f"it has {context['actual_length']} members, not {next(iter(_lengths(context)))}"
    if kind == "list_type" and error["loc"][-1] in ("where", "accept", "probe"):
        return f"write [[{error['loc'][-1]}]] above it, in two brackets"
    if kind in _KINDS:
        return f"it should be {_KINDS[kind]}"
    return error["msg"].replace("Input should be", "it should be")


def _lengths(context: dict[str, Any]) -> Iterator[int]:
    """How many members a list must have."""
    yield from (context[key] for key in ("min_length", "max_length") if key in context)


def _culprit(at: str, error: ErrorDetails) -> str:
    """The key inside a table that a message names."""
    for name, value in error["input"].items():
        for inner in value if isinstance(value, dict) else ():
            if repr(inner) in _words(error):
                return f"{at}.{name}.{inner}"
    return at


def _known(path: list[str]) -> tuple[str, ...]:
    models: dict[str, type[_Model]] = {"where": Where, "accept": Accept, "probe": Probe}
    model = models.get(path[0], Keys) if path else Keys
    return tuple(field.alias or name for name, field in model.model_fields.items())
