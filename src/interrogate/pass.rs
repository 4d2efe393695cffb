//! One pass: every window correlated, every peak read.

use ndarray::Array2;
use rayon::prelude::*;

use super::deform::Deformed;
use super::layout::Layout;
use super::peak::three_point;
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
                    bench.batch(&correlator, images, layout, (j, first), reach, batch);
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
        (j, first): (usize, usize),
        reach: (usize, usize),
        out: &mut [Finding],
    ) {
        let mut energy = [(0f32, 0f32, 0f32); BATCH];
        for l in 0..BATCH {
            let corner = layout.corner(j, (first + l).min(layout.columns - 1));
            energy[l] = gather(images, layout, corner, l, &mut self.a, &mut self.b);
        }
        correlator.correlate(&self.a, &self.b, &mut self.planes, &mut self.scratch);
        for (l, out) in out.iter_mut().enumerate() {
            let (ea, eb, lit) = energy[l];
            let norm = (ea * eb).sqrt();
            *out = Finding {
                lit,
                ..if norm > 0.0 && norm.is_finite() {
                    read_plane(&self.planes, layout, reach, l, norm)
                } else {
                    Finding::NOTHING
                }
            };
        }
    }
}

fn gather(
    images: &Deformed,
    layout: &Layout,
    (top, left): (usize, usize),
    lane: usize,
    a: &mut [f32],
    b: &mut [f32],
) -> (f32, f32, f32) {
    let (w, h) = (layout.window.width, layout.window.height);
    let rows = |image: &'_ [f32], r: usize| {
        let start = (top + r) * images.width + left;
        start..(start + w).min(image.len())
    };
    let mut mean = (0f32, 0f32, 0f32);
    for r in 0..h {
        let range = rows(&images.first, r);
        for p in range {
            let lit = images.lit.as_ref().map_or(1.0, |l| l[p]);
            mean.0 += lit * images.first[p];
            mean.1 += lit * images.second[p];
            mean.2 += lit;
        }
    }
    let (ma, mb) = (mean.0 / mean.2.max(1.0), mean.1 / mean.2.max(1.0));
    let (mut ea, mut eb) = (0.0, 0.0);
    for r in 0..h {
        for (c, p) in rows(&images.first, r).enumerate() {
            let lit = images.lit.as_ref().map_or(1.0, |l| l[p]);
            let va = lit * (images.first[p] - ma);
            let vb = lit * (images.second[p] - mb);
            a[(r * w + c) * BATCH + lane] = va;
            b[(r * w + c) * BATCH + lane] = vb;
            ea += va * va;
            eb += vb * vb;
        }
    }
    (ea, eb, mean.2 / (w * h) as f32)
}

fn read_plane(
    planes: &[f32],
    layout: &Layout,
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
    // A window that moved by m has lost the share |m|/W of its pattern at that offset: the
    // circular correlation is divided by what is left, so that the lean towards zero goes.
    let whole_x = |m: isize| 1.0 - m.abs() as f32 / w as f32;
    let whole_y = |m: isize| 1.0 - m.abs() as f32 / h as f32;
    let dx = three_point([-1, 0, 1].map(|k| at(x + k, y) / whole_x(x + k)));
    let dy = three_point([-1, 0, 1].map(|k| at(x, y + k) / whole_y(y + k)));
    Finding {
        shift: (x as f64 + dx, y as f64 + dy),
        height: top / norm,
        second: ((x2 as f64, y2 as f64), next / norm),
        lit: 1.0,
    }
}
