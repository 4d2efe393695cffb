"""Displacements of two photographs of a real scene against published ones.

The wheel of scikit-image holds a rectified pair of stereo photographs (a motorcycle in a garage, 741 x
500 px) and its disparity, measured by structured light (D. Scharstein et al., German Conference on
Pattern Recognition, 2014; as cited by the library). Taken for two exposures, the left one first,
everything moves to the left by 7 to 60 px: nothing that particle images or this project's own
generator have a say in. The same windows go through kolk and through the numerical script of
tests/bench/script.py.

A disparity d belongs to pixel x of the left photograph; the same thing is at x - d in the right one,
and so at x - d/2 at the mid time, which is where a vector belongs. The disparity is resampled to
there. It is compared where it is smooth: where over the 25 x 25 px round a vector at least 80 % is
known and a plane fits it to 0.5 px (root mean square). Every vector there counts, replaced ones too.
Printed beside it, not required: the same where it is level, 1 px at most between highest and lowest.

    python3 -m venv /tmp/outside && /tmp/outside/bin/pip install scikit-image==0.26.0
    /tmp/outside/bin/python tests/outside/stereo.py target/release/kolk [windows ...]

Ends with status 1 unless kolk, with the first windows given, has a smaller median error and a larger
share within 1 px than the script, and than 0.51 px and 71 %, which a script reached before. Windows
are written 128,64,32; without any, those of the default plan are used behind one of 128 px, since
half a window has to reach 60 px.
"""

import csv
import pathlib
import subprocess
import sys
import tempfile

import numpy as np
import skimage
import tifffile
from scipy import ndimage

HERE = pathlib.Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent / "bench"))
import script  # noqa: E402

WINDOWS, OVERLAP = ["128,64,32,32,32"], 0.75
BEATEN = 0.51, 71.0  # px, %
SIDE = 25  # px over which the disparity has to be smooth


def at_mid_time(disparity):
    """The disparity by mid-time pixel: linear between neighbours; of two surfaces the nearer one."""
    rows, columns = disparity.shape
    x = np.arange(columns) - disparity / 2
    d, ahead, following = disparity[:, :-1], disparity[:, 1:] - disparity[:, :-1], np.diff(x)
    found = np.full(disparity.shape, np.nan)
    for k in (0, 1):  # neighbours at most 1.5 px apart hold two whole pixels at most
        place = np.ceil(x[:, :-1]) + k
        with np.errstate(invalid="ignore"):
            held = (following > 0) & (following <= 1.5) & (place <= x[:, 1:]) & (place >= 0)
        row, column = np.nonzero(held)
        share = (place - x[:, :-1])[held] / following[held]
        np.fmax.at(found, (row, place[held].astype(int)), d[held] + share * ahead[held])
    return found


def mean(values):
    """Mean over the square round every pixel; nothing counts beyond the edge."""
    return ndimage.uniform_filter(values, SIDE, mode="constant")


def smooth_and_level(disparity):
    """Where the disparity is known and lies in a plane, and where it is known and level."""
    known = np.isfinite(disparity)
    y, x = np.indices(disparity.shape, float) - 300
    weight = mean(known.astype(float))
    with np.errstate(all="ignore"):
        average = lambda values: mean(np.where(known, values, 0)) / weight
        product = lambda a, b: average(a * b) - average(a) * average(b)
        xx, xy, yy = product(x, x), product(x, y), product(y, y)
        xd, yd, dd = product(x, disparity), product(y, disparity), product(disparity, disparity)
        residual = dd - (xd * xd * yy - 2 * xd * yd * xy + yd * yd * xx) / (xx * yy - xy * xy)
        highest = ndimage.maximum_filter(np.where(known, disparity, -np.inf), SIDE)
        lowest = ndimage.minimum_filter(np.where(known, disparity, np.inf), SIDE)
        enough = weight >= 0.8
        return enough & (residual < 0.5**2), enough & (highest - lowest <= 1)


def by_kolk(program, folder, windows):
    """x and y of the nodes (y down), displacement to the right and status, by kolk."""
    command = [program, "run", HERE / "stereo.rhai", "--set", f"windows={windows}"]
    subprocess.run(command, cwd=folder, check=True, stderr=subprocess.DEVNULL)
    with open(folder / "out" / "vectors.csv", newline="") as file:
        rows = list(csv.DictReader(file))
    number = lambda name: np.array([float(row[name] or "nan") for row in rows])
    status = np.array([row["status"] for row in rows])
    return number("x_px"), number("y_px"), number("u_px_per_frame"), status == "measured"


def by_script(pair, windows):
    """The same by the script, nodes in kolk's order."""
    sides = [int(side) for side in windows.split(",")]
    field, _, good, where = script.interrogate(*pair, sides, OVERLAP)
    return field[0, ::-1].ravel(), good[::-1].ravel()


def main(program, *plans):
    left, right, disparity = skimage.data.stereo_motorcycle()
    # Mean of three colours of 8 bits, stretched over 16.
    pair = [(image.sum(2, dtype=int) * 85).astype(np.uint16) for image in (left, right)]
    truth = at_mid_time(np.where(np.isfinite(disparity), disparity, np.nan).astype(float))
    places = dict(zip(("smooth", "level"), smooth_and_level(truth)))
    verdicts = [judge(program, pair, truth, places, plan) for plan in plans or WINDOWS]
    sys.exit(verdicts[0])


def judge(program, pair, truth, places, windows):
    """Prints what both sides reach with these windows; what kolk does not reach, else None."""
    with tempfile.TemporaryDirectory() as name:
        folder = pathlib.Path(name)
        for image, file in zip(pair, ("left.tif", "right.tif")):
            tifffile.imwrite(folder / file, image)
        x, y, found, measured = by_kolk(program, folder, windows)
    row, column = len(truth) - 1 - y, x
    exact = ndimage.map_coordinates(truth, [row, column], order=1)
    sides = {"kolk": (found, measured), "script": by_script(pair, windows)}
    print(f"windows {windows} px, overlap {OVERLAP}")
    reached = {}
    for place, where in places.items():
        here = where[row.round().astype(int), column.round().astype(int)]
        here &= np.isfinite(found) & np.isfinite(exact)
        for side, (moved, good) in sides.items():
            error, kept = abs(-moved - exact)[here], good[here]
            median, within = np.median(error), 100 * (error < 1).mean()
            reached[place, side] = median, within
            print(f"  {place:6s} {len(error):5d} vectors, {side:6s}: median error {median:.3f} px, "
                  f"{within:.1f} % within 1 px; measured {100 * kept.mean():.0f} %, "
                  f"of them {100 * (error[kept] < 1).mean():.1f} % within 1 px")
    median, within = reached["smooth", "kolk"]
    for rival, (worse, fewer) in {"the script": reached["smooth", "script"], "before": BEATEN}.items():
        if not (median < worse and within > fewer):
            return f"kolk is not better than {rival} ({worse:.3f} px, {fewer:.1f} %) where it is smooth"
    return None


main(str(pathlib.Path(sys.argv[1]).resolve()), *sys.argv[2:])
