//! Difference schemes: which nodes a first derivative is made of, and with which weights.

/// A scheme for the first derivatives of a field on a regular grid.
///
/// With independent errors e of the nodes and spacing d, the noise of one derivative is
/// [`Scheme::noise_factor`] times e/d; truncation grows with [`Scheme::reach`]. Neither the
/// quietest nor the sharpest is best everywhere: noisy fields of large eddies want reach, clean
/// fields of small ones want order.
///
/// Beside the edge and beside masked cells, where a scheme's own nodes are missing, the first of
/// these that finds its nodes takes over: the scheme's stencil along the line alone, central
/// (second order), one-sided over three nodes (second order), one-sided over two (first order).
/// A cell without a value, or with no neighbour along the line, has no derivative (NaN).
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, serde::Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Scheme {
    /// f1 - f0. First order; the value belongs half a cell ahead. Kept as a reference.
    Forward,
    /// (f1 - f-1) / 2. Second order.
    Central,
    /// (f-2 - 8 f-1 + 8 f1 - f2) / 12: two central differences extrapolated to spacing zero
    /// (Richardson). Fourth order.
    Richardson,
    /// (-2 f-2 - f-1 + f1 + 2 f2) / 10: slope of the straight line fitted to five nodes.
    /// Second order with 3.4 times the truncation of [`Scheme::Central`].
    LeastSquares,
    /// Central, averaged across with weights 1, 2, 1. Vorticity is then exactly the circulation
    /// round the eight neighbours by the trapezoidal rule over the area 4 d², divergence the
    /// flux through them. Second order.
    EightNeighbours,
    /// Slope at the centre of the polynomial, cubic along and quadratic across, fitted by least
    /// squares to 5 x 5 nodes (Savitzky & Golay 1964, in two directions): Richardson along,
    /// (-3, 12, 17, 12, -3) / 35 across. Fourth order with less noise than central.
    CubicFit,
}

/// Offsets in nodes with their weights.
pub(super) type Taps = &'static [(isize, f64)];

const FORWARD: Taps = &[(0, -1.0), (1, 1.0)];
const CENTRAL: Taps = &[(-1, -0.5), (1, 0.5)];
const RICHARDSON: Taps = &[
    (-2, 1.0 / 12.0),
    (-1, -8.0 / 12.0),
    (1, 8.0 / 12.0),
    (2, -1.0 / 12.0),
];
const LEAST_SQUARES: Taps = &[(-2, -0.2), (-1, -0.1), (1, 0.1), (2, 0.2)];
const AHEAD_OVER_THREE: Taps = &[(0, -1.5), (1, 2.0), (2, -0.5)];
const BEHIND_OVER_THREE: Taps = &[(-2, 0.5), (-1, -2.0), (0, 1.5)];
const BEHIND: Taps = &[(-1, -1.0), (0, 1.0)];

/// What stands in, best first, where a scheme's own nodes are missing.
pub(super) const STAND_INS: [Taps; 5] = [
    CENTRAL,
    AHEAD_OVER_THREE,
    BEHIND_OVER_THREE,
    FORWARD,
    BEHIND,
];

const ALONE: Taps = &[(0, 1.0)];
const ONE_TWO_ONE: Taps = &[(-1, 0.25), (0, 0.5), (1, 0.25)];
const QUADRATIC_FIT: Taps = &[
    (-2, -3.0 / 35.0),
    (-1, 12.0 / 35.0),
    (0, 17.0 / 35.0),
    (1, 12.0 / 35.0),
    (2, -3.0 / 35.0),
];

impl Scheme {
    /// Every scheme.
    pub const ALL: [Scheme; 6] = [
        Scheme::Forward,
        Scheme::Central,
        Scheme::Richardson,
        Scheme::LeastSquares,
        Scheme::EightNeighbours,
        Scheme::CubicFit,
    ];

    /// The word used in the language and in records.
    pub fn text(self) -> &'static str {
        match self {
            Scheme::Forward => "forward",
            Scheme::Central => "central",
            Scheme::Richardson => "richardson",
            Scheme::LeastSquares => "least_squares",
            Scheme::EightNeighbours => "eight_neighbours",
            Scheme::CubicFit => "cubic_fit",
        }
    }

    /// Reads what [`Scheme::text`] writes.
    pub fn parse(text: &str) -> Option<Scheme> {
        Scheme::ALL.into_iter().find(|s| s.text() == text)
    }

    /// Weights of the derivative along its line, at unit spacing.
    pub(super) fn along(self) -> Taps {
        match self {
            Scheme::Forward => FORWARD,
            Scheme::Central | Scheme::EightNeighbours => CENTRAL,
            Scheme::Richardson | Scheme::CubicFit => RICHARDSON,
            Scheme::LeastSquares => LEAST_SQUARES,
        }
    }

    /// Weights of the average across that line.
    pub(super) fn across(self) -> Taps {
        match self {
            Scheme::EightNeighbours => ONE_TWO_ONE,
            Scheme::CubicFit => QUADRATIC_FIT,
            _ => ALONE,
        }
    }

    /// Order of accuracy away from edges and masked cells.
    pub fn order(self) -> u8 {
        match self {
            Scheme::Forward => 1,
            Scheme::Central | Scheme::LeastSquares | Scheme::EightNeighbours => 2,
            Scheme::Richardson | Scheme::CubicFit => 4,
        }
    }

    /// Nodes the stencil reaches out from its centre.
    pub fn reach(self) -> usize {
        let far = |taps: Taps| taps.iter().map(|(k, _)| k.unsigned_abs()).max();
        far(self.along()).max(far(self.across())).unwrap_or(0)
    }

    /// Standard deviation of one derivative for independent errors of standard deviation 1 at
    /// unit spacing: the root of the sum of the squared weights.
    pub fn noise_factor(self) -> f64 {
        let power = |taps: Taps| taps.iter().map(|(_, w)| w * w).sum::<f64>();
        (power(self.along()) * power(self.across())).sqrt()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_are_read_back() {
        for scheme in Scheme::ALL {
            assert_eq!(Scheme::parse(scheme.text()), Some(scheme));
            let quoted = format!("\"{}\"", scheme.text());
            assert_eq!(serde_json::from_str::<Scheme>(&quoted).unwrap(), scheme);
        }
        assert_eq!(Scheme::parse("upwind"), None);
    }
}
