//! One pass: every window correlated, every peak read.

use ndarray::Array2;
use rayon::prelude::*;

use super::deform::Deformed;
use super::layout::Layout;
use super::peak::{Patch, Peak};
use super::statistics::{StatisticsScratch, lean_variance, variance};
use super::taper::Taper;
use super::transform::{BATCH, Correlator, Scratch};
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
    /// Residual shift of the next highest peak, whole px, and its height.
    pub second: ((f64, f64), f32),
    /// Share of the window that was lit in both exposures.
    pub lit: f32,
}

impl Finding {
    const NOTHING: Finding = Finding {
        shift: (0.0, 0.0),
        variance: (None, None),
        height: 0.0,
        second: ((0.0, 0.0), 0.0),
        lit: 0.0,
    };
}

/// One pass over a pair of deformed images.
pub(crate) struct Pass<'a> {
    images: &'a Deformed,
    layout: &'a Layout,
    /// Columns, rows.
    tapers: [Taper; 2],
    correlator: Correlator,
    /// How far peaks are sought (columns, rows), px.
    reach: (usize, usize),
    /// Whether each vector gets its uncertainty.
    statistics: bool,
}

impl<'a> Pass<'a> {
    /// A pass over `layout`, peaks sought up to `reach` (columns, rows) px away, with the
    /// uncertainty of each vector if `statistics` is true.
    pub fn new(
        images: &'a Deformed,
        layout: &'a Layout,
        reach: (usize, usize),
        statistics: bool,
    ) -> Self {
        let (width, height) = (layout.window.width, layout.window.height);
        Self {
            images,
            layout,
            tapers: [Taper::new(width), Taper::new(height)],
            correlator: Correlator::new(height, width),
            reach,
            statistics,
        }
    }

    /// Correlates every window; rows of windows share the cores.
    pub fn run(&self, task: &Task) -> Result<Array2<Finding>, Cancelled> {
        let columns = self.layout.columns;
        let mut out = vec![Finding::NOTHING; self.layout.rows * columns];
        out.par_chunks_mut(columns)
            .enumerate()
            .map_init(
                || Bench::new(self),
                |bench, (j, row)| {
                    task.check()?;
                    for (k, batch) in row.chunks_mut(BATCH).enumerate() {
                        self.batch(bench, (j, k * BATCH), batch);
                    }
                    Ok(())
                },
            )
            .collect::<Result<(), Cancelled>>()?;
        let shaped = Array2::from_shape_vec(self.layout.shape(), out);
        Ok(shaped.unwrap_or_else(|_| unreachable!("one finding a window")))
    }

    fn batch(&self, bench: &mut Bench, (j, first): (usize, usize), out: &mut [Finding]) {
        let mut contents = [Contents::default(); BATCH];
        for (l, contents) in contents.iter_mut().enumerate() {
            let corner = self
                .layout
                .corner(j, (first + l).min(self.layout.columns - 1));
            let lanes = (&mut bench.a[..], &mut bench.b[..]);
            *contents = gather(self.images, self.layout, &self.tapers, corner, l, lanes);
        }
        self.correlator
            .correlate(&bench.a, &bench.b, &mut bench.planes, &mut bench.scratch);
        let leans = self.statistics.then(|| {
            let (a, b) = (bench.a.as_chunks().0, bench.b.as_chunks().0);
            lean_variance(a, b, self.layout.window.width, &mut bench.statistics)
        });
        for (l, out) in out.iter_mut().enumerate() {
            let Contents { energy, lit } = contents[l];
            let norm = (energy.0 * energy.1).sqrt();
            if !(norm > 0.0 && norm.is_finite()) {
                *out = Finding {
                    lit,
                    ..Finding::NOTHING
                };
                continue;
            }
            let leans = leans.map(|axes| axes.map(|lanes| lanes[l]));
            *out = Finding {
                lit,
                ..read_plane(&bench.planes, self, l, norm, leans)
            };
        }
    }
}

/// The workplace of one thread: a batch of windows, their planes, and room for the sums.
struct Bench {
    a: Vec<f32>,
    b: Vec<f32>,
    planes: Vec<f32>,
    scratch: Scratch,
    statistics: StatisticsScratch,
}

