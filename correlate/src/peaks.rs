//! The highest peak of each plane of a batch, and the highest beside it.
//!
//! All lanes are searched at once: the largest value of every row of the search rectangle first,
//! then the row that holds the largest of those; only in that one row is the column looked for
//! lane by lane. The second search reuses the row maxima of the rows no lane's exclusion touches.

use std::ops::Range;

use multiversion::multiversion;

use super::lanes::{LANES, Lanes};
use super::spectrum::lanes_at;

/// Where peaks are looked for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Search {
    /// Largest column offset either way, px. Beyond half the window it means the whole plane.
    pub reach_x: usize,
    /// Largest row offset either way, px.
    pub reach_y: usize,
    /// The second peak lies further than this from the first in columns or in rows, px; 1 leaves out
    /// the 3 x 3 values around it.
    pub exclusion: usize,
}

/// A largest value of one plane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Peak {
    /// Column offset of the second window's pattern, px, positive to the right.
    pub column: i32,
    /// Row offset, px, positive **downwards** as image rows are.
    pub row: i32,
    /// Value of the plane there; negative infinity if nothing was left to search.
    pub height: f32,
}

impl Peak {
    const NONE: Peak = Peak {
        column: 0,
        row: 0,
        height: f32::NEG_INFINITY,
    };
}

/// First and second peak by lane. Of equal values the one found first counts, rows from the top and
/// columns from the left.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Peaks {
    /// The largest values in the search rectangle.
    pub first: [Peak; LANES],
    /// The largest values outside the first peaks' exclusion.
    pub second: [Peak; LANES],
}

/// The offsets searched along one side.
#[derive(Clone, Copy)]
struct Span {
    /// The largest negative and positive ones.
    before: usize,
    after: usize,
    /// Length of the side.
    length: usize,
}

impl Span {
    fn new(reach: usize, length: usize) -> Span {
        Span {
            before: reach.min(length / 2),
            after: reach.min((length - 1) / 2),
            length,
        }
    }

    /// The searched stretches of a circular plane: indices, and what to take from an index to get
    /// its offset. Lowest offset first.
    fn stretches(self) -> [(Range<usize>, i32); 2] {
        let negative = self.length - self.before..self.length;
        [(negative, self.length as i32), (0..self.after + 1, 0)]
    }

    /// Offsets and their indices, lowest offset first.
    fn places(self) -> impl Iterator<Item = (i32, usize)> {
        let stretches = self.stretches().into_iter();
        stretches.flat_map(|(range, shift)| range.map(move |index| (index as i32 - shift, index)))
    }
}

/// Offset as an index of a circular plane.
pub(super) fn wrapped(offset: i32, length: usize) -> usize {
    offset.rem_euclid(length as i32) as usize
}

/// Row and column offsets no farther than `exclusion` from one lane's first peak.
struct Excluded {
    row: [i32; LANES],
    column: [i32; LANES],
    exclusion: i32,
}

impl Excluded {
    fn covers(&self, lane: usize, row: i32, column: i32) -> bool {
        (row - self.row[lane]).abs() <= self.exclusion
            && (column - self.column[lane]).abs() <= self.exclusion
    }
}

/// Searches planes of `height` x `width`, lane-interleaved; `maxima` has a place for every row.
pub(super) fn search(
    planes: &[f32],
    (height, width): (usize, usize),
    search: &Search,
    maxima: &mut [Lanes],
) -> Peaks {
    let rows = Span::new(search.reach_y, height);
    let columns = Span::new(search.reach_x, width);
    let line = |index: usize| &planes[index * width * LANES..][..width * LANES];
    for (place, (_, index)) in maxima.iter_mut().zip(rows.places()) {
        *place = row_maximum(line(index), columns);
    }
    let first = locate(planes, rows, columns, maxima, None);

    let excluded = Excluded {
        row: first.map(|peak| peak.row),
        column: first.map(|peak| peak.column),
        exclusion: search.exclusion as i32,
    };
    let highest = excluded
        .row
        .iter()
        .min()
        .map_or(0, |row| row - excluded.exclusion);
    let lowest = excluded
        .row
        .iter()
        .max()
        .map_or(0, |row| row + excluded.exclusion);
    for (place, (row, index)) in maxima.iter_mut().zip(rows.places()) {
        if (highest..=lowest).contains(&row) {
            *place = remaining_maximum(line(index), columns, row, &excluded);
        }
    }
    let second = locate(planes, rows, columns, maxima, Some(&excluded));
    Peaks { first, second }
}

