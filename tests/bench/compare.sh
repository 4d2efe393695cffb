#!/usr/bin/env bash
# Whole interrogation of one 1024 x 1024 pair (windows 64, 32, 32 px, overlap 0.5) by kolk, by a
# numerical script (numpy and scipy, script.py) on the very same images, and beside them the bare
# transforms of the same windows by a general-purpose C library. The sides run in turn; printed are
# the least times and their ratios. The machine must be otherwise quiet: on a busy one a long run is
# always disturbed, a short one sometimes not, and ratios come out too large. Needs cc, FFTW 3 (single precision) and python3 with venv, for
# this comparison only; numpy, scipy and Pillow are installed into a temporary folder.
#
#   bash tests/bench/compare.sh [turns]
set -euo pipefail
cd "$(dirname "$0")/../.."
turns="${1:-5}"
work="$(mktemp -d)"
trap 'rm -rf "$work"' EXIT
cc -O3 -march=native -o "$work/bare" tests/bench/fftw_bare.c -lfftw3f -lm
python3 -m venv "$work/python"
"$work/python/bin/pip" install -q --disable-pip-version-check numpy scipy pillow
cargo bench --bench interrogation --no-run 2>/dev/null
cargo bench --bench interrogation -- 1 "$work" >/dev/null 2>&1 # leaves the pair as TIFF files
cores="$(nproc)"
# One thread means one: the library for matrix products would take all.
export OPENBLAS_NUM_THREADS=1
script() {
  "$work/python/bin/python" tests/bench/script.py "$work/first.tif" "$work/second.tif" --repeats 3 "$@"
}
for _ in $(seq "$turns"); do
  taskset -c 0 "$work/bare" | grep -o 'total [0-9.]*' | cut -d' ' -f2 | sort -n | head -1 >> "$work/bare.ms"
  cargo bench --bench interrogation -- 7 2>/dev/null | grep '^kolk' >> "$work/kolk.txt"
  script --workers 1 >> "$work/script.txt"
  script --workers "$cores" >> "$work/script_all.txt"
done
least() { grep -o 'least [0-9.]*' | cut -d' ' -f2 | sort -n | head -1; }
bare="$(sort -n "$work/bare.ms" | head -1)"
one="$(grep ' 1 thread' "$work/kolk.txt" | least)"
all="$(grep " $cores thread" "$work/kolk.txt" | least)"
by_script="$(least < "$work/script.txt")"
by_script_all="$(least < "$work/script_all.txt")"
awk -v b="$bare" -v o="$one" -v a="$all" -v s="$by_script" -v t="$by_script_all" -v n="$cores" 'BEGIN {
  row = "%-44s %8.1f ms %8.2f %8.2f\n"
  printf "%-44s %11s %8s %8s\n", "least time of a 1024 x 1024 px pair", "", "/ bare", "/ kolk 1"
  printf row, "bare transforms in C, 1 thread", b, 1, b / o
  printf row, "kolk, all of it, 1 thread", o, o / b, 1
  printf row, "kolk, all of it, " n " threads", a, a / b, a / o
  printf row, "numerical script, all of it, 1 thread", s, s / b, s / o
  printf row, "numerical script, all of it, " n " threads", t, t / b, t / o
  printf "script / kolk: %.1f on one thread, %.1f on %d\n", s / o, t / a, n }'
