"""The tables of a preset, as models.  What a kind adds comes from its own `Params`."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Discriminator, Field, GetCoreSchemaHandler, Tag, create_model
from pydantic_core import CoreSchema, core_schema

from patterngen import registry
from patterngen.job.tables import FORM_TAGS
from patterngen.model.fields import (
    Angle,
    AngleError,
    AngleOrChoose,
    ChoiceField,
    Illuminance,
    Lab,
    LengthOrZero,
    NameField,
    NumberField,
    PositiveLength,
    QuantityField,
    Resolution,
    RulingOrChoose,
    Share,
    TextField,
    refusal,
)
from patterngen.rules import _limits
from patterngen.units import LENGTH, RESOLUTION, RULING, Quantity

VERSION = 1
MOST_INKS = 16


class Table(BaseModel):
    """A table of a preset: no key but its own, nothing turned silently into something else."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


@dataclass(frozen=True, eq=False)
class Pair:
    """Two quantities in a list, as ["90 mm", "60 mm"]."""

    of: QuantityField

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: Any) -> dict[str, Any]:
        return {"type": "array", "items": self.of.schema(), "minItems": 2, "maxItems": 2}

    def read(self, value: object) -> tuple[float, float]:
        """Both in the inner unit."""
        example = self.of.quantity.example
        if not isinstance(value, list | tuple) or len(value) != 2:
            raise refusal("not a pair", allowed=f'two values in a list, like ["{example}", "{example}"]')
        first, second = (float(self.of.read(part)) for part in value)
        return first, second


def _length_pair(*, positive: bool) -> Pair:
    return Pair(QuantityField(LENGTH, low=0.0 if positive else -10_000.0, high=10_000.0, above=positive))


Size = Annotated[tuple[float, float], _length_pair(positive=True)]
Point = Annotated[tuple[float, float], _length_pair(positive=False)]
Truth = Annotated[bool, Field(strict=True)]
ArtPath = Annotated[str, TextField("a path relative to the preset's folder", 200)]
# an imager's or scanner's pixels are counted in dpi, a mesh in threads to the cm
GridRuling = Annotated[
    float,
    QuantityField(Quantity("a ruling", RULING.units | RESOLUTION.units, "120 /cm"), low=0.0, high=10_000.0, above=True),
]
InkName = Annotated[str, TextField("the name of an ink", 60)]


class SheetTable(Table):
    """The trimmed sheet."""

    size: Size = Field(description="width and height of the trimmed sheet")
    bleed: LengthOrZero = Field(0.0, description="ink beyond the trim, all around")
    marks: Truth = Field(False, description="register and trim marks")


class ViewingTable(Table):
    """Who looks, from where, in what light."""

    distance: PositiveLength = Field(350.0, description="reading distance")
    far: PositiveLength | None = Field(
        None, description="where the print must look even; default twice the reading distance"
    )
    limit: Annotated[float, NumberField("limit of visibility for periods up to 1 mm", 0.0, 1000.0, above=True)] = 4.0
    limit_coarse: Annotated[float, NumberField("limit of visibility for longer periods", 0.0, 1000.0, above=True)] = 1.0
    light: Illuminance = Field(500.0, description="light on the print")
    eye: Annotated[str, ChoiceField("an eye model", lambda: registry.names("patterngen.vision"))] = "barten1999"


class GainTable(Table):
    """How shapes grow in print; one of the two."""

    gain: Share | None = Field(None, description="tone value increase at half tone")
    edge_gain: LengthOrZero | None = Field(None, description="growth of every edge")


class PressFields(GainTable):
    """The press: its process, imager, tolerances and gain.  Limits of the process may be overridden here."""

    process: Annotated[str, ChoiceField("a process", _limits.processes)] | None = None
    imager: Resolution | None = Field(None, description="resolution of the imager")
    register_: LengthOrZero = Field(0.0, alias="register", description="register tolerance of the press")
    angle_error: AngleError = Field(0.0, description="angle tolerance of the press")
    size_error: Share = Field(0.0, description="size tolerance of the press")
    yule_nielsen: Annotated[float, NumberField("Yule-Nielsen n", 1.0, 10.0)] = 1.0


class PaperTable(Table):
    """The bare paper."""

    lab: Lab = (95.0, 0.0, -2.0)


class InkTable(Table):
    """A printing ink, in the order of printing."""

    name: InkName
    lab: Lab = Field(description="the solid on this paper")
    opaque: Truth = Field(False, description="hides what is under it")


class OverprintTable(Table):
    """Inks on top of each other: the measured colour, or that they never meet."""

    inks: Annotated[list[InkName], Field(min_length=2, max_length=MOST_INKS)]
    lab: Lab | None = None
    never: Truth = False


class WaiveTable(Table):
    """A rule whose failure is accepted, and why; the reason stays in every report."""

    rule: Annotated[str, ChoiceField("a rule", lambda: registry.names("patterngen.rules"))]
    reason: Annotated[str, TextField("why the failure is accepted", 500)]


class ImageTone(Table):
    """Tone from a grey picture: 1 - value / largest value, fitted to the area's box."""

    image: ArtPath


class SvgArea(Table):
    """An area from the outlines of an SVG file, or of one element of it."""

    svg: ArtPath
    id: Annotated[str, TextField("the id of an element", 200)] | None = None


def _by_shape(value: object) -> str:
    return FORM_TAGS[isinstance(value, dict)]


