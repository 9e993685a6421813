"""What `find_beats` lists, how it grades it, and what balance it reports."""

from __future__ import annotations

import numpy as np
import pytest

from patterngen.errors import InputError
from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, Ink, Overprint, Press, SheetSize
from patterngen.model.verdict import BeatTable
from tests.superpositions import (
    PAPER,
    PROCESS_INKS,
    SHEET,
    PixelComb,
    beats_of,
    process_set,
    process_stack,
    row_of,
    screen,
    sharp_eye,
)

USUAL = (15.0, 75.0, 0.0, 45.0)
TONES = [(0.4, 0.4, 0.4, 0.25), (0.25, 0.25, 0.25, 0.1), (0.5, 0.5, 0.3, 0.3)]


def worst_far(table: BeatTable) -> tuple[float, float]:
    """Most visible from far (periods up to 1 mm, longer ones up to the sheet), as multiples of threshold."""
    real = table.period_mm < SHEET.diagonal_mm
    fine, far = table.period_mm <= 1.0, table.visibility_far
    return float(far[real & fine].max(initial=0.0)), float(far[real & ~fine].max(initial=0.0))


# Trial: orders up to four in all; here all orders, so that figures may be a little larger, never smaller.
TRIAL = {
    ((0.4, 0.4, 0.4, 0.25), 133): [(2.69, 0.43), (2.65, 9.17), (3.65, 12.6), (15.3, 0), (2.20, 6.38)],
    ((0.4, 0.4, 0.4, 0.25), 150): [(2.07, 0.41), (2.04, 9.97), (2.18, 11.9), (11.8, 0), (1.10, 5.67)],
    ((0.4, 0.4, 0.4, 0.25), 175): [(1.39, 0.39), (1.37, 11.0), (1.37, 10.7), (7.91, 0), (0.36, 4.73)],
    ((0.25, 0.25, 0.25, 0.1), 133): [(1.53, 0.09), (1.53, 2.04), (1.53, 2.81), (4.81, 0), (1.03, 3.67)],
    ((0.25, 0.25, 0.25, 0.1), 150): [(1.18, 0.09), (1.18, 2.22), (1.18, 2.64), (3.70, 0), (0.75, 3.26)],
    ((0.25, 0.25, 0.25, 0.1), 175): [(0.79, 0.08), (0.79, 2.44), (0.79, 2.38), (2.48, 0), (0.57, 2.72)],
    ((0.5, 0.5, 0.3, 0.3), 133): [(2.78, 0.04), (2.72, 13.8), (4.81, 19.0), (20.1, 0), (2.75, 6.53)],
    ((0.5, 0.5, 0.3, 0.3), 150): [(2.14, 0.04), (2.09, 15.0), (2.86, 17.8), (15.5, 0), (1.38, 5.80)],
    ((0.5, 0.5, 0.3, 0.3), 175): [(1.44, 0.04), (1.41, 16.5), (1.41, 16.1), (10.4, 0), (0.86, 4.84)],
}
CASES = [USUAL, (15.0, 75.0, 0.0, 46.0), (15.0, 75.0, 0.0, 50.0), (15.0, 75.0, 0.0, 30.0), (15.0, 75.0, 7.5, 45.0)]


@pytest.mark.parametrize(("tones", "lpi"), TRIAL, ids=str)
def test_calibration_on_practice(tones: tuple[float, ...], lpi: int) -> None:
    """second way: strongest beats from far, fine and coarse, of a trial with orders up to four."""
    for angles, (fine, coarse) in zip(CASES, TRIAL[tones, lpi], strict=True):
        table, _ = beats_of(process_set(angles, tones, lpi=lpi))
        found_fine, found_coarse = worst_far(table)
        # the trial joined its components as here; higher orders add up to some tenths
        assert found_fine >= fine * 0.99 - 0.01
        assert found_fine <= fine * 1.05 + 0.9
        assert found_coarse >= coarse * 0.99 - 0.01
        assert found_coarse <= coarse * 1.01 + (1.9 if angles == CASES[3] else 0.7)


