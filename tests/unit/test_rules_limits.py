"""invariant: every limit has a kind, a unit, and a source whose standing decides how hard a breach counts."""

from __future__ import annotations

import math

import pytest

from patterngen import registry, sources
from patterngen.errors import InputError
from patterngen.rules import _engine, _limits
from patterngen.units import parse

KEYS = frozenset(sources.keys())
EVERYWHERE = (None, *_limits.processes())


@pytest.mark.parametrize("process", EVERYWHERE)
def test_every_limit_is_known_by_name_and_has_its_source(process: str | None) -> None:
    rows = _limits.rows(process)
    assert rows
    for row in rows:
        assert row.name in _limits.KINDS
        assert row.source_key in KEYS
        assert parse(row.written, _limits.KINDS[row.name].quantity) > 0


def test_every_limit_is_used_by_a_rule_and_every_rule_names_known_limits() -> None:
    used = {
        limit
        for name in registry.names(_engine.PACKAGE)
        for limit in registry.load(_engine.PACKAGE, name).LIMITS
    }
    assert used == set(_limits.KINDS)


def test_sources_of_limits_are_cited_by_the_rule_or_shown_beside_the_limit() -> None:
    for name in registry.names(_engine.PACKAGE):
        page = " ".join(_engine.why(name).split())
        for process in EVERYWHERE:
            for row in _limits.rows(process):
                if row.name in registry.load(_engine.PACKAGE, name).LIMITS:
                    assert sources.source(row.source_key).text in page


def test_processes_come_from_the_files() -> None:
    assert {"sheetfed-offset", "web-offset", "metal-decoration"} <= set(_limits.processes())
    assert not any(name.startswith("_") for name in _limits.processes())


def test_a_process_adds_to_what_holds_everywhere() -> None:
    every, metal = _limits.limits(None), _limits.limits("metal-decoration")
    assert set(every) < set(metal)
    assert every["tone_steps"].source.standing == "common practice"
    assert metal["tone_steps"].source.standing == "published"
    assert metal["tone_steps"].origin == "process metal-decoration"
    assert metal["drift_fail"] == every["drift_fail"]


def test_values_stand_in_inner_units() -> None:
    """published (ISO 12647-9:2021, 4.2.2, excerpt): rulings on metal 48 to 80 per cm, 69 the commonest."""
    metal = _limits.limits("metal-decoration")
    assert [metal[n].value for n in ("ruling_lowest", "ruling_usual", "ruling_highest")] == pytest.approx(
        [4.8, 6.9, 8.0]
    )
    assert metal["ruling_lowest"].unit == "/mm"
    sheet = _limits.limits("sheetfed-offset")
    assert (sheet["smallest_dot"].value, sheet["smallest_dot"].unit) == (pytest.approx(0.02), "mm")
    assert (sheet["tone_minimum"].value, sheet["tone_minimum"].unit) == (pytest.approx(0.01), "share")
    assert (sheet["drift_warn"].value, sheet["drift_warn"].unit) == (3.0, "CIEDE2000")
    assert (sheet["tone_steps"].value, sheet["tone_steps"].unit) == (150.0, "steps")


def test_limits_of_one_process_do_not_leak_into_another() -> None:
    first = _limits.limits("web-offset")
    first.clear()
    assert _limits.limits("web-offset")
    assert "total_ink" not in _limits.limits(None)
    assert "total_ink" not in _limits.limits("metal-decoration")


def test_an_unknown_process_is_refused_with_the_nearest() -> None:
    with pytest.raises(InputError) as caught:
        _limits.limits("sheet-offset")
    assert caught.value.faults[0].nearest == "sheetfed-offset"


def test_practice_warns_what_is_published_fails_and_a_shop_means_its_own_limit() -> None:
    sheet = _limits.limits("sheetfed-offset")
    assert sheet["smallest_dot"].source.standing == "common practice"
    assert _limits.worst(sheet["smallest_dot"]) == "warn"
    assert _limits.worst(sheet["line_minimum"]) == "fail"
    assert _limits.worst(sheet["drift_fail"]) == "fail"
    assert _limits.worst(_limits.limits(None)["angle_apart_axis"]) == "warn"
    own = _limits.own_limit("smallest_dot", 0.03)
    assert (_limits.worst(own), own.unit, own.value) == ("fail", "mm", 0.03)
    assert _limits.is_own(own)


def test_tone_steps_limit_the_ruling_as_printed() -> None:
    """published (ISO 12647-9:2021, 4.2.3, excerpt): 150 steps at 80 /cm want about 1000 /cm."""
    least_imager = 8.0 * math.sqrt(_limits.limits("metal-decoration")["tone_steps"].value - 1)
    assert 95.0 < least_imager < 100.0


def test_every_source_that_rules_cite_exists() -> None:
    for name in registry.names(_engine.PACKAGE):
        for key in registry.load(_engine.PACKAGE, name).SOURCES:
            assert key in KEYS, f"{name} cites {key}"
