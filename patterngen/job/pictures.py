"""Picture files to grey samples.  Runs in the capped child process of `artwork`.

PNG, TIFF and JPEG, told by their content.  Grey is taken as stored; colour by the
luminance weights of ITU-R BT.709 on the coded values; transparency lies on white.
"""

from __future__ import annotations

import io
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from PIL.Image import Image

MOST_PIXELS = 64_000_000
_LUMINANCE = (0.2126, 0.7152, 0.0722)
_SIGNATURES = (
    (b"\x89PNG\r\n\x1a\n", "PNG"),
    (b"II*\x00", "TIFF"),
    (b"MM\x00*", "TIFF"),
    (b"\xff\xd8\xff", "JPEG"),
)
_OTHERS = (
    (b"II+\x00", "a BigTIFF"),
    (b"MM\x00+", "a BigTIFF"),
    (b"GIF8", "a GIF"),
    (b"BM", "a BMP"),
    (b"RIFF", "a WebP or other RIFF file"),
    (b"%PDF", "a PDF"),
    (b"\x1f\x8b", "a gzip file"),
    (b"8BPS", "a layered image file"),
)
_ALLOWED = "PNG, TIFF or JPEG; 8 or 16 bit; grey, palette or RGB"
_ROWS_AT_ONCE = 256
_SAME_LEVEL = 2
"""Channels this near (of 255) are one grey: a decoder's rounding may part them so far."""


class PictureError(ValueError):
    """The picture cannot be used: `problem`, and what is `allowed`."""

    def __init__(self, problem: str, *, value: str = "", allowed: str = _ALLOWED) -> None:
        super().__init__(problem)
        self.problem, self.value, self.allowed, self.nearest = problem, value, allowed, ""


@dataclass
class Picture:
    """Grey samples (rows, columns) uint8 or uint16, the largest value being white; remarks."""

    values: NDArray[Any]
    remarks: list[str]


def read(data: bytes, *, label: str) -> Picture:
    """The first page of a picture file, upright.  Raises `PictureError`."""
    import warnings

    from PIL import Image as Images

    # the plugins named here are the only ones that need to be loaded
    from PIL import ImageFile, JpegImagePlugin, PngImagePlugin, TiffImagePlugin  # noqa: F401

    kind = _kind(data)
    ImageFile.LOAD_TRUNCATED_IMAGES = False
    Images.MAX_IMAGE_PIXELS = None  # the cap below is lower and comes first
    remarks: list[str] = []
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            image: Image = Images.open(io.BytesIO(data), formats=[kind])
            wide, high = image.size
            if wide < 1 or high < 1 or wide * high > MOST_PIXELS:
                raise PictureError(
                    "has too many pixels",
                    value=f"{wide} x {high}",
                    allowed=f"at most {MOST_PIXELS // 10**6} million",
                )
            if _more_pages(data, kind):
                remarks.append(f"{label}: only the first page is used")
            image.load()
            inverted = _stored_inverted(image)
            values, coloured = _grey(image, inverted)
            if coloured:
                red, green, blue = _LUMINANCE
                remarks.append(
                    f"{label}: the picture is in colour and was read as grey, by its luminance "
                    f"({red} red + {green} green + {blue} blue)"
                )
            turned = _upright(image, values, remarks, label)
        except PictureError:
            raise
        except MemoryError:
            raise
        except Exception as error:
            # whatever a decoder throws at broken data is the data's fault
            raise PictureError(f"is damaged or cut short ({_clip(error)})") from None
    if turned.size == 1:
        remarks.append(f"{label}: the picture is a single pixel, an even tone")
    elif turned.min() == _white(turned):
        remarks.append(f"{label}: the picture is all white (or all transparent); it prints nothing")
    return Picture(np.ascontiguousarray(turned), remarks)


def _kind(data: bytes) -> str:
    for signature, kind in _SIGNATURES:
        if data.startswith(signature):
            return kind
    for signature, words in _OTHERS:
        if data.startswith(signature):
            raise PictureError(f"is {words}, by its content")
    head = data[:512].lstrip(b"\xef\xbb\xbf \t\r\n").lower()
    if head.startswith((b"<svg", b"<?xml", b"<!doctype")):
        raise PictureError("is an SVG drawing, by its content", allowed=f"{_ALLOWED}; a drawing may be an area")
    raise PictureError("is no picture, by its content" if data else "is empty")


