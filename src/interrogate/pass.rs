//! One pass: every window correlated, every peak read.

use ndarray::Array2;
use rayon::prelude::*;

use super::deform::Deformed;
use super::layout::Layout;
use super::peak::{Patch, peak_offset};
use super::taper::Taper;
use super::transform::{BATCH, Correlator, Scratch};
use crate::task::{Cancelled, Task};

/// What the correlation of one window says.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Finding {
    /// Residual shift of the highest peak (right, down), px.
    pub shift: (f64, f64),
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
        height: 0.0,
        second: ((0.0, 0.0), 0.0),
        lit: 0.0,
    };
}

/// Correlates every window of `layout`; peaks are sought up to `reach` (columns, rows) px away.
pub(crate) fn correlate(
    images: &Deformed,
    layout: &Layout,
    reach: (usize, usize),
    task: &Task,
) -> Result<Array2<Finding>, Cancelled> {
    let correlator = Correlator::new(layout.window.height, layout.window.width);
    let tapers = [
        Taper::new(layout.window.width),
        Taper::new(layout.window.height),
    ];
    let n = layout.window.height * layout.window.width * BATCH;
    let mut out = Array2::from_elem(layout.shape(), Finding::NOTHING);
    let per_row = layout.columns;
    out.as_slice_mut()
        .unwrap_or_default()
        .par_chunks_mut(per_row)
        .enumerate()
        .map_init(
            || Bench {
                a: vec![0.0; n],
                b: vec![0.0; n],
                planes: vec![0.0; n],
                scratch: correlator.scratch(),
            },
            |bench, (j, row)| {
                task.check()?;
                for (k, batch) in row.chunks_mut(BATCH).enumerate() {
                    let first = k * BATCH;
                    bench.batch(
                        &correlator,
                        images,
                        layout,
                        &tapers,
                        (j, first),
                        reach,
                        batch,
                    );
                }
                Ok(())
            },
        )
        .collect::<Result<(), Cancelled>>()?;
    Ok(out)
}

/// The workplace of one thread: a batch of windows, their planes, the transform's own scratch.
struct Bench {
    a: Vec<f32>,
    b: Vec<f32>,
    planes: Vec<f32>,
    scratch: Scratch,
}

impl Bench {
    fn batch(
        &mut self,
        correlator: &Correlator,
        images: &Deformed,
        layout: &Layout,
        tapers: &[Taper; 2],
        (j, first): (usize, usize),
        reach: (usize, usize),
        out: &mut [Finding],
    ) {
        let mut contents = [Contents::default(); BATCH];
        for (l, contents) in contents.iter_mut().enumerate() {
            let corner = layout.corner(j, (first + l).min(layout.columns - 1));
            let lanes = (&mut self.a[..], &mut self.b[..]);
            *contents = gather(images, layout, tapers, corner, l, lanes);
        }
        correlator.correlate(&self.a, &self.b, &mut self.planes, &mut self.scratch);
        for (l, out) in out.iter_mut().enumerate() {
            let Contents { energy, lit } = contents[l];
            let norm = (energy.0 * energy.1).sqrt();
            *out = Finding {
                lit,
                ..if norm > 0.0 && norm.is_finite() {
                    read_plane(&self.planes, layout, tapers, reach, l, norm)
                } else {
                    Finding::NOTHING
                }
            };
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
    layout: &Layout,
    tapers: &[Taper; 2],
    (reach_x, reach_y): (usize, usize),
    lane: usize,
    norm: f32,
) -> Finding {
    let (w, h) = (layout.window.width as isize, layout.window.height as isize);
    let at = |x: isize, y: isize| {
        planes[((y.rem_euclid(h) * w + x.rem_euclid(w)) as usize) * BATCH + lane]
    };
    let (rx, ry) = (reach_x as isize, reach_y as isize);
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
    let [across, down] = tapers;
    let patch: Patch = std::array::from_fn(|r| {
        std::array::from_fn(|c| {
            let (x, y) = (x + c as isize - 2, y + r as isize - 2);
            at(x, y) / (across.left(x) * down.left(y))
        })
    });
    let (dx, dy) = peak_offset(&patch);
    Finding {
        shift: (x as f64 + dx, y as f64 + dy),
        height: top / norm,
        second: ((x2 as f64, y2 as f64), next / norm),
        lit: 1.0,
    }
}
