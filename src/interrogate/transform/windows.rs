//! Where the pixels of a batch of windows are, and how to bring them there.
//!
//! The kernel wants the same pixel of [`LANES`] windows side by side. Windows on a regular grid
//! need no gathering for that: [`Polyphase`] regroups the columns of a whole image once a pass, and
//! after that every window pixel of a batch is one contiguous load. Windows anywhere else are
//! gathered with [`gather`].

use multiversion::multiversion;

use super::lanes::LANES;

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

/// An image with its columns regrouped by their remainder modulo the window spacing.
///
/// Pixel (row, k * spacing + phase) lies at `[row][phase][k]`. Windows whose left edges are
/// `spacing` apart then have each of their pixels next to that of their neighbour, and overlapping
/// windows share storage: one regrouping of the image replaces all gathering of a pass. Unused
/// places are 0.
#[derive(Clone, Debug)]
pub struct Polyphase {
    height: usize,
    width: usize,
    spacing: usize,
    /// Places a phase has in a row.
    pitch: usize,
    pixels: Vec<f32>,
}

impl Polyphase {
    /// A black image of `height` x `width` pixels for windows `spacing` columns apart (at least 1).
    pub fn new(height: usize, width: usize, spacing: usize) -> Polyphase {
        let spacing = spacing.max(1);
        // A last batch may reach LANES - 1 windows beyond the last one inside the image.
        let pitch = (width.div_ceil(spacing) + LANES).next_multiple_of(LANES);
        Polyphase {
            height,
            width,
            spacing,
            pitch,
            pixels: vec![0.0; height * spacing * pitch],
        }
    }

    /// Regroups a whole image, row `r` of which starts at `image[r * stride]`.
    ///
    /// # Panics
    /// If `image` is too short for the height and width given at the start.
    pub fn fill(&mut self, image: &[f32], stride: usize) {
        let (width, spacing, pitch) = (self.width, self.spacing, self.pitch);
        for (row, place) in self.rows_mut().enumerate() {
            regroup(&image[row * stride..][..width], spacing, pitch, place);
        }
    }

    /// The rows from top to bottom, each to be written by [`Self::regroup_row`]; for filling from several
    /// threads.
    pub fn rows_mut(&mut self) -> std::slice::ChunksExactMut<'_, f32> {
        self.pixels.chunks_exact_mut(self.spacing * self.pitch)
    }

    /// Places in one row of [`Self::rows_mut`].
    pub fn row_length(&self) -> usize {
        self.spacing * self.pitch
    }

    /// Writes one row of an image `width` pixels wide into `place`, a row of an image regrouped for
    /// the same width and `spacing`.
    ///
    /// # Panics
    /// If `place` is not as long as [`Self::row_length`].
    pub fn regroup_row(row: &[f32], spacing: usize, place: &mut [f32]) {
        regroup(row, spacing, place.len() / spacing, place);
    }

    /// Height of the image, px.
    pub fn height(&self) -> usize {
        self.height
    }

    /// Width of the image, px.
    pub fn width(&self) -> usize {
        self.width
    }

    /// Columns between neighbouring windows, px.
    pub fn spacing(&self) -> usize {
        self.spacing
    }

    /// The regrouped pixels, to be handed to [`Windows`].
    pub fn pixels(&self) -> &[f32] {
        &self.pixels
    }

    /// The layout of windows `width` columns wide, the left edge of the first at column `left`.
    pub fn layout(&self, left: usize, width: usize) -> Layout {
        let phase = left % self.spacing;
        Layout {
            row_stride: self.row_length(),
            columns: (phase..phase + width)
                .map(|column| (column % self.spacing) * self.pitch + column / self.spacing)
                .collect(),
        }
    }

    /// Start of the batch whose first window has its top row at `top` and is number `index` of its
    /// row of windows, the left edge of number 0 being at column `left`.
    pub fn start(&self, top: usize, left: usize, index: usize) -> usize {
        top * self.row_length() + left / self.spacing + index
    }
}

/// Side of the square tiles in which a row is regrouped.
const TILE: usize = 4;

#[multiversion(targets("x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma", "x86_64+avx2+fma"))]
fn regroup(row: &[f32], spacing: usize, pitch: usize, place: &mut [f32]) {
    let groups = row.len() / spacing;
    let (tiled_groups, tiled_phases) = (groups - groups % TILE, spacing - spacing % TILE);
    for k in (0..tiled_groups).step_by(TILE) {
        for phase in (0..tiled_phases).step_by(TILE) {
            let mut tile = [[0.0_f32; TILE]; TILE];
            for (i, line) in tile.iter_mut().enumerate() {
                line.copy_from_slice(&row[(k + i) * spacing + phase..][..TILE]);
            }
            for j in 0..TILE {
                let line = [tile[0][j], tile[1][j], tile[2][j], tile[3][j]];
                place[(phase + j) * pitch + k..][..TILE].copy_from_slice(&line);
            }
        }
        for phase in tiled_phases..spacing {
            for i in k..k + TILE {
                place[phase * pitch + i] = row[i * spacing + phase];
            }
        }
    }
    for (column, value) in row.iter().enumerate().skip(tiled_groups * spacing) {
        place[(column % spacing) * pitch + column / spacing] = *value;
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

/// Interleaves one row of each window; empty rows count as 0.
#[multiversion(targets("x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma", "x86_64+avx2+fma"))]
fn interleave(rows: &[&[f32]; LANES], out: &mut [f32]) {
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