/// The peak of each lane: the first of its highest rows, and in it the first column as high.
fn locate(
    planes: &[f32],
    rows: Span,
    columns: Span,
    maxima: &[Lanes],
    excluded: Option<&Excluded>,
) -> [Peak; LANES] {
    let first = -(rows.before as i32);
    let (heights, best) = highest_rows(first, &maxima[..rows.before + rows.after + 1]);
    let mut peaks = [Peak::NONE; LANES];
    for (lane, peak) in peaks.iter_mut().enumerate() {
        let (row, height) = (best[lane], heights[lane]);
        let start = wrapped(row, rows.length) * columns.length * LANES + lane;
        let line = &planes[start..][..(columns.length - 1) * LANES + 1];
        'found: for (range, shift) in columns.stretches() {
            for index in range {
                let column = index as i32 - shift;
                let free = excluded.is_none_or(|excluded| !excluded.covers(lane, row, column));
                if line[index * LANES] == height && free {
                    *peak = Peak {
                        column,
                        row,
                        height,
                    };
                    break 'found;
                }
            }
        }
    }
    peaks
}

/// The largest of the row maxima and the offset of its row, the lowest offset being `start`.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
fn highest_rows(start: i32, maxima: &[Lanes]) -> (Lanes, [i32; LANES]) {
    let (mut heights, mut best) = ([f32::NEG_INFINITY; LANES], [start; LANES]);
    for (row, maximum) in maxima.iter().enumerate() {
        let row = start + row as i32;
        for l in 0..LANES {
            let higher = maximum[l] > heights[l];
            heights[l] = if higher { maximum[l] } else { heights[l] };
            best[l] = if higher { row } else { best[l] };
        }
    }
    (heights, best)
}

/// Columns compared at a time, each in a chain of its own.
const CHAINS: usize = 4;

/// The largest value of one row of the planes within `columns`.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
fn row_maximum(line: &[f32], columns: Span) -> Lanes {
    let mut chains = [[f32::NEG_INFINITY; LANES]; CHAINS];
    for (part, _) in columns.stretches() {
        let mut fours = line[part.start * LANES..part.end * LANES].chunks_exact(CHAINS * LANES);
        for four in &mut fours {
            let mut x = [[0.0; LANES]; CHAINS];
            for k in 0..CHAINS {
                x[k] = lanes_at(four, k * LANES);
            }
            for l in 0..LANES {
                for k in 0..CHAINS {
                    chains[k][l] = larger(chains[k][l], x[k][l]);
                }
            }
        }
        for one in fours.remainder().chunks_exact(LANES) {
            let x = lanes_at(one, 0);
            for l in 0..LANES {
                chains[0][l] = larger(chains[0][l], x[l]);
            }
        }
    }
    let mut maximum = [0.0; LANES];
    for l in 0..LANES {
        let (a, b) = (
            larger(chains[0][l], chains[1][l]),
            larger(chains[2][l], chains[3][l]),
        );
        maximum[l] = larger(a, b);
    }
    maximum
}

#[inline(always)]
fn larger(a: f32, b: f32) -> f32 {
    if b > a { b } else { a }
}

/// The largest value of one row of the planes within `columns` that is not excluded.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
fn remaining_maximum(line: &[f32], columns: Span, row: i32, excluded: &Excluded) -> Lanes {
    // Rows out of the exclusion's reach have it begin beyond every column.
    let (mut from, mut to) = ([i32::MAX; LANES], [i32::MIN; LANES]);
    for l in 0..LANES {
        if (row - excluded.row[l]).abs() <= excluded.exclusion {
            from[l] = excluded.column[l] - excluded.exclusion;
            to[l] = excluded.column[l] + excluded.exclusion;
        }
    }
    let mut maximum = [f32::NEG_INFINITY; LANES];
    for (range, shift) in columns.stretches() {
        for index in range {
            let column = index as i32 - shift;
            let x = lanes_at(line, index * LANES);
            for l in 0..LANES {
                let out = (column < from[l]) | (column > to[l]);
                let value = if out { x[l] } else { f32::NEG_INFINITY };
                maximum[l] = larger(maximum[l], value);
            }
        }
    }
    maximum
}

/// The N x N values of one lane's plane around an offset, rows from the top; the plane is circular.
pub(super) fn neighbourhood<const N: usize>(
    planes: &[f32],
    (height, width): (usize, usize),
    lane: usize,
    peak: &Peak,
) -> [[f32; N]; N] {
    let half = (N / 2) as i32;
    let mut values = [[0.0; N]; N];
    for (i, line) in values.iter_mut().enumerate() {
        let row = wrapped(peak.row + i as i32 - half, height);
        for (j, value) in line.iter_mut().enumerate() {
            let column = wrapped(peak.column + j as i32 - half, width);
            *value = planes[(row * width + column) * LANES + lane];
        }
    }
    values
}
