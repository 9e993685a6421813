"""Hostile and wrong artwork: refused in words with the preset's key, or mended with a remark.

The corpus is kept as generators; whatever once broke the reader is added and stays.
"""

from __future__ import annotations

import gzip
import hashlib
import io
import os
import struct
import zlib
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from patterngen.errors import InputError
from patterngen.job.read import load
from patterngen.model.job import Job
from tests import cream_lid, spent

HEAD = (
    '<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink"'
    ' width="60mm" height="40mm" viewBox="0 0 60 40">'
)
PANEL = '<rect x="5" y="5" width="20" height="10"/>'


def svg(body: str) -> Callable[[], bytes]:
    return lambda: f"{HEAD}{body}</svg>".encode()


def page(attributes: str) -> Callable[[], bytes]:
    return lambda: f'<svg xmlns="http://www.w3.org/2000/svg" {attributes}>{PANEL}</svg>'.encode()


def path(data: str) -> Callable[[], bytes]:
    return svg(f'<path id="p" d="{data}"/>')


def use_tree(levels: int) -> bytes:
    groups = "".join(f'<g id="g{n}"><use href="#g{n + 1}"/><use href="#g{n + 1}"/></g>' for n in range(levels))
    return f'{HEAD}<defs>{groups}<g id="g{levels}">{PANEL}</g></defs><use href="#g0"/></svg>'.encode()


def laughs() -> bytes:
    entities = "".join(f'<!ENTITY l{n} "{f"&l{n - 1};" * 10}">' for n in range(1, 11))
    kind = f'<!DOCTYPE svg [<!ENTITY l0 "ha">{entities}]>'
    return f"{kind}{HEAD}<desc>&l10;</desc></svg>".encode()


