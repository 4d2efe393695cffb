"""Writes the small image files of tests/data/images, which tests/frames_outside.rs reads.

The files come from two general-purpose libraries of the Python package index, tifffile (with
imagecodecs) and Pillow, so that reading is held against writers outside this project:

    python3 -m venv venv
    venv/bin/pip install tifffile==2026.3.3 imagecodecs==2026.3.6 pillow numpy
    venv/bin/python tests/outside/make_tiffs.py

The grey level in row r and column c of page p (all counted from 0, row 0 on top) is

    8 bit:   (r*r + 29*c + 53*p + 7)        mod 256
    12 bit:  (r*r + 37*c + 977*p + 123)     mod 4096
    16 bit:  (r*r*251 + 4001*c + 977*p + 12345) mod 65536

Every good image is 40 px wide and 24 px high unless its name ends in _large (100 x 90 px, long
enough for all code widths of LZW).
"""

from pathlib import Path

import numpy
import tifffile
from PIL import Image

FOLDER = Path(__file__).resolve().parents[1] / "data" / "images"


def levels(bits, page=0, width=40, height=24):
    r = numpy.arange(height, dtype=numpy.int64)[:, None]
    c = numpy.arange(width, dtype=numpy.int64)[None, :]
    if bits == 8:
        return ((r * r + 29 * c + 53 * page + 7) % 256).astype(numpy.uint8)
    if bits == 12:
        return ((r * r + 37 * c + 977 * page + 123) % 4096).astype(numpy.uint16)
    return ((r * r * 251 + 4001 * c + 977 * page + 12345) % 65536).astype(numpy.uint16)


def tiff(name, data, **options):
    options.setdefault("photometric", "minisblack")
    tifffile.imwrite(FOLDER / name, data, metadata=None, software=None, **options)


def good():
    tile = {"tile": (16, 16)}
    for bits in (8, 16):
        data = levels(bits)
        tiff(f"strips_{bits}.tif", data, rowsperstrip=5)
        tiff(f"tiles_{bits}.tif", data, **tile)
        tiff(f"packbits_{bits}.tif", data, compression="packbits", rowsperstrip=7)
        tiff(f"packbits_tiles_{bits}.tif", data, compression="packbits", **tile)
        tiff(f"lzw_{bits}.tif", data, compression="lzw", rowsperstrip=7)
        tiff(f"lzw_predictor_tiles_{bits}.tif", data, compression="lzw", predictor=2, **tile)
        tiff(f"deflate_{bits}.tif", data, compression="adobe_deflate", rowsperstrip=7)
        tiff(f"deflate_predictor_{bits}.tif", data, compression="adobe_deflate", predictor=2)
        tiff(f"deflate_old_number_{bits}.tif", data, compression="deflate")
        tiff(f"deflate_tiles_{bits}.tif", data, compression="adobe_deflate", **tile)
        tiff(f"white_is_zero_{bits}.tif", 2**bits - 1 - data, photometric="miniswhite")
        tiff(f"white_is_zero_tiles_{bits}.tif", 2**bits - 1 - data, photometric="miniswhite",
             compression="lzw", **tile)
        tiff(f"big_endian_{bits}.tif", data, byteorder=">", rowsperstrip=5)
        tiff(f"big_endian_predictor_{bits}.tif", data, byteorder=">", compression="lzw", predictor=2)
        tiff(f"bigtiff_{bits}.tif", data, bigtiff=True, rowsperstrip=5)
        tiff(f"bigtiff_big_endian_{bits}.tif", data, bigtiff=True, byteorder=">", **tile)
        Image.fromarray(data).save(FOLDER / f"pillow_lzw_{bits}.tif", compression="tiff_lzw")
        Image.fromarray(data).save(FOLDER / f"grey_{bits}.png")
        tiff(f"lzw_{bits}_large.tif", levels(bits, 0, 100, 90), compression="lzw", rowsperstrip=90)
    # 281: MaxSampleValue, 3: SHORT.
    tiff("camera_12.tif", levels(12), extratags=[(281, 3, 1, 4095, True)])
    with tifffile.TiffWriter(FOLDER / "pages_16.tif") as file:
        for page in range(4):
            file.write(levels(16, page), photometric="minisblack", metadata=None, software=None,
                       compression=[None, "lzw", "adobe_deflate", "packbits"][page])
    with tifffile.TiffWriter(FOLDER / "pages_with_thumbnail_8.tif") as file:
        # subfiletype 1: a reduced-resolution copy of another page.
        for page, data in ((0, levels(8, 0)), (None, levels(8, 0)[::4, ::4]), (1, levels(8, 1))):
            file.write(data, photometric="minisblack", metadata=None, software=None,
                       subfiletype=1 if page is None else 0)


def bad():
    grey = levels(8)
    colour = numpy.stack([grey, grey, grey], axis=-1)
    tiff("bad_colour.tif", colour, photometric="rgb")
    tiff("bad_colour_planes.tif", numpy.moveaxis(colour, -1, 0), photometric="rgb",
         planarconfig="separate")
    tiff("bad_colour_table.tif", grey, photometric="palette",
         colormap=numpy.zeros((3, 256), numpy.uint16))
    tiff("bad_float.tif", grey.astype(numpy.float32))
    tiff("bad_half.tif", grey.astype(numpy.float16))
    tiff("bad_32_bit.tif", grey.astype(numpy.uint32))
    tiff("bad_signed.tif", grey.astype(numpy.int16))
    tiff("bad_1_bit.tif", grey > 100)
    tiff("bad_two_channels.tif", numpy.stack([grey, grey], axis=-1), planarconfig="contig")
    tiff("bad_jpeg_inside.tif", grey, compression="jpeg")
    Image.fromarray(colour).save(FOLDER / "bad_colour.png")
    Image.fromarray(grey).convert("P").save(FOLDER / "bad_colour_table.png")
    Image.fromarray(grey).convert("LA").save(FOLDER / "bad_transparent.png")
    Image.fromarray(grey > 100).save(FOLDER / "bad_1_bit.png")
    Image.fromarray(grey).save(FOLDER / "bad_jpeg.jpg")
    for whole, cut in (("strips_16.tif", "bad_cut_short.tif"), ("grey_16.png", "bad_cut_short.png"),
                       ("lzw_16.tif", "bad_cut_short_lzw.tif")):
        data = (FOLDER / whole).read_bytes()
        (FOLDER / cut).write_bytes(data[: len(data) * 6 // 10])
    (FOLDER / "bad_text.tif").write_text("x_mm,y_mm\n")
    (FOLDER / "bad_empty.tif").write_bytes(b"")


if __name__ == "__main__":
    FOLDER.mkdir(parents=True, exist_ok=True)
    good()
    bad()
