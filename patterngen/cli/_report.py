"""The verdict in words, for a person at a terminal."""

from __future__ import annotations

import textwrap

import numpy as np

from patterngen.cli._options import strong
from patterngen.model.verdict import Finding, Verdict

_COLOUR = {"pass": "green", "warn": "yellow", "fail": "red", "waived": "yellow", "not-applicable": "white"}
_ORDER = ("fail", "warn", "waived", "pass", "not-applicable")
_WORDS = {"pass": "PASS", "warn": "PASS, with warnings", "fail": "FAIL"}
_WIDTH = 96


def report(verdict: Verdict, *, everything: bool) -> str:
    """What a busy person reads first; the rest with `everything`."""
    lines = [f"{strong(_WORDS[verdict.status], _COLOUR[verdict.status])}  {verdict.job}: {verdict.title}", ""]
    shown = [f for f in _by_weight(verdict.findings) if everything or f.status in ("fail", "warn", "waived")]
    for place, finding in enumerate(shown):
        # a source that several findings in a row share is told once, under the last of them
        told_below = any(following.source == finding.source for following in shown[place + 1 : place + 2])
        lines += _finding(finding, sourced=not told_below)
    lines.append(_counts(verdict, shown))
    if everything:
        lines += ["", *_screens(verdict), "", *_derived(verdict), "", *_beats(verdict)]
    elif verdict.derived:
        lines += ["", *_derived(verdict)]
    return "\n".join(lines)


def _by_weight(findings: tuple[Finding, ...]) -> list[Finding]:
    return sorted(findings, key=lambda f: _ORDER.index(f.status))


def _finding(finding: Finding, *, sourced: bool) -> list[str]:
    head = f"{strong(finding.status, _COLOUR[finding.status])}  {finding.rule}"
    if finding.where:
        head += f"  ({finding.where})"
    body = [finding.message]
    if finding.measured is not None and finding.limit is not None and finding.margin is not None:
        figures = f"measured {finding.measured:.4g}, limit {finding.limit:.4g}, margin {finding.margin:+.4g}"
        body.append(f"{figures} {finding.unit}".rstrip())
    if sourced:
        body.append(f"source: {finding.source.text} [{finding.source.standing}]")
    if finding.waiver:
        body.append(f"waived: {finding.waiver}")
    wrapped = [textwrap.fill(text, width=_WIDTH, initial_indent="      ", subsequent_indent="      ") for text in body]
    return [head, *wrapped, ""]


def _counts(verdict: Verdict, shown: list[Finding]) -> str:
    passed = sum(f.status == "pass" for f in verdict.findings)
    idle = [f.rule for f in verdict.findings if f.status == "not-applicable"]
    text = f"{passed} checks passed"
    if idle:
        text += f", {len(idle)} did not apply"
    beats = verdict.beats
    if len(beats):
        text += (
            f". {len(beats)} beats listed, the strongest at {np.max(beats.visibility_far):.2f} times threshold from far"
        )
    else:
        text += ". No beat is strong enough to be listed"
    if len(shown) < len(verdict.findings):
        text += "; --all shows everything"
    return text + "."


def _screens(verdict: Verdict) -> list[str]:
    rows = ["Screens"]
    for screen in verdict.screens:
        rows.append(
            f"  {screen['name']:<16} {screen['ink']:<16} {screen['kind']:<8} {screen['ruling_per_mm']:8.4f} /mm"
            f" ({screen['ruling_per_mm'] * 25.4:.2f} lpi)  {screen['angle_deg']:7.2f} deg"
        )
    return rows


def _derived(verdict: Verdict) -> list[str]:
    if not verdict.derived:
        return []
    rows = ["Derived"]
    for item in verdict.derived:
        text = f"{item.value} = {item.chosen}, by {item.by}: {item.because}"
        rows.append(textwrap.fill(text, width=_WIDTH, initial_indent="  ", subsequent_indent="      "))
    return rows


def _beats(verdict: Verdict) -> list[str]:
    beats = verdict.beats
    rows = [
        "Beats (contrast / threshold at the reading distance, at the far distance)",
        f"  {'period':>10}  {'contrast':>9}  {'near':>7}  {'far':>7}  grade    who",
    ]
    for row in range(len(beats)):
        period = beats.period_mm[row]
        length = f"{period:7.3f} mm" if np.isfinite(period) else "balanced"
        who = ", ".join(f"{name} {tuple(k)}" for name, k in beats.participants(row).items())
        rows.append(
            f"  {length:>10}  {beats.contrast[row]:9.5f}  {beats.visibility[row]:7.2f}"
            f"  {beats.visibility_far[row]:7.2f}  {beats.grade[row]:<8} {who}"
        )
    rows.append(
        f"  No combination that is not listed exceeds {beats.bound_visibility:.2g} times threshold at the reading"
        f" distance;\n  from far {beats.bound_visibility_far:.2g} for periods up to 1 mm,"
        f" {beats.bound_visibility_far_coarse:.2g} for longer ones."
    )
    return rows
