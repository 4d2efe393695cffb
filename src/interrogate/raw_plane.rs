//! One window of a pass correlated by itself, with the whole of its plane.

use ndarray::Array2;

use super::deform::{Exposures, Row};
use super::peak::Patch;
use super::plan::WindowSize;
use super::run::Stage;
use super::taper::Taper;
use super::transform::{
    Correlator, LANES, Layout as PixelLayout, Search, TransformError, Windows, gather,
};

/// A peak is the highest sample up to this many px away in columns and in rows: what the fit of
/// its place looks at, and what the passes leave out beside a highest peak.
const APART: i32 = 2;

/// The plane as the transforms give it: circular, in rows of the image, not divided by anything.
pub(super) struct RawPlane {
    samples: Array2<f32>,
    /// Factor that makes them coefficients; 0 without contrast.
    norm: f32,
    /// Share of the window that could be read in both exposures.
    pub lit: f64,
    /// Column and row of the highest sample within the reach of the pass, as offsets.
    pub highest: (i32, i32),
    /// Columns, rows.
    tapers: [Taper; 2],
}

impl RawPlane {
    /// Correlates the window in row `j`, column `i` as the pass does, but with the whole plane.
    pub fn of(
        view: &Stage,
        images: &Exposures,
        (j, i): (usize, usize),
    ) -> Result<RawPlane, TransformError> {
        let WindowSize { width, height } = view.layout.window;
        let tapers = [Taper::new(width), Taper::new(height)];
        let [across, down] = &tapers;
        let across = &across.weights;
        let rows = down.weights.iter();
        let weights = rows.flat_map(|wy| across.iter().map(move |wx| wx * wy));
        let correlator = Correlator::new(height, width)?.weighted(weights.collect())?;
        let (top, left) = view.layout.corner(j, i);
        let pixels = || Vec::with_capacity(height * width);
        let (mut first, mut second, mut lit) = (pixels(), pixels(), pixels());
        let mut row = Row::new(images.width);
        let mut dark = false;
        for r in top..top + height {
            dark |= images.row(r, &mut row);
            first.extend_from_slice(&row.first[left..left + width]);
            second.extend_from_slice(&row.second[left..left + width]);
            lit.extend_from_slice(&row.lit[left..left + width]);
        }
        let share = lit.iter().sum::<f32>() / (height * width) as f32;
        let gathered = |pixels: &[f32]| {
            let mut out = vec![0.0; height * width * LANES];
            gather(pixels, width, &[(0, 0)], (height, width), &mut out);
            out
        };
        let (first, second) = (gathered(&first), gathered(&second));
        let lit = dark.then(|| gathered(&lit));
        let windows = Windows {
            first: &first,
            second: &second,
            lit: lit.as_deref(),
            start: 0,
            layout: &PixelLayout::interleaved(width),
        };
        let (mut planes, mut scratch) = (correlator.planes(), correlator.scratch());
        let moments = correlator.correlate(&windows, usize::MAX, &mut planes, &mut scratch);
        let search = Search {
            reach_x: view.reach.0,
            reach_y: view.reach.1,
            exclusion: 2,
        };
        let highest = correlator.peaks(&planes, &search, &mut scratch).first[0];
        Ok(RawPlane {
            samples: Array2::from_shape_fn((height, width), |(m, n)| {
                planes[(m * width + n) * LANES]
            }),
            norm: moments.normalization(0),
            lit: f64::from(share),
            highest: (highest.column, highest.row),
            tapers,
        })
    }

    /// Sample at an offset (columns to the right, rows down), which may lie round the rim.
    fn at(&self, column: i32, row: i32) -> f32 {
        let (height, width) = self.samples.dim();
        let wrapped = |p: i32, n: usize| p.rem_euclid(n as i32) as usize;
        self.samples[(wrapped(row, height), wrapped(column, width))]
    }

    /// The samples about an offset, what the weights leave of the pattern divided out.
    pub fn patch(&self, (column, row): (i32, i32)) -> Patch {
        let [across, down] = &self.tapers;
        std::array::from_fn(|r| {
            std::array::from_fn(|c| {
                let (x, y) = (column + c as i32 - 2, row + r as i32 - 2);
                self.at(x, y) / (across.left(x) * down.left(y))
            })
        })
    }

    /// True where the sample is above zero and higher than all up to [`APART`] px away; of equal
    /// ones the first counts.
    fn is_peak(&self, (column, row): (i32, i32)) -> bool {
        let here = self.at(column, row);
        let about = || -APART..=APART;
        let higher = |(dx, dy): (i32, i32)| {
            let there = self.at(column + dx, row + dy);
            here > there || (here == there && (dy, dx) >= (0, 0))
        };
        here > 0.0 && about().all(|dy| about().all(|dx| higher((dx, dy))))
    }

    /// Offsets from the first to the last: columns to the right, rows down.
    pub fn limits(&self) -> [(i32, i32); 2] {
        let (height, width) = self.samples.dim();
        [width, height].map(|n| (-((n / 2) as i32), ((n - 1) / 2) as i32))
    }

    /// Offsets of all peaks, row by row; none without contrast.
    pub fn peaks(&self) -> Vec<(i32, i32)> {
        if self.norm <= 0.0 {
            return Vec::new();
        }
        let [(left, right), (top, bottom)] = self.limits();
        (top..=bottom)
            .flat_map(|row| (left..=right).map(move |column| (column, row)))
            .filter(|offset| self.is_peak(*offset))
            .collect()
    }

    /// The sample at an offset as a correlation coefficient; 0 without contrast.
    pub fn coefficient(&self, (column, row): (i32, i32)) -> f64 {
        if self.norm > 0.0 {
            f64::from(self.at(column, row) * self.norm)
        } else {
            0.0
        }
    }

    /// A plane of coefficients (circular, row after row) in a window of that size.
    #[cfg(test)]
    pub fn of_coefficients(samples: Array2<f32>) -> RawPlane {
        let (height, width) = samples.dim();
        RawPlane {
            samples,
            norm: 1.0,
            lit: 1.0,
            highest: (0, 0),
            tapers: [Taper::new(width), Taper::new(height)],
        }
    }

    /// What the weights leave of a pattern at an offset.
    #[cfg(test)]
    pub fn left(&self, (column, row): (i32, i32)) -> f32 {
        self.tapers[0].left(column) * self.tapers[1].left(row)
    }
}
