"""Circular correlation planes by a general-purpose numerical library (numpy's double-precision FFT).

Writes tests/data/correlation_planes.csv, against which a test in src/interrogate/transform checks
the transform kernel. Run once, by hand:

    python3 -m venv /tmp/outside && /tmp/outside/bin/pip install numpy
    /tmp/outside/bin/python tests/outside/correlation_planes.py

The windows are whole numbers by formula, the same in the test. With k the number of the window pair,
i the row and j the column of a window of H x W:

    first(i, j)  = (7 i i + 13 j j + 5 i j + 31 k) mod 97
    second(i, j) = first((i - 2) mod H, (j + 3) mod W) + (3 i + 11 j + k) mod 19

Their means are removed. The plane is R(m, n) = sum first(i, j) second(i + m, j + n), circular.
"""

import csv
import pathlib

import numpy

SHAPES = [(16, 16), (16, 16), (32, 24)]


def windows(k, height, width):
    def first(i, j):
        return (7 * i * i + 13 * j * j + 5 * i * j + 31 * k) % 97

    i, j = numpy.mgrid[0:height, 0:width]
    a = first(i, j).astype(float)
    b = (first((i - 2) % height, (j + 3) % width) + (3 * i + 11 * j + k) % 19).astype(float)
    return a - a.mean(), b - b.mean()


path = pathlib.Path(__file__).parent.parent / "data" / "correlation_planes.csv"
with open(path, "w", newline="") as file:
    rows = csv.writer(file, lineterminator="\n")
    rows.writerow(["pair", "height", "width", "row", "column", "value"])
    for k, (height, width) in enumerate(SHAPES):
        a, b = windows(k, height, width)
        plane = numpy.fft.ifft2(numpy.conj(numpy.fft.fft2(a)) * numpy.fft.fft2(b)).real
        for m in range(height):
            for n in range(width):
                rows.writerow([k, height, width, m, n, f"{plane[m, n]:.4f}"])