SVG_REFUSED: dict[str, tuple[Callable[[], bytes], tuple[str, ...]]] = {
    "empty": (lambda: b"", ("empty",)),
    "blank": (lambda: b"  \n ", ("empty",)),
    "no xml": (lambda: b"hello", ("not well-formed", "line 1")),
    "cut short": (lambda: HEAD.encode(), ("not well-formed",)),
    "other xml": (lambda: b"<html/>", ("no SVG", "<html>")),
    "no namespace": (lambda: b'<svg width="1mm" height="1mm"/>', ("no SVG",)),
    "png by content": (lambda: b"\x89PNG\r\n\x1a\n" + b"\0" * 50, ("no SVG, by its content",)),
    "random bytes": (lambda: np.random.default_rng(7).bytes(5000), ("not well-formed",)),
    "document type": (
        lambda: f'<!DOCTYPE svg PUBLIC "-//W3C//DTD SVG 1.1//EN" "x.dtd">{HEAD}</svg>'.encode(),
        ("document type",),
    ),
    "external entity": (
        lambda: f'<!DOCTYPE svg [<!ENTITY x SYSTEM "file:///etc/passwd">]>{HEAD}<desc>&x;</desc></svg>'.encode(),
        ("document type",),
    ),
    "laughs": (laughs, ("document type",)),
    "a million deep": (lambda: (HEAD + "<g>" * 1_000_000).encode(), ("nested too deep",)),
    "a hundred deep": (svg("<g>" * 100 + "</g>" * 100), ("nested too deep",)),
    "too many elements": (svg("<g/>" * 60_000), ("too many elements",)),
    "too many points": (path("M0 0" + "l1 1" * 1_100_000), ("too many points",)),
    "too many bytes": (svg("<!--" + "x" * (9 << 20) + "-->"), ("too large",)),
    "use of itself": (svg('<g id="a"><use href="#a"/></g>'), ("refers to itself",)),
    "use in a circle": (
        svg('<g id="a"><use href="#b"/></g><g id="b"><use href="#a"/></g>'),
        ("refers to itself",),
    ),
    "use 2^20 times": (lambda: use_tree(20), ("uses of uses",)),
    "use of nothing": (svg('<use href="#nobody"/>'), ("not there",)),
    "use over the network": (svg('<use href="http://example.com/a.svg#x"/>'), ("outside the file",)),
    "use of a file": (svg('<use xlink:href="file:///etc/passwd"/>'), ("outside the file",)),
    "use of data": (svg('<use href="data:image/svg+xml;base64,AAAA"/>'), ("outside the file",)),
    "path of words": (path("M 0 0 junk"), ("path data", "id=")),
    "path with nan": (path("M 0 0 L nan 5 5 5z"), ("path data",)),
    "path with 1e308": (path("M 0 0 L 1e308 5 5 5z"), ("path data",)),
    "path with odd numbers": (path("M 0 0 L 5 5 5z"), ("path data",)),
    "path with odd arc flags": (path("M0 0 A 5 5 0 2 0 10 10z"), ("path data",)),
    "path not begun": (path("L 5 5 5 0z"), ("path data",)),
    "path with empty command": (path("M 0 0 L 5 5 C z"), ("path data",)),
    "a long number": (path("M0 0 A " + "1" * 200_000), ("path data",)),
    "points that are no pairs": (svg('<polygon points="1 2 3"/>'), ("pairs",)),
    "circle of words": (svg('<circle r="large"/>'), ("no length",)),
    "circle in percent": (svg('<circle r="50%"/>'), ("no length",)),
    "negative radius": (svg('<circle r="-5"/>'), ("negative",)),
    "rectangle of nan": (svg('<rect width="nan" height="1"/>'), ("no length",)),
    "no size": (page('viewBox="0 0 60 40"'), ("no width",)),
    "size in percent": (page('width="100%" height="100%" viewBox="0 0 60 40"'), ("no real size",)),
    "size zero": (page('width="0mm" height="40mm"'), ("out of range",)),
    "size negative": (page('width="-60mm" height="40mm"'), ("out of range",)),
    "size in ells": (page('width="1ell" height="40mm"'), ("no real size",)),
    "viewBox zero": (page('width="60mm" height="40mm" viewBox="0 0 0 0"'), ("viewBox",)),
    "viewBox negative": (page('width="60mm" height="40mm" viewBox="0 0 -60 40"'), ("viewBox",)),
    "viewBox of three": (page('width="60mm" height="40mm" viewBox="0 0 60"'), ("viewBox",)),
    "viewBox of words": (page('width="60mm" height="40mm" viewBox="a b c d"'), ("viewBox",)),
    "singular transform": (svg(f'<g transform="scale(0)">{PANEL}</g>'), ("flattens",)),
    "huge transform": (svg(f'<g transform="scale(1e9)">{PANEL}</g>'), ("transform",)),
    "many transforms": (svg(f'<g transform="{"rotate(1) " * 10_000}">{PANEL}</g>'), ("transform",)),
    "transform of words": (svg(f'<g transform="spin(9)">{PANEL}</g>'), ("transform",)),
    "transform short of numbers": (svg(f'<g transform="matrix(1 0 0)">{PANEL}</g>'), ("transform",)),
    "transform in the style": (
        svg(f'<g style="transform:scale(2)">{PANEL}</g>'),
        ("transform in its style",),
    ),
    "clipped": (svg(f'<g clip-path="url(#c)">{PANEL}</g>'), ("clip-path",)),
    "masked by a style sheet": (svg(f"<style>.m{{mask:url(#m)}}</style><g class='m'>{PANEL}</g>"), ("mask",)),
    "page in a page": (svg(f"<svg>{PANEL}</svg>"), ("page within the page",)),
    "selector that matters": (svg(f"<style>g > rect{{display:none}}</style>{PANEL}"), ("selector",)),
    "no outline": (svg("<text>Fennick</text>"), ("nothing in it has an area",)),
    "only a line": (svg('<line x2="50" y2="30"/><path d="M0 0h5"/>'), ("nothing in it has an area",)),
    "off the sheet": (svg('<rect x="500" y="5" width="20" height="10"/>'), ("wholly outside",)),
    "packed": (lambda: gzip.compress(b" " * 50_000_000), ("packed",)),
}

