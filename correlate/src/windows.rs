//! Where the pixels of a batch of windows are, and how to bring them there.
//!
//! The kernel wants the same pixel of [`LANES`] windows side by side. Windows on a regular grid
//! need no gathering for that: [`Polyphase`] regroups the columns of a whole image once a pass, and
//! after that every window pixel of a batch is one contiguous load. Windows anywhere else are
//! gathered with [`gather`].

use multiversion::multiversion;

use super::lanes::{LANES, Lanes};
use super::spectrum::lanes_at;

/// How window pixels are found: pixel (row, column) of window `lane` is
/// `start + row * row_stride + columns[column] + lane`, `start` being the batch's own.
#[derive(Clone, Debug)]
pub struct Layout {
    pub(super) row_stride: usize,
    pub(super) columns: Vec<usize>,
}

impl Layout {
    /// Windows of `width` columns interleaved in a buffer of their own, as [`gather`] makes them:
    /// `[(row * width + column) * LANES + lane]`.
    pub fn interleaved(width: usize) -> Layout {
        Layout {
            row_stride: width * LANES,
            columns: (0..width).map(|column| column * LANES).collect(),
        }
    }

    /// Where each column of a window lies, counted from the start of its row.
    pub fn columns(&self) -> &[usize] {
        &self.columns
    }
}

/// A batch of [`LANES`] window pairs and, where something is masked, what is lit.
#[derive(Clone, Copy, Debug)]
pub struct Windows<'a> {
    /// Grey levels of the first exposure.
    pub first: &'a [f32],
    /// Grey levels of the second exposure.
    pub second: &'a [f32],
    /// 1 where a pixel counts and 0 where it is masked, laid out as the exposures; values between
    /// weigh. Masked pixels still have to hold finite numbers. `None`: everything counts.
    pub lit: Option<&'a [f32]>,
    /// Where the batch starts in each of them.
    pub start: usize,
    /// How its pixels follow.
    pub layout: &'a Layout,
}

impl Windows<'_> {
    #[inline(always)]
    pub(super) fn row<'b>(&self, pixels: &'b [f32], row: usize) -> &'b [f32] {
        &pixels[self.start + row * self.layout.row_stride..]
    }
}

/// The columns of windows on a regular grid: window `index` of a row of windows has its left
/// edge at column `left + index * spacing`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct WindowColumns {
    /// Left edge of the first window, px.
    pub left: usize,
    /// From one window to the next, px; at least 1.
    pub spacing: usize,
    /// Windows in a row of windows.
    pub count: usize,
    /// Width of a window, px.
    pub width: usize,
}

impl WindowColumns {
    /// Batches in a row of windows. The last may have lanes to spare; they hold whatever lies to
    /// the right and zeros beyond the image.
    pub fn batches(&self) -> usize {
        self.count.div_ceil(LANES)
    }

    /// Places that hold one pixel column of a batch: a lane for each window, and as many more as
    /// windows overlap, since column c + spacing of one window is column c of the next.
    fn pitch(&self) -> usize {
        LANES + self.width.div_ceil(self.spacing) - 1
    }
}

/// Copies a batch, each exposure less its mean (`means`, by lane) and times weight (row-major,
/// one a pixel) and light, to `first` and `second`, one lane array a pixel, row after row.
///
/// # Panics
/// If the windows reach beyond their images or the slices are not of one length.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
pub fn copy_weighted(
    windows: &Windows,
    means: [&Lanes; 2],
    weights: &[f32],
    first: &mut [Lanes],
    second: &mut [Lanes],
) {
    let width = windows.layout.columns.len();
    for (row, weights) in weights.chunks_exact(width).enumerate() {
        let lines = [
            windows.row(windows.first, row),
            windows.row(windows.second, row),
        ];
        let lit = windows.lit.map(|lit| windows.row(lit, row));
        for (index, (&column, &weight)) in windows.layout.columns.iter().zip(weights).enumerate() {
            let mut light = [weight; LANES];
            if let Some(lit) = lit {
                let lit = lanes_at(lit, column);
                for l in 0..LANES {
                    light[l] *= lit[l];
                }
            }
            let (a, b) = (lanes_at(lines[0], column), lanes_at(lines[1], column));
            let place = row * width + index;
            let (a_out, b_out) = (&mut first[place], &mut second[place]);
            for l in 0..LANES {
                a_out[l] = light[l] * (a[l] - means[0][l]);
                b_out[l] = light[l] * (b[l] - means[1][l]);
            }
        }
    }
}