Tone = Annotated[
    Annotated[Share, Tag(FORM_TAGS[0])] | Annotated[ImageTone, Tag(FORM_TAGS[1])], Discriminator(_by_shape)
]
AreaField = Annotated[
    Annotated[Literal["sheet"], Tag(FORM_TAGS[0])] | Annotated[SvgArea, Tag(FORM_TAGS[1])],
    Discriminator(_by_shape),
]


class ScreenTable(GainTable):
    """What every screen has."""

    name: Annotated[str, NameField("the screen's own name")]
    ink: InkName
    kind: Annotated[str, ChoiceField("a kind of screen", lambda: registry.names("patterngen.screens"))]
    ruling: RulingOrChoose | None = Field(None, description="left out: derived by a rule")
    angle: AngleOrChoose | None = Field(
        None, description="counter-clockwise from the sheet's horizontal; left out: derived by a rule"
    )
    tone: Tone
    area: AreaField = "sheet"
    origin: Point = Field((0.0, 0.0), description="where a dot or line centre lies, from the trim's lower left corner")


class GridTable(Table):
    """What every grid has: periodic, but not ink."""

    name: Annotated[str, NameField("the grid's own name")]
    kind: Annotated[str, ChoiceField("a kind of grid", lambda: registry.names("patterngen.grids"))]
    ruling: GridRuling
    angle: Angle = 0.0


@cache
def press_table() -> type[PressFields]:
    """The [press] table: its own keys and one for every limit there is."""
    limits: dict[str, Any] = {
        name: (
            Annotated[float, QuantityField(kind.quantity, low=0.0)] | None,
            Field(None, description=kind.meaning),
        )
        for name, kind in _limits.KINDS.items()
    }
    return create_model("PressTable", __base__=PressFields, __doc__=PressFields.__doc__, **limits)


@cache
def kinds(family: str) -> dict[str, type[Table]]:
    """The full table model of every kind in a family ("screen" or "grid"): common keys and the kind's own."""
    families: dict[str, type[Table]] = {"screen": ScreenTable, "grid": GridTable}
    base = families[family]
    out: dict[str, type[Table]] = {}
    for name, module in registry.modules(f"patterngen.{family}s").items():
        words = "".join(part.capitalize() for part in name.split("-"))
        fields: dict[str, Any] = {"kind": (Literal[name], Field(description=module.SUMMARY))}
        model: Any = create_model(
            f"{words}{family.capitalize()}",
            __base__=(base, module.Params),
            __doc__=module.SUMMARY,
            **fields,
        )
        out[name] = model
    return out


@dataclass(frozen=True)
class TableKind:
    """How a table stands in a preset: once or in a list (at most `most`), needed or not, by which model."""

    many: bool
    needed: bool
    most: int = 1
    family: str = ""
    """"screen" or "grid" where the model depends on `kind`."""

    def models(self, name: str) -> dict[str, type[Table]]:
        """Every model that a table of this name may have, by kind ("" where there are no kinds)."""
        return kinds(self.family) if self.family else {"": _plain_models()[name]}

    def base(self, name: str) -> type[Table]:
        """The model for a table whose kind is not known."""
        families: dict[str, type[Table]] = {"screen": ScreenTable, "grid": GridTable}
        return families[self.family] if self.family else _plain_models()[name]


TABLES: dict[str, TableKind] = {
    "sheet": TableKind(many=False, needed=True),
    "viewing": TableKind(many=False, needed=False),
    "press": TableKind(many=False, needed=False),
    "paper": TableKind(many=False, needed=False),
    "ink": TableKind(many=True, needed=True, most=MOST_INKS),
    "overprint": TableKind(many=True, needed=False, most=1000),
    "screen": TableKind(many=True, needed=True, most=64, family="screen"),
    "grid": TableKind(many=True, needed=False, most=16, family="grid"),
    "waive": TableKind(many=True, needed=False, most=100),
}

LATER: dict[str, str] = {
    "key": "this version does not make keys yet",
    "choose": "this version does not search for angles yet",
    "ground": "this version does not draw grounds yet",
    "film": "this version does not make films yet",
    "hybrid": "this version does not make hybrid screens yet",
    "sweep": "a sweep file is no preset, and this version does not run sweeps yet",
}
"""Tables that are known by name and refused with a clear line."""

TITLE = TextField("the title of the job", 200)


def _plain_models() -> dict[str, type[Table]]:
    return {
        "sheet": SheetTable,
        "viewing": ViewingTable,
        "press": press_table(),
        "paper": PaperTable,
        "ink": InkTable,
        "overprint": OverprintTable,
        "waive": WaiveTable,
    }


@cache
def preset_model() -> type[Table]:
    """The whole preset as one model, for the JSON Schema."""
    fields: dict[str, Any] = {
        "patterngen": (Literal[1], Field(description="version of the preset's language")),
        "title": (Annotated[str, TITLE], Field()),
    }
    for name, table in TABLES.items():
        models = tuple(table.models(name).values())
        one: Any = models[0]
        if table.family:
            for model in models[1:]:
                one = one | model
            if len(models) > 1:
                one = Annotated[one, Field(discriminator="kind")]
        if table.many:
            one = Annotated[list[one], Field(min_length=int(table.needed), max_length=table.most)]
        fields[name] = (one, Field()) if table.needed else (one | None, Field(None))
    return create_model("Preset", __base__=Table, __doc__="One job of patterngen.", **fields)