SVG_MENDED = {
    "script": (svg(f"<script>alert(1)</script>{PANEL}"), "<script>"),
    "handler": (svg(f'<g onload="alert(1)">{PANEL}</g>'), "event handlers"),
    "foreign object": (
        svg(f'<foreignObject><p xmlns="http://www.w3.org/1999/xhtml">x</p></foreignObject>{PANEL}'),
        "<foreignObject>",
    ),
    "link": (svg(f'<a href="javascript:alert(1)">{PANEL}</a>'), "links"),
    "picture": (svg(f'<image href="http://example.com/x.png"/>{PANEL}'), "<image>"),
    "text": (svg(f"<text>Fennick</text>{PANEL}"), "<text>"),
    "style import": (svg(f'<style>@import url("http://example.com/x.css");</style>{PANEL}'), "@import"),
    "moving": (svg(f"<animate/>{PANEL}"), "<animate>"),
    "open": (svg('<path d="M5 5h20v10h-20"/>'), "closed by a straight line"),
    "bow tie": (svg('<path d="M5 5 L25 15 L25 5 L5 15 z"/>'), "crosses itself"),
    "beyond the sheet": (svg('<rect x="-5" y="5" width="200" height="10"/>'), "cut there"),
}

PRESET = cream_lid.WITHOUT_TONE


def with_area(folder: Path, data: bytes, *, more: str = "") -> Path:
    (folder / "panel.svg").write_bytes(data)
    preset = folder / "lid.toml"
    preset.write_text(PRESET + f'tone = "40 %"\narea = {{ svg = "panel.svg"{more} }}\n', encoding="utf-8")
    return preset


def with_picture(folder: Path, data: bytes, name: str = "cow.png") -> Path:
    (folder / name).write_bytes(data)
    preset = folder / "lid.toml"
    preset.write_text(PRESET + f'tone = {{ image = "{name}" }}\n', encoding="utf-8")
    return preset


def refusal(preset: Path, key: str) -> str:
    # two seconds of work, and what starting the child takes
    with spent.at_most(4.0), pytest.raises(InputError) as caught:
        load(preset)
    (fault,) = caught.value.faults
    assert (fault.where, fault.key) == (str(preset), key)
    return fault.line()


@pytest.mark.parametrize("name", SVG_REFUSED)
def test_drawing_refused(name: str, tmp_path: Path) -> None:
    """invariant: refused in words that name the preset's key, and the element where there is one."""
    make, words = SVG_REFUSED[name]
    line = refusal(with_area(tmp_path, make()), "screen.clover.area.svg")
    assert not [word for word in words if word not in line], line
    assert "example.com" not in line or "outside the file" in line


@pytest.mark.parametrize("name", SVG_MENDED)
def test_drawing_mended(name: str, tmp_path: Path) -> None:
    """invariant: what cannot harm is left out or mended, and that is told."""
    make, words = SVG_MENDED[name]
    job = load(with_area(tmp_path, make()))
    assert any(words in remark and "panel.svg" in remark for remark in job.remarks), job.remarks
    assert job.screens[0].area.rings


