"""One table of a preset through its model, with every fault of it in plain words."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches
from typing import Any

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from patterngen.errors import Fault

_LONGEST_SHOWN = 60
FORM_TAGS = ("<value>", "<table>")
"""Names of the two forms that a value may have: plain, or a table of its own."""


@dataclass(frozen=True)
class TableReading:
    """A table as read: `path` ("screen.cyan"), the fields that are sound, which of them were given.

    `values` is by key as the preset writes it and lacks the faulty ones, so that checks
    across tables can go on with what is sound.
    """

    path: str
    model: type[BaseModel]
    values: Mapping[str, Any]
    given: frozenset[str]
    faults: tuple[Fault, ...] = field(default=())

    def get(self, key: str) -> Any:
        """A sound value, or None."""
        return self.values.get(key)

    def __getitem__(self, key: str) -> Any:
        return self.values[key]


def read_table(model: type[BaseModel], raw: Mapping[str, Any], *, path: str, where: str) -> TableReading:
    """Validate one table; faults are collected, never raised."""
    keys = {info.alias or name: name for name, info in model.model_fields.items()}
    given = frozenset(raw) & frozenset(keys)
    try:
        table = model.model_validate(dict(raw))
    except ValidationError as error:
        faults = tuple(_fault(detail, model, path, where) for detail in error.errors(include_url=False))
        return TableReading(path, model, _sound_values(model, raw, keys), given, faults)
    return TableReading(path, model, {key: getattr(table, name) for key, name in keys.items()}, given)


def _sound_values(model: type[BaseModel], raw: Mapping[str, Any], keys: Mapping[str, str]) -> dict[str, Any]:
    values: dict[str, Any] = {}
    for key, name in keys.items():
        info = model.model_fields[name]
        if key not in raw:
            if not info.is_required():
                values[key] = info.get_default(call_default_factory=True)
            continue
        blank = model.model_construct()
        try:
            # one field alone: the others, faulty or not, do not take part
            validated = model.__pydantic_validator__.validate_assignment(blank.model_copy(), name, raw[key])
        except ValidationError:
            continue
        fields = validated[0] if isinstance(validated, tuple) else vars(validated)
        values[key] = fields[name]
    return values


def shown(value: object) -> str:
    """A value as the preset would write it, shortened."""
    if isinstance(value, str):
        text = '"' + "".join(c if c.isprintable() else f"\\u{ord(c):04X}" for c in value[: 2 * _LONGEST_SHOWN]) + '"'
    elif isinstance(value, bool):
        text = "true" if value else "false"
    elif isinstance(value, list | tuple):
        text = f"[{', '.join(shown(part) for part in value[:8])}{', …' if len(value) > 8 else ''}]"
    elif isinstance(value, dict):
        pairs = [f"{name} = {shown(part)}" for name, part in list(value.items())[:6]]
        text = f"{{ {', '.join(pairs)}{', …' if len(value) > 6 else ''} }}" if pairs else "{}"
    else:
        text = str(value)
    return text if len(text) <= _LONGEST_SHOWN else text[: _LONGEST_SHOWN - 1] + "…"


def nearest(word: str, words: Iterable[str]) -> str:
    """The word of those that looks most like it, or an empty text."""
    known = list(words)
    lowered = {w.lower(): w for w in known}
    close = get_close_matches(word.lower()[:100], list(lowered), n=1, cutoff=0.5)
    return lowered[close[0]] if close else ""


def _fault(detail: ErrorDetails, model: type[BaseModel], path: str, where: str) -> Fault:
    # the tags of a choice between forms are no part of the preset's own path
    loc, kind = list(detail["loc"]), detail["type"]
    last = [loc.pop()] if kind == "extra_forbidden" else []  # the user's own word, whatever it looks like
    place = [part for part in loc if part not in FORM_TAGS] + last
    key = path + "".join(f"[{part}]" if isinstance(part, int) else f".{part}" for part in place)
    context, value = detail.get("ctx") or {}, detail["input"]
    if kind == "refused":
        return Fault(where, key, context["problem"], shown(value), context["allowed"], context["nearest"])
    if kind == "missing":
        return Fault(where, key, "this key is missing", allowed=_meaning(model, place))
    if kind == "extra_forbidden":
        keys = _keys_at(model, place[:-1])
        return Fault(where, key, "no such key here", allowed=", ".join(keys), nearest=nearest(str(place[-1]), keys))
    problem, allowed, near = _plain_words(kind, context, value, detail["msg"])
    return Fault(where, key, problem, shown(value), allowed, near)


def _plain_words(kind: str, context: Mapping[str, Any], value: object, message: str) -> tuple[str, str, str]:
    """(problem, allowed, nearest) for the errors that pydantic itself raises."""
    if kind in ("literal_error", "enum"):
        words = [word.strip(" '") for word in str(context.get("expected", "")).replace(" or ", ", ").split(",")]
        near = nearest(value, words) if isinstance(value, str) else ""
        return (
            "not one of the words that may stand here",
            ", ".join(f'"{w}"' for w in words),
            f'"{near}"' if near else "",
        )
    if kind in ("bool_type", "bool_parsing"):
        word = str(value).strip().lower()
        guess = "true" if word in ("true", "yes", "on", "1") else "false" if word in ("false", "no", "off", "0") else ""
        return "not a yes or no", "true or false, without quotes", guess
    if kind in ("list_type", "tuple_type"):
        return (
            "not a list",
            "a list in square brackets",
            f"[{shown(value)}]" if not isinstance(value, dict) else "",
        )
    if kind == "too_short":
        return f"a list of {context['actual_length']}", f"at least {context['min_length']} entries", ""
    if kind == "too_long":
        return f"a list of {context['actual_length']}", f"at most {context['max_length']} entries", ""
    if kind in ("model_type", "model_attributes_type", "dict_type"):
        return "not a table", "a table", ""
    if kind in ("string_type", "string_sub_type"):
        return "not a text", "a text in quotes", f'"{value}"' if isinstance(value, int | float) else ""
    if kind in ("int_type", "int_parsing", "int_from_float"):
        return "not a whole number", "a whole number without quotes", ""
    if kind in ("float_type", "float_parsing", "finite_number"):
        return "not a number", "a finite number without quotes", ""
    bounds = {
        "greater_than": ("more than", "gt"),
        "greater_than_equal": ("at least", "ge"),
        "less_than": ("less than", "lt"),
        "less_than_equal": ("at most", "le"),
    }
    if kind in bounds:
        relation, name = bounds[kind]
        return "out of range", f"{relation} {context[name]}", ""
    if kind == "value_error":
        return str(context.get("error", message)), "", ""
    return message[:1].lower() + message[1:], "", ""


def models_in(annotation: Any) -> list[type[BaseModel]]:
    """The models that an annotation is made of."""
    from typing import get_args

    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [annotation]
    return [model for part in get_args(annotation) for model in models_in(part)]


def _keys_at(model: type[BaseModel], place: list[int | str]) -> list[str]:
    """The keys that the table at `place` may have."""
    here: list[type[BaseModel]] = [model]
    for part in place:
        if isinstance(part, str):
            here = [
                inner
                for m in here
                for name, info in m.model_fields.items()
                if part in (name, info.alias)
                for inner in models_in(info.annotation)
            ]
    return [info.alias or name for m in here for name, info in m.model_fields.items()]


def _meaning(model: type[BaseModel], place: list[int | str]) -> str:
    for name, info in model.model_fields.items():
        if place and place[-1] in (name, info.alias):
            examples = [f.schema() for f in info.metadata if hasattr(f, "schema")]
            description = info.description or next((e.get("description", "") for e in examples), "")
            example = next((e["examples"][0] for e in examples if e.get("examples")), "")
            return f"{description}{f', like {shown(example)}' if example else ''}"
    return ""
