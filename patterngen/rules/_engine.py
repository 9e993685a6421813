"""Runs the rules: derives what a job leaves open, judges what was found, explains itself.

A rule only measures.  Here, and nowhere else, a measurement becomes a status with its margin.
"""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from dataclasses import replace
from difflib import get_close_matches
from functools import cache
from graphlib import TopologicalSorter
from math import inf
from types import ModuleType

from patterngen import registry
from patterngen.errors import Fault
from patterngen.model.evidence import Evidence
from patterngen.model.job import Job, Waiver
from patterngen.model.verdict import Finding, Measurement, Status
from patterngen.rules import _limits
from patterngen.sources import source

PACKAGE = "patterngen.rules"
SHOWN_PER_RULE = 5
"""Findings of one status that a rule may list; the last one says how many more there are."""

_SEVERITY: dict[Status, int] = {"fail": 0, "waived": 1, "warn": 2, "pass": 3, "not-applicable": 4}
_WIDTH = 96


@cache
def judging() -> tuple[str, ...]:
    """Names of the rules that judge, sorted."""
    return tuple(name for name, module in registry.modules(PACKAGE).items() if hasattr(module, "measure"))


@cache
def deriving() -> tuple[str, ...]:
    """Names of the rules that derive, in the order in which they run.

    A deriving rule names in `AFTER` those whose values it reads; beyond that the order is by
    name.  Today: dot-shape, ruling-for-imager, usual-angles.
    """
    found = {name: module for name, module in registry.modules(PACKAGE).items() if hasattr(module, "derive")}
    sorter = TopologicalSorter({name: found[name].AFTER for name in sorted(found)})
    sorter.prepare()
    order: list[str] = []
    while sorter.is_active():
        ready = sorted(sorter.get_ready())
        order += ready
        sorter.done(*ready)
    return tuple(order)


def derive(job: Job) -> Job:
    """The job with every open value derived; each choice is listed in `derived` and `origin`."""
    for name in deriving():
        job = registry.load(PACKAGE, name).derive(job)
    return job


def judge(evidence: Evidence, waivers: Sequence[Waiver] | None = None) -> tuple[Finding, ...]:
    """Every rule's findings, worst first; `waivers` are the job's own where none are given.

    Waivers of rules that do not judge are of no effect here: see `waiver_faults`.
    """
    waivers = evidence.design.job.waivers if waivers is None else waivers
    findings: list[Finding] = []
    for name in judging():
        module = registry.load(PACKAGE, name)
        mine = [finding_of(name, m) for m in module.measure(evidence)]
        if not mine:
            idle = Measurement(None, None, "", "", module.IDLE, source("own-rule"), applies=False)
            mine = [finding_of(name, idle)]
        findings += _shortened(_waived(name, mine, waivers))
    return tuple(sorted(findings, key=lambda f: _SEVERITY[f.status]))


def finding_of(rule: str, measurement: Measurement) -> Finding:
    """A measurement with its status and margin.

    The limit shown is the one that decided: the milder one (`warn_at`) as long as the hard
    one holds.  The margin is the distance from it in the rule's unit, positive on the good
    side.  Exactly on the limit is still good; 1e-9 of the limit is forgiven for rounding.
    """
    m = measurement
    status: Status
    limit, said = m.limit, m.source
    if not m.applies:
        status = "not-applicable"
    elif m.measured is None or (m.limit is not None and _margin(m, m.limit) < 0):
        status = m.worst
    elif m.warn_at is not None:
        limit, said = m.warn_at, m.warn_source or m.source
        status = "warn" if _margin(m, m.warn_at) < 0 else "pass"
    else:
        status = "pass"
    margin = None if m.measured is None or limit is None else _margin(m, limit)
    return Finding(
        rule, status, m.measured, limit, margin, m.unit, said, m.where, " ".join(m.message.split())
    )


def _margin(measurement: Measurement, limit: float) -> float:
    if measurement.measured is None:
        raise ValueError("nothing measured has no margin")
    margin = limit - measurement.measured if measurement.bad_when == "above" else measurement.measured - limit
    return 0.0 if abs(margin) <= 1e-9 * abs(limit) else margin