/// An image regrouped so that the same pixel of neighbouring windows lies side by side.
///
/// For each row, batch of windows, and phase (column modulo the spacing) the pixels of that phase
/// follow each other. Each window pixel of a batch is then one contiguous load, overlapping windows
/// share storage, and one regrouping of the image replaces all gathering of a pass.
#[derive(Clone, Debug)]
pub struct Polyphase {
    columns: WindowColumns,
    pixels: Vec<f32>,
}

impl Polyphase {
    /// A black image of `height` rows for windows in `columns`.
    pub fn new(height: usize, columns: WindowColumns) -> Polyphase {
        let mut image = Polyphase {
            columns,
            pixels: Vec::new(),
        };
        image.pixels = vec![0.0; height * image.row_length()];
        image
    }

    /// Places in one row.
    pub fn row_length(&self) -> usize {
        self.columns.batches() * self.batch_length()
    }

    /// Places in one row of one batch.
    fn batch_length(&self) -> usize {
        self.columns.spacing * self.columns.pitch()
    }

    /// Regroups a whole image `width` pixels wide whose row `r` starts at `image[r * stride]`.
    ///
    /// # Panics
    /// If `image` has fewer rows than were said at the start.
    pub fn fill(&mut self, image: &[f32], stride: usize, width: usize) {
        for (r, mut row) in self.rows_mut().enumerate() {
            row.fill(&image[r * stride..][..width]);
        }
    }

    /// Moves everything up by `rows`, losing as many at the top; the same number at the bottom then
    /// wait to be filled. A band as high as one window that scrolls down an image stays in the
    /// nearer caches, which a whole image does not.
    pub fn scroll(&mut self, rows: usize) {
        let lost = (rows * self.row_length()).min(self.pixels.len());
        self.pixels.copy_within(lost.., 0);
    }

    /// The rows from top to bottom, each to be filled by itself, on any thread.
    pub fn rows_mut(&mut self) -> impl ExactSizeIterator<Item = PolyphaseRow<'_>> {
        let (columns, length) = (self.columns, self.row_length());
        let rows = self.pixels.chunks_exact_mut(length);
        rows.map(move |places| PolyphaseRow { columns, places })
    }

    /// The regrouped pixels, to be handed to [`Windows`].
    pub fn pixels(&self) -> &[f32] {
        &self.pixels
    }

    /// How the pixels of a window follow; the same for all batches.
    pub fn layout(&self) -> Layout {
        let WindowColumns { spacing, width, .. } = self.columns;
        Layout {
            row_stride: self.row_length(),
            columns: (0..width)
                .map(|column| (column % spacing) * self.columns.pitch() + column / spacing)
                .collect(),
        }
    }

    /// Start of batch `batch` of the windows whose top row is `top`.
    pub fn start(&self, top: usize, batch: usize) -> usize {
        top * self.row_length() + batch * self.batch_length()
    }
}

/// One row of a [`Polyphase`] image.
#[derive(Debug)]
pub struct PolyphaseRow<'a> {
    columns: WindowColumns,
    places: &'a mut [f32],
}

impl PolyphaseRow<'_> {
    /// Regroups one row of pixels; places beyond its end become 0.
    pub fn fill(&mut self, pixels: &[f32]) {
        regroup(pixels, self.columns, self.places);
    }

    /// The same value everywhere.
    pub fn fill_with(&mut self, value: f32) {
        self.places.fill(value);
    }
}

/// Writes pixel left + (batch * LANES + i) * spacing + phase to place (batch, phase, i), in order;
/// the usual spacings with constant strides.
fn regroup(pixels: &[f32], columns: WindowColumns, places: &mut [f32]) {
    match columns.spacing {
        4 => regroup_by(4, pixels, columns, places),
        8 => regroup_by(8, pixels, columns, places),
        12 => regroup_by(12, pixels, columns, places),
        16 => regroup_by(16, pixels, columns, places),
        24 => regroup_by(24, pixels, columns, places),
        32 => regroup_by(32, pixels, columns, places),
        64 => regroup_by(64, pixels, columns, places),
        spacing => regroup_by(spacing, pixels, columns, places),
    }
}