def test_id(tmp_path: Path) -> None:
    """invariant: an id that is not there is told with the nearest one; one that is there twice is refused."""
    two = '<rect id="b" width="1" height="1"/><rect id="b" width="2" height="1"/>'
    drawing = svg(f'<rect id="panel" width="5" height="5"/>{two}')()
    line = refusal(with_area(tmp_path, drawing, more=', id = "pannel"'), "screen.clover.area.id")
    assert "nearest: panel" in line
    assert "more than one" in refusal(with_area(tmp_path, drawing, more=', id = "b"'), "screen.clover.area.id")
    assert load(with_area(tmp_path, drawing, more=', id = "panel"')).screens[0].area.area_mm2() == pytest.approx(25)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("../cow.svg", "leaves"),
        ("/etc/passwd", "leaves"),
        ("a/../../cow.svg", "leaves"),
        ("~/cow.svg", "leaves"),
        ("c:cow.svg", "leaves"),
        ("art\\\\cow.svg", "backslashes"),
        ("missing.svg", "does not exist"),
        (".", "is a folder"),
        ("link.svg", "through a link"),
        ("circle.svg", "circle of links"),
        ("pipe.svg", "is a pipe"),
        ("cow\\u0000.svg", "control character"),
        ("", "empty"),
        ("x" * 300, "too long"),
        ("x/" * 90 + "y", "does not exist"),
    ],
)
def test_paths(text: str, words: str, tmp_path: Path) -> None:
    """invariant: art lies in the preset's folder, also when links are followed; nothing else is opened."""
    folder = tmp_path / "job"
    folder.mkdir()
    (tmp_path / "cow.svg").write_bytes(svg(PANEL)())
    (folder / "link.svg").symlink_to(tmp_path / "cow.svg")
    (folder / "circle.svg").symlink_to(folder / "circle.svg")
    os.mkfifo(folder / "pipe.svg")
    preset = folder / "lid.toml"
    preset.write_text(PRESET + f'tone = "40 %"\narea = {{ svg = "{text}" }}\n', encoding="utf-8")
    with pytest.raises(InputError) as caught:
        load(preset)
    assert words in str(caught.value)


def png(array: np.ndarray, **more: object) -> bytes:
    stream = io.BytesIO()
    Image.fromarray(array).save(stream, "PNG", **more)
    return stream.getvalue()


def tiff(array: np.ndarray, **more: object) -> bytes:
    stream = io.BytesIO()
    Image.fromarray(array).save(stream, "TIFF", **more)
    return stream.getvalue()


def png_chunk(kind: bytes, body: bytes) -> bytes:
    return struct.pack(">I", len(body)) + kind + body + struct.pack(">I", zlib.crc32(kind + body))


def png_header(wide: int, high: int, idat: bytes = b"") -> bytes:
    head = struct.pack(">IIBBBBB", wide, high, 8, 0, 0, 0, 0)
    return b"\x89PNG\r\n\x1a\n" + png_chunk(b"IHDR", head) + png_chunk(b"IDAT", idat) + png_chunk(b"IEND", b"")


def tiff_loop() -> bytes:
    data = bytearray(tiff(np.full((4, 4), 128, np.uint8)))
    (first,) = struct.unpack("<I", data[4:8])
    (count,) = struct.unpack("<H", data[first : first + 2])
    data[first + 2 + 12 * count : first + 6 + 12 * count] = struct.pack("<I", first)
    return bytes(data)


RAMP = np.arange(0, 240, 5, dtype=np.uint8).reshape(4, 12)

PICTURE_REFUSED: dict[str, tuple[Callable[[], bytes], tuple[str, ...]]] = {
    "empty": (lambda: b"", ("is empty",)),
    "svg by content": (svg(PANEL), ("SVG drawing, by its content",)),
    "random bytes": (lambda: np.random.default_rng(3).bytes(5000), ("no picture, by its content",)),
    "gif": (lambda: b"GIF89a" + b"\0" * 50, ("a GIF",)),
    "bigtiff": (lambda: b"II+\0" + b"\0" * 50, ("BigTIFF",)),
    "truncated png": (
        lambda: png(np.random.default_rng(1).integers(0, 255, (200, 200), np.uint8))[:5000],
        ("damaged or cut short",),
    ),
    "truncated tiff": (lambda: tiff(np.zeros((200, 200), np.uint8))[:5000], ("damaged or cut short",)),
    "bad checksum": (lambda: png(RAMP).replace(b"IHDR\0", b"IHDR\1", 1), ("damaged or cut short",)),
    "bad data": (lambda: png_header(100, 100, b"rubbish"), ("damaged or cut short",)),
    "12000 x 12000": (
        lambda: png_header(12_000, 12_000, zlib.compress(b"\0" * 12_001 * 12_000)),
        ("too many pixels", "12000 x 12000"),
    ),
    "100000 x 1 of nothing": (lambda: png_header(100_000, 1), ("damaged or cut short",)),
    "no width": (lambda: png_header(0, 5), ()),
    "text bomb": (
        lambda: (
            b"\x89PNG\r\n\x1a\n"
            + png_chunk(b"IHDR", struct.pack(">IIBBBBB", 4, 4, 8, 0, 0, 0, 0))
            + b"".join(png_chunk(b"zTXt", b"k\0\0" + zlib.compress(b"x" * 50_000_000)) for _ in range(3))
        ),
        ("damaged or cut short",),
    ),
    "cmyk": (lambda: _saved(Image.new("CMYK", (4, 4)), "TIFF"), ("CMYK",)),
    "cmyk jpeg": (lambda: _saved(Image.new("CMYK", (4, 4)), "JPEG"), ("CMYK",)),
    "lab": (lambda: _saved(Image.new("LAB", (4, 4)), "TIFF"), ("CIELAB",)),
    "floats": (lambda: tiff(np.zeros((4, 4), np.float32)), ("floating point",)),
    "32 bits": (lambda: tiff(np.zeros((4, 4), np.int32)), ("32 bit",)),
}