def waiver_faults(waivers: Sequence[Waiver], *, where: str) -> list[Fault]:
    """A fault for every waiver of a rule that does not exist or does not judge; `where` names the preset."""
    faults = []
    for place, waiver in enumerate(waivers):
        if waiver.rule not in judging():
            near = get_close_matches(waiver.rule, judging(), n=1, cutoff=0.3)
            faults.append(
                Fault(
                    where,
                    f"waive[{place}].rule",
                    "no rule that judges has this name",
                    value=repr(waiver.rule),
                    allowed=", ".join(judging()),
                    nearest=near[0] if near else "",
                )
            )
    return faults


def _waived(rule: str, findings: list[Finding], waivers: Sequence[Waiver]) -> list[Finding]:
    """Failures that a waiver accepts; a waiver without a failure earns a warning of its own."""
    reasons = [waiver.reason for waiver in waivers if waiver.rule == rule]
    if not reasons:
        return findings
    reason = "; ".join(reasons)
    if not any(finding.status == "fail" for finding in findings):
        text = f"{rule} is waived and did not fail: take the waiver out, it would hide the next fault."
        return [
            *findings,
            Finding(rule, "warn", None, None, None, "", source("own-rule"), "waive", text, reason),
        ]
    return [replace(f, status="waived", waiver=reason) if f.status == "fail" else f for f in findings]


def _shortened(findings: list[Finding]) -> list[Finding]:
    """Worst first, and of each status no more than a person reads."""
    out: list[Finding] = []
    for status in _SEVERITY:
        mine = sorted((f for f in findings if f.status == status), key=_nearness)
        shown = mine[:SHOWN_PER_RULE]
        more = len(mine) - len(shown)
        if more:
            shown[-1] = replace(
                shown[-1], message=f"{shown[-1].message} (And {more} more, none of them worse.)"
            )
        out += shown
    return out


def _nearness(finding: Finding) -> float:
    """Margin as a share of the limit, so that the worst of several limits comes first."""
    if finding.margin is None or finding.limit is None:
        return inf
    return finding.margin / abs(finding.limit) if finding.limit else finding.margin


def summaries() -> dict[str, str]:
    """Every rule with what it is about, sorted by name."""
    return {name: module.SUMMARY for name, module in registry.modules(PACKAGE).items()}


def why(name: str) -> str:
    """A rule's page: its reason, what it measures, its limits by process, its sources.

    Raises `InputError` with the nearest name.
    """
    module = registry.load(PACKAGE, name)
    parts = [_indented(f"{name}: {module.SUMMARY}", 0), _indented(module.REASON, 0, hang=0)]
    if hasattr(module, "measure"):
        parts.append(_section("What is measured", [module.MEASURES]))
    if hasattr(module, "derive"):
        parts.append(_section("What is derived", [module.DERIVES]))
    if module.LIMITS:
        parts.append("\n\n".join(_limit_lines(module)))
    parts.append(_section("Sources", [_cited(key) for key in module.SOURCES]))
    return "\n\n".join(parts) + "\n"


def _cited(key: str) -> str:
    found = source(key)
    return f"{found.text} [{found.standing}]"


def _section(title: str, texts: Sequence[str]) -> str:
    wrapped = [_indented(text, 2) for text in texts]
    return "\n".join([title, *wrapped])


def _indented(text: str, by: int, *, hang: int = 2) -> str:
    return textwrap.fill(
        " ".join(text.split()),
        width=_WIDTH,
        initial_indent=" " * by,
        subsequent_indent=" " * (by + hang),
        break_on_hyphens=False,
    )


def _limit_lines(module: ModuleType) -> list[str]:
    """One block a limit: what it is, then its value by process."""
    blocks = []
    for limit in module.LIMITS:
        lines = [_indented(f"Limit {limit} ({_limits.KINDS[limit].meaning}; set your own in [press])", 0)]
        for process in (None, *_limits.processes()):
            for row in _limits.rows(process):
                if row.name == limit:
                    note = f", {row.note}" if row.note else ""
                    place = process or "any process"
                    lines.append(_indented(f"{place}: {row.written}{note}. {_cited(row.source_key)}", 2))
        blocks.append("\n".join(lines))
    return blocks
