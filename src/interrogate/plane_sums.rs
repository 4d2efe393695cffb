//! Correlation planes of many pairs, added up window by window.
//!
//! What the pairs have in common grows with their number, chance peaks only with its root: a
//! steady flow can be read from seeding far too thin for one pair (Meinhart, Wereley & Santiago
//! 2000, J. Fluids Eng. 122, 285; from memory).

use rayon::prelude::*;

use super::layout::Layout;
use super::peak::Patch;
use super::significance::Scatter;

/// The searched part of the planes of one window, summed as coefficients.
#[derive(Clone)]
pub(crate) struct WindowSum {
    /// How far a peak is sought (columns, rows), px; the samples go 2 px further.
    reach: (i32, i32),
    samples: Vec<f32>,
    /// Variance of the lean of the sum, right and below.
    leans: [f32; 2],
    /// Pairs in which the window had contrast.
    pairs: usize,
    /// Sum of the lit shares, and of how many.
    lit: (f32, usize),
}

/// The highest peak of a sum.
pub(crate) struct SumPeak {
    /// Offset of its highest sample (right, down).
    pub at: (i32, i32),
    /// That sample, a sum of coefficients.
    pub height: f32,
    /// The samples round it.
    pub patch: Patch,
    /// As those of a finding.
    pub prominence: f32,
    /// As that of a finding.
    pub ratio: f32,
}

impl WindowSum {
    fn new((x, y): (usize, usize)) -> Self {
        Self {
            reach: (x as i32, y as i32),
            samples: vec![0.0; (2 * x + 5) * (2 * y + 5)],
            leans: [0.0; 2],
            pairs: 0,
            lit: (0.0, 0),
        }
    }

    /// Adds the plane of one pair, whose samples (right, down) times `norm` are coefficients; `norm`
    /// is 0 for a window without contrast.
    pub fn add(
        &mut self,
        norm: f32,
        leans: Option<[f32; 2]>,
        lit: f32,
        sample: impl Fn(i32, i32) -> f32,
    ) {
        self.lit = (self.lit.0 + lit, self.lit.1 + 1);
        if norm == 0.0 {
            return;
        }
        self.pairs += 1;
        let (x, y) = (self.reach.0 + 2, self.reach.1 + 2);
        let places = (-y..=y).flat_map(|down| (-x..=x).map(move |right| (right, down)));
        for (sum, (right, down)) in self.samples.iter_mut().zip(places) {
            *sum += norm * sample(right, down);
        }
        if let Some(leans) = leans {
            for (sum, lean) in self.leans.iter_mut().zip(leans) {
                *sum += norm * norm * lean;
            }
        }
    }

    /// Adds the samples of another window, whatever is lit there.
    fn add_samples(&mut self, other: &WindowSum) {
        self.pairs += other.pairs;
        for (sum, more) in self.samples.iter_mut().zip(&other.samples) {
            *sum += more;
        }
    }

    fn at(&self, right: i32, down: i32) -> f32 {
        let (x, y) = (self.reach.0 + 2, self.reach.1 + 2);
        self.samples[((down + y) * (2 * x + 1) + right + x) as usize]
    }

    /// Variance of the lean of the sum, right and below.
    pub fn leans(&self) -> [f32; 2] {
        self.leans
    }

    /// Mean share that was lit.
    pub fn lit(&self) -> f32 {
        self.lit.0 / self.lit.1.max(1) as f32
    }

    /// A sum as the mean coefficient of the pairs that had contrast.
    pub fn mean(&self, sum: f32) -> f32 {
        sum / self.pairs.max(1) as f32
    }

    /// The highest sample within reach; `None` where no pair had contrast.
    pub fn peak(&self) -> Option<SumPeak> {
        if self.pairs == 0 {
            return None;
        }
        let (x, y) = self.reach;
        let places = || (-y..=y).flat_map(|down| (-x..=x).map(move |right| (right, down)));
        let highest = |skip: Option<(i32, i32)>| {
            let far = |(right, down): (i32, i32)| {
                skip.is_none_or(|(r, d)| (right - r).abs() > 2 || (down - d).abs() > 2)
            };
            let mut best: Option<((i32, i32), f32)> = None;
            for place in places().filter(|place| far(*place)) {
                let here = self.at(place.0, place.1);
                if best.is_none_or(|(_, height)| here > height) {
                    best = Some((place, here));
                }
            }
            best
        };
        let (at, height) = highest(None)?;
        let patch: Patch = std::array::from_fn(|r| {
            std::array::from_fn(|c| self.at(at.0 + c as i32 - 2, at.1 + r as i32 - 2))
        });
        let scatter = Scatter::of(places().map(|(right, down)| self.at(right, down)));
        let (mean, scatter) = scatter.without(&patch);
        let second = highest(Some(at)).map_or(0.0, |(_, height)| height);
        Some(SumPeak {
            at,
            height,
            patch,
            prominence: ((f64::from(height) - mean) / scatter) as f32,
            ratio: height / second.max(f32::MIN_POSITIVE),
        })
    }
}

/// The sums of all windows of a pass.
pub(crate) struct PlaneSums(Vec<WindowSum>);

impl PlaneSums {
    /// Empty sums for windows laid out in `shape` (rows, columns), peaks sought up to `reach`
    /// (columns, rows) px away.
    pub fn new(shape: (usize, usize), reach: (usize, usize)) -> Self {
        Self(vec![WindowSum::new(reach); shape.0 * shape.1])
    }

    /// Row after row.
    pub fn windows(&self) -> &[WindowSum] {
        &self.0
    }

    /// The same with each window's samples averaged with those of the up to eight windows about
    /// half a window away in a layout: what is chance in one is none of its neighbours'
    /// (Hart 2000, Exp. Fluids 29, 13, multiplies planes; from memory).
    pub fn joined(&self, layout: &Layout) -> PlaneSums {
        let (rows, columns) = layout.shape();
        let stride = |side: usize, step: usize| ((side + step) / (2 * step)).max(1);
        let window = layout.window;
        let (sj, si) = (
            stride(window.height, layout.step_y),
            stride(window.width, layout.step_x),
        );
        let about = |at: usize, stride: usize, n: usize| {
            let after = Some(at + stride).filter(|at| *at < n);
            [at.checked_sub(stride), Some(at), after]
                .into_iter()
                .flatten()
        };
        let joined = (0..rows * columns).into_par_iter().map(|at| {
            let mut sum = self.0[at].clone();
            for jj in about(at / columns, sj, rows) {
                for ii in about(at % columns, si, columns) {
                    if jj * columns + ii != at {
                        sum.add_samples(&self.0[jj * columns + ii]);
                    }
                }
            }
            sum
        });
        PlaneSums(joined.collect())
    }

    pub(super) fn windows_mut(&mut self) -> &mut [WindowSum] {
        &mut self.0
    }
}
