//! A vector field as arrows.

use super::axis::Plot;
use super::colour::{INK, PAPER};
use super::curve::within;
use super::error::FigureError;
use super::scene::{Path, Point, Rect, Scene, Stroke};
use super::ticks::{decimal, step_near};
use crate::field::{Status, VectorField};

/// How vectors are drawn.
#[derive(Clone, Debug, Default, PartialEq, serde::Deserialize)]
#[serde(default, deny_unknown_fields)]
pub struct ArrowOptions {
    /// Draw every n-th vector along each axis; by default as many as stand at least
    /// `spacing_mm` apart.
    pub every: Option<usize>,
    /// Least distance between arrows on paper in mm; 3.4 by default.
    pub spacing_mm: Option<f64>,
    /// Length of the reference arrow on paper in mm; by default such that the longest arrows
    /// reach a little beyond their neighbours.
    pub reference_mm: Option<f64>,
    /// Speed the reference arrow stands for, in the field's unit; by default a round number near
    /// the greatest speed.
    pub reference: Option<f64>,
}

/// Arrows settled in all but the size of the sheet.
#[derive(Clone, Debug)]
pub(crate) struct Arrows {
    /// Speed of the reference arrow.
    pub reference: f64,
    /// The speed nearly all vectors stay below.
    fast: f64,
    options: ArrowOptions,
}

/// Arrows settled on a sheet.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Fitted {
    every: usize,
    /// Millimetres for one unit of speed.
    mm_per_speed: f64,
}

const SPACING_MM: f64 = 3.4;
/// Gap between an arrow and a mark or label it keeps off.
const CLEARANCE: f64 = 0.3;

impl Arrows {
    pub fn new(field: &VectorField, options: &ArrowOptions) -> Result<Self, FigureError> {
        check("every", options.every.map(|n| n as f64), "1 or more")?;
        check("spacing_mm", options.spacing_mm, "a length above zero")?;
        check("reference_mm", options.reference_mm, "a length above zero")?;
        check("reference", options.reference, "a speed above zero")?;
        let mut speeds: Vec<f64> = field
            .u
            .iter()
            .zip(&field.v)
            .map(|(u, v)| u.hypot(*v))
            .filter(|s| s.is_finite())
            .collect();
        if speeds.is_empty() {
            return Err(FigureError::NothingFinite("the vector field".to_owned()));
        }
        speeds.sort_by(f64::total_cmp);
        // The fastest hundredth may be outliers; they must not shrink all other arrows.
        let fast = speeds[(speeds.len() - 1) * 99 / 100];
        let fast = if fast > 0.0 {
            fast
        } else {
            speeds[speeds.len() - 1]
        };
        let round = if fast > 1e-150 {
            let (mantissa, power) = step_near(fast / 1.3);
            decimal(mantissa, power)
        } else {
            1.0
        };
        Ok(Self {
            reference: options.reference.unwrap_or(round),
            fast,
            options: options.clone(),
        })
    }

    pub fn fit(&self, field: &VectorField, plot: &Plot) -> Fitted {
        let along = |spacing: f64, span: f64, mm: f64| spacing / span * mm;
        let cell = along(field.grid.dx, plot.x.hi - plot.x.lo, plot.rect.w)
            .min(along(field.grid.dy, plot.y.hi - plot.y.lo, plot.rect.h))
            .max(1e-6);
        let spacing = self.options.spacing_mm.unwrap_or(SPACING_MM);
        let every = self
            .options
            .every
            .unwrap_or((spacing / cell - 0.05).ceil().max(1.0) as usize);
        // Reach of the fast ones: 1.8 spacings, but readable where vectors are few and far apart.
        let reach = (1.8 * cell * every as f64).clamp(3.0, 9.0);
        let mm_per_speed = match self.options.reference_mm {
            Some(mm) => mm / self.reference,
            None if self.fast > 1e-150 => reach / self.fast,
            None => 0.0,
        };
        Fitted {
            every,
            mm_per_speed,
        }
    }
}