def _saved(image: Image.Image, kind: str) -> bytes:
    stream = io.BytesIO()
    image.save(stream, kind)
    return stream.getvalue()


@pytest.mark.parametrize("name", PICTURE_REFUSED)
def test_picture_refused(name: str, tmp_path: Path) -> None:
    """invariant: refused in words that name the preset's key; size is judged by the header."""
    make, words = PICTURE_REFUSED[name]
    line = refusal(with_picture(tmp_path, make()), "screen.clover.tone.image")
    assert not [word for word in words if word not in line], line


def tones(job: Job) -> np.ndarray:
    values = job.screens[0].tone.values
    assert values is not None
    return values


GREY = RAMP.astype(float) / 255
RGB = np.stack([RAMP, RAMP[::-1], RAMP[:, ::-1]], axis=2)
LUMA = (RGB @ np.array([0.2126, 0.7152, 0.0722])) / 255


def _oriented(kind: str, orientation: int) -> bytes:
    exif = Image.Exif()
    exif[274] = orientation
    # stored so that the tag turns it upright again: 6 is "turn by a quarter clockwise"
    stored = {1: RAMP, 3: RAMP[::-1, ::-1], 6: np.rot90(RAMP, 1), 8: np.rot90(RAMP, -1), 2: RAMP[:, ::-1]}[orientation]
    stream = io.BytesIO()
    Image.fromarray(np.ascontiguousarray(stored)).save(stream, kind, exif=exif)
    return stream.getvalue()


def _palette() -> bytes:
    image = Image.new("P", (12, 4))
    image.putdata(RAMP.ravel().tolist())
    image.putpalette([v for g in range(256) for v in (g, g, g)])
    return _saved(image, "PNG")


def _transparent() -> bytes:
    alpha = np.full_like(RAMP, 128)
    return _saved(Image.merge("LA", (Image.fromarray(RAMP), Image.fromarray(alpha))), "PNG")