@pytest.mark.parametrize("lpi", [133, 150, 175])
@pytest.mark.parametrize("tones", TONES, ids=str)
def test_what_practice_accepts_and_rejects(tones: tuple[float, ...], lpi: int) -> None:
    """common practice, no source: the usual set passes; one ink 1, 2, 5 degrees off and yellow at 7.5 do not."""

    def spoiled(*angles: float) -> bool:
        return "visible" in beats_of(process_set(angles, tones, lpi=lpi))[0].grade

    assert not spoiled(*USUAL)
    for off in (1.0, 2.0, 5.0):
        assert spoiled(15.0, 75.0, 0.0, 45.0 + off)
    assert spoiled(15.0, 75.0, 7.5, 45.0)
    if tones != TONES[1]:
        # in light tones two drawing inks 15 degrees apart stay below the limit
        assert spoiled(15.0, 75.0, 0.0, 30.0)


def test_balance_of_the_usual_set_moves_a_little_of_two_inks_on_one_angle_much() -> None:
    """second way: swings by CIEDE2000 of 0.7 to 5.9 for usual sets, 9 to 17 for two inks on one angle."""
    for tones in TONES:
        _, balance = beats_of(process_set(USUAL, tones, lpi=150))
        assert [set(group.names) for group in balance] == [{"C", "M", "K"}]
        assert 0.7 < balance[0].colour_swing < 5.9
    _, balance = beats_of(process_set((45.0, 45.0), (0.4, 0.4), lpi=150, names="CM"))
    assert len(balance) == 1
    assert 9 < balance[0].colour_swing < 17
    assert balance[0].exact
    assert {sum(map(abs, k)) for k in balance[0].orders.values()} == {1}


def test_press_reaches_more_of_the_swing_the_worse_its_register() -> None:
    """invariant: nothing at no register error, everything once shifts cover a cell, more in between."""
    swings = []
    for register in (0.0, 0.005, 0.02, 0.2):
        press = Press(register_mm=register, angle_error_deg=0.02)
        _, balance = beats_of(process_set(USUAL, TONES[0], lpi=150), press=press)
        swings.append(balance[0].colour_swing_register)
    assert swings[0] == 0.0
    assert swings == sorted(swings)
    assert swings[1] < 0.5 * balance[0].colour_swing
    assert swings[3] == pytest.approx(balance[0].colour_swing, rel=0.02)


def test_drift_needs_tolerances() -> None:
    """second way: exact balance stays; with 0.02 degrees free on three plates it drifts at 485.104 / 2 mm."""
    _, still = beats_of(process_set(USUAL, TONES[0], lpi=150))
    assert still[0].drift_period_mm == np.inf
    _, free = beats_of(process_set(USUAL, TONES[0], lpi=150), press=Press(angle_error_deg=0.02))
    assert free[0].drift_period_mm == pytest.approx(485.104 / 2, rel=1e-3)


def test_slower_than_the_sheet_is_balance_too() -> None:
    """invariant: 0.01 degrees off makes 970 mm, longer than the sheet, and stands in the table with its period."""
    angles = (15.01, 75.0, 0.0, 45.0)
    table, balance = beats_of(process_set(angles, TONES[0], lpi=150))
    assert len(balance) == 1
    assert not balance[0].exact
    assert 1 / np.hypot(*balance[0].frequency_per_mm) == pytest.approx(970.21, abs=0.01)
    rows = np.flatnonzero(table.period_mm > SHEET.diagonal_mm)
    assert len(rows) == 1
    assert table.colour_swing[rows[0]] == balance[0].colour_swing
    assert set(table.participants(int(rows[0]))) == {"C", "M", "K"}


def test_screens_of_one_ink_stand_on_one_plate() -> None:
    """invariant: two screens of one ink in exact balance cannot move against each other."""
    same = [
        screen("a", ink="K", ruling_per_mm=5.0, angle_deg=45.0, tone=0.3),
        screen("b", ink="K", ruling_per_mm=5.0, angle_deg=45.0, tone=0.3, origin_mm=(0.05, 0.0)),
    ]
    _, balance = beats_of(same)
    assert balance == ()


