"""published: ISO 32000-1:2008, Table 130, whose PostScript is run here against the program's functions.

Source: iso-32000-1.  The code was read in the resource files of the ghostscript interpreter, version 10.00.0
(pdf_draw.ps), which carries the standard's functions.  EllipseC and InvertedEllipseC are left
out: there they have the code of EllipseA, which cannot be what the standard means.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from patterngen.screens import _spot

DOT = "dup mul exch dup mul add 1 exch sub"
HOLE = "1 sub dup mul exch 1 sub dup mul add 1 sub"
WAVES = "360 mul sin 2 div exch 360 mul sin 2 div exch add"
CODE = {
    "simpledot": DOT,
    "invertedsimpledot": "dup mul exch dup mul add 1 sub",
    "doubledot": WAVES,
    "inverteddoubledot": f"{WAVES} neg",
    "cosinedot": "180 mul cos exch 180 mul cos add 2 div",
    "double": f"exch 2 div exch {WAVES}",
    "inverteddouble": f"exch 2 div exch {WAVES} neg",
    "line": "exch pop abs neg",
    "linex": "pop",
    "liney": "exch pop",
    "round": f"abs exch abs 2 copy add 1 le {{ {DOT} }} {{ {HOLE} }} ifelse",
    "ellipse": (
        "abs exch abs 2 copy 3 mul exch 4 mul add 3 sub dup 0 lt "
        "{ pop dup mul exch .75 div dup mul add 4 div 1 exch sub } "
        "{ dup 1 gt { pop 1 exch sub dup mul exch 1 exch sub .75 div dup mul add 4 div 1 sub } "
        "{ .5 exch sub exch pop exch pop } ifelse } ifelse"
    ),
    "ellipsea": "dup mul .9 mul exch dup mul add 1 exch sub",
    "invertedellipsea": "dup mul .9 mul exch dup mul add 1 sub",
    "ellipseb": "dup 5 mul 8 div mul exch dup mul exch add sqrt 1 exch sub",
    "square": "abs exch abs 2 copy lt { exch } if pop neg",
    "cross": "abs exch abs 2 copy gt { exch } if pop neg",
    "rhomboid": "abs exch abs 0.9 mul add 2 div",
    "diamond": (
        f"abs exch abs 2 copy add .75 le {{ {DOT} }} "
        f"{{ 2 copy add 1.23 le {{ .85 mul add 1 exch sub }} {{ {HOLE} }} ifelse }} ifelse"
    ),
}

ONE = {
    "abs": abs,
    "neg": lambda a: -a,
    "sqrt": math.sqrt,
    "sin": lambda a: math.sin(math.radians(a)),
    "cos": lambda a: math.cos(math.radians(a)),
}
TWO = {
    "add": lambda a, b: a + b,
    "sub": lambda a, b: a - b,
    "mul": lambda a, b: a * b,
    "div": lambda a, b: a / b,
    "le": lambda a, b: a <= b,
    "lt": lambda a, b: a < b,
    "gt": lambda a, b: a > b,
}


def parse(words: list[str]) -> list:
    """Words to a program: procedures in braces become lists."""
    out: list = []
    while words:
        word = words.pop(0)
        if word == "}":
            break
        out.append(parse(words) if word == "{" else word)
    return out


def run(program: list, stack: list) -> None:
    """The part of PostScript that the spot functions use."""
    for word in program:
        if isinstance(word, list):
            stack.append(word)
        elif word in ONE:
            stack.append(ONE[word](stack.pop()))
        elif word in TWO:
            b, a = stack.pop(), stack.pop()
            stack.append(TWO[word](a, b))
        elif word == "dup":
            stack.append(stack[-1])
        elif word == "pop":
            stack.pop()
        elif word == "exch":
            stack[-1], stack[-2] = stack[-2], stack[-1]
        elif word == "copy":
            count = int(stack.pop())
            stack.extend(stack[-count:])
        elif word == "if":
            then, condition = stack.pop(), stack.pop()
            run(then if condition else [], stack)
        elif word == "ifelse":
            other, then, condition = stack.pop(), stack.pop(), stack.pop()
            run(then if condition else other, stack)
        else:
            stack.append(float(word))


@pytest.mark.parametrize("name", CODE)
def test_spot_function(name: str) -> None:
    program = parse(CODE[name].split())
    at = np.random.default_rng(32000).uniform(-1, 1, (500, 2))
    found = _spot.value(name, at[:, 0], at[:, 1])
    for (x, y), value in zip(at, found, strict=True):
        stack = [float(x), float(y)]
        run(program, stack)
        assert len(stack) == 1
        assert float(value) == pytest.approx(stack[0], abs=1e-12)


def test_no_function_is_forgotten() -> None:
    """invariant: all of the program's functions but the two that the outside source has wrong."""
    assert set(_spot.FUNCTIONS) - set(CODE) == {"ellipsec", "invertedellipsec"}