# name: (file, its grey from 0 to 1, tolerance)
PICTURES: dict[str, tuple[Callable[[], bytes], np.ndarray, float]] = {
    "8 bit png": (lambda: png(RAMP), GREY, 1e-7),
    "16 bit png": (lambda: png(RAMP.astype(np.uint16) * 257 + 100), (RAMP * 257.0 + 100) / 65535, 1e-7),
    "8 bit tiff": (lambda: tiff(RAMP), GREY, 1e-7),
    "16 bit tiff": (lambda: tiff(RAMP.astype(np.uint16) * 257), GREY, 1e-7),
    "16 bit tiff, big end first": (
        lambda: _saved(Image.frombytes("I;16B", (12, 4), (RAMP.astype(">u2") * 257).astype(">u2").tobytes()), "TIFF"),
        GREY,
        1e-7,
    ),
    "white is zero": (lambda: tiff(RAMP, tiffinfo={262: 0}), GREY, 1e-7),
    "16 bit, white is zero": (lambda: _white_is_zero_16(), 1 - GREY, 1e-7),
    "1 bit": (lambda: _saved(Image.fromarray(RAMP > 120), "PNG"), (RAMP > 120).astype(float), 1e-7),
    "jpeg": (
        lambda: _saved(Image.fromarray(np.repeat(np.repeat(RAMP, 8, 0), 8, 1)), "JPEG"),
        np.repeat(np.repeat(GREY, 8, 0), 8, 1),
        0.02,
    ),
    "rgb": (lambda: png(RGB), LUMA, 1e-5),
    "palette": (_palette, GREY, 1e-5),
    "half clear": (_transparent, GREY * (128 / 255) + (1 - 128 / 255), 1e-5),
    "clear colour": (lambda: png(RAMP, transparency=0), np.where(RAMP == 0, 1.0, GREY), 1e-5),
    "clear colour in 16 bits": (
        lambda: png(RAMP.astype(np.uint16) * 257, transparency=0),
        np.where(RAMP == 0, 1.0, GREY),
        1e-5,
    ),
    **{
        f"turned {n}, {kind}": (
            (lambda kind=kind, n=n: _oriented(kind, n)),
            GREY,
            1e-7 if kind != "JPEG" else 0.2,
        )
        for n in (1, 2, 3, 6, 8)
        for kind in ("PNG", "TIFF")
    },
    "turned jpeg": (lambda: _oriented_jpeg(), np.repeat(np.repeat(GREY, 8, 0), 8, 1), 0.02),
    "loop of pages": (tiff_loop, np.full((4, 4), 128 / 255), 1e-7),
}


def _oriented_jpeg() -> bytes:
    exif = Image.Exif()
    exif[274] = 6
    large = np.repeat(np.repeat(RAMP, 8, 0), 8, 1)
    stream = io.BytesIO()
    Image.fromarray(np.ascontiguousarray(np.rot90(large, 1))).save(stream, "JPEG", exif=exif)
    return stream.getvalue()


def _white_is_zero_16() -> bytes:
    data = bytearray(tiff(RAMP.astype(np.uint16) * 257))
    (first,) = struct.unpack("<I", data[4:8])
    (count,) = struct.unpack("<H", data[first : first + 2])
    for entry in range(count):
        at = first + 2 + 12 * entry
        if struct.unpack("<H", data[at : at + 2])[0] == 262:
            data[at + 8 : at + 10] = struct.pack("<H", 0)
    return bytes(data)


@pytest.mark.parametrize("name", PICTURES)
def test_picture_right_way_up_and_right_sign(name: str, tmp_path: Path) -> None:
    """second way: every storage form of one grey ramp gives 1 - v / largest, top row first."""
    make, grey, tolerance = PICTURES[name]
    values = tones(load(with_picture(tmp_path, make(), name="cow.dat")))
    # 8 and 16 bit grey are exact in float32; luminance and blends are rounded to 16 bits
    np.testing.assert_allclose(values, 1 - grey, atol=tolerance)


def test_picture_is_fitted(tmp_path: Path) -> None:
    """invariant: fitted to the area's box, aspect kept, centred."""
    tone = load(with_picture(tmp_path, png(RAMP))).screens[0].tone
    assert tone.box_mm == pytest.approx((0, 10, 60, 30))


@pytest.mark.parametrize(
    ("array", "words"),
    [(np.array([[100]], np.uint8), "single pixel"), (np.full((5, 5), 255, np.uint8), "all white")],
)
def test_odd_pictures_are_told(array: np.ndarray, words: str, tmp_path: Path) -> None:
    """invariant: a picture that can hardly be meant is used and told."""
    job = load(with_picture(tmp_path, png(array)))
    assert any(words in remark for remark in job.remarks)


