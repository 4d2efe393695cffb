"""The yardstick that a numerical script is: the steps of one kolk interrogation in numpy and scipy.

What somebody who knows both libraries well writes in a few days: windows are views, one row of them
is transformed at a time (so that it stays in the cache) in single precision, and everything else is
done for all windows at once. Same windows, weights, deformation, spline degrees, peak, validation and
uncertainty as kolk; simpler at the edges (mirrored images instead of dark ones), in the validation
(no second look at rejected vectors) and in the uncertainty (that of the last windows alone).
Half its time goes into scipy's map_coordinates; reading the images by 36 gathers in numpy instead
takes a third off the whole (tried; left out for its length).

    python3 -m venv /tmp/outside && /tmp/outside/bin/pip install numpy scipy pillow
    /tmp/outside/bin/python tests/bench/script.py first.tif second.tif
        [--windows 64,32,32] [--overlap 0.5] [--workers 1] [--repeats 5] [--shift RIGHT,DOWN]

Prints the least time of the repeats, reading of files excluded; with --shift, a known uniform
displacement in px, also bias, random error and mean stated uncertainty.
"""

import argparse
import concurrent.futures
import time
import warnings

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view
from scipy import fft, ndimage, signal
from scipy.interpolate import CubicSpline

NEAR = np.array([1, 6, 1], np.float32) / 8  # smoothing of the plane before the peak is read
REACH = 3  # px over which the statistics of neighbouring pixels are taken to be correlated


