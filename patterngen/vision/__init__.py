"""Published models of the eye's contrast sensitivity, one a file, found by their names.

Each module has `SUMMARY`, `VALID_CPD` (the cycles per degree it was made for), `TAKES_LIGHT`
(False: the luminance is ignored), `SOURCE_KEY`, and `sensitivity(cpd, *, luminance_cd_m2)`.
"""

from patterngen.vision._viewer import luminance_cd_m2, viewer

__all__ = ["luminance_cd_m2", "viewer"]
