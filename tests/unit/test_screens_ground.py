"""Placing and cutting: lattice rows against an outline with holes."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, ScreenRequest
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.shapes import Polygons, Stamps
from patterngen.screens import dots, lines
from patterngen.screens._ground import Ground, polygons
from patterngen.screens._steps import ToneSteps


def blob(count: int, *, radius_mm: float, centre_mm: tuple[float, float], seed: int) -> FloatArray:
    """A smooth closed outline with bays, counter-clockwise."""
    rng = np.random.default_rng(seed)
    turn = np.arange(count) / count * 2 * np.pi
    r = 1 + sum(rng.uniform(-0.12, 0.12) * np.cos(k * turn + rng.uniform(0, 6)) for k in (2, 3, 5, 9, 17))
    return np.stack([np.cos(turn), np.sin(turn)], 1) * r[:, None] * radius_mm + np.array(centre_mm)


def panel(outline: int, hole: int, *, size_mm: float) -> Area:
    ring = blob(outline, radius_mm=size_mm, centre_mm=(0, 0), seed=1)
    inner = blob(hole, radius_mm=0.3 * size_mm, centre_mm=(0.1 * size_mm, 0), seed=2)[::-1]
    low, high = ring.min(axis=0), ring.max(axis=0)
    return Area((low[0], low[1], high[0], high[1]), (ring, inner), "a blob with a hole")


def request(kind: str, area: Area, tone: ToneField, **more: object) -> ScreenRequest:
    fields: dict[str, object] = {
        "name": "a", "ink": "Slate", "kind": kind, "shape": None, "ruling_per_mm": 5.0, "angle_deg": 22.0,
        "tone": tone, "area": area, "origin_mm": (0.05, 0.02), "gain": Gain(),
    }  # fmt: skip
    return ScreenRequest(**{**fields, **more})  # type: ignore[arg-type]


@pytest.mark.parametrize("angle_deg", [0.0, 15.0, 45.0, 90.0])
def test_places_are_those_inside(angle_deg: float) -> None:
    """second way: shapely's contains and distance for every lattice place near the area, one by one."""
    area = panel(700, 90, size_mm=6.0)
    lattice = Lattice.square(pitch_mm=0.31, angle_deg=angle_deg, origin_mm=np.array([0.1, 0.2]))
    radius = 0.45
    inside, rim = Ground(area, lattice).places(radius)
    ij = np.stack(np.meshgrid(np.arange(-40, 41), np.arange(-40, 41), indexing="ij"), -1).reshape(-1, 2)
    xy = lattice.place(ij.astype(float))
    geometry = area.geometry()
    points = shapely.points(xy)
    distance = shapely.distance(geometry.boundary, points) / 0.31
    within = shapely.contains_xy(geometry, xy[:, 0], xy[:, 1])
    surely = {tuple(p) for p in inside.places().tolist()}
    maybe = {tuple(p) for p in rim.places().tolist()}
    assert not surely & maybe
    assert surely <= {tuple(p) for p in ij[within & (distance > radius)].tolist()}
    # none is lost: whatever a shape of that radius touches is in one or the other
    assert {tuple(p) for p in ij[within | (distance < radius)].tolist()} <= surely | maybe
    # and the rim is not much wider than it must be
    assert len(maybe) <= np.count_nonzero(distance < 1.04 * radius + 1e-6)


def test_vertices_on_rows() -> None:
    """invariant: a box whose sides run along the rows holds each place once."""
    lattice = Lattice.square(pitch_mm=1.0, angle_deg=0.0, origin_mm=np.zeros(2))
    inside, rim = Ground(Area((0.0, 0.0, 10.0, 7.0)), lattice).places(0.25)
    assert inside.count.sum() == 9 * 6
    places = np.concatenate([inside.places(), rim.places()])
    assert len(np.unique(places, axis=0)) == len(places) == 11 * 8