class Windows:
    """Where the windows of a pass lie, and how much their pixels count."""

    def __init__(self, side, overlap, shape):
        self.side = side
        self.step = max(1, round(side * (1 - overlap)))
        self.corner = [(n - side) % self.step // 2 for n in shape]
        middle = (side - 1) / 2
        self.y, self.x = (
            np.arange(start, n - side + 1, self.step) + middle for start, n in zip(self.corner, shape)
        )
        weight = np.sqrt(1 - ((2 * np.arange(side) - side + 1) / side) ** 2)
        self.weight = np.outer(weight, weight).astype(np.float32)
        # Share of a weighted pattern that is left at each offset.
        overlapped = np.correlate(weight, weight, "full")[side - 1 :]
        self.left = np.append(overlapped / overlapped[0], 0).clip(0.05)

    def cut(self, image):
        """A view of every window: (rows, columns, side, side)."""
        views = sliding_window_view(image, (self.side, self.side))
        return views[self.corner[0] :: self.step, self.corner[1] :: self.step]

    def weighted(self, cut):
        """A row of windows without their means, weighted, and the energy of each."""
        weight = self.weight.ravel()
        flat = np.array(cut).reshape(len(cut), -1)
        flat -= (flat @ (weight / weight.sum()))[:, None]
        flat *= weight
        return flat.reshape(cut.shape), np.einsum("ij,ij->i", flat, flat)


def one_pass(images, windows, reach, statistics, workers):
    """Residual shift of every window (2, rows, columns), and its variance where it is asked for."""
    n, near = windows.side, np.arange(-reach, reach + 1)
    shifts, variances = [], []
    for cut in zip(*(windows.cut(image) for image in images)):
        (a, energy_a), (b, energy_b) = map(windows.weighted, cut)
        energy = np.sqrt(energy_a * energy_b) + np.float32(1e-30)
        spectrum = fft.rfft2(a, workers=workers).conj()
        spectrum *= fft.rfft2(b, workers=workers)
        plane = fft.irfft2(spectrum, (n, n), workers=workers, overwrite_x=True)
        sought = plane[:, near][:, :, near].reshape(len(a), -1)
        row, column = np.divmod(sought.argmax(1), len(near))
        row, column = row - reach, column - reach
        offset, top, sides = read_peaks(plane, energy, row, column, windows.left)
        shifts.append(np.stack([column, row]) + offset)
        if statistics:
            slope = 4 * energy * sides * np.log(np.where(top > sides, top / sides, np.nan))
            variances.append(lean_variance(a, b) / slope**2)
    return np.stack(shifts, 1), np.stack(variances, 1) if statistics else None


def read_peaks(plane, energy, row, column, left):
    """Three-point Gaussian fit in the smoothed plane: offsets (x, y), top, mean of the sides."""
    n, around = plane.shape[1], np.arange(-2, 3)
    r, c = row[:, None] + around, column[:, None] + around
    patch = plane[np.arange(len(plane))[:, None, None], r[:, :, None] % n, c[:, None, :] % n]
    patch = patch / (energy[:, None, None] * left[abs(r)][:, :, None] * left[abs(c)][:, None, :])
    rows = sum(NEAR[k] * patch[:, k : k + 3] for k in range(3))
    smooth = sum(NEAR[k] * rows[:, :, k : k + 3] for k in range(3))
    before = np.stack([smooth[:, 1, 0], smooth[:, 0, 1]])
    after = np.stack([smooth[:, 1, 2], smooth[:, 2, 1]])
    top = smooth[:, 1, 1]
    logs = [np.log(values.clip(1e-6)) for values in (before, top, after)]
    bend = 2 * logs[0] - 4 * logs[1] + 2 * logs[2]
    offset = np.where(bend < 0, (logs[0] - logs[2]) / np.minimum(bend, -1e-6), 0).clip(-1, 1)
    return offset, top, (before + after).clip(1e-6) / 2


def lean_variance(a, b):
    """Variance of the difference between the samples beside the peak (Wieneke 2015, Meas. Sci.
    Technol. 26, 074002), along x and y."""
    soft = ndimage.correlate1d(ndimage.correlate1d(b, NEAR, 1), NEAR, 2)
    size = 2 * REACH + 1
    found = []
    for axis in (2, 1):
        here, after = ([slice(None)] * 3 for _ in range(2))
        here[axis], after[axis] = slice(None, -1), slice(1, None)
        here, after = tuple(here), tuple(after)
        lean = a[here] * soft[after] - a[after] * soft[here]
        lean -= lean.mean((1, 2), keepdims=True)
        box = lean
        for along in (1, 2):
            box = ndimage.uniform_filter1d(box, size, along, mode="constant")
        kept = 1 - size**2 / lean[0].size
        found.append(np.einsum("ijk,ijk->i", lean, box) * size**2 / kept)
    return np.stack(found)


def neighbours(field):
    """The eight around each node, NaN past the edge: (8, ..., rows, columns)."""
    rows, columns = field.shape[-2:]
    wide = np.pad(field, [(0, 0)] * (field.ndim - 2) + [(1, 1)] * 2, constant_values=np.nan)
    places = [(j, i) for j in range(3) for i in range(3) if (j, i) != (1, 1)]
    return np.stack([wide[..., j : j + rows, i : i + columns] for j, i in places])


def validate(field, limit=2.0, floor=0.1):
    """Normalized median test (Westerweel & Scarano 2005), two rounds: the field with what failed
    replaced by the median of its good neighbours, and where it passed."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", RuntimeWarning)  # medians of nothing are NaN, as they should
        good = np.full(field.shape[1:], True)
        for _ in range(2):
            around = neighbours(np.where(good, field, np.nan))
            median = np.nanmedian(around, 0)
            scatter = np.nanmedian(abs(around - median), 0)
            good = np.hypot(*(abs(field - median) / (scatter + floor))) <= limit
        filled = np.where(good, field, np.nan)
        while good.any() and np.isnan(filled).any():
            filled = np.where(np.isnan(filled), np.nanmedian(neighbours(filled), 0), filled)
    return filled, good


def smooth(field, windows):
    """Least-squares parabola over about 1.25 windows along each axis (Savitzky & Golay 1964)."""
    half = 5 * windows.side // (8 * windows.step)
    for axis in (1, 2):
        if half >= 2 and field.shape[axis] > 2 * half:
            field = signal.savgol_filter(field, 2 * half + 1, 2, axis=axis)
        elif half == 1:
            field = ndimage.correlate1d(field, np.array([1, 14, 1]) / 16, axis, mode="nearest")
    return field


def spline(nodes, places):
    """The matrix that reads a cubic spline through values at `nodes` at other places; continued
    evenly for two nodes past the ends."""
    values = np.pad(np.eye(len(nodes)), ((2, 2), (0, 0)), "reflect", reflect_type="odd")
    wide = np.pad(nodes, 2, "reflect", reflect_type="odd")
    return CubicSpline(wide, values, bc_type="natural")(places).astype(np.float32)


def filtered(image):
    """The coefficients of the quintic spline through an image."""
    return ndimage.spline_filter(image, 5, np.float32, "mirror")


def interrogate(first, second, sides=(64, 32, 32), overlap=0.5, workers=1):
    """Displacement (2, rows, columns) to the right and down at the mid time, in px; its standard
    uncertainty; where it was measured, not replaced; and the windows of the last pass."""
    images = exposures = [np.ascontiguousarray(image, np.float32) for image in (first, second)]
    rows, columns = np.indices(images[0].shape, np.float32, sparse=True)
    coefficients, predictor = None, None

    def read(at_rows, at_columns):
        nodes, values = predictor
        return spline(nodes.y, at_rows) @ values @ spline(nodes.x, at_columns).T

    def deform(coefficients, half):
        at = np.stack([rows + half * down, columns + half * right])
        return ndimage.map_coordinates(
            coefficients, at, np.float32, order=5, mode="mirror", prefilter=False
        )

    with concurrent.futures.ThreadPoolExecutor(workers) as pool:
        for number, side in enumerate(sides, 1):
            windows, last = Windows(side, overlap, images[0].shape), number == len(sides)
            if predictor:
                right, down = read(rows.ravel(), columns.ravel())
                coefficients = coefficients or list(pool.map(filtered, exposures))
                images = list(pool.map(deform, coefficients, (-0.5, 0.5)))
            reach = max(2, side // 4) if predictor else side // 2 - 1
            field, variances = one_pass(images, windows, reach, last, workers)
            if predictor:
                field += read(windows.y, windows.x)
            field, good = validate(field)
            predictor = windows, smooth(field, windows).astype(np.float32)
    # Too few particles in one window to say its own variance well: the mean over half a window.
    pool_size = 2 * (windows.side // 2 // windows.step) + 1
    known = good & np.isfinite(variances)
    total, count = (
        ndimage.uniform_filter(values, (0, pool_size, pool_size), mode="constant")
        for values in (np.where(known, variances, 0), known.astype(float))
    )
    uncertainty = np.sqrt((total / count.clip(1e-9)).clip(0))
    return field, np.where(good, uncertainty, np.nan), good, windows


def main():
    from PIL import Image

    words = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    words.add_argument("first")
    words.add_argument("second")
    words.add_argument("--windows", default="64,32,32")
    words.add_argument("--overlap", type=float, default=0.5)
    words.add_argument("--workers", type=int, default=1)
    words.add_argument("--repeats", type=int, default=5)
    words.add_argument("--shift")
    given = words.parse_args()
    pair = [np.asarray(Image.open(name)).astype(np.float32) for name in (given.first, given.second)]
    sides = [int(side) for side in given.windows.split(",")]
    times = []
    for _ in range(given.repeats):
        start = time.perf_counter()
        found = interrogate(*pair, sides, given.overlap, given.workers)
        times.append(1e3 * (time.perf_counter() - start))
    field, uncertainty, good, _ = found
    print(f"script, {given.workers} worker(s): least {min(times):.1f} ms, "
          f"median {np.median(times):.1f} ms; {100 * good.mean():.1f} % measured")
    if given.shift:
        true = np.array([float(part) for part in given.shift.split(",")])[:, None, None]
        error = (field - true)[:, 1:-1, 1:-1].reshape(2, -1)
        print("bias {:.4f} {:.4f} px, random {:.4f} {:.4f} px, uncertainty {:.4f} {:.4f} px".format(
            *error.mean(1), *error.std(1), *np.nanmean(uncertainty, (1, 2))))


if __name__ == "__main__":
    main()
