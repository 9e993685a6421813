"""The JSON Schema of a preset, made from the models, for editors that complete and check while one types."""

from __future__ import annotations

from typing import Any

from pydantic import BaseModel

from patterngen.job.preset import Pair
from patterngen.job.tables import models_in
from patterngen.model.fields import QuantityField
from patterngen.units import spell

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def schema() -> dict[str, Any]:
    """JSON Schema 2020-12 of a preset: every table, key, unit, and word that may stand there.

    What needs more than one value to see (names that clash, inks that do not exist) is
    left to `load`.
    """
    from patterngen.job.preset import LATER, preset_model

    made = preset_model().model_json_schema(by_alias=True)
    for model in _models(preset_model()):
        _spell_defaults(model, made["$defs"].get(model.__name__, made))
    later = ", ".join(f"[{name}]" for name in LATER)
    about = f"One job: sheet, press, inks, screens, grids.  Tables of later versions: {later}."
    cleaned = _without_noise({**made, "description": about})
    return {"$schema": DIALECT, "title": "patterngen preset", **cleaned}


def _models(model: type[BaseModel]) -> list[type[BaseModel]]:
    """A model and all those in it."""
    inner = [m for info in model.model_fields.values() for part in models_in(info.annotation) for m in _models(part)]
    return [model, *inner]


def _spell_defaults(model: type[BaseModel], shape: dict[str, Any]) -> None:
    """Defaults stand in the models as plain numbers; a preset writes them with their unit."""
    for name, info in model.model_fields.items():
        quantity = next((m.quantity for m in info.metadata if isinstance(m, QuantityField)), None)
        pair = next((m.of.quantity for m in info.metadata if isinstance(m, Pair)), None)
        entry = shape["properties"][info.alias or name]
        if quantity and isinstance(info.default, float):
            entry["default"] = spell(info.default, quantity, quantity.unit)
        elif pair and isinstance(info.default, tuple):
            entry["default"] = [spell(part, pair, pair.unit) for part in info.default]


def _without_noise(part: Any, *, names: bool = False) -> Any:
    """The same without generated titles and null branches: a preset knows no null.

    `names` marks a table of properties, whose keys are no keywords.
    """
    if isinstance(part, list):
        return [_without_noise(item) for item in part]
    if not isinstance(part, dict):
        return part
    out = {}
    for key, value in part.items():
        if not names and key == "title":
            continue
        if not names and key == "default" and value is None:
            continue
        # an example or a constant is data, not a schema
        keep = not names and key in ("examples", "enum", "const", "default")
        out[key] = value if keep else _without_noise(value, names=not names and key in ("properties", "$defs"))
    branches = out.get("anyOf")
    if not names and isinstance(branches, list):
        real = [b for b in branches if b != {"type": "null"}]
        if len(real) == 1:
            rest = {k: v for k, v in out.items() if k != "anyOf"}
            return {**real[0], **rest}
        out["anyOf"] = real
    return out