fn check(option: &'static str, value: Option<f64>, right: &'static str) -> Result<(), FigureError> {
    match value {
        Some(v) if !(v.is_finite() && v > 0.0) => Err(FigureError::Option {
            option,
            value: v.to_string(),
            right,
        }),
        _ => Ok(()),
    }
}

impl Fitted {
    /// Length of the reference arrow in mm.
    pub fn length(&self, speed: f64) -> f64 {
        speed * self.mm_per_speed
    }

    /// Draws the vectors: measured ones solid, replaced ones hollow.
    ///
    /// An arrow whose tip would lie beyond the frame, or that would cross one of the boxes to be
    /// kept `clear`, is left out; tails end at the frame.
    pub fn draw(&self, scene: &mut Scene, field: &VectorField, plot: &Plot, clear: &[Rect]) {
        let (mut measured, mut replaced) = (Path::new(), Path::new());
        let start = |n: usize| n.saturating_sub(1) % self.every / 2;
        for j in (start(field.grid.ny)..field.grid.ny).step_by(self.every) {
            for i in (start(field.grid.nx)..field.grid.nx).step_by(self.every) {
                let path = match field.status[(j, i)] {
                    Status::Measured => &mut measured,
                    Status::Replaced => &mut replaced,
                    Status::Masked | Status::Outside => continue,
                };
                let (x, y) = (field.grid.x(i), field.grid.y(j));
                if let Some(at) = plot.at(x, y).filter(|p| plot.rect.grown(0.01).holds(*p)) {
                    let k = self.mm_per_speed;
                    let vector = [k * field.u[(j, i)], -k * field.v[(j, i)]];
                    if fits(at, vector, plot, clear) {
                        add_arrow(path, at, vector);
                    }
                }
            }
        }
        scene.clipped(plot.rect, |scene| {
            draw_measured(scene, measured);
            draw_replaced(scene, replaced);
        });
    }
}

/// True where the arrow ends inside the frame and crosses none of the boxes.
fn fits(at: Point, vector: Point, plot: &Plot, clear: &[Rect]) -> bool {
    let end = |half: f64| [at[0] + half * vector[0], at[1] + half * vector[1]];
    let (tail, tip) = (end(-0.5), end(0.5));
    // Nodes on the frame itself keep their dots.
    plot.rect.grown(0.01).holds(tip)
        && clear
            .iter()
            .all(|rect| within(&[tail, tip], rect.grown(CLEARANCE)).is_empty())
}

pub(crate) fn draw_measured(scene: &mut Scene, path: Path) {
    scene.stroke(path.clone(), Stroke::new(PAPER.faded(150), 0.34).rounded());
    scene.fill(path, INK);
}

pub(crate) fn draw_replaced(scene: &mut Scene, path: Path) {
    let rim = Stroke::new(INK, 0.13).rounded();
    scene.stroke(path.clone(), Stroke::new(PAPER.faded(150), 0.45).rounded());
    scene.shape(path, Some(PAPER), Some(rim));
}

/// Adds an arrow with its middle at `at` and `vector` (mm on the sheet) from tail to tip; a dot
/// where that is too short to have a direction.
pub(crate) fn add_arrow(path: &mut Path, at: Point, vector: Point) {
    let length = vector[0].hypot(vector[1]);
    if !length.is_finite() {
        return;
    }
    if length < 0.35 {
        path.add(&Path::circle(at, 0.17), |p| p);
        return;
    }
    let (along, across) = ([vector[0] / length, vector[1] / length], 0.5 * length);
    let head = (0.42 * length).clamp(0.3, 1.5);
    let (barb, shaft) = (0.37 * head, (0.05 * length).clamp(0.08, 0.15));
    let notch = 0.72 * head;
    let place = |s: f64, n: f64| {
        [
            at[0] + s * along[0] - n * along[1],
            at[1] + s * along[1] + n * along[0],
        ]
    };
    let (tail, tip) = (-across, across);
    path.add_polyline(
        [
            place(tail, -shaft),
            place(tip - notch, -shaft),
            place(tip - head, -barb),
            place(tip, 0.0),
            place(tip - head, barb),
            place(tip - notch, shaft),
            place(tail, shaft),
        ],
        true,
    );
}
