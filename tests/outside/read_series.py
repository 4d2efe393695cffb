"""A series read by the general-purpose packages for Zarr and for labelled arrays.

Makes a recording, lets the program interrogate it into a Zarr group and save every field as CSV as
well, opens the group with zarr and with xarray, and holds every number of the one against the
other. Ends with status 1 at the first that differs.

    python3 -m venv /tmp/outside && /tmp/outside/bin/pip install zarr==3.1.6 xarray==2026.9.0
    /tmp/outside/bin/python tests/outside/read_series.py target/release/kolk
"""

import csv
import pathlib
import subprocess
import sys
import tempfile
import warnings

import numpy
import xarray
import zarr

PAIRS = 4
SCRIPT = """
let eddy = lamb_oseen(#{ x_px: 64, y_px: 48, core_radius_px: 12, circulation_px2_per_frame: 200 });
for k in 0..%d {
    eddy.pair(#{ width_px: 128, height_px: 96, seed: k + 1 }).save(`frames/${k}_a.tif`, `frames/${k}_b.tif`);
}
let rec = recording("out/frames/*.tif", #{ dt_s: 0.004, mm_per_px: 0.05 });
let all = rec.interrogate(plan(#{ windows_px: [32, 16], overlap: 0.5 }), "s.zarr");
let k = 0;
for flow in all { flow.save(`${k}.csv`); k += 1; }
""" % PAIRS
WORDS = ["measured", "replaced", "masked", "outside"]


def check(holds, what):
    if not holds:
        sys.exit(f"differs: {what}")


def table(path):
    with open(path, newline="") as file:
        rows = list(csv.reader(file))
    return {name: [row[i] for row in rows[1:]] for i, name in enumerate(rows[0])}


def numbers(cells):
    return numpy.array([float(cell) if cell else numpy.nan for cell in cells])


def compare(out, data):
    """Every number of a mapping from names to arrays against the tables."""
    names = {"u": "u_mm_per_s", "v": "v_mm_per_s", "u_unc": "u_unc_mm_per_s", "v_unc": "v_unc_mm_per_s"}
    for k in range(PAIRS):
        rows = table(out / f"{k}.csv")
        y, x = numpy.meshgrid(data["y"], data["x"], indexing="ij")
        check((x.ravel() == numbers(rows["x_mm"])).all(), f"x of frame {k}")
        check((y.ravel() == numbers(rows["y_mm"])).all(), f"y of frame {k}")
        for name, column in names.items():
            found = numpy.asarray(data[name][k]).ravel()
            same = numpy.array_equal(found, numbers(rows[column]), equal_nan=True)
            check(same, f"{name} of frame {k}")
        found = [WORDS[code] for code in numpy.asarray(data["status"][k]).ravel()]
        check(found == rows["status"], f"status of frame {k}")


def main(program):
    warnings.simplefilter("error")  # A reader that wonders about the group is a failure, too.
    with tempfile.TemporaryDirectory() as name:
        folder = pathlib.Path(name)
        (folder / "a.rhai").write_text(SCRIPT)
        subprocess.run([program, "run", "a.rhai"], cwd=folder, check=True, stderr=subprocess.DEVNULL)
        out = folder / "out"
        group = zarr.open_group(out / "s.zarr", mode="r")
        members = dict(group.members())
        compare(out, {name: array[...] for name, array in members.items()})
        check(set(members["status"].attrs["flag_meanings"].split()) >= set(WORDS), "flag_meanings")
        with xarray.open_zarr(out / "s.zarr", consolidated=False) as data:
            compare(out, data)
            check(dict(data.sizes)["pair"] == PAIRS, "number of pairs")
            check(data.u.dims == ("pair", "y", "x"), "dimensions of u")
            check(set(data.u.coords) == {"pair", "y", "x"}, "coordinates of u")
            check((data.u.units, data.x.units) == ("mm/s", "mm"), "units")
            check(data.attrs["made_by"]["plan"]["overlap"] == 0.5, "the plan")
            check(float(data.error_correlation[0, 0]) == 1.0, "error_correlation")
            check(data.u.sel(pair=2, x=3.0, y=2.0, method="nearest").ndim == 0, "selection by place")
            speed = numpy.hypot(data.u, data.v).mean("pair")
            print(f"zarr {zarr.__version__}, xarray {xarray.__version__}: {PAIRS} frames of "
                  f"{data.sizes['y']} x {data.sizes['x']} agree; mean speed {float(speed.mean()):.3f} {data.u.units}")


main(pathlib.Path(sys.argv[1]).resolve())
