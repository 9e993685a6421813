"""invariant: every judging rule passes its good example and catches its bad one, in the whole program."""

from __future__ import annotations

import pytest

import patterngen
from patterngen import registry
from patterngen.model.verdict import Finding
from patterngen.rules import _engine

DERIVED = [
    pytest.param(preset, wanted, name, id=f"{name}-{i}")
    for name in _engine.deriving()
    for i, (preset, wanted) in enumerate(registry.load(_engine.PACKAGE, name).EXAMPLES)
]


def findings(rule: str, example: str) -> list[Finding]:
    preset = getattr(registry.load(_engine.PACKAGE, rule), example)
    verdict = patterngen.verify(patterngen.load(preset))
    return [finding for finding in verdict.findings if finding.rule == rule]


@pytest.mark.parametrize("rule", _engine.judging())
def test_the_good_example_passes(rule: str) -> None:
    statuses = {finding.status for finding in findings(rule, "EXAMPLE_PASS")}
    assert statuses == {"pass"}


@pytest.mark.parametrize("rule", _engine.judging())
def test_the_bad_example_is_caught(rule: str) -> None:
    caught = [finding for finding in findings(rule, "EXAMPLE_FAIL") if finding.status in ("fail", "warn")]
    assert caught
    for finding in caught:
        assert finding.message
        assert finding.margin is None or finding.margin < 0


@pytest.mark.parametrize(("preset", "wanted", "rule"), DERIVED)
def test_deriving_examples_come_out_as_said(preset: dict, wanted: dict[str, str], rule: str) -> None:  # type: ignore[type-arg]
    job = _engine.derive(patterngen.load(preset))
    assert {d.value: d.chosen for d in job.derived if d.by == rule} == wanted
