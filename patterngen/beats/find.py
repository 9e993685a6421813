"""Finds every beat that could matter, says how strong the rest can be, and how balance moves colour."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from patterngen.beats._balance import balances
from patterngen.beats._families import with_families
from patterngen.beats._joined import JoinedBeats, join
from patterngen.beats._search import search
from patterngen.beats._superposition import Superposition, ToneRows, michelson
from patterngen.beats._tiers import LISTED_FAR, LISTED_NEAR
from patterngen.model.job import Overprint, Press, SheetSize
from patterngen.model.screen import Grid, Screen
from patterngen.model.seeing import InkColours, Viewer
from patterngen.model.verdict import Balance, BeatTable, Grade

_STILL_PER_MM = 1e-9
"""Frequencies below this are zero."""


def find_beats(
    *, screens: Sequence[Screen], grids: Sequence[Grid], colours: InkColours, viewer: Viewer,
    sheet: SheetSize, press: Press, overprints: Sequence[Overprint], shadow: float = 0.0,
) -> tuple[BeatTable, tuple[Balance, ...]]:  # fmt: skip
    """Every listed beat of two or more screens or grids, of any order, and every balance.

    `screens` print (their gain and tones are asked of them), `grids` multiply the print; one
    grid may sample it.  A combination is listed from half the threshold at the reading
    distance or a tenth of the limit at the far one, a slow one also from 1 CIEDE2000 between
    crest and trough.  Combinations with orders beyond those that were worked out are bounded
    by the decay of the coefficients (to cancel they need partners of like length), and the
    bounds stand in the table.  A sampling grid cancels any length, so with one the bound is
    weaker.  A period longer than the sheet's diagonal is balance: a `Balance`, and one row of
    the table whose contrast is that of the mean.  Tones whose mean luminance is below `shadow`
    (share of the paper's) count less in proportion in the `judged` columns.

    Raises `InputError` when more than one grid samples.

    Sources: Neugebauer 1937 with Demichel's weights; combinations of orders as in Amidror,
    The Theory of the Moire Phenomenon, volume I, chapter 2.
    """
    # of one screen alone, a picture perhaps, it need not be known where its tones hold
    alone = len(screens) + len(grids) < 2
    rows = ToneRows.blank(len(screens)) if alone else ToneRows.of(screens, overprints, sheet)
    over = Superposition(screens, grids, colours, rows, shadow=shadow)
    bounds = (LISTED_NEAR, LISTED_FAR * viewer.limit, LISTED_FAR * viewer.limit_coarse)
    beats = JoinedBeats.none(over)
    found: tuple[Balance, ...] = ()
    if over.participants >= 2 and len(over.rows.plate):
        result = search(over, viewer, diagonal_mm=sheet.diagonal_mm)
        bounds = (result.bound_near, result.bound_far, result.bound_far_coarse)
        hits = with_families(over, result.hits, viewer)
        speed = np.hypot(hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1])
        slowest = 1.0 / sheet.diagonal_mm
        beats = join(over, hits.take(speed >= slowest), viewer, tolerance_per_mm=0.1 * slowest)
        slow, found = balances(over, hits.take(speed < slowest), press, slowest_per_mm=slowest)
        beats = beats.with_more(slow)
    return _table(over, beats, viewer, bounds), found


def _table(
    over: Superposition, beats: JoinedBeats, viewer: Viewer, bounds: tuple[float, float, float]
) -> BeatTable:
    """The beats as the eye has them, most visible from far first."""
    speed = np.hypot(beats.frequency_per_mm[:, 0], beats.frequency_per_mm[:, 1])
    contrast = michelson(beats.power[:, 1], beats.mean[:, 1])
    # what does not vary over the sheet is no pattern: models that do not fall to 0 there are not asked
    varies = speed > _STILL_PER_MM
    near = np.where(varies, viewer.sensitivity_near(speed), 0.0)
    far = np.where(varies, viewer.sensitivity_far(speed), 0.0)
    with np.errstate(divide="ignore", over="ignore"):
        threshold = 1.0 / near
    visibility, visibility_far = contrast * near, contrast * far
    order = np.lexsort((-visibility, -visibility_far))
    limits = viewer.limit_at(speed)
    return BeatTable(
        slots=over.slots,
        orders=beats.orders[order],
        frequency_per_mm=beats.frequency_per_mm[order],
        amplitude=beats.amplitude[order],
        power=beats.power[order],
        mean=beats.mean[order],
        contrast=contrast[order],
        # a root of squares and a sum of moduli of one component may differ in their last digit
        contrast_min=np.minimum(beats.contrast_min, contrast)[order],
        contrast_max=np.maximum(beats.contrast_max, contrast)[order],
        threshold=threshold[order],
        visibility=visibility[order],
        visibility_far=visibility_far[order],
        components=beats.components[order],
        tones=beats.tones[order],
        colour_swing=beats.colour_swing[order],
        visibility_far_judged=(beats.contrast_judged * far)[order],
        colour_swing_judged=beats.colour_swing_judged[order],
        grade=tuple(_grade(float(visibility[i]), float(visibility_far[i]), float(limits[i])) for i in order),
        bound_visibility=bounds[0],
        bound_visibility_far=bounds[1],
        bound_visibility_far_coarse=bounds[2],
    )


def _grade(visibility: float, visibility_far: float, limit: float) -> Grade:
    if visibility_far >= limit:
        return "visible"
    return "unseen" if visibility < 1.0 and visibility_far < 1.0 else "texture"
