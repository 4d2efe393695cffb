//! A plan tried on the pairs that are looked at, and two of them compared.

use super::AdviceError;
use super::images::Images;
use super::look::{squares, stairs};
use crate::field::{Status, VectorField};
use crate::task::Task;

/// A share of the largest uncertainties, which a few chance peaks make huge, counts as the rest.
const WILD: f64 = 0.02;

/// Particle images in a window at which the variance of its vector is twice what its uncertainty
/// says. On synthetic images the ratio was 2.2 at 12, 1.7 at 20, 1.1 at 50 (seen once).
const FEW: f64 = 10.0;

/// Share of the vectors that a better plan may fail to measure.
const MOST_LOST: f64 = 0.1;

/// What a plan made of the pairs.
pub(super) struct Trial {
    /// Side of its last window, px.
    pub side: usize,
    /// How often that comes.
    pub passes: usize,
    /// Mean variance of a component, px²: by the vectors' own uncertainty, and more where a window
    /// holds few particle images, of which that says too little.
    pub variance: f64,
    /// Share of the vectors that are measured.
    pub measured: f64,
    fields: Vec<VectorField>,
}

impl Trial {
    pub fn new(
        images: &[Images],
        per_px2: f64,
        (first, side, passes): (usize, usize, usize),
        task: &Task,
    ) -> Result<Trial, AdviceError> {
        let held = per_px2 * (side * side) as f64;
        let plan = squares(&stairs(first, side, passes))?;
        let fields = images
            .iter()
            .map(|images| images.interrogate(&plan, task))
            .collect::<Result<Vec<_>, _>>()?;
        let count = |status| fields.iter().map(|f| f.count(status)).sum::<usize>();
        let nodes = fields.iter().map(|f| f.status.len()).sum::<usize>();
        let nodes = (nodes - count(Status::Masked)).max(1);
        Ok(Trial {
            side,
            passes,
            variance: variance(&fields) * (1.0 + FEW / held),
            measured: count(Status::Measured) as f64 / nodes as f64,
            fields,
        })
    }

    /// Root of the variance, px.
    pub fn noise(&self) -> f64 {
        self.variance.sqrt()
    }

    /// Mean square difference of a component from another trial of the same pairs, at the places
    /// of the other's vectors, px². Vectors that were filled in count too: that a plan needs them
    /// is its fault. Those whose window lies at the edge of the image do not: every plan is worse
    /// there.
    pub fn difference(&self, other: &Trial) -> f64 {
        let side = 1.5 * self.side.max(other.side) as f64;
        let (mut square, mut count) = (0.0, 0.0);
        for (here, there) in self.fields.iter().zip(&other.fields) {
            let grid = there.grid;
            // From the edge of the image, at which the outermost windows end.
            let clear = side - 0.5 * other.side as f64;
            let inside = |at: f64, from: f64, to: f64| at >= from + clear && at <= to - clear;
            for ((j, i), status) in there.status.indexed_iter() {
                let (at_x, at_y) = (grid.x(i), grid.y(j));
                let (in_x, in_y) = (inside(at_x, grid.x0, grid.x1()), inside(at_y, grid.y0, grid.y1()));
                if !status.has_vector() || !in_x || !in_y {
                    continue;
                }
                if let Ok((u, v)) = here.at(at_x, at_y)
                    && u.is_finite()
                    && v.is_finite()
                {
                    let (u, v) = (u - there.u[(j, i)], v - there.v[(j, i)]);
                    square += 0.5 * (u * u + v * v);
                    count += 1.0;
                }
            }
        }
        square / f64::max(count, 1.0)
    }

    /// Whether a smoother plan is the better one by the error to be expected of both.
    ///
    /// Both read the same noise, of which the smoother one keeps a part; so their fields differ
    /// by noise of variance s² - S² and by the detail that the smoother one loses (the argument
    /// of Hausman 1978, from memory). Its expected square error is that loss and S², and less
    /// than s² where the difference is below 2 (s² - S²). A plan that measures many fewer vectors
    /// is not better.
    pub fn is_bettered_by(&self, smoother: &Trial) -> bool {
        let gained = 2.0 * (self.variance - smoother.variance);
        smoother.measured > self.measured - MOST_LOST && self.difference(smoother) < gained
    }
}

/// Mean of the squared uncertainties of both components, where known.
fn variance(fields: &[VectorField]) -> f64 {
    let mut squares: Vec<f64> = fields
        .iter()
        .filter_map(|field| field.unc.as_ref())
        .flat_map(|(u, v)| u.iter().chain(v.iter()))
        .filter(|unc| unc.is_finite())
        .map(|unc| unc * unc)
        .collect();
    squares.sort_by(f64::total_cmp);
    let n = squares.len();
    let Some(&limit) = squares.get((n as f64 * (1.0 - WILD)) as usize) else {
        return 0.0;
    };
    squares.iter().map(|square| square.min(limit)).sum::<f64>() / n as f64
}
