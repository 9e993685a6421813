"""invariant: margins, statuses, waivers and order are worked out in one place, for all rules alike."""

from __future__ import annotations

from types import ModuleType

import pytest

from patterngen import registry
from patterngen.errors import InputError
from patterngen.model.job import Waiver
from patterngen.model.verdict import Finding, Measurement
from patterngen.rules import _engine
from patterngen.sources import source

ONE, OTHER = source("own-rule"), source("trade-register")


def finding(measured: float | None, **changes: object) -> Finding:
    base = {
        "measured": measured,
        "limit": 6.0,
        "unit": "mm",
        "where": "here",
        "message": "said",
        "source": ONE,
        **changes,
    }
    return _engine.finding_of("rule", Measurement(**base))  # type: ignore[arg-type]


def test_above_the_limit_fails_with_a_negative_margin() -> None:
    found = finding(7.5)
    assert (found.status, found.limit, found.margin) == ("fail", 6.0, -1.5)


def test_below_the_limit_is_the_good_side_or_the_bad_one() -> None:
    assert (finding(4.0).status, finding(4.0).margin) == ("pass", 2.0)
    found = finding(4.0, bad_when="below")
    assert (found.status, found.margin) == ("fail", -2.0)


def test_on_the_limit_passes_also_after_rounding() -> None:
    assert finding(0.1 + 0.2, limit=0.3).status == "pass"
    assert finding(0.3, limit=0.1 + 0.2, bad_when="below").margin == 0.0


def test_the_milder_limit_decides_while_the_hard_one_holds() -> None:
    warned = finding(4.0, warn_at=3.0, warn_source=OTHER)
    assert (warned.status, warned.limit, warned.margin, warned.source) == ("warn", 3.0, -1.0, OTHER)
    passed = finding(2.0, warn_at=3.0)
    assert (passed.status, passed.limit, passed.margin, passed.source) == ("pass", 3.0, 1.0, ONE)
    failed = finding(7.0, warn_at=3.0, warn_source=OTHER)
    assert (failed.status, failed.limit, failed.source) == ("fail", 6.0, ONE)


def test_a_milder_limit_does_not_make_a_breach_of_the_hard_one_milder() -> None:
    assert finding(7.0, warn_at=3.0, worst="warn").limit == 6.0


def test_what_does_not_apply_never_looks_like_a_pass() -> None:
    found = finding(2.0, applies=False)
    assert found.status == "not-applicable"
    assert finding(None, worst="warn").status == "warn"
    assert finding(None, worst="warn").margin is None


def test_messages_are_single_lines() -> None:
    assert finding(1.0, message="two\n   lines").message == "two lines"


def rule_of(*measurements: Measurement) -> ModuleType:
    module = ModuleType("made")
    module.measure = lambda evidence: iter(measurements)  # type: ignore[attr-defined]
    module.IDLE = "nothing to do"  # type: ignore[attr-defined]
    return module


@pytest.fixture
def made_rule(monkeypatch: pytest.MonkeyPatch):  # type: ignore[no-untyped-def]
    def install(*measurements: Measurement) -> None:
        monkeypatch.setattr(_engine, "judging", lambda: ("made",))
        monkeypatch.setattr(registry, "load", lambda package, name: rule_of(*measurements))

    return install


def measured(value: float) -> Measurement:
    return Measurement(value, 6.0, "mm", f"at {value:g}", f"measured {value:g}", ONE)


def test_a_rule_with_nothing_to_say_is_listed_with_its_reason(made_rule) -> None:  # type: ignore[no-untyped-def]
    made_rule()
    (found,) = _engine.judge(None, [])  # type: ignore[arg-type]
    assert (found.status, found.message) == ("not-applicable", "nothing to do")


def test_findings_come_worst_first_and_no_more_than_a_person_reads(made_rule) -> None:  # type: ignore[no-untyped-def]
    made_rule(*(measured(v) for v in (1, 7, 13, 9, 8, 11, 10, 12)))
    found = _engine.judge(None, [])  # type: ignore[arg-type]
    assert [f.measured for f in found] == [13, 12, 11, 10, 9, 1]
    assert "2 more" in found[4].message
    assert found[5].status == "pass"


def test_a_waiver_accepts_failures_and_keeps_its_reason(made_rule) -> None:  # type: ignore[no-untyped-def]
    made_rule(measured(7), measured(2))
    found = _engine.judge(None, [Waiver("made", "the customer wants it")])  # type: ignore[arg-type]
    assert [(f.status, f.waiver) for f in found] == [("waived", "the customer wants it"), ("pass", "")]


def test_a_waiver_without_a_failure_is_warned_of(made_rule) -> None:  # type: ignore[no-untyped-def]
    made_rule(measured(2))
    found = _engine.judge(None, [Waiver("made", "habit")])  # type: ignore[arg-type]
    assert [f.status for f in found] == ["warn", "pass"]
    assert "take the waiver out" in found[0].message


def test_a_waiver_of_an_unknown_rule_is_refused_with_the_nearest_name() -> None:
    first, second = _engine.waiver_faults(
        [Waiver("beat-visible", "x"), Waiver("usual-angles", "derives, cannot be waived")], where="lid.toml"
    )
    assert (first.where, first.key, second.key) == ("lid.toml", "waive[0].rule", "waive[1].rule")
    assert first.nearest == "beats-visible"
    assert "usual-angles" in second.value


def test_deriving_rules_run_in_the_documented_order() -> None:
    assert _engine.deriving() == ("dot-shape", "ruling-for-imager", "usual-angles")


@pytest.mark.parametrize("name", registry.names(_engine.PACKAGE))
def test_every_rule_explains_itself(name: str) -> None:
    module = registry.load(_engine.PACKAGE, name)
    page = _engine.why(name)
    assert " ".join(page.split()).startswith(f"{name}: {module.SUMMARY}")
    assert all(len(line) <= 96 for line in page.splitlines())
    for key in module.SOURCES:
        cited = source(key)
        assert cited.text in " ".join(page.split())
        assert f"{cited.text} [{cited.standing}]" in " ".join(page.split())
    for limit in module.LIMITS:
        assert f"Limit {limit}" in page
    assert hasattr(module, "measure") or hasattr(module, "derive")
    if hasattr(module, "measure"):
        assert module.EXAMPLE_PASS["patterngen"] == module.EXAMPLE_FAIL["patterngen"] == 1
        assert module.MEASURES
        assert module.IDLE
    if hasattr(module, "derive"):
        assert module.EXAMPLES
        assert module.DERIVES


def test_why_names_the_nearest_rule() -> None:
    with pytest.raises(InputError) as caught:
        _engine.why("balance")
    assert caught.value.faults[0].nearest == "balance-drift"