def test_cut_pieces_have_their_holes_turned() -> None:
    """invariant: outlines counter-clockwise, holes clockwise, rings open, nothing but polygons."""
    ring = shapely.Point(0, 0).buffer(1.0).difference(shapely.Point(0, 0).buffer(0.5))
    mixed = shapely.GeometryCollection([ring, shapely.LineString([(3, 3), (4, 4)])])
    columns = polygons(np.array([mixed, shapely.Polygon(), shapely.box(5, 5, 6, 6)]), Lattice.millimetres())
    assert columns.total == 2
    rings = list(columns.rings())
    turned = [shapely.LinearRing(r).is_ccw for r in rings]
    assert turned == [True, False, True]
    assert all(not np.array_equal(r[0], r[-1]) for r in rings)
    assert columns.shape_start.tolist() == [0, 2, 3]


def test_islands_in_holes() -> None:
    """second way: an outline in another's hole keeps its ink: 100 - 36 + 4."""
    square = np.array([[0.0, 0], [1, 0], [1, 1], [0, 1]])
    area = Area((0, 0, 10, 10), (square * 10, (square * 6 + 2)[::-1], square * 2 + 4))
    assert area.geometry().area == pytest.approx(68.0)
    assert area.area_mm2() == pytest.approx(68.0)
    inside = area.contains(np.array([1.0, 3.0, 5.0]), np.array([1.0, 3.0, 5.0]))
    assert inside.tolist() == [True, False, True]


def drawn_area(batches: list[Stamps | Polygons]) -> float:
    """Sum of all areas, for shapes that do not overlap."""
    total = 0.0
    for batch in batches:
        if isinstance(batch, Stamps):
            each = np.array([sum(c.area() for c in outline.contours) for outline in batch.outlines])
            total += float((each[batch.variety] * batch.count).sum()) * batch.lattice.cell_mm2
        else:
            signed = [_shoelace(r) for r in batch.rings()]
            total += sum(signed) * batch.frame.cell_mm2
    return total


def _shoelace(ring: FloatArray) -> float:
    x, y = ring[:, 0], ring[:, 1]
    return 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


@pytest.mark.parametrize("kind", ["dots", "lines"])
def test_many_vertices_cut_exactly(kind: str) -> None:
    """second way: the overlap of every whole shape with the area, by shapely in one piece, 5,000 and 500 vertices."""
    area = panel(5000, 500, size_mm=7.0)
    module = {"dots": dots, "lines": lines}[kind]
    screen = module.make(request(kind, area, ToneField(constant=0.3)))
    inked = drawn_area(list(screen.shapes()))
    everywhere = module.make(request(kind, Area((-12.0, -12.0, 12.0, 12.0)), ToneField(constant=0.3)))
    pieces = []
    for batch in everywhere.shapes():
        if isinstance(batch, Stamps):
            ij, variety = batch.expand()
            rings = [outline.contours[0].points(steps=64) for outline in batch.outlines]
            pieces += [shapely.Polygon(batch.lattice.place(rings[v] + p)) for p, v in zip(ij, variety, strict=True)]
        else:
            pieces += [shapely.Polygon(batch.frame.place(ring)) for ring in batch.rings()]
    expected = float(shapely.area(shapely.intersection(np.array(pieces), area.geometry())).sum())
    # chords: of the reference 3e-5, of the cut dots 4e-4 of their fifth of the ink
    assert inked == pytest.approx(expected, rel=2e-4 if kind == "dots" else 1e-9)
    # whole cells are exact; the rim's 600 cut cells of 0.04 mm2 vary by their place
    assert inked == pytest.approx(0.3 * area.area_mm2(), abs=0.25)


