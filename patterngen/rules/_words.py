"""Findings in words that a press person reads aloud."""

from __future__ import annotations

import math
from collections.abc import Sequence


def listed(names: Sequence[str]) -> str:
    """Names as people say them.

    >>> listed(["cyan", "magenta", "black"])
    'cyan, magenta and black'
    """
    if len(names) < 2:
        return "".join(names)
    return f"{', '.join(names[:-1])} and {names[-1]}"


def rounded(value: float, *, digits: int = 2) -> str:
    """A number to `digits` figures, whole from 100 up, without exponent.

    >>> rounded(3.6421), rounded(477.4), rounded(0.0312)
    ('3.6', '477', '0.031')
    """
    if value == 0 or not math.isfinite(value):
        return "0" if value == 0 else "unlimited"
    places = max(0, digits - 1 - math.floor(math.log10(abs(value))))
    text = f"{value:.{places}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def width(value_mm: float) -> str:
    """A length: mm from a tenth of a millimetre up, um below.

    >>> width(3.64), width(0.0197)
    ('3.6 mm', '20 um')
    """
    return f"{rounded(value_mm)} mm" if value_mm >= 0.0995 else f"{rounded(value_mm * 1000)} um"


def percent(share: float) -> str:
    """A share as percent.

    >>> percent(0.125)
    '12.5 %'
    """
    return f"{rounded(share * 100, digits=3)} %"


def ruling(ruling_per_mm: float) -> str:
    """A ruling in lines per inch and per centimetre.

    >>> ruling(150 / 25.4)
    '150 lpi (59.1 /cm)'
    """
    return f"{rounded(ruling_per_mm * 25.4, digits=4)} lpi ({rounded(ruling_per_mm * 10, digits=3)} /cm)"


def degrees(angle_deg: float) -> str:
    """An angle to a tenth of a degree, for reading aloud.

    >>> degrees(37.96)
    '38 degrees'
    """
    text = rounded(round(angle_deg, 1) + 0.0, digits=4)
    return f"{text} degree{'' if text == '1' else 's'}"