def test_register_phases_bound_contrast() -> None:
    """invariant: least and largest contrast over register hold the joined one between them."""
    table, _ = beats_of(process_set((15.0, 75.0, 0.0, 45.0), TONES[2], lpi=150))
    assert (table.contrast_min <= table.contrast).all()
    assert (table.contrast <= table.contrast_max).all()
    single = table.components == 1
    assert table.contrast_min[single] == pytest.approx(table.contrast[single], rel=1e-9)
    assert table.contrast_max[~single].min() > 0
    assert (table.contrast_max[~single] > 1.001 * table.contrast[~single]).any()


def test_contrast_over_register_is_what_shifts_make_of_it() -> None:
    """second way: the sum with phases at 400 shifts of the inks stays within the extremes and comes near."""
    screens = process_set((15.0, 75.0, 45.0), (0.5, 0.5, 0.4), lpi=150, names="CMK")
    table, _ = beats_of(screens, viewer=sharp_eye(2000.0))
    joined = np.flatnonzero((table.components >= 3) & (table.period_mm < 1.0))
    assert len(joined)
    row = int(joined[0])
    rng = np.random.default_rng(2)
    sums = []
    for _ in range(400):
        moved = process_set((15.0, 75.0, 45.0), (0.5, 0.5, 0.4), lpi=150, names="CMK")
        sums.append(_coherent(moved, table, row, rng.uniform(0, 1, (3, 2))))
    # the table leaves out components below its least contrast, the sum here those above order 9
    assert max(sums) <= table.contrast_max[row] + 1e-3
    assert min(sums) >= table.contrast_min[row] - 1e-3
    assert max(sums) > 0.95 * table.contrast_max[row]


def _coherent(screens: list, table: BeatTable, row: int, shifts_mm: np.ndarray) -> float:
    from tests.orders import combinations_by_order

    vectors = [s.frequencies_per_mm for s in screens]
    orders = combinations_by_order(vectors, total=9, f_max_per_mm=3.2)
    f = orders @ np.concatenate(vectors)
    target = table.frequency_per_mm[row]
    sign = np.where(np.hypot(*(f - target).T) < 1e-6, 1, np.where(np.hypot(*(f + target).T) < 1e-6, -1, 0))
    orders = (orders * sign[:, None])[sign != 0]
    orders = orders[(orders.reshape(len(orders), -1, 2) != 0).any(axis=2).sum(axis=1) >= 2]
    primaries = process_stack().primaries([s.ink for s in screens])[..., 1]
    tones = table.tones[row]
    total, mean = 0j, 0.0
    for inked in np.ndindex(primaries.shape):
        mean += primaries[inked] * np.prod([t if on else 1 - t for t, on in zip(tones, inked, strict=True)])
    for k in orders.reshape(len(orders), -1, 2):
        product, strength = 1 + 0j, 0.0
        for i, s in enumerate(screens):
            if k[i].any():
                c = s.coefficients(float(tones[i]), reach=9)[k[i][0] + 9, k[i][1] + 9]
                product *= c * np.exp(-2j * np.pi * float(k[i] @ s.frequencies_per_mm @ shifts_mm[i]))
        for inked in np.ndindex(primaries.shape):
            weight = 1.0
            for i, on in enumerate(inked):
                weight *= (1 if on else -1) if k[i].any() else (tones[i] if on else 1 - tones[i])
            strength += weight * primaries[inked]
        total += product * strength
    return float(2 * abs(total) / mean)