#[inline(always)]
fn regroup_by(spacing: usize, pixels: &[f32], columns: WindowColumns, places: &mut [f32]) {
    let pitch = columns.pitch();
    let mut edge = columns.left;
    for places in places.chunks_exact_mut(spacing * pitch) {
        for (phase, places) in places.chunks_exact_mut(pitch).enumerate() {
            let there = pixels.get(edge + phase..).unwrap_or_default();
            let (lanes, rest) = places.split_at_mut(LANES);
            if there.len() > (LANES - 1) * spacing {
                for (i, place) in lanes.iter_mut().enumerate() {
                    *place = there[i * spacing];
                }
            } else {
                for (i, place) in lanes.iter_mut().enumerate() {
                    *place = there.get(i * spacing).copied().unwrap_or(0.0);
                }
            }
            for (i, place) in rest.iter_mut().enumerate() {
                let beyond = there.get((LANES + i) * spacing);
                *place = beyond.copied().unwrap_or(0.0);
            }
        }
        edge += LANES * spacing;
    }
}

/// Gathers windows from anywhere: window `lane` has its top left pixel at `corners[lane]` (row,
/// column) of `image`, whose rows are `stride` apart, and goes to
/// `out[(row * width + column) * LANES + lane]`. Lanes without a corner become 0.
///
/// # Panics
/// If there are more than [`LANES`] corners, a window reaches beyond `image`, or `out` is shorter
/// than `height * width * LANES`.
pub fn gather(
    image: &[f32],
    stride: usize,
    corners: &[(usize, usize)],
    (height, width): (usize, usize),
    out: &mut [f32],
) {
    assert!(corners.len() <= LANES, "more windows than lanes");
    for row in 0..height {
        let mut rows = [&image[..0]; LANES];
        for (place, &(top, left)) in rows.iter_mut().zip(corners) {
            *place = &image[(top + row) * stride + left..][..width];
        }
        interleave(&rows, &mut out[row * width * LANES..][..width * LANES]);
    }
}

/// Side of the square tiles in which windows are interleaved.
const TILE: usize = 4;

/// Interleaves one row of each window, `out[column * LANES + lane]`; rows that are too short count
/// as 0 beyond their end.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
pub fn interleave(rows: &[&[f32]; LANES], out: &mut [f32]) {
    let width = out.len() / LANES;
    let tiled = width - width % TILE;
    for quad in 0..LANES / TILE {
        let some = &rows[quad * TILE..][..TILE];
        let full = some.iter().all(|row| row.len() == width);
        for column in (0..if full { tiled } else { 0 }).step_by(TILE) {
            let mut tile = [[0.0_f32; TILE]; TILE];
            for (line, row) in tile.iter_mut().zip(some) {
                line.copy_from_slice(&row[column..][..TILE]);
            }
            for j in 0..TILE {
                let line = [tile[0][j], tile[1][j], tile[2][j], tile[3][j]];
                out[(column + j) * LANES + quad * TILE..][..TILE].copy_from_slice(&line);
            }
        }
        for column in if full { tiled } else { 0 }..width {
            for (i, row) in some.iter().enumerate() {
                out[column * LANES + quad * TILE + i] = row.get(column).copied().unwrap_or(0.0);
            }
        }
    }
}

/// The opposite of [`interleave`]: lane `i` of each column to `rows[i]`, as far as it goes.
#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
pub fn deinterleave(from: &[f32], rows: &mut [&mut [f32]; LANES]) {
    let width = from.len() / LANES;
    let tiled = width - width % TILE;
    for quad in 0..LANES / TILE {
        let some = &mut rows[quad * TILE..][..TILE];
        let full = some.iter().all(|row| row.len() == width);
        for column in (0..if full { tiled } else { 0 }).step_by(TILE) {
            let mut tile = [[0.0_f32; TILE]; TILE];
            for (j, line) in tile.iter_mut().enumerate() {
                line.copy_from_slice(&from[(column + j) * LANES + quad * TILE..][..TILE]);
            }
            for (i, row) in some.iter_mut().enumerate() {
                let line = [tile[0][i], tile[1][i], tile[2][i], tile[3][i]];
                row[column..][..TILE].copy_from_slice(&line);
            }
        }
        for column in if full { tiled } else { 0 }..width {
            for (i, row) in some.iter_mut().enumerate() {
                if let Some(place) = row.get_mut(column) {
                    *place = from[column * LANES + quad * TILE + i];
                }
            }
        }
    }
}
