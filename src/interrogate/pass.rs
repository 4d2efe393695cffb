//! One pass: every window correlated, every peak read.

use ndarray::Array2;
use rayon::prelude::*;

use super::deform::Deformed;
use super::layout::Layout;
use super::peak::{Patch, Peak};
use super::statistics::{StatisticsScratch, lean_variance, variance};
use super::taper::Taper;
use super::transform::{
    Correlator, LANES, Lanes, Moments, Planes, Polyphase, Scratch, Search, TransformError,
    WindowColumns, Windows, copy_weighted,
};
use super::transform::{Layout as PixelLayout, Peak as Sample};
use crate::task::{Cancelled, Task};

/// Rows of windows that one thread does in a stretch, so that what they share is regrouped once.
const STRETCH: usize = 8;

/// What the correlation of one window says.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Finding {
    /// Residual shift of the highest peak (right, down), px.
    pub shift: (f64, f64),
    /// Variance of that shift estimated from this window alone, px², where it was asked for and
    /// the peak allows it; below zero by chance.
    pub variance: (Option<f64>, Option<f64>),
    /// Height of that peak as a correlation coefficient, -1 to 1.
    pub height: f32,
    /// Share of the window that was lit in both exposures.
    pub lit: f32,
}

impl Finding {
    const NOTHING: Finding = Finding {
        shift: (0.0, 0.0),
        variance: (None, None),
        height: 0.0,
        lit: 0.0,
    };
}

/// One pass over a pair of deformed images.
pub(crate) struct Pass<'a> {
    images: &'a Deformed,
    layout: &'a Layout,
    /// Columns, rows.
    tapers: [Taper; 2],
    /// Weight of each pixel of a window, row after row.
    weights: Vec<f32>,
    correlator: Correlator,
    search: Search,
    /// Whether each vector gets its uncertainty.
    statistics: bool,
    /// Lit pixels above and left of each pixel, where some are dark.
    lit: Option<Vec<u32>>,
}

impl<'a> Pass<'a> {
    /// A pass over `layout`, peaks sought up to `reach` (columns, rows) px away, with the
    /// uncertainty of each vector if `statistics` is true.
    pub fn new(
        images: &'a Deformed,
        layout: &'a Layout,
        reach: (usize, usize),
        statistics: bool,
    ) -> Result<Self, TransformError> {
        let (width, height) = (layout.window.width, layout.window.height);
        let tapers = [Taper::new(width), Taper::new(height)];
        let [across, down] = &tapers;
        let weights: Vec<f32> = down
            .weights
            .iter()
            .flat_map(|wy| across.weights.iter().map(move |wx| wx * wy))
            .collect();
        Ok(Self {
            images,
            layout,
            correlator: Correlator::new(height, width)?.weighted(weights.clone())?,
            tapers,
            weights,
            search: Search {
                reach_x: reach.0,
                reach_y: reach.1,
                exclusion: 2,
            },
            statistics,
            lit: images.lit.as_ref().map(|lit| lit_sums(lit, images.width)),
        })
    }

    /// Correlates every window; stretches of rows share the cores.
    pub fn run(&self, task: &Task) -> Result<Array2<Finding>, Cancelled> {
        let columns = self.layout.columns;
        let mut out = vec![Finding::NOTHING; self.layout.rows * columns];
        out.par_chunks_mut(columns * STRETCH)
            .enumerate()
            .map_init(
                || Bench::new(self),
                |bench, (stretch, rows)| {
                    for (k, row) in rows.chunks_mut(columns).enumerate() {
                        task.check()?;
                        self.row(bench, stretch * STRETCH + k, k == 0, row);
                    }
                    Ok(())
                },
            )
            .collect::<Result<(), Cancelled>>()?;
        let shaped = Array2::from_shape_vec(self.layout.shape(), out);
        Ok(shaped.unwrap_or_else(|_| unreachable!("one finding a window")))
    }

    /// Correlates row `j` of windows; `fresh` when the bench does not hold the row above.
    fn row(&self, bench: &mut Bench, j: usize, fresh: bool, out: &mut [Finding]) {
        bench.advance(self, j, fresh);
        for (batch, out) in out.chunks_mut(LANES).enumerate() {
            let windows = Windows {
                first: bench.first.pixels(),
                second: bench.second.pixels(),
                lit: bench.lit.as_ref().map(Polyphase::pixels),
                start: bench.first.start(0, batch),
                layout: &bench.pixels,
            };
            let reach = self.search.reach_y + 2;
            let moments =
                self.correlator
                    .correlate(&windows, reach, &mut bench.planes, &mut bench.scratch);
            let peaks = self
                .correlator
                .peaks(&bench.planes, &self.search, &mut bench.scratch);
            let leans = self
                .statistics
                .then(|| self.leans(&windows, &moments, &mut bench.statistics));
            for (l, out) in out.iter_mut().enumerate() {
                let norm = moments.normalization(l);
                let lit = self.lit_share(j, batch * LANES + l);
                *out = Finding {
                    lit,
                    ..if norm > 0.0 {
                        let leans = leans.map(|axes| axes.map(|lanes| lanes[l]));
                        self.read(&bench.planes, l, peaks.first[l], norm, leans)
                    } else {
                        Finding::NOTHING
                    }
                };
            }
        }
    }

