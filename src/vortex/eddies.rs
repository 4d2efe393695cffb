//! The eddies of one field.

use std::sync::Arc;

use ndarray::Array2;

use super::circulation::CirculationCurve;
use super::find::{Core, cores};
use super::fraction::{Fraction, fraction};
use super::peak::{Peak, peak};
use super::{Eddy, EddyOptions, Flag, Sense};
use crate::field::{FieldError, Gradient, ScalarField, Status, VectorField};
use crate::quantity::{Measured, Unit};
use crate::task::{Cancelled, Task};

/// A core whose 25 % region is narrower than this many spacings is under-resolved: the default
/// scheme then reads the peak more than 2 % low.
const LEAST_SPACINGS: f64 = 5.9;

/// The same against the window each vector is a mean over.
const LEAST_WINDOWS: f64 = 1.5;

/// Why eddies could not be looked for.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum VortexError {
    /// The person who started the work ended it.
    #[error(transparent)]
    Cancelled(#[from] Cancelled),
    /// The field is too small or an option makes no sense.
    #[error(transparent)]
    Field(#[from] FieldError),
}

/// The eddies of one field with the fields they were found in.
#[derive(Clone, Debug)]
pub struct Eddies {
    /// The velocities.
    pub field: Arc<VectorField>,
    /// Their vorticity.
    pub vorticity: Arc<ScalarField>,
    /// Their swirling strength, signed by vorticity.
    pub swirl: Arc<ScalarField>,
    /// How they were found and measured.
    pub options: EddyOptions,
    /// The eddies, the largest |circulation| first.
    pub list: Vec<Eddy>,
}

/// Finds and measures the eddies of a field; a field without any gives an empty list.
///
/// Cores are connected regions of swirling strength of one sign (see [`EddyOptions`]); each is
/// measured as the doc comments of [`Eddy`] and [`super::Method`] say. Uncertainties are missing.
///
/// # Errors
/// [`VortexError::Field`] on a grid of fewer than 5 x 5 nodes or for options that make no sense,
/// [`VortexError::Cancelled`] once the task is cancelled.
pub fn find_eddies(
    field: &VectorField,
    options: &EddyOptions,
    task: &Task,
) -> Result<Eddies, VortexError> {
    options.check()?;
    let grid = field.grid;
    if grid.nx < 5 || grid.ny < 5 {
        return Err(VortexError::Field(FieldError::TooSmall {
            what: "finding eddies",
            least: 5,
            nx: grid.nx,
            ny: grid.ny,
        }));
    }
    task.check()?;
    let scheme = options.scheme.unwrap_or(EddyOptions::DEFAULT_SCHEME);
    let gradient = field.gradient(scheme)?;
    let (vorticity, swirl) = (gradient.vorticity(), gradient.swirl());
    let cores = cores(&swirl.values, largest(&gradient), options, task)?;
    let rotations = Rotations {
        forward: &vorticity.values,
        backward: vorticity.values.mapv(|w| -w),
    };
    let mut seen = Vec::new();
    for core in &cores {
        task.check()?;
        seen.extend(Seen::of(field, &rotations, &swirl.values, core, options));
    }
    let mut list: Vec<Eddy> = (0..seen.len())
        .map(|k| seen[k].eddy(field, vorticity.unit, &seen))
        .collect();
    list.sort_by(|a, b| {
        let strength = |e: &Eddy| e.circulation.value().abs();
        strength(b).total_cmp(&strength(a))
    });
    for (index, eddy) in list.iter_mut().enumerate() {
        eddy.index = index;
    }
    Ok(Eddies {
        field: Arc::new(field.clone()),
        vorticity: Arc::new(vorticity),
        swirl: Arc::new(swirl),
        options: *options,
        list,
    })
}

fn largest(gradient: &Gradient) -> f64 {
    [&gradient.ux, &gradient.uy, &gradient.vx, &gradient.vy]
        .into_iter()
        .flatten()
        .filter(|d| d.is_finite())
        .fold(0.0, |m, d| m.max(d.abs()))
}

/// The vorticity, and its negative for eddies that turn clockwise.
struct Rotations<'a> {
    forward: &'a Array2<f64>,
    backward: Array2<f64>,
}

/// What was read of one core before the eddies are put side by side.
struct Seen {
    sense: Sense,
    peak: Peak,
    fraction: Fraction,
    /// Diameter at 25 % of the peak, whatever fraction was asked for: as that of a Gaussian core,
    /// whose radius at the fraction f goes as sqrt(ln(1/f)).
    quarter_diameter: f64,
}

impl Seen {
    fn of(
        field: &VectorField,
        rotations: &Rotations<'_>,
        swirl: &Array2<f64>,
        core: &Core,
        options: &EddyOptions,
    ) -> Option<Seen> {
        let (sense, rotation) = if swirl[*core.nodes.first()?] > 0.0 {
            (Sense::CounterClockwise, rotations.forward)
        } else {
            (Sense::Clockwise, &rotations.backward)
        };
        let peak = peak(rotation, &field.grid, &core.nodes)?;
        let fraction = fraction(field, rotation, peak, core.nodes.len(), options.fraction)?;
        let to_quarter = (4f64.ln() / (1.0 / options.fraction).ln()).sqrt();
        Some(Seen {
            sense,
            peak,
            quarter_diameter: fraction.diameter * to_quarter,
            fraction,
        })
    }

    fn eddy(&self, field: &VectorField, rate: Unit, all: &[Seen]) -> Eddy {
        let length = field.grid.length;
        let sign = self.sense.sign();
        let curve = CirculationCurve::around(field, self.peak, self.fraction.diameter / 2.0);
        let largest = curve.first_maximum(sign);
        let mut flags = self.flags(field, all);
        if largest.is_err() {
            flags.push(Flag::NoCirculationMaximum);
        }
        let measured = Measured::without_uncertainty;
        Eddy {
            index: 0,
            x: measured(self.peak.x, length),
            y: measured(self.peak.y, length),
            sense: self.sense,
            peak_vorticity: measured(sign * self.peak.height, rate),
            circulation: measured(self.fraction.circulation, curve.unit),
            diameter: measured(self.fraction.diameter, length),
            flags,
            outline: self.fraction.contour.points.clone(),
            curve,
            largest,
        }
    }

    fn flags(&self, field: &VectorField, all: &[Seen]) -> Vec<Flag> {
        let contour = &self.fraction.contour;
        let inside = &contour.inside;
        let replaced = inside
            .iter()
            .filter(|node| field.status[**node] == Status::Replaced)
            .count();
        let others = all.iter().filter(|other| {
            !std::ptr::eq(*other, self)
                && other.sense == self.sense
                && contour.encloses(other.peak.x, other.peak.y)
        });
        let of = inside.len();
        [
            (contour.cut_by_edge, Flag::CutByEdge),
            (contour.cut_by_mask, Flag::CutByMask),
            (self.is_under_resolved(field), Flag::UnderResolved),
            (others.count() > 0, Flag::MergedWithNeighbour),
            (replaced > 0, Flag::ReplacedInside { replaced, of }),
        ]
        .into_iter()
        .filter(|(raised, _)| *raised)
        .map(|(_, flag)| flag)
        .collect()
    }

    fn is_under_resolved(&self, field: &VectorField) -> bool {
        let spacing = field.grid.dx.max(field.grid.dy);
        let window = field.window.map_or(0.0, |(wide, high)| wide.max(high));
        let diameter = self.quarter_diameter;
        diameter < LEAST_SPACINGS * spacing || diameter < LEAST_WINDOWS * window
    }
}
