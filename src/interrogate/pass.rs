//! One pass: every window correlated, every peak read.

use std::collections::VecDeque;

use ndarray::Array2;
use rayon::prelude::*;

use super::deform::{Exposures, Row};
use super::layout::Layout;
use super::peak::{Patch, Peak};
use super::plane_sums::PlaneSums;
use super::significance::Background;
use super::statistics::{StatisticsScratch, lean_variance, variance};
use super::taper::Taper;
use super::transform::{
    Correlator, LANES, Lanes, Moments, Planes, Polyphase, Scratch, Search, TransformError,
    WindowColumns, Windows, copy_weighted, lanes_at,
};
use super::transform::{Layout as PixelLayout, Peak as Sample};
use crate::task::{Cancelled, Task};

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
    /// How far that peak stands above the mean of the rest of the plane, in units of the rest's
    /// scatter; 0 where it was not asked for.
    pub prominence: f32,
    /// Height of that peak over that of the next highest; 0 where it was not asked for.
    pub ratio: f32,
    /// Share of the window that was lit in both exposures.
    pub lit: f32,
}

impl Finding {
    const NOTHING: Finding = Finding {
        shift: (0.0, 0.0),
        variance: (None, None),
        height: 0.0,
        prominence: 0.0,
        ratio: 0.0,
        lit: 0.0,
    };
}

/// One pass over a pair.
pub(crate) struct Pass<'a> {
    layout: &'a Layout,
    /// Columns, rows.
    tapers: [Taper; 2],
    /// Weight of each pixel of a window, row after row.
    weights: Vec<f32>,
    correlator: Correlator,
    search: Search,
    /// Whether each vector gets its uncertainty.
    statistics: bool,
}

