"""One small preset that many tests begin from: one ink, one dot screen."""

TEXT = """\
patterngen = 1
title = "Fennick & Oake, cream lid"
[sheet]
size = ["60 mm", "40 mm"]
[[ink]]
name = "Clover"
lab = [55, -37, -50]
[[screen]]
name = "clover"
ink = "Clover"
kind = "dots"
ruling = "150 lpi"
angle = "15 deg"
tone = "40 %"
"""

WITHOUT_TONE = TEXT.replace('tone = "40 %"\n', "")

WITH_IMAGER = TEXT.replace("[[ink]]", '[press]\nimager = "2400 dpi"\n[[ink]]', 1)
