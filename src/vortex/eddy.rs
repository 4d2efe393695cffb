//! One eddy: where it is, how big, how strong, and what to beware of.

use std::fmt;

use super::CirculationCurve;
use super::circulation::Circle;
use crate::quantity::{Measured, Unit, plain_number};

/// Sense of rotation.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Sense {
    /// Vorticity above zero.
    CounterClockwise,
    /// Vorticity below zero.
    Clockwise,
}

impl Sense {
    /// The word used in tables.
    pub fn text(self) -> &'static str {
        match self {
            Sense::CounterClockwise => "counter-clockwise",
            Sense::Clockwise => "clockwise",
        }
    }

    /// 1 or -1.
    pub fn sign(self) -> f64 {
        match self {
            Sense::CounterClockwise => 1.0,
            Sense::Clockwise => -1.0,
        }
    }
}

/// A way to say how big an eddy is; what each measures stands in its own file.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Method {
    /// Equivalent-area diameter of the region above a fraction of the peak vorticity.
    VorticityFraction,
    /// Circle of the first maximum of circulation against radius.
    LargestCirculation,
}

impl Method {
    /// Every method.
    pub const ALL: [Method; 2] = [Method::VorticityFraction, Method::LargestCirculation];

    /// The word used in the language.
    pub fn text(self) -> &'static str {
        match self {
            Method::VorticityFraction => "vorticity_fraction",
            Method::LargestCirculation => "largest_circulation",
        }
    }

    /// Reads what [`Method::text`] writes.
    pub fn parse(text: &str) -> Option<Method> {
        Method::ALL.into_iter().find(|m| m.text() == text)
    }
}

/// Why a method has no answer for an eddy.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum NoAnswer {
    /// The circulation has no maximum.
    #[error(
        "the circulation has no maximum up to a radius of {} {length}, where the circle meets \
         the edge, a mask or five times the eddy's own radius: it has no shield and no neighbour of the other \
         sense; use vorticity_fraction",
        plain_number(*reach, 4)
    )]
    NoCirculationMaximum {
        /// The largest circle looked at.
        reach: f64,
        /// Unit of `reach`.
        length: Unit,
    },
}

/// What to beware of in an eddy's numbers.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Flag {
    /// The vorticity region reaches the edge of the field.
    CutByEdge,
    /// The vorticity region meets masked cells.
    CutByMask,
    /// The core is too small for the spacing or the window.
    UnderResolved,
    /// The vorticity region holds another core of the same sense.
    MergedWithNeighbour,
    /// Some vectors of the region were replaced.
    ReplacedInside {
        /// How many.
        replaced: usize,
        /// Of how many in the region.
        of: usize,
    },
    /// Largest circulation has no answer.
    NoCirculationMaximum,
}

impl Flag {
    /// The flag in words.
    pub fn text(self) -> String {
        match self {
            Flag::CutByEdge => "cut by the edge".to_owned(),
            Flag::CutByMask => "cut by a mask".to_owned(),
            Flag::UnderResolved => "under-resolved".to_owned(),
            Flag::MergedWithNeighbour => "merged with a neighbour".to_owned(),
            Flag::ReplacedInside { replaced, of } => {
                format!("{replaced} of {of} vectors inside replaced")
            }
            Flag::NoCirculationMaximum => "no circulation maximum".to_owned(),
        }
    }

    /// True when the flag casts doubt on what this method says. A missing circulation maximum
    /// leaves the vorticity fraction untouched; the others concern both.
    pub fn concerns(self, method: Method) -> bool {
        self != Flag::NoCirculationMaximum || method == Method::LargestCirculation
    }
}

/// One eddy of a field; lengths in the field's unit.
#[derive(Clone, Debug)]
pub struct Eddy {
    /// Place in the list, 0 for the eddy of largest |circulation|.
    pub index: usize,
    /// x of the centre: the maximum of |vorticity|.
    pub x: Measured,
    /// y of the centre.
    pub y: Measured,
    /// Sense of rotation.
    pub sense: Sense,
    /// Vorticity at the centre, with its sign.
    pub peak_vorticity: Measured,
    /// Circulation inside `outline`, with its sign: for Lamb-Oseen 1 - fraction of the whole.
    pub circulation: Measured,
    /// Diameter by [`Method::VorticityFraction`].
    pub diameter: Measured,
    /// What to beware of.
    pub flags: Vec<Flag>,
    /// The boundary by [`Method::VorticityFraction`]: corners (x, y), counter-clockwise.
    pub outline: Vec<[f64; 2]>,
    pub(super) curve: CirculationCurve,
    pub(super) largest: Result<Circle, NoAnswer>,
}

impl Eddy {
    /// The diameter by the given method.
    ///
    /// # Errors
    /// [`NoAnswer`] where the method has none.
    pub fn diameter_by(&self, method: Method) -> Result<Measured, NoAnswer> {
        match method {
            Method::VorticityFraction => Ok(self.diameter.clone()),
            Method::LargestCirculation => {
                let diameter = 2.0 * self.largest?.radius;
                Ok(Measured::without_uncertainty(
                    diameter,
                    self.diameter.unit(),
                ))
            }
        }
    }

    /// The circulation inside the boundary of the given method, with its sign.
    ///
    /// # Errors
    /// [`NoAnswer`] where the method has none.
    pub fn circulation_by(&self, method: Method) -> Result<Measured, NoAnswer> {
        match method {
            Method::VorticityFraction => Ok(self.circulation.clone()),
            Method::LargestCirculation => Ok(Measured::without_uncertainty(
                self.largest?.circulation,
                self.circulation.unit(),
            )),
        }
    }

    /// The boundary of the given method: corners (x, y), counter-clockwise.
    ///
    /// # Errors
    /// [`NoAnswer`] where the method has none.
    pub fn outline_by(&self, method: Method) -> Result<Vec<[f64; 2]>, NoAnswer> {
        match method {
            Method::VorticityFraction => Ok(self.outline.clone()),
            Method::LargestCirculation => {
                let r = self.largest?.radius;
                let corner = |k: u32| {
                    let (sin, cos) = (f64::from(k) * std::f64::consts::TAU / 120.0).sin_cos();
                    [self.x.value() + r * cos, self.y.value() + r * sin]
                };
                Ok((0..120).map(corner).collect())
            }
        }
    }

    /// Circulation against radius of the circle round the centre.
    pub fn circulation_curve(&self) -> &CirculationCurve {
        &self.curve
    }

    /// The flags that cast doubt on what this method says.
    pub fn flags_of(&self, method: Method) -> impl Iterator<Item = Flag> {
        let flags = self.flags.iter().copied();
        flags.filter(move |flag| flag.concerns(method))
    }
}

impl fmt::Display for Eddy {
    /// One line: sense, place, diameter, circulation, flags.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "{} eddy at ({}, {}) {}: diameter {}, circulation {}",
            self.sense.text(),
            plain_number(self.x.value(), 4),
            plain_number(self.y.value(), 4),
            self.x.unit(),
            self.diameter,
            self.circulation
        )?;
        for (k, flag) in self.flags.iter().enumerate() {
            write!(f, "{}{}", if k == 0 { "; " } else { ", " }, flag.text())?;
        }
        Ok(())
    }
}
