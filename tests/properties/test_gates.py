"""The gates under generated input."""

from __future__ import annotations

import math
import re
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from patterngen.errors import InputError
from patterngen.job import gates
from patterngen.job.outlines import OutlineError, read
from patterngen.job.read import load
from patterngen.model.fields import name_problem, nearest_name, text_problem
from patterngen.units import ANGLE, LENGTH, RULING, SHARE, Quantity, QuantityError, parse, spell
from tests import cream_lid

QUICK = settings(max_examples=200, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow])
QUANTITIES = st.sampled_from([LENGTH, RULING, ANGLE, SHARE])
GOOD = cream_lid.TEXT


def refusal(call: Callable[..., Any], *values: Any) -> Any:
    """What the call refuses its values with, or None; any other error comes through."""
    try:
        call(*values)
    except (InputError, QuantityError) as error:
        return error
    return None


@QUICK
@given(
    text=st.text(max_size=40) | st.from_regex(r"[+-]?[0-9]{0,4}[.,]?[0-9]{0,4}(e[+-]?[0-9]{1,4})? ?[a-z/%]{0,4}"),
    quantity=QUANTITIES,
)
def test_any_text_is_a_number_or_refused(text: str, quantity: Quantity) -> None:
    """invariant: a quantity is finite and of everyday size, or refused; a proposed spelling is legal."""
    error = refusal(parse, text, quantity)
    if error is None:
        number = parse(text, quantity)
        assert math.isfinite(number)
        assert number == 0 or 1e-20 < abs(number) < 1e20
        return
    assert error.allowed
    if error.nearest:
        again = refusal(parse, error.nearest.strip('"'), quantity)
        # a number that no unit saves is told as that, the second time at the latest
        assert again is None or "range" in again.problem


@QUICK
@given(number=st.floats(1e-6, 1e6), quantity=QUANTITIES, data=st.data())
def test_spelt_numbers_come_back(number: float, quantity: Quantity, data: st.DataObject) -> None:
    """invariant: writing and reading lose no more than the last digit."""
    unit = data.draw(st.sampled_from(sorted(quantity.units)))
    assert parse(spell(number, quantity, unit), quantity) == pytest.approx(number, rel=1e-15)


@QUICK
@given(text=st.text(max_size=100))
def test_nearest_names_are_names(text: str) -> None:
    """invariant: what is proposed as a name passes the gate, and a sound name is its own nearest."""
    name = nearest_name(text)
    assert not name or not name_problem(name)
    if not name_problem(text):
        assert nearest_name(text) in (text, text.rstrip("-_"))


@QUICK
@given(text=st.text(max_size=50))
def test_sound_texts_are_printable(text: str) -> None:
    """invariant: no control character passes the text gate."""
    if not text_problem(text):
        assert not any(ord(c) < 32 or 127 <= ord(c) < 160 for c in text)


@QUICK
@given(data=st.binary(max_size=300) | st.text(alphabet="[]{}=.,\"'#\\\n ab1-:_", max_size=120).map(str.encode))
def test_any_bytes_are_data_or_refused(data: bytes) -> None:
    """invariant: whatever the bytes, plain data comes out or a refusal; never another error."""

    def both() -> None:
        text, _ = gates.decode(data, where="lid.toml")
        gates.parse(text, where="lid.toml")

    error = refusal(both)
    assert error is None or all(line.startswith("lid.toml: ") for line in str(error).splitlines())


@settings(parent=QUICK, suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow])
@given(at=st.integers(0, len(GOOD) - 1), length=st.integers(0, 12), patch=st.text(max_size=6))
def test_damaged_presets(at: int, length: int, patch: str, tmp_path: Path) -> None:
    """invariant: a preset damaged anywhere is a job or a refusal that names the file."""
    path = tmp_path / "lid.toml"
    path.write_text(GOOD[:at] + patch + GOOD[at + length :], encoding="utf-8", errors="surrogatepass")
    error = refusal(load, path)
    if error is not None:
        assert all(str(path) in fault.where for fault in error.faults)
        assert len(str(error)) < 20_000


VALUES = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=8),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=5), inner, max_size=3),
    max_leaves=6,
)


@QUICK
@given(
    table=st.sampled_from(
        ["sheet", "viewing", "press", "paper", "ink", "overprint", "screen", "grid", "waive", "title"]
    ),
    value=VALUES,
)
def test_any_value_anywhere(table: str, value: object) -> None:
    """invariant: any value in place of a table is read or refused with its place."""
    error = refusal(load, tomllib.loads(GOOD) | {table: value})
    # nothing of another table is blamed, but for names that are then missing
    assert error is None or all(re.match(rf"{table}\b|screen.clover.ink$|$", f.key) for f in error.faults)


@QUICK
@given(
    table=st.sampled_from(["ink", "screen"]),
    key=st.sampled_from(["name", "ink", "kind", "shape", "ruling", "angle", "tone", "area", "origin", "lab", "gain"]),
    value=VALUES,
)
def test_any_value_in_a_table(table: str, key: str, value: object) -> None:
    """invariant: the same one level deeper; art that is not there included."""
    data = tomllib.loads(GOOD)
    data[table][0][key] = value
    error = refusal(load, data)
    assert error is None or all(fault.problem and fault.key for fault in error.faults)


@QUICK
@given(text=st.text(alphabet="MmLlHhVvCcSsQqTtAaZz0123456789.-+e ,", max_size=60))
def test_any_path_data(text: str) -> None:
    """invariant: path data is drawn or refused; rings lie on the sheet."""
    head = '<svg xmlns="http://www.w3.org/2000/svg" width="90mm" height="60mm" viewBox="0 0 90 60">'
    svg = f'{head}<path d="{text}"/></svg>'
    try:
        found = read(svg.encode(), element=None, sheet_mm=(90.0, 60.0), box_mm=(0, 0, 90, 60), label="x")
    except OutlineError:
        return
    for ring in found.rings:
        assert ring.min() > -1e-9
        assert ring[:, 0].max() < 90 + 1e-9


@QUICK
@given(address=st.text(alphabet="screen.clover[0]\"'=x ", max_size=30), value=st.text(max_size=10))
def test_any_override(address: str, value: str) -> None:
    """invariant: an override is put in or refused."""
    error = refusal(load, tomllib.loads(GOOD), [f"{address}={value}"])
    assert error is None or error.faults[0].where == "--set"