def test_yule_nielsen_is_the_first_order_of_the_power() -> None:
    """second way: contrast against a finite difference of N^n, N being the mean of the n-th roots."""
    n = 1.7
    screens = process_set((0.0, 15.0), (0.4, 0.25), lpi=150, names="CK")
    table, _ = beats_of(screens, colours=process_stack(yule_nielsen=n), viewer=sharp_eye(60.0))
    row = row_of(table, {"C": [1, 0], "K": [-1, 0]})
    assert row is not None
    root = process_stack().primaries(["C", "K"])[..., 1] ** (1 / n)
    t = np.array([0.4, 0.25])
    mean = (1 - t[0]) * ((1 - t[1]) * root[0, 0] + t[1] * root[0, 1]) + t[0] * (
        (1 - t[1]) * root[1, 0] + t[1] * root[1, 1]
    )
    difference = root[1, 1] - root[1, 0] - root[0, 1] + root[0, 0]
    c = [abs(s.coefficients(tone, reach=1)[2, 1]) for s, tone in zip(screens, t, strict=True)]
    small = 1e-6
    slope = ((mean + small) ** n - (mean - small) ** n) / (2 * small)
    assert table.mean[row, 1] == pytest.approx(mean**n, rel=1e-12)
    own = 2 * abs(table.amplitude[row, 1]) / table.mean[row, 1]
    assert own == pytest.approx(2 * c[0] * c[1] * abs(difference) * slope / mean**n, rel=1e-6)


def test_printed_tone_decides_and_plate_tone_is_named() -> None:
    """second way: gain of 16 % at half tone makes the beats of the tone 4 g t (1 - t) higher."""
    gained = [
        screen("C", ruling_per_mm=5.9, angle_deg=0.0, tone=0.4, gain=Gain(half_tone=0.16)),
        screen("K", ruling_per_mm=5.9, angle_deg=15.0, tone=0.25, gain=Gain(half_tone=0.16)),
    ]
    plain = [
        screen("C", ruling_per_mm=5.9, angle_deg=0.0, tone=0.4 + 0.64 * 0.24),
        screen("K", ruling_per_mm=5.9, angle_deg=15.0, tone=0.25 + 0.64 * 0.1875),
    ]
    with_gain, _ = beats_of(gained)
    without, _ = beats_of(plain)
    assert with_gain.contrast == pytest.approx(without.contrast, rel=1e-9)
    assert (with_gain.tones == [[0.4, 0.25]]).all()


def test_measured_overprint_changes_the_beat() -> None:
    """invariant: an overprint as light as its lighter ink halves nothing but the mixed difference."""
    screens = process_set((0.0, 15.0), (0.4, 0.4), lpi=150, names="CM")
    multiplied, _ = beats_of(screens, viewer=sharp_eye(60.0))
    like_cyan = process_stack(overprints=(Overprint(frozenset({"C", "M"}), (55.0, -37.0, -50.0)),))
    measured, _ = beats_of(screens, colours=like_cyan, viewer=sharp_eye(60.0))
    y = like_cyan.primaries(["C", "M"])[..., 1]
    product = process_stack().primaries(["C", "M"])[..., 1]
    row, other = (row_of(t, {"C": [1, 0], "M": [-1, 0]}) for t in (measured, multiplied))
    assert row is not None
    assert other is not None
    ratio = abs(measured.amplitude[row, 1]) / abs(multiplied.amplitude[other, 1])
    mixed = (y[1, 1] - y[1, 0] - y[0, 1] + y[0, 0]) / (product[1, 1] - product[1, 0] - product[0, 1] + product[0, 0])
    assert ratio == pytest.approx(abs(mixed), rel=1e-9)


def test_opaque_white_over_black_is_not_missed() -> None:
    """second way: a light opaque ink on a little black beats by the pair alone, though each alone does little."""
    from patterngen.colour.inks import InkStack

    white = Ink("White", (95.0, 0.0, -2.0), opaque=True)
    stack = InkStack(PAPER, (PROCESS_INKS[3], white))
    screens = [
        screen("K", ruling_per_mm=5.0, angle_deg=0.0, tone=0.02),
        screen("White", ruling_per_mm=5.0, angle_deg=8.0, tone=0.5),
    ]
    table, _ = beats_of(screens, colours=stack)
    row = row_of(table, {"K": [1, 0], "White": [-1, 0]})
    assert row is not None
    y = stack.primaries(["K", "White"])[..., 1]
    mixed = y[1, 1] - y[1, 0] - y[0, 1] + y[0, 0]
    mean = 0.98 * y[0, 0] + 0.02 * (0.5 * y[1, 0] + 0.5 * y[1, 1])
    c = [abs(s.coefficients(tone, reach=1)[2, 1]) for s, tone in zip(screens, (0.02, 0.5), strict=True)]
    assert table.contrast[row] == pytest.approx(2 * c[0] * c[1] * abs(mixed) / mean, rel=1e-3)


