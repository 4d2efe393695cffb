#!/usr/bin/env bash
# Whole interrogation of one 1024 x 1024 pair (windows 64, 32, 32 px, overlap 0.5) against the bare
# transforms of the same windows by a general-purpose C library, in turn; prints both and the
# ratio of the least times. Needs cc and FFTW 3 (single precision), for this comparison only.
#
#   bash tests/bench/compare.sh [turns]
set -euo pipefail
cd "$(dirname "$0")/../.."
turns="${1:-5}"
work="$(mktemp -d)"
trap 'rm -rf "$work"' EXIT
cc -O3 -march=native -o "$work/bare" tests/bench/fftw_bare.c -lfftw3f -lm
cargo bench --bench interrogation --no-run 2>/dev/null
for _ in $(seq "$turns"); do
  taskset -c 0 "$work/bare" | grep -o 'total [0-9.]*' | cut -d' ' -f2 | sort -n | head -1 >> "$work/bare.ms"
  cargo bench --bench interrogation -- 7 2>/dev/null | tee -a "$work/kolk.txt" | grep '^kolk' || true
done
least() { sort -n | head -1; }
bare="$(least < "$work/bare.ms")"
one="$(grep '1 thread' "$work/kolk.txt" | grep -o 'least [0-9.]*' | cut -d' ' -f2 | least)"
all="$(grep -v '1 thread' "$work/kolk.txt" | grep -o 'least [0-9.]*' | cut -d' ' -f2 | least)"
awk -v b="$bare" -v o="$one" -v a="$all" 'BEGIN {
  printf "bare transforms %.1f ms, kolk whole: one thread %.1f ms, all threads %.1f ms\n", b, o, a
  printf "one thread / bare %.2f, one thread / all threads %.2f\n", o / b, o / a }'