impl<'a> Pass<'a> {
    /// A pass over `layout`, peaks sought up to `reach` (columns, rows) px away, with the
    /// uncertainty of each vector if `statistics` is true.
    pub fn new(
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
        })
    }

    /// Correlates every window; stretches of rows share the cores.
    pub fn run(&self, images: &Exposures, task: &Task) -> Result<Array2<Finding>, Cancelled> {
        let (rows, columns) = self.layout.shape();
        let mut out = vec![Finding::NOTHING; rows * columns];
        self.each_row(images, task, &mut out, columns, |bench, out| {
            self.read_row(bench, out)
        })?;
        let shaped = Array2::from_shape_vec(self.layout.shape(), out);
        Ok(shaped.unwrap_or_else(|_| unreachable!("one finding a window")))
    }

    /// Correlates every window and adds its plane to those of the pairs before.
    pub fn add(
        &self,
        images: &Exposures,
        sums: &mut PlaneSums,
        task: &Task,
    ) -> Result<(), Cancelled> {
        let columns = self.layout.columns;
        self.each_row(
            images,
            task,
            sums.windows_mut(),
            columns,
            |bench, windows| {
                for (batch, windows) in windows.chunks_mut(LANES).enumerate() {
                    let found = self.correlate(bench, batch);
                    for (l, window) in windows.iter_mut().enumerate() {
                        let norm = found.moments.normalization(l);
                        let leans = found.leans.map(|axes| axes.map(|lanes| lanes[l]));
                        window.add(norm, leans, found.lit[l], |column, row| {
                            let at = Sample {
                                column,
                                row,
                                height: 0.0,
                            };
                            self.correlator.neighbourhood::<1>(&bench.planes, l, &at)[0][0]
                        });
                    }
                }
            },
        )
    }

    /// Room for the sums of many pairs.
    pub fn sums(&self) -> PlaneSums {
        let reach = (self.search.reach_x, self.search.reach_y);
        PlaneSums::new(self.layout.shape(), reach)
    }

    /// What the planes of many pairs say together.
    pub fn read_sums(&self, sums: &PlaneSums) -> Array2<Finding> {
        let findings = sums.windows().iter().map(|window| {
            let Some(peak) = window.peak() else {
                return Finding {
                    lit: window.lit(),
                    ..Finding::NOTHING
                };
            };
            let leans = self.statistics.then(|| window.leans());
            Finding {
                height: window.mean(peak.height),
                prominence: peak.prominence,
                ratio: peak.ratio,
                lit: window.lit(),
                ..self.read(peak.patch, peak.at, leans)
            }
        });
        let shaped = Array2::from_shape_vec(self.layout.shape(), findings.collect());
        shaped.unwrap_or_else(|_| unreachable!("one finding a window"))
    }

    /// Goes through the rows of windows, `columns` places of `out` for each, with the bench's band
    /// over them.
    fn each_row<T: Send>(
        &self,
        images: &Exposures,
        task: &Task,
        out: &mut [T],
        columns: usize,
        row: impl Fn(&mut Bench, &mut [T]) + Sync,
    ) -> Result<(), Cancelled> {
        // Each stretch makes the rows under its first windows anew, so it should be long; none of
        // them is made differently for it.
        let threads = rayon::current_num_threads();
        let stretch = match threads {
            1 => self.layout.rows,
            threads => self.layout.rows.div_ceil(2 * threads),
        };
        out.par_chunks_mut(columns * stretch)
            .enumerate()
            .map_init(
                || Bench::new(self, images.width),
                |bench, (number, chunk)| {
                    for (k, out) in chunk.chunks_mut(columns).enumerate() {
                        task.check()?;
                        bench.advance(self, images, number * stretch + k, k == 0);
                        row(bench, out);
                    }
                    Ok(())
                },
            )
            .collect()
    }

    /// Correlates one batch of the row of windows over the bench's band: the planes are left there.
    fn correlate(&self, bench: &mut Bench, batch: usize) -> Batch {
        let dark = bench.is_dark(batch);
        let windows = Windows {
            first: bench.first.pixels(),
            second: bench.second.pixels(),
            lit: dark.then(|| bench.lit.pixels()),
            start: bench.first.start(0, batch),
            layout: &bench.pixels,
        };
        let reach = self.search.reach_y + 2;
        let moments =
            self.correlator
                .correlate(&windows, reach, &mut bench.planes, &mut bench.scratch);
        let leans = self
            .statistics
            .then(|| self.leans(&windows, &moments, &mut bench.statistics));
        let lit = if dark {
            bench.lit_shares(batch, self.layout.window.height)
        } else {
            [1.0; LANES]
        };
        Batch {
            moments,
            leans,
            lit,
        }
    }

    /// Correlates the row of windows over the bench's band and reads their peaks.
    fn read_row(&self, bench: &mut Bench, out: &mut [Finding]) {
        for (batch, out) in out.chunks_mut(LANES).enumerate() {
            let found = self.correlate(bench, batch);
            let peaks = self
                .correlator
                .peaks(&bench.planes, &self.search, &mut bench.scratch);
            let background = self.statistics.then(|| {
                let window = self.layout.window;
                let reach = (self.search.reach_x, self.search.reach_y);
                Background::of(&bench.planes, (window.width, window.height), reach)
            });
            for (l, out) in out.iter_mut().enumerate() {
                let norm = found.moments.normalization(l);
                let lit = found.lit[l];
                if norm == 0.0 {
                    *out = Finding {
                        lit,
                        ..Finding::NOTHING
                    };
                    continue;
                }
                let (first, second) = (&peaks.first[l], &peaks.second[l]);
                let patch = self.correlator.neighbourhood(&bench.planes, l, first);
                let leans = found.leans.map(|axes| axes.map(|lanes| lanes[l]));
                *out = Finding {
                    height: first.height * norm,
                    lit,
                    ..self.read(patch, (first.column, first.row), leans)
                };
                if let Some(background) = &background {
                    let (mean, scatter) = background.without(l, &patch);
                    out.prominence = ((f64::from(first.height) - mean) / scatter) as f32;
                    out.ratio = first.height / second.height.max(f32::MIN_POSITIVE);
                }
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

    /// Reads the peak whose highest sample is at an offset (right, down), from the samples round
    /// it.
    fn read(
        &self,
        mut patch: Patch,
        (right, down): (i32, i32),
        leans: Option<[f32; 2]>,
    ) -> Finding {
        let [across, along] = &self.tapers;
        for (r, row) in patch.iter_mut().enumerate() {
            for (c, value) in row.iter_mut().enumerate() {
                let (x, y) = (right + c as i32 - 2, down + r as i32 - 2);
                *value /= across.left(x) * along.left(y);
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
                f64::from(right) + peak.offset.0,
                f64::from(down) + peak.offset.1,
            ),
            variance,
            ..Finding::NOTHING
        }
    }
}

/// What the correlation of a batch gives besides the planes, by lane.
struct Batch {
    moments: Moments,
    leans: Option<[Lanes; 2]>,
    lit: Lanes,
}

/// The workplace of one thread: the rows under the present windows, regrouped, and room for what
/// is made of them.
struct Bench {
    first: Polyphase,
    second: Polyphase,
    lit: Polyphase,
    /// Whether a row of the band is dark somewhere under a batch: [row][batch].
    dark: VecDeque<Vec<bool>>,
    /// Whether all of `lit` is 1.
    all_lit: bool,
    columns: WindowColumns,
    pixels: PixelLayout,
    row: Row,
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
    fn new(pass: &Pass, width: usize) -> Self {
        let layout = pass.layout;
        let columns = WindowColumns {
            left: layout.left,
            spacing: layout.step_x,
            count: layout.columns,
            width: layout.window.width,
        };
        let band = || Polyphase::new(layout.window.height, columns);
        let (first, mut lit) = (band(), band());
        for mut row in lit.rows_mut() {
            row.fill_with(1.0);
        }
        let pixels = if pass.statistics {
            layout.window.width * layout.window.height
        } else {
            0
        };
        Self {
            pixels: first.layout(),
            first,
            second: band(),
            lit,
            all_lit: true,
            dark: vec![vec![false; columns.batches()]; layout.window.height].into(),
            columns,
            row: Row::new(width),
            planes: pass.correlator.planes(),
            scratch: pass.correlator.scratch(),
            statistics: Statistics {
                first: vec![[0.0; LANES]; pixels],
                second: vec![[0.0; LANES]; pixels],
                sums: StatisticsScratch::new(pixels, layout.window.width),
            },
        }
    }

    /// Brings the pixels of row `j` of windows into the bands; all of them when `fresh`, else
    /// those that the row of windows above did not have.
    fn advance(&mut self, pass: &Pass, images: &Exposures, j: usize, fresh: bool) {
        let (top, _) = pass.layout.corner(j, 0);
        let height = pass.layout.window.height;
        let new = if fresh {
            height
        } else {
            pass.layout.step_y.min(height)
        };
        self.first.scroll(new);
        self.second.scroll(new);
        if !self.all_lit {
            self.lit.scroll(new);
        }
        self.dark.rotate_left(new);
        let rows = self.first.rows_mut().zip(self.second.rows_mut());
        let rows = rows.zip(self.lit.rows_mut()).zip(&mut self.dark);
        for (r, (((mut first, mut second), mut lit), dark)) in rows.enumerate().skip(height - new) {
            dark.fill(false);
            if images.row(top + r, &mut self.row) {
                for (batch, dark) in dark.iter_mut().enumerate() {
                    let left = self.columns.left + batch * LANES * self.columns.spacing;
                    let end = left + (LANES - 1) * self.columns.spacing + self.columns.width;
                    let end = end.min(images.width);
                    *dark = self.row.lit[left..end].contains(&0.0);
                    self.all_lit &= !*dark;
                }
            }
            first.fill(&self.row.first);
            second.fill(&self.row.second);
            if !self.all_lit {
                lit.fill(&self.row.lit);
            }
        }
        if !self.all_lit && !self.dark.iter().flatten().any(|dark| *dark) {
            for mut row in self.lit.rows_mut() {
                row.fill_with(1.0);
            }
            self.all_lit = true;
        }
    }

    /// Whether a pixel of this batch's windows is dark.
    fn is_dark(&self, batch: usize) -> bool {
        self.dark.iter().any(|row| row[batch])
    }

    /// Share of each window of a batch that is lit.
    fn lit_shares(&self, batch: usize, height: usize) -> Lanes {
        let width = self.columns.width;
        let mut sum = [0.0; LANES];
        for row in 0..height {
            let start = self.lit.start(row, batch);
            for column in self.pixels.columns() {
                let lit = lanes_at(self.lit.pixels(), start + column);
                for l in 0..LANES {
                    sum[l] += lit[l];
                }
            }
        }
        sum.map(|lit| lit / (width * height) as f32)
    }
}