    fn leans(&self, windows: &Windows, moments: &Moments, room: &mut Statistics) -> [Lanes; 2] {
        let means = [&moments.first_mean, &moments.second_mean];
        copy_weighted(
            windows,
            means,
            &self.weights,
            &mut room.first,
            &mut room.second,
        );
        let width = self.layout.window.width;
        lean_variance(&room.first, &room.second, width, &mut room.sums)
    }

    /// Share of the window in row `j`, column `i` that is lit.
    fn lit_share(&self, j: usize, i: usize) -> f32 {
        let Some(sums) = &self.lit else { return 1.0 };
        let (top, left) = self.layout.corner(j, i);
        let (w, h) = (self.layout.window.width, self.layout.window.height);
        let at = |r: usize, c: usize| sums[r * (self.images.width + 1) + c];
        let lit = at(top + h, left + w) + at(top, left) - at(top, left + w) - at(top + h, left);
        lit as f32 / (w * h) as f32
    }

    /// Reads the highest peak of one plane.
    fn read(
        &self,
        planes: &Planes,
        lane: usize,
        first: Sample,
        norm: f32,
        leans: Option<[f32; 2]>,
    ) -> Finding {
        let [across, down] = &self.tapers;
        let mut patch: Patch = self.correlator.neighbourhood(planes, lane, &first);
        for (r, row) in patch.iter_mut().enumerate() {
            for (c, value) in row.iter_mut().enumerate() {
                let (x, y) = (first.column + c as i32 - 2, first.row + r as i32 - 2);
                *value /= across.left(x) * down.left(y);
            }
        }
        let peak = Peak::of(&patch);
        let (w, h) = (self.layout.window.width, self.layout.window.height);
        let variance = match leans {
            Some([right, below]) => (
                variance(right, peak.top, peak.sides.0, (w - 1) * h),
                variance(below, peak.top, peak.sides.1, w * (h - 1)),
            ),
            None => (None, None),
        };
        Finding {
            shift: (
                f64::from(first.column) + peak.offset.0,
                f64::from(first.row) + peak.offset.1,
            ),
            variance,
            height: first.height * norm,
            lit: 1.0,
        }
    }
}

/// Sums of lit pixels above and left of every corner of every pixel.
fn lit_sums(lit: &[f32], width: usize) -> Vec<u32> {
    let height = lit.len() / width;
    let mut sums = vec![0u32; (width + 1) * (height + 1)];
    for r in 0..height {
        let mut run = 0;
        for c in 0..width {
            run += u32::from(lit[r * width + c] > 0.0);
            sums[(r + 1) * (width + 1) + c + 1] = sums[r * (width + 1) + c + 1] + run;
        }
    }
    sums
}

/// The workplace of one thread: the rows under the present windows, regrouped, and room for what
/// is made of them.
struct Bench {
    first: Polyphase,
    second: Polyphase,
    lit: Option<Polyphase>,
    pixels: PixelLayout,
    planes: Planes,
    scratch: Scratch,
    statistics: Statistics,
}

/// Room for the statistics of one batch.
struct Statistics {
    first: Vec<Lanes>,
    second: Vec<Lanes>,
    sums: StatisticsScratch,
}

impl Bench {
    fn new(pass: &Pass) -> Self {
        let layout = pass.layout;
        let columns = WindowColumns {
            left: layout.left,
            spacing: layout.step_x,
            count: layout.columns,
            width: layout.window.width,
        };
        let band = || Polyphase::new(layout.window.height, columns);
        let first = band();
        let pixels = if pass.statistics {
            layout.window.width * layout.window.height
        } else {
            0
        };
        Self {
            pixels: first.layout(),
            first,
            second: band(),
            lit: pass.images.lit.as_ref().map(|_| band()),
            planes: pass.correlator.planes(),
            scratch: pass.correlator.scratch(),
            statistics: Statistics {
                first: vec![[0.0; LANES]; pixels],
                second: vec![[0.0; LANES]; pixels],
                sums: StatisticsScratch::new(pixels),
            },
        }
    }

    /// Brings the pixels of row `j` of windows into the bands.
    fn advance(&mut self, pass: &Pass, j: usize, fresh: bool) {
        let (top, _) = pass.layout.corner(j, 0);
        let height = pass.layout.window.height;
        let new = if fresh {
            height
        } else {
            pass.layout.step_y.min(height)
        };
        let width = pass.images.width;
        let images = pass.images;
        let bands = [
            (Some(&mut self.first), Some(&images.first)),
            (Some(&mut self.second), Some(&images.second)),
            (self.lit.as_mut(), images.lit.as_ref()),
        ];
        for (band, image) in bands {
            let (Some(band), Some(image)) = (band, image) else {
                continue;
            };
            band.scroll(new);
            for (r, mut row) in band.rows_mut().enumerate().skip(height - new) {
                row.fill(&image[(top + r) * width..][..width]);
            }
        }
    }
}