def test_nothing_and_everything() -> None:
    """invariant: tone 0 draws nothing, tone 1 the area itself."""
    area = panel(60, 20, size_mm=4.0)
    for kind, module in (("dots", dots), ("lines", lines)):
        assert list(module.make(request(kind, area, ToneField(constant=0.0))).shapes()) == []
        full = list(module.make(request(kind, area, ToneField(constant=1.0))).shapes())
        assert drawn_area(full) == pytest.approx(area.area_mm2(), rel=1e-12)


@pytest.mark.parametrize("kind", ["dots", "lines"])
def test_area_smaller_than_a_cell(kind: str) -> None:
    """second way: `covers` over an area that holds no lattice place; 250,000 samples, straight edges."""
    area = Area((0.11, 0.08, 0.21, 0.2))
    module = {"dots": dots, "lines": lines}[kind]
    screen = module.make(request(kind, area, ToneField(constant=0.6)))
    at = (np.arange(500) + 0.5) / 500
    x, y = np.meshgrid(0.11 + 0.1 * at, 0.08 + 0.12 * at)
    expected = float(screen.covers(x, y).mean()) * 0.012
    assert drawn_area(list(screen.shapes())) == pytest.approx(expected, abs=0.012 * 3e-3)


def test_runs_hold_equal_neighbours() -> None:
    """invariant: an even tint is one run a row and stretch; a picture's runs hold one tone step each."""
    area = Area((0.0, 0.0, 20.0, 20.0))
    even = next(iter(dots.make(request("dots", area, ToneField(constant=0.3))).shapes()))
    assert isinstance(even, Stamps)
    assert len(even.count) < 160
    ramp = ToneField(values=np.tile(np.linspace(0.2, 0.8, 100, dtype=np.float32), (100, 1)), box_mm=area.box_mm)
    screen = dots.make(request("dots", area, ramp))
    for batch in screen.shapes():
        if isinstance(batch, Stamps):
            ij, variety = batch.expand()
            xy = batch.lattice.place(ij)
            wanted = screen.tone.at(xy[:, 0], xy[:, 1], size_mm=0.2)
            tones = np.array([outline.tone for outline in batch.outlines])[variety]
            # half a step of 1/512
            assert np.abs(tones - wanted).max() <= 0.5 / 512 + 1e-9


@pytest.mark.parametrize("pitch_um", [60.0, 169.3, 2500.0])
def test_tone_steps(pitch_um: float) -> None:
    """second way: neighbouring steps differ by at most 1/512, and 1 um of disc diameter, inked or clear."""
    steps = ToneSteps(pitch_um=pitch_um)
    tones = steps.tones(np.arange(steps.count + 1))
    assert tones[0] == 0.0
    assert tones[-1] == 1.0
    assert np.all(np.diff(tones) > 0)
    assert np.diff(tones).max() <= 1 / 512 + 1e-12
    half = tones[tones <= 0.5]
    assert np.diff(2 * pitch_um * np.sqrt(half / np.pi)).max() <= 1.0 + 1e-9
    assert np.allclose(tones + tones[::-1], 1.0)
    drawn = (tones == 0.0) | (tones == 1.0) | ((tones > 1e-5) & (tones < 1 - 1e-5))
    assert np.array_equal(steps.nearest(tones)[drawn], np.arange(steps.count + 1)[drawn])


def test_same_request_same_shapes() -> None:
    """invariant: two runs give the same bytes."""
    area = panel(300, 50, size_mm=5.0)
    ramp = ToneField(values=np.linspace(0, 1, 2500, dtype=np.float32).reshape(50, 50), box_mm=area.box_mm)
    for kind, module in (("dots", dots), ("lines", lines)):
        runs = [list(module.make(request(kind, area, ramp)).shapes()) for _ in range(2)]
        for first, second in zip(*runs, strict=True):
            assert type(first) is type(second)
            if isinstance(first, Stamps):
                assert first.first.tobytes() == second.first.tobytes()
                assert first.variety.tobytes() == second.variety.tobytes()
            else:
                assert first.uv.tobytes() == second.uv.tobytes()