def test_second_pages_are_told(tmp_path: Path) -> None:
    """invariant: only the first page of many is used, and they are not all looked at."""
    stream = io.BytesIO()
    pages = [Image.fromarray(RAMP)] * 50
    pages[0].save(stream, "TIFF", save_all=True, append_images=pages[1:])
    job = load(with_picture(tmp_path, stream.getvalue()))
    assert any("only the first page" in remark for remark in job.remarks)


def test_every_bad_file_is_told(tmp_path: Path) -> None:
    """invariant: one bad file does not hide another, nor a good one."""
    (tmp_path / "good.svg").write_bytes(svg(PANEL)())
    (tmp_path / "bad.svg").write_bytes(b"<html/>")
    preset = tmp_path / "lid.toml"
    second = PRESET[PRESET.index("[[screen]]") :].replace('name = "clover"', 'name = "second"')
    third = second.replace("second", "third")
    preset.write_text(
        PRESET
        + 'tone = "40 %"\narea = { svg = "bad.svg" }\n'
        + second + 'tone = { image = "good.svg" }\narea = { svg = "good.svg" }\n'
        + third + 'tone = "5 %"\narea = { svg = "none.svg" }\n',
        encoding="utf-8",
    )  # fmt: skip
    with pytest.raises(InputError) as caught:
        load(preset)
    assert {fault.key for fault in caught.value.faults} == {
        "screen.clover.area.svg",
        "screen.second.tone.image",
        "screen.third.area.svg",
    }


def test_a_reader_that_dies_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """invariant: a file that takes too long is named with the cap; the rest is still read."""
    from patterngen.job import artwork

    monkeypatch.setattr(artwork, "WALL_SECONDS", 0.01)
    with pytest.raises(InputError, match="took longer than"):
        load(with_area(tmp_path, svg(PANEL)()))


@pytest.mark.parametrize(
    ("shape", "free"),
    [
        ((40, 60), ""),
        ((40, 40), "leaves 10 mm free at the left and right of its area (60 x 40 mm)"),
        ((20, 60), "leaves 10 mm free at the top and bottom of its area (60 x 40 mm)"),
        ((400, 590), ""),  # 0.5 mm, but less than 1 %
        ((400, 585), "leaves 0.75 mm free at the left and right"),
    ],
)
def test_free_sides_are_told(shape: tuple[int, int], free: str, tmp_path: Path) -> None:
    """second way: what stays free beside the picture, by hand from its proportions on a sheet of 60 x 40 mm."""
    job = load(with_picture(tmp_path, png(np.full(shape, 100, np.uint8))))
    assert [r.startswith("screen.clover.tone: the picture") and free in r for r in job.remarks] == [True] * bool(free)


def test_free_sides_of_a_small_area(tmp_path: Path) -> None:
    """second way: 6 % of a 3 mm wide area is less than 0.2 mm and not told; 8 % is."""
    for columns, told in ((88, False), (84, True)):
        preset = with_picture(tmp_path, png(np.full((100, columns), 100, np.uint8)))
        (tmp_path / "panel.svg").write_bytes(svg('<rect x="5" y="5" width="3" height="3"/>')())
        text = preset.read_text(encoding="utf-8")
        preset.write_text(f'{text}area = {{ svg = "panel.svg" }}\n', encoding="utf-8")
        assert bool(load(preset).remarks) == told


COLOURS = np.stack([np.full((4, 6), v, np.uint8) for v in (200, 90, 40)], axis=2)
GREYS = np.repeat(np.arange(24, dtype=np.uint8).reshape(4, 6, 1) * 9, 3, axis=2)