def test_inks_that_never_meet_do_not_beat() -> None:
    """invariant: two panels apart, or inks that never overprint, make nothing together."""
    left, right = Area((0.0, 0.0, 40.0, 60.0), label="left"), Area((50.0, 0.0, 90.0, 60.0), label="right")
    apart = [
        screen("C", ruling_per_mm=5.9, angle_deg=0.0, tone=0.4, area=left),
        screen("K", ruling_per_mm=5.9, angle_deg=15.0, tone=0.4, area=right),
    ]
    table, balance = beats_of(apart)
    assert len(table) == 0
    assert balance == ()
    meeting = process_set((0.0, 15.0), (0.4, 0.4), lpi=150, names="CK")
    assert len(beats_of(meeting)[0]) > 0
    never, _ = beats_of(meeting, overprints=[Overprint(frozenset({"C", "K"}), never=True)])
    assert len(never) == 0


def test_a_beat_longer_than_its_panel_is_none() -> None:
    """invariant: tones must hold over at least a period, so a 30 mm beat does not live on a 4 mm strip."""
    strip = Area((0.0, 0.0, 90.0, 4.0), label="strip")
    pair = [
        screen("C", ruling_per_mm=5.0, angle_deg=45.0, tone=0.4, area=strip),
        screen("K", ruling_per_mm=5.0 + 1 / 30, angle_deg=45.0, tone=0.4),
    ]
    table, _ = beats_of(pair)
    assert not (table.period_mm > 8.0).any()
    whole = [screen("C", ruling_per_mm=5.0, angle_deg=45.0, tone=0.4), pair[1]]
    assert (beats_of(whole)[0].period_mm > 29.0).any()


def test_pictures_are_judged_at_their_worst_tones() -> None:
    """invariant: a picture from white to black beats as hard as the worst even tone, to its rounding."""
    ramp = np.tile(np.linspace(0.0, 1.0, 300, dtype=np.float32), (200, 1))
    picture = ToneField(values=ramp, box_mm=(0.0, 0.0, 90.0, 60.0))
    pair = [
        screen("C", ruling_per_mm=5.9, angle_deg=0.0, tone=0.5),
        screen("K", ruling_per_mm=5.9, angle_deg=15.0, tone=picture),
    ]
    table, _ = beats_of(pair)
    row = row_of(table, {"C": [1, 0], "K": [-1, 0]})
    assert row is not None
    even = []
    for tone in np.linspace(0.05, 0.95, 37):
        t, _ = beats_of([pair[0], screen("K", ruling_per_mm=5.9, angle_deg=15.0, tone=float(tone))])
        r = row_of(t, {"C": [1, 0], "K": [-1, 0]})
        even.append(t.contrast[r] if r is not None else 0.0)
    # tones in steps of 1/32: less than 3 % off the peak, which is flat
    assert table.contrast[row] == pytest.approx(max(even), rel=0.03)
    assert 0.0 < table.tones[row, 1] < 1.0