impl Bench {
    fn new(pass: &Pass) -> Self {
        let pixels = pass.layout.window.height * pass.layout.window.width;
        let room = || vec![0.0; pixels * BATCH];
        Self {
            a: room(),
            b: room(),
            planes: room(),
            scratch: pass.correlator.scratch(),
            statistics: StatisticsScratch::new(if pass.statistics { pixels } else { 0 }),
        }
    }
}

/// What one gathered window holds: the energy of its two weighted exposures and its lit share.
#[derive(Clone, Copy, Default)]
struct Contents {
    energy: (f32, f32),
    lit: f32,
}

/// Copies one window into its lane: weighted, its weighted mean removed, dark pixels zero.
fn gather(
    images: &Deformed,
    layout: &Layout,
    tapers: &[Taper; 2],
    (top, left): (usize, usize),
    lane: usize,
    (a, b): (&mut [f32], &mut [f32]),
) -> Contents {
    let (w, h) = (layout.window.width, layout.window.height);
    let [across, down] = tapers;
    let pixels = |r: usize| {
        let start = (top + r) * images.width + left;
        (start..start + w).zip(&across.weights).map(move |(p, wx)| {
            let lit = images.lit.as_ref().map_or(1.0, |l| l[p]);
            (p, lit, lit * wx * down.weights[r])
        })
    };
    let (mut sum_a, mut sum_b, mut weight, mut lit) = (0f32, 0f32, 0f32, 0f32);
    for r in 0..h {
        for (p, bright, w) in pixels(r) {
            sum_a += w * images.first[p];
            sum_b += w * images.second[p];
            weight += w;
            lit += bright;
        }
    }
    let weight = weight.max(f32::MIN_POSITIVE);
    let (mean_a, mean_b) = (sum_a / weight, sum_b / weight);
    let mut energy = (0.0, 0.0);
    for r in 0..h {
        for (c, (p, _, w)) in pixels(r).enumerate() {
            let va = w * (images.first[p] - mean_a);
            let vb = w * (images.second[p] - mean_b);
            let cell = (r * layout.window.width + c) * BATCH + lane;
            (a[cell], b[cell]) = (va, vb);
            energy.0 += va * va;
            energy.1 += vb * vb;
        }
    }
    Contents {
        energy,
        lit: lit / (w * h) as f32,
    }
}

/// Reads the highest and the next highest peak of one plane.
fn read_plane(
    planes: &[f32],
    pass: &Pass,
    lane: usize,
    norm: f32,
    leans: Option<[f32; 2]>,
) -> Finding {
    let window = pass.layout.window;
    let (w, h) = (window.width as isize, window.height as isize);
    let at = |x: isize, y: isize| {
        planes[((y.rem_euclid(h) * w + x.rem_euclid(w)) as usize) * BATCH + lane]
    };
    let (rx, ry) = (pass.reach.0 as isize, pass.reach.1 as isize);
    let highest = |skip: Option<(isize, isize)>| {
        let mut best = (f32::MIN, 0, 0);
        for y in -ry..=ry {
            for x in -rx..=rx {
                if skip.is_some_and(|(sx, sy)| (x - sx).abs() <= 2 && (y - sy).abs() <= 2) {
                    continue;
                }
                if at(x, y) > best.0 {
                    best = (at(x, y), x, y);
                }
            }
        }
        best
    };
    let (top, x, y) = highest(None);
    let (next, x2, y2) = highest(Some((x, y)));
    let [across, down] = &pass.tapers;
    let patch: Patch = std::array::from_fn(|r| {
        std::array::from_fn(|c| {
            let (x, y) = (x + c as isize - 2, y + r as isize - 2);
            at(x, y) / (across.left(x) * down.left(y))
        })
    });
    let peak = Peak::of(&patch);
    let (across, down) = match leans {
        Some([across, down]) => (
            variance(
                across,
                peak.top,
                peak.sides.0,
                (w as usize - 1) * h as usize,
            ),
            variance(down, peak.top, peak.sides.1, w as usize * (h as usize - 1)),
        ),
        None => (None, None),
    };
    Finding {
        shift: (x as f64 + peak.offset.0, y as f64 + peak.offset.1),
        variance: (across, down),
        height: top / norm,
        second: ((x2 as f64, y2 as f64), next / norm),
        lit: 1.0,
    }
}