@pytest.mark.parametrize(
    ("make", "told"),
    [
        (lambda: png(COLOURS), True),
        (lambda: _saved(Image.fromarray(COLOURS), "JPEG"), True),
        (lambda: _saved(Image.fromarray(COLOURS).quantize(4), "PNG"), True),
        (lambda: png(GREYS), False),
        (lambda: _saved(Image.fromarray(GREYS), "JPEG"), False),
        (lambda: png(GREYS + np.array([0, 2, 0], np.uint8)), False),
        (lambda: png(GREYS + np.array([0, 3, 0], np.uint8)), True),
        (lambda: png(GREYS[..., 0]), False),
        # colour that is wholly transparent shows nowhere
        (lambda: png(np.dstack([COLOURS, np.zeros((4, 6), np.uint8)])), False),
        (lambda: png(np.dstack([COLOURS, np.full((4, 6), 9, np.uint8)])), True),
    ],
)
def test_colour_read_as_grey_is_told(make: Callable[[], bytes], told: bool, tmp_path: Path) -> None:
    """invariant: told only when the channels of what shows really differ."""
    job = load(with_picture(tmp_path, make()))
    words = "cow.png: the picture is in colour and was read as grey, by its luminance (0.2126 red"
    assert any(remark.startswith(words) for remark in job.remarks) == told


@pytest.mark.parametrize(
    ("asked", "nearest"),
    [
        ("art/pannel.svg", '"art/panel.svg"'),
        ("art/Panel.SVG", '"art/panel.svg"'),
        ("Art/panel.svg", '"art/panel.svg"'),
        ("art/panel.toml", '"art/panel.svg"'),
        ("art/panel-2", '"art/panel.svg"'),
        ("art/zzz.svg", ""),
        ("nowhere/panel.svg", ""),
        ("art/outsid.svg", ""),  # a link out of the folder is no help
    ],
)
def test_missing_files_name_the_nearest(asked: str, nearest: str, tmp_path: Path) -> None:
    """invariant: what is proposed is there, is of the kind, and lies in the preset's folder."""
    folder = tmp_path / "job"
    (folder / "art").mkdir(parents=True)
    (tmp_path / "far.svg").write_bytes(b"")
    (folder / "art" / "outside.svg").symlink_to(tmp_path / "far.svg")
    for name in ("panel.svg", "panel.png", "panels.txt"):
        (folder / "art" / name).write_bytes(svg(PANEL)())
    preset = folder / "lid.toml"
    preset.write_text(PRESET + f'tone = "40 %"\narea = {{ svg = "{asked}" }}\n', encoding="utf-8")
    with pytest.raises(InputError) as caught:
        load(preset)
    (fault,) = caught.value.faults
    assert fault.problem == "the drawing does not exist"
    assert (fault.value, fault.nearest) == (f'"{asked}"', nearest)


def test_missing_pictures_name_the_nearest(tmp_path: Path) -> None:
    """invariant: for a picture, a picture is proposed."""
    (tmp_path / "cows.svg").write_bytes(svg(PANEL)())
    preset = with_picture(tmp_path, png(RAMP), name="cow-brown.png")
    preset.write_text(PRESET + 'tone = { image = "cow-brwn.jpg" }\n', encoding="utf-8")
    assert 'nearest: "cow-brown.png"' in refusal(preset, "screen.clover.tone.image")


def test_digests_of_what_was_used(tmp_path: Path) -> None:
    """second way: the digest of each file's bytes, by the path that the preset gives; once for a file used twice."""
    drawing = svg('<rect id="a" x="5" y="5" width="20" height="20"/><rect id="b" x="30" y="5" width="20" height="20"/>')
    (tmp_path / "art").mkdir()
    (tmp_path / "art" / "panel.svg").write_bytes(drawing())
    (tmp_path / "cow.png").write_bytes(png(RAMP))
    preset = tmp_path / "lid.toml"
    second = PRESET[PRESET.index("[[screen]]") :].replace('name = "clover"', 'name = "second"')
    preset.write_text(
        PRESET
        + 'tone = "40 %"\narea = { svg = "art/panel.svg", id = "a" }\n'
        + second + 'tone = { image = "cow.png" }\narea = { svg = "art/panel.svg", id = "b" }\n',
        encoding="utf-8",
    )  # fmt: skip
    assert load(preset).artwork == {
        "art/panel.svg": hashlib.sha256(drawing()).hexdigest(),
        "cow.png": hashlib.sha256(png(RAMP)).hexdigest(),
    }
