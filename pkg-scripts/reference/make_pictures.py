"""Draws the picture files of tests/data/pictures, with what Pillow reads from each: `venv`'s python, no options.

Invented pictures, no rights of others. `expected.json` holds, per file, the upright size and the mean colour of each
cell of a 4 × 3 grid, by Pillow: orientation applied, transparency on white, the first frame.
"""

import json
import struct
import zlib
from pathlib import Path

import numpy as np
from PIL import Image, ImageDraw, ImageOps

FOLDER = Path(__file__).resolve().parent.parent.parent / "tests" / "data" / "pictures"
SIZE = (96, 60)
ORIENTATION = 0x0112
# The transposition that undoes each EXIF orientation (Exif 2.32, table 6), so that every file shows the same scene.
STORED_AS = {
    1: None,
    2: Image.Transpose.FLIP_LEFT_RIGHT,
    3: Image.Transpose.ROTATE_180,
    4: Image.Transpose.FLIP_TOP_BOTTOM,
    5: Image.Transpose.TRANSPOSE,
    6: Image.Transpose.ROTATE_90,
    7: Image.Transpose.TRANSVERSE,
    8: Image.Transpose.ROTATE_270,
}


def scene():
    """A picture that no turn and no mirror maps to itself, with something different in each cell of the grid."""
    x, y = np.meshgrid(np.linspace(0, 1, SIZE[0]), np.linspace(0, 1, SIZE[1]))
    sky = np.stack([40 + 180 * x, 60 + 120 * y, 220 - 160 * x * y], axis=-1)
    picture = Image.fromarray(sky.astype(np.uint8))
    draw = ImageDraw.Draw(picture)
    draw.ellipse((8, 6, 34, 30), fill=(230, 60, 40))
    draw.rectangle((60, 36, 90, 56), fill=(20, 90, 30))
    draw.polygon([(40, 50), (56, 12), (64, 52)], fill=(250, 240, 120))
    return picture


def upright_grid(file):
    picture = ImageOps.exif_transpose(Image.open(file))
    if picture.mode.startswith("I"):
        picture = Image.fromarray(np.rint(np.asarray(picture, np.float64) / 257).astype(np.uint8))
    if picture.has_transparency_data:
        picture = picture.convert("RGBA")
        picture = Image.alpha_composite(Image.new("RGBA", picture.size, "white"), picture)
    pixels = np.asarray(picture.convert("RGB"), np.float64)
    cells = [cell.mean(axis=(0, 1)).round(2).tolist() for row in np.array_split(pixels, 3) for cell in np.array_split(row, 4, axis=1)]
    return {"width": picture.width, "height": picture.height, "cells": cells}


def rgb16_png(pixels):
    """A PNG with 16 bits a channel, which Pillow does not write."""
    def chunk(kind, data):
        return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))

    height, width, _ = pixels.shape
    rows = b"".join(b"\0" + row.astype(">u2").tobytes() for row in pixels)
    header = struct.pack(">IIBBBBB", width, height, 16, 2, 0, 0, 0)
    return b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", header) + chunk(b"IDAT", zlib.compress(rows, 9)) + chunk(b"IEND", b"")


def main():
    FOLDER.mkdir(parents=True, exist_ok=True)
    picture = scene()

    def save(name, image=picture, **options):
        image.save(FOLDER / name, **options)

    for orientation, transposition in STORED_AS.items():
        exif = Image.Exif()
        exif[ORIENTATION] = orientation
        stored = picture if transposition is None else picture.transpose(transposition)
        save(f"orientation-{orientation}.jpg", stored, quality=92, subsampling=0, exif=exif)
    turned = picture.transpose(STORED_AS[6])
    exif = Image.Exif()
    exif[ORIENTATION] = 6
    save("orientation-6.png", turned, exif=exif)
    save("orientation-6.webp", turned, lossless=True, exif=exif)

    save("plain.png")
    save("plain.bmp")
    save("lossy.webp", quality=90)
    save("lossless.webp", lossless=True)
    save("subsampled.jpg", quality=90, subsampling=2)
    save("progressive.jpg", quality=90, progressive=True)
    save("restarts.jpg", quality=90, restart_marker_blocks=2)
    save("grey.jpg", picture.convert("L"), quality=92)
    save("grey-progressive.jpg", picture.convert("L"), quality=92, progressive=True)
    save("cmyk.jpg", picture.convert("CMYK"), quality=92, subsampling=0)
    save("palette.png", picture.quantize(64))
    save("bilevel.png", picture.convert("1"))
    grey = np.asarray(picture.convert("L"), np.uint16) * 257
    save("grey16.png", Image.fromarray(grey))
    (FOLDER / "rgb16.png").write_bytes(rgb16_png(np.asarray(picture, np.uint16) * 257))

    alpha = Image.fromarray(np.linspace(0, 255, SIZE[0] * SIZE[1]).reshape(SIZE[1], SIZE[0]).astype(np.uint8))
    clear = picture.copy()
    clear.putalpha(alpha)
    save("transparent.png", clear)
    save("transparent.webp", clear, lossless=True)
    save("transparent-grey.png", clear.convert("LA"))
    coloured = picture.quantize(32)
    save("transparent.gif", coloured, transparency=coloured.getpixel((20, 18)))
    second = Image.new("RGB", SIZE, (0, 0, 0))
    save("animated.gif", picture.quantize(128), save_all=True, append_images=[second.quantize(2)], duration=100)
    save("animated.webp", lossless=True, save_all=True, append_images=[second], duration=100)

    save("one-pixel.png", Image.new("RGB", (1, 1), (200, 30, 90)))
    save("sliver.png", Image.new("RGB", (3000, 1), (10, 160, 90)))
    no_grid = {"expected.json", "huge.png", "rgb16.png", "one-pixel.png", "sliver.png"}
    exact = {path.name: upright_grid(path) for path in sorted(FOLDER.iterdir()) if path.name not in no_grid}
    # Pillow reads 16-bit colour as 8-bit, which is what the file holds in its high bytes.
    exact["rgb16.png"] = exact["plain.png"]
    Image.new("1", (20_000, 20_000)).save(FOLDER / "huge.png", optimize=True)

    lines = ",\n".join(f" {json.dumps(name)}: {json.dumps(grid)}" for name, grid in sorted(exact.items()))
    (FOLDER / "expected.json").write_text("{\n" + lines + "\n}\n")


if __name__ == "__main__":
    main()
