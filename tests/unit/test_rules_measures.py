"""invariant: what each rule measures, on designs made by hand whose figures are plain geometry."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from patterngen import registry
from patterngen.model.area import Area, ToneField
from patterngen.model.design import Design, Layer, Sheet
from patterngen.model.evidence import Evidence
from patterngen.model.job import Gain, Ink, Job, Press, ScreenRequest, SheetSize, Viewing
from patterngen.model.lattice import FloatArray, direction
from patterngen.model.screen import Screen
from patterngen.model.verdict import Balance, BeatTable, Finding
from patterngen.rules import _engine, _limits
from patterngen.rules._examples import INKS

LPI_150 = 150 / 25.4


class MadeScreen(Screen):
    """Only what a rule looks at: directions, ruling, tone, and widths as of a square dot or a line."""

    def __init__(
        self,
        ink: str,
        angle_deg: float,
        *,
        kind: str = "dots",
        tone: ToneField | None = None,
        ruling_per_mm: float = LPI_150,
        symmetry_deg: float = 90.0,
    ) -> None:
        self.name, self.ink, self.kind = ink.lower(), ink, kind
        self.angle_deg, self.ruling_per_mm, self.symmetry_deg = angle_deg, ruling_per_mm, symmetry_deg
        self.shape, self.origin_mm, self.area = "square", np.zeros(2), Area((0, 0, 30, 20))
        self.tone = tone or ToneField(constant=0.4)
        turned = ruling_per_mm * direction(angle_deg + 90.0)[None, :]
        along = ruling_per_mm * direction(angle_deg)[None, :]
        self.frequencies_per_mm = turned if kind == "lines" else np.concatenate([along, turned])

    def smallest_mm(self, tone: float) -> tuple[float, float]:
        pitch = 1.0 / self.ruling_per_mm
        if self.kind == "lines":
            return pitch * tone, pitch * (1 - tone)
        return pitch * math.sqrt(tone), pitch * (1 - math.sqrt(tone))

    def printed_tone(self, tone: FloatArray | float) -> FloatArray:
        return np.asarray(tone, dtype=float)

    def coefficients(self, tone: float, *, reach: int) -> Any:
        raise NotImplementedError

    def tail(self, tone: float, *, radius: float) -> float:
        raise NotImplementedError

    def edge_per_mm(self, tone: float) -> float:
        raise NotImplementedError

    def shapes(self) -> Iterator[Any]:
        raise NotImplementedError

    def covers(self, x_mm: FloatArray, y_mm: FloatArray) -> Any:
        raise NotImplementedError


def no_beats(slots: tuple[tuple[str, int], ...]) -> BeatTable:
    return beats(slots, [])


def beats(slots: tuple[tuple[str, int], ...], rows: list[Mapping[str, Any]]) -> BeatTable:
    """A table from rows with orders, frequency, visibility_far, grade and colour_swing."""
    n = len(rows)

    def column(key: str, empty: float = 0.0) -> FloatArray:
        return np.array([row.get(key, empty) for row in rows], dtype=float)

    zero = np.zeros(n)
    return BeatTable(
        slots=slots,
        orders=np.array([row["orders"] for row in rows], dtype=np.int32).reshape(
            n, sum(size for _, size in slots)
        ),
        frequency_per_mm=np.array([row["frequency"] for row in rows], dtype=float).reshape(n, 2),
        amplitude=np.zeros((n, 3), dtype=complex),
        power=np.zeros((n, 3)),
        mean=np.zeros((n, 3)),
        contrast=zero,
        contrast_min=zero,
        contrast_max=zero,
        threshold=zero,
        visibility=zero,
        visibility_far=column("far"),
        components=np.ones(n, dtype=np.int32),
        tones=np.zeros((n, len(slots))),
        colour_swing=column("swing", math.nan),
        visibility_far_judged=np.array([row.get("judged", row.get("far", 0.0)) for row in rows], dtype=float),
        colour_swing_judged=column("swing", math.nan),
        grade=tuple(row.get("grade", "texture") for row in rows),
        bound_visibility=0.1,
        bound_visibility_far=0.05,
        bound_visibility_far_coarse=0.05,
    )


def evidence(*screens: MadeScreen, press: Press | None = None, **changes: Any) -> Evidence:
    """Evidence about screens that all print over the whole sheet."""
    press = press or Press(process="sheetfed-offset")
    inks = tuple(dict.fromkeys(screen.ink for screen in screens))
    requests = tuple(
        ScreenRequest(
            s.name, s.ink, s.kind, s.shape, s.ruling_per_mm, s.angle_deg, s.tone, s.area, (0, 0), Gain()
        )
        for s in screens
    )
    job = Job(
        name="tile",
        title="Fennick & Oake, test tile",
        text="",
        folder=None,
        sheet=SheetSize(30.0, 20.0),
        viewing=Viewing(),
        press=press,
        paper_lab=(95.0, 0.0, -2.0),
        inks=tuple(Ink(name, tuple(INKS[name])) for name in inks),  # type: ignore[arg-type]
        overprints=(),
        screens=requests,
        **changes.pop("job", {}),
    )
    layers = tuple(Layer(job.ink(ink), tuple(s for s in screens if s.ink == ink)) for ink in inks)
    tones = np.array([[s.tone.constant if s.tone.constant is not None else 0.5 for s in screens]])
    base: dict[str, Any] = {
        "design": Design(job, Sheet(layers)),
        "beats": no_beats(tuple((s.name, len(s.frequencies_per_mm)) for s in screens)),
        "balance": (),
        "limits": _limits.in_force(job),
        "tones_together": tones,
        "luminance": {},
        "paper_y": 0.876,
        "most_ink": float(tones.sum()),
        "heaviest": tones[0],
        "tone_extremes": {
            s.name: (s.tone.constant, s.tone.constant) if s.tone.constant is not None else (0.002, 0.998)
            for s in screens
        },
        "shapes_drawn": {s.name: 100 for s in screens},
    }
    return Evidence(**{**base, **changes})


def found(rule: str, about: Evidence) -> list[Finding]:
    return [_engine.finding_of(rule, m) for m in registry.load(_engine.PACKAGE, rule).measure(about)]


def only(rule: str, about: Evidence) -> Finding:
    (finding,) = found(rule, about)
    return finding


def flat(tone: float) -> ToneField:
    return ToneField(constant=tone)


PICTURE = ToneField(values=np.full((2, 2), 0.5, dtype=np.float32), box_mm=(0, 0, 30, 20))


# ---------------------------------------------------------------- beats


def band(angle_deg: float, period_mm: float, **more: Any) -> dict[str, Any]:
    """A row whose bands run at `angle_deg`."""
    fx, fy = direction(angle_deg + 90.0) / period_mm
    return {"orders": [1, 0, -1, 0], "frequency": (fx, fy), "grade": "visible", "far": 2.1, **more}


def pair(*rows: Mapping[str, Any], **changes: Any) -> Evidence:
    table = beats((("magenta", 2), ("black", 2)), list(rows))
    return evidence(MadeScreen("Magenta", 70.0), MadeScreen("Black", 45.0), beats=table, **changes)


def test_a_visible_beat_is_told_in_words() -> None:
    finding = only("beats-visible", pair(band(38.0, 3.6)))
    assert finding.status == "fail"
    assert (finding.measured, finding.limit, finding.margin) == (2.1, 1.0, pytest.approx(-1.1))
    assert finding.message.startswith(
        "magenta and black make bands 3.6 mm wide, running at 38 degrees, 2.1 times over the limit (at "
    )
    assert "They stand 25 degrees apart" in finding.message


def test_short_periods_have_the_other_limit() -> None:
    finding = only("beats-visible", pair(band(38.0, 0.8, far=6.0)))
    assert (finding.limit, finding.measured) == (4.0, 6.0)
    assert "1.5 times over the limit" in finding.message


def test_the_same_pattern_crosswise_is_one_finding() -> None:
    crossed = band(128.0, 3.6) | {"orders": [0, 1, 0, -1]}
    finding = only("beats-visible", pair(band(38.0, 3.6), crossed))
    assert "running at 38 degrees and 128 degrees" in finding.message


def test_bands_along_the_edge_run_at_zero_and_never_at_180() -> None:
    assert "running at 0 degrees" in only("beats-visible", pair(band(179.99, 3.6))).message


def test_calm_beats_pass_with_the_strongest_named_and_the_rest_bounded() -> None:
    calm = [band(38.0, 0.5, far=2.0, grade="texture"), band(10.0, 3.0, far=0.2, grade="texture")]
    strongest, fine, coarse = found("beats-visible", pair(*calm))
    assert (strongest.status, strongest.measured, strongest.margin) == ("pass", 2.0, 2.0)
    assert (fine.status, fine.measured, fine.limit) == ("pass", 0.05, 4.0)
    assert (coarse.status, coarse.measured, coarse.limit) == ("pass", 0.05, 1.0)


def test_a_beat_that_only_shadows_make_strong_warns() -> None:
    finding = only("beats-visible", pair(band(38.0, 3.6, judged=0.8)))
    assert (finding.status, finding.measured, finding.limit) == ("warn", 2.1, 1.0)
    assert "count less in proportion" in finding.message
    assert only("beats-visible", pair(band(38.0, 3.6, judged=1.2))).status == "fail"


def test_beats_slower_than_the_sheet_are_left_to_the_drift_rule() -> None:
    assert all(f.status == "pass" for f in found("beats-visible", pair(band(38.0, 40.0, far=9.0))))


def test_a_grid_that_takes_part_is_not_to_be_turned() -> None:
    class Pixels:
        name = "imager"

    about = pair()
    slots = (("magenta", 2), ("black", 2), ("imager", 2))
    table = beats(slots, [band(38.0, 3.6, orders=[1, 0, 0, 0, 1, 0])])
    about = replace(about, beats=table, design=replace(about.design, grids=(Pixels(),)))
    message = only("beats-visible", about).message
    assert "magenta and imager make bands" in message
    assert "turn magenta by 7.5 degrees" in message


def test_one_screen_alone_cannot_beat() -> None:
    assert found("beats-visible", evidence(MadeScreen("Black", 45.0))) == []


def balance(swing: float, **more: Any) -> Balance:
    base: dict[str, Any] = {
        "names": ("cyan", "magenta", "black"),
        "orders": {},
        "frequency_per_mm": (0.0, 0.0),
        "exact": True,
        "drift_period_mm": 477.4,
        "lab_low": (60, 0, 0),
        "lab_high": (63, 0, 0),
        "mean_y": (0.21, 0.22, 0.24),
        "colour_swing": swing,
        "colour_swing_register": 0.8 * swing,
        "colour_swing_judged": swing,
        "tones": {},
        **more,
    }
    return Balance(**base)


@pytest.mark.parametrize(("swing", "status", "limit"), [(2.9, "pass", 3), (4.2, "warn", 3), (9.0, "fail", 6)])
def test_balance_warns_at_three_and_fails_at_six(swing: float, status: str, limit: float) -> None:
    press = Press(process="sheetfed-offset", register_mm=0.05)
    finding = only("balance-drift", pair(balance=(balance(swing),), press=press))
    assert (finding.status, finding.limit, finding.unit) == (status, limit, "CIEDE2000")
    assert "dot-centred against clear-centred" in finding.message
    assert "477 mm" in finding.message
    assert "infinite" not in finding.message
    assert "50 um" in finding.message


def test_balance_without_tolerances_asks_for_them_and_knows_no_infinite_period() -> None:
    finding = only("balance-drift", pair(balance=(balance(4.2, drift_period_mm=math.inf),)))
    assert "angle_error" in finding.message
    assert "inf" not in finding.message


def test_two_inks_in_balance_are_dot_on_dot() -> None:
    two = balance(9.0, names=("magenta", "black"), exact=False, frequency_per_mm=(0.01, 0.0))
    message = only("balance-drift", pair(balance=(two,))).message
    assert "dot beside dot against dot on dot" in message
    assert "waves of 100 mm" in message


def test_long_beats_in_colour_are_drift_too() -> None:
    finding = only("balance-drift", pair(band(38.0, 9.7, swing=3.4, grade="texture")))
    assert (finding.status, finding.measured) == ("warn", 3.4)
    assert "waves 9.7 mm long" in finding.message


def test_shading_both_ways_is_one_finding_and_what_outlasts_the_sheet_is_left_to_balance() -> None:
    crossed = band(128.0, 9.7, swing=3.4) | {"orders": [0, 1, 0, -1]}
    slow = band(0.0, 40.0, swing=8.0)
    assert only("balance-drift", pair(band(38.0, 9.7, swing=3.4), crossed, slow)).measured == 3.4


def test_two_inks_of_first_order_share_angle_and_ruling() -> None:
    two = balance(9.0, names=("magenta", "black"), orders={"magenta": [1, 0], "black": [-1, 0]})
    assert (
        "magenta and black share one angle and ruling" in only("balance-drift", pair(balance=(two,))).message
    )


def test_no_balance_is_measured_as_none() -> None:
    finding = only("balance-drift", pair())
    assert (finding.status, finding.measured, finding.margin) == ("pass", 0.0, 3.0)


# ---------------------------------------------------------------- angles


@pytest.mark.parametrize(
    ("a_deg", "b_deg", "apart"),
    [(15, 75, 30), (15, 45, 30), (0, 75, 15), (45, 135, 0), (10, 100.4, 0.4), (14.93, 45.0, 30.07)],
)
def test_dots_are_compared_modulo_ninety(a_deg: float, b_deg: float, apart: float) -> None:
    about = evidence(MadeScreen("Cyan", a_deg), MadeScreen("Black", b_deg), MadeScreen("Yellow", 22.0))
    finding = next(f for f in found("angles-too-close", about) if "yellow" not in f.where)
    assert finding.measured == pytest.approx(apart, abs=1e-9)
    assert finding.status == ("pass" if apart >= 30 else "warn")


def test_the_lightest_ink_needs_fifteen() -> None:
    about = evidence(MadeScreen("Cyan", 15.0), MadeScreen("Yellow", 0.0), MadeScreen("Black", 45.0))
    by_pair = {f.where: f for f in found("angles-too-close", about)}
    assert by_pair["cyan and yellow"].limit == 15.0
    assert by_pair["cyan and black"].limit == 30.0
    assert {f.status for f in by_pair.values()} == {"pass"}


def test_line_screens_are_compared_modulo_180() -> None:
    about = evidence(MadeScreen("Cyan", 10.0, kind="lines"), MadeScreen("Black", 100.0, kind="lines"))
    assert only("angles-too-close", about).measured == 90.0


def test_inks_that_never_meet_and_solids_are_not_compared() -> None:
    screens = (MadeScreen("Cyan", 15.0), MadeScreen("Black", 20.0))
    assert (
        found("angles-too-close", evidence(*screens, tones_together=np.array([[0.4, 0.0], [0.0, 0.4]]))) == []
    )
    assert found("angles-too-close", evidence(*screens, tones_together=np.array([[0.4, 1.0]]))) == []


def test_rulings_far_apart_are_not_compared() -> None:
    about = evidence(MadeScreen("Cyan", 15.0), MadeScreen("Black", 20.0, ruling_per_mm=1.4 * LPI_150))
    assert found("angles-too-close", about) == []


@pytest.mark.parametrize(
    ("angle_deg", "apart", "status"), [(75, 60, "pass"), (135, 60, "pass"), (45, 30, "warn")]
)
def test_axis_dots_are_counted_over_the_half_turn(angle_deg: float, apart: float, status: str) -> None:
    about = evidence(
        MadeScreen("Cyan", 15.0, symmetry_deg=180.0),
        MadeScreen("Black", angle_deg, symmetry_deg=180.0),
        MadeScreen("Yellow", 105.0),
    )
    finding = only("axis-dots-too-close", about)
    assert (finding.measured, finding.status, finding.limit) == (apart, status, 60.0)
    assert finding.source.standing == "from memory"


def test_a_tint_on_a_taken_angle_is_told_which_are_free() -> None:
    about = evidence(MadeScreen("Black", 45.0, tone=PICTURE), MadeScreen("Orange", 45.0))
    finding = only("angle-already-taken", about)
    assert (finding.where, finding.measured, finding.status) == ("orange", 0.0, "warn")
    assert "Free, far enough from all it meets: 0, 15 and 75." in finding.message


# ---------------------------------------------------------------- dots, lines, tones, ink


def test_smallest_dot_and_gap() -> None:
    dot, gap = found("dot-too-small", evidence(MadeScreen("Black", 45.0, tone=flat(0.01))))
    assert dot.measured == pytest.approx(25.4 / 150 * 0.1)
    assert (dot.status, gap.status) == ("warn", "pass")
    assert "17 um" in dot.message


def test_lines_warn_below_the_advised_width_and_fail_below_the_least() -> None:
    def line(tone: float) -> Finding:
        return found("line-too-fine", evidence(MadeScreen("Black", 45.0, kind="lines", tone=flat(tone))))[0]

    assert [line(t).status for t in (0.1, 0.2, 0.3)] == ["fail", "warn", "pass"]
    assert line(0.2).source.standing == "common practice"
    assert line(0.1).source.standing == "published"
    fading = found("line-too-fine", evidence(MadeScreen("Black", 45.0, kind="lines", tone=PICTURE)))
    assert [finding.status for finding in fading] == ["warn", "warn"]
    assert found("line-too-fine", evidence(MadeScreen("Black", 45.0))) == []


def test_gaps_between_lines() -> None:
    about = evidence(MadeScreen("Black", 45.0, kind="lines", tone=flat(0.8)))
    assert found("line-too-fine", about)[1].status == "warn"


def test_a_tint_outside_the_range_fails_and_a_picture_warns() -> None:
    low, high = found("tone-out-of-range", evidence(MadeScreen("Black", 45.0, tone=flat(0.005))))
    assert (low.status, high.status) == ("fail", "pass")
    assert [
        f.status for f in found("tone-out-of-range", evidence(MadeScreen("Black", 45.0, tone=PICTURE)))
    ] == ["warn"] * 2
    assert found("tone-out-of-range", evidence(MadeScreen("Black", 45.0, tone=flat(1.0)))) == []


def test_total_ink_takes_the_worst_place_and_the_printed_tone() -> None:
    screens = (MadeScreen("Cyan", 15.0), MadeScreen("Black", 45.0))
    press = Press(process="web-offset")
    about = evidence(*screens, most_ink=1.85, heaviest=np.array([0.9, 0.95]), press=press)
    finding = only("total-ink-too-high", about)
    assert finding.measured == pytest.approx(1.85)
    assert "cyan 90 % and black 95 % make 185 % in print" in finding.message
    exact = {**about.limits, "total_ink": _limits.own_limit("total_ink", 1.85)}
    assert only("total-ink-too-high", replace(about, limits=exact)).status == "pass"
    own = {**about.limits, "total_ink": _limits.own_limit("total_ink", 1.8)}
    assert only("total-ink-too-high", replace(about, limits=own)).status == "fail"


@pytest.mark.parametrize(
    ("process", "dpi", "steps", "status"),
    [
        ("sheetfed-offset", 2400, 257, "pass"),
        ("sheetfed-offset", 1200, 65, "warn"),
        ("metal-decoration", 1200, 65, "fail"),
    ],
)
def test_tone_steps(process: str, dpi: float, steps: float, status: str) -> None:
    """published (aim-dtp.net, Printing halftones, excerpt): 2400/150 = 257 grey levels, 1200/150 = 65."""
    press = Press(process=process, imager_per_mm=dpi / 25.4)
    finding = only("tone-steps-too-few", evidence(MadeScreen("Black", 45.0), press=press))
    assert finding.measured == pytest.approx(steps)
    assert finding.status == status


def test_rulings_outside_everyday_use_warn_at_the_nearer_end() -> None:
    def ruling(per_cm: float) -> Finding:
        screen = MadeScreen("Black", 45.0, ruling_per_mm=per_cm / 10)
        return only("ruling-out-of-range", evidence(screen, press=Press(process="metal-decoration")))

    assert [ruling(r).status for r in (40, 48, 60, 80, 90)] == ["warn", "pass", "pass", "pass", "warn"]
    assert (ruling(40).limit, ruling(90).limit) == (pytest.approx(4.8), pytest.approx(8.0))


def test_a_register_better_than_the_process_is_not_believed() -> None:
    def stated(register_mm: float) -> Finding:
        press = Press(process="web-offset", register_mm=register_mm)
        return only("register-hopeful", evidence(MadeScreen("Black", 45.0), press=press))

    assert [stated(r).status for r in (0.0, 0.02, 0.1)] == ["not-applicable", "warn", "pass"]


@pytest.mark.parametrize(
    "rule",
    ["dot-too-small", "line-too-fine", "tone-out-of-range", "total-ink-too-high", "ruling-out-of-range"],
)
def test_without_a_process_rules_that_need_one_say_so(rule: str) -> None:
    kind = "lines" if rule == "line-too-fine" else "dots"
    press = Press(register_mm=0.1, imager_per_mm=2400 / 25.4)
    for finding in found(rule, evidence(MadeScreen("Black", 45.0, kind=kind), press=press)):
        assert finding.status == "not-applicable"
        assert "[press]" in finding.message


def test_an_empty_area_fails_and_an_uncounted_one_counts_its_cells() -> None:
    screen = MadeScreen("Black", 45.0)
    drawn = [only("area-without-shapes", evidence(screen, shapes_drawn={"black": n})) for n in (0, 1, None)]
    assert [finding.status for finding in drawn] == ["fail", "pass", "pass"]
    assert drawn[2].measured == pytest.approx(30 * 20 * LPI_150**2)
    screen.area = Area((0, 0, 0.1, 0.1))
    assert only("area-without-shapes", evidence(screen, shapes_drawn={"black": None})).status == "warn"


def test_remarks_become_warnings() -> None:
    screen = MadeScreen("Black", 45.0)
    assert only("input-odd", evidence(screen)).status == "pass"
    two = found("input-odd", evidence(screen, job={"remarks": ("one thing", "another thing")}))
    assert [(f.status, f.message) for f in two] == [("warn", "one thing."), ("warn", "another thing.")]


# ---------------------------------------------------------------- the eye


def test_beats_outside_the_published_range_of_the_eye_are_told() -> None:
    about = pair(band(38.0, 20.0, far=0.5), eye_valid_cpd=(1.0, 60.0))
    low, high = found("eye-out-of-range", about)
    assert low.measured == pytest.approx(700 * math.pi / 180 / 20.0, rel=1e-3)
    assert (low.status, high.status) == ("warn", "pass")


def test_an_eye_without_light_says_not_applicable() -> None:
    job = {"origin": {"viewing.light": "preset"}}
    about = pair(band(38.0, 2.0), eye_valid_cpd=(1.0, 60.0), eye_takes_light=False, job=job)
    first = found("eye-out-of-range", about)[0]
    assert first.status == "not-applicable"
    assert "luminance" in first.message


def test_an_eye_of_unknown_range_is_not_judged() -> None:
    assert only("eye-out-of-range", pair(band(38.0, 2.0))).status == "not-applicable"


# ---------------------------------------------------------------- all of them


def test_every_rule_runs_on_a_plain_design_and_never_fails_it() -> None:
    press = Press(process="sheetfed-offset", imager_per_mm=2400 / 25.4, register_mm=0.05)
    screens = [MadeScreen(i, a) for i, a in (("Cyan", 15), ("Magenta", 75), ("Yellow", 0), ("Black", 45))]
    found_all = _engine.judge(evidence(*screens, press=press, eye_valid_cpd=(0.2, 60.0)))
    assert {f.rule for f in found_all} == set(_engine.judging())
    assert {f.status for f in found_all} <= {"pass", "not-applicable"}
    for finding in found_all:
        assert finding.message
        assert "nan" not in finding.message
        assert finding.measured is None or math.isfinite(finding.measured)