def test_pixels_beat_with_a_screen() -> None:
    """second way: a screen of 5.9 /mm at 0 degrees on pixels of 23.5 /mm beats at 4 * 5.9 - 23.5 = 0.1 /mm."""
    dots = screen("K", ruling_per_mm=5.9, angle_deg=0.0, tone=0.3)
    table, _ = beats_of([dots], grids=[PixelComb("pixels", ruling_per_mm=23.5)])
    row = row_of(table, {"K": [4, 0], "pixels": [-1, 0]})
    assert row is not None
    assert table.period_mm[row] == pytest.approx(10.0, abs=1e-6)
    paper, solid = process_stack().primaries(["K"])[:, 1]
    c = abs(dots.coefficients(0.3, reach=4)[8, 4])
    mean = 0.7 * paper + 0.3 * solid
    pixel = np.sinc(0.1 / 23.5)
    assert table.contrast[row] == pytest.approx(2 * c * (paper - solid) / mean * pixel, rel=1e-6)


def test_two_sampling_grids_are_refused() -> None:
    """invariant: only one grid may sample the print."""
    combs = [PixelComb("a", ruling_per_mm=90.0), PixelComb("b", ruling_per_mm=40.0)]
    with pytest.raises(InputError, match="more than one grid samples"):
        beats_of([screen("K", ruling_per_mm=5.9, angle_deg=0.0, tone=0.3)], grids=combs)


def test_fewer_than_two_make_nothing() -> None:
    """invariant: an empty sheet and a single screen give an empty table with its bounds."""
    for screens in ([], process_set((45.0,), (0.4,), lpi=150, names="K")):
        table, balance = beats_of(screens)
        assert len(table) == 0
        assert balance == ()
        assert table.bound_visibility == 0.5
        assert table.tones.shape == (0, len(screens))


def test_solids_and_empty_screens_take_no_part() -> None:
    """invariant: a screen at 0 or 100 % has no structure."""
    for tone in (0.0, 1.0):
        table, balance = beats_of(process_set((0.0, 15.0), (0.4, tone), lpi=150, names="CK"))
        assert len(table) == 0
        assert balance == ()


def test_grades_and_order() -> None:
    """invariant: grades follow the limits in their order, rows the visibility from far."""
    table, _ = beats_of(process_set((15.0, 75.0, 0.0, 50.0), TONES[0], lpi=150))
    assert (np.diff(table.visibility_far) <= 0).all()
    limit = np.where(table.period_mm <= 1.0, 4.0, 1.0)
    for row, grade in enumerate(table.grade):
        far, near = table.visibility_far[row], table.visibility[row]
        expected = "visible" if far >= limit[row] else "unseen" if near < 1 and far < 1 else "texture"
        assert grade == expected
    assert set(table.grade) == {"visible", "texture", "unseen"}
    assert table.visibility == pytest.approx(table.contrast / table.threshold)


def test_slow_beats_carry_their_colour() -> None:
    """invariant: from 2 mm on the table says how far colour moves from crest to trough, above not."""
    table, _ = beats_of(process_set((15.0, 75.0, 0.0, 46.0), TONES[0], lpi=150))
    slow = table.period_mm >= 2.0
    assert slow.any()
    assert np.isfinite(table.colour_swing[slow]).all()
    assert np.isnan(table.colour_swing[~slow]).all()
    assert table.colour_swing[slow].max() > 1.0


def test_the_same_twice() -> None:
    """invariant: the same screens give the same table to the last bit."""
    first, _ = beats_of(process_set(USUAL, TONES[0], lpi=150))
    second, _ = beats_of(process_set(USUAL, TONES[0], lpi=150))
    for name in ("orders", "frequency_per_mm", "contrast", "contrast_min", "contrast_max", "colour_swing"):
        np.testing.assert_array_equal(getattr(first, name), getattr(second, name))


def test_a_small_sheet_keeps_its_slow_beats_apart() -> None:
    """invariant: on a sheet of 3 by 2 mm everything slower than its diagonal is balance."""
    sheet = SheetSize(3.0, 2.0)
    pair = [
        screen("C", ruling_per_mm=5.0, angle_deg=45.0, tone=0.4, sheet=sheet),
        screen("K", ruling_per_mm=5.1, angle_deg=45.0, tone=0.4, sheet=sheet),
    ]
    table, balance = beats_of(pair, sheet=sheet)
    assert len(balance) == 1
    assert (table.period_mm > sheet.diagonal_mm).sum() == 1