def _more_pages(data: bytes, kind: str) -> bool:
    """Whether there is a second page; only that one is looked for, as a file may claim any number."""
    from PIL import Image as Images

    if kind != "TIFF":
        return False
    with Images.open(io.BytesIO(data), formats=[kind]) as image:
        try:
            image.seek(1)
        except EOFError:
            return False
    return True


def _stored_inverted(image: Image) -> bool:
    """TIFF with white as zero in 16 bits, which the decoder hands on as stored (8 bits it turns round)."""
    photometric = getattr(image, "tag_v2", {}).get(262)
    return photometric == 0 and image.mode.startswith("I;16")


def _white(values: NDArray[Any]) -> int:
    return int(np.iinfo(values.dtype).max)


def _grey(image: Image, inverted: bool) -> tuple[NDArray[Any], bool]:
    """Grey samples, and whether they came from real colours."""
    mode = image.mode
    if mode.startswith("I;16"):
        return _sixteen_bits(image, inverted), False
    if mode in ("CMYK", "LAB", "YCbCr", "HSV", "I", "F"):
        words = {"CMYK": "CMYK", "LAB": "CIELAB", "I": "32 bit whole numbers", "F": "floating point numbers"}
        raise PictureError(
            f"holds {words.get(mode, mode)}, of which no one true grey can be made here",
            allowed=f"{_ALLOWED}: convert it first",
        )
    clear = "transparency" in image.info or mode in ("LA", "RGBA", "PA", "La", "RGBa")
    if mode == "1":
        return np.asarray(image.convert("L"), dtype=np.uint8), False
    if mode == "L" and not clear:
        return np.asarray(image, dtype=np.uint8), False
    if mode not in ("L", "LA", "P", "PA", "RGB", "RGBA", "La", "RGBa", "RGBX"):
        raise PictureError(f"has a pixel format that is not known here ({mode})")
    return _colour(image.convert("RGBA" if clear else "RGB"), clear)


def _sixteen_bits(image: Image, inverted: bool) -> NDArray[Any]:
    values: NDArray[Any] = np.array(image).astype(np.uint16)
    transparent = image.info.get("transparency")
    if inverted:
        values = 65535 - values
    if isinstance(transparent, int):
        values[values == transparent] = 65535
    return values


def _colour(image: Image, clear: bool) -> tuple[NDArray[Any], bool]:
    """Luminance in 16 bits, so that no grey of the sum is lost, and whether any pixel that shows is coloured.

    In strips, so that memory stays small.
    """
    wide, high = image.size
    out = np.empty((high, wide), dtype=np.uint16)
    coloured = False
    for top in range(0, high, _ROWS_AT_ONCE):
        strip = np.asarray(image.crop((0, top, wide, min(top + _ROWS_AT_ONCE, high))), dtype=np.float32)
        grey: NDArray[Any] = strip[..., :3] @ np.array(_LUMINANCE, dtype=np.float32)
        if not coloured:
            apart = strip[..., :3].max(axis=-1) - strip[..., :3].min(axis=-1)
            coloured = bool(np.any((apart > _SAME_LEVEL) & (strip[..., 3] > 0 if clear else True)))
        if clear:
            cover = strip[..., 3] / 255
            grey = grey * cover + 255 * (1 - cover)
        out[top : top + len(strip)] = np.rint(np.clip(grey, 0, 255) * 257)
    return out, coloured


def _upright(image: Image, values: NDArray[Any], remarks: list[str], label: str) -> NDArray[Any]:
    """Turned as its orientation tag says, unless the decoder has done so already."""
    try:
        orientation = int(image.getexif().get(274, 1))
    except Exception:
        # a broken tag block says nothing about the picture
        orientation = 1
    if orientation in (1, 0) or not 1 <= orientation <= 8:
        return values
    remarks.append(f"{label}: turned upright as its orientation tag says")
    turns = {
        2: lambda v: v[:, ::-1],
        3: lambda v: v[::-1, ::-1],
        4: lambda v: v[::-1],
        5: lambda v: v.T,
        6: lambda v: np.rot90(v, -1),
        7: lambda v: v[::-1, ::-1].T,
        8: lambda v: np.rot90(v, 1),
    }
    return np.asarray(turns[orientation](values))


def _clip(error: Exception) -> str:
    text = " ".join(str(error).split()) or type(error).__name__
    return text if len(text) <= 80 else text[:79] + "…"
