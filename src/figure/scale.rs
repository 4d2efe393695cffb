//! Colour scales: from a fraction to a colour.
//!
//! Both scales are straight lines in CIELAB lightness, so equal steps of the value are equal steps
//! from light to dark, in print and to colour-blind readers alike. The path through a* and b* is a
//! Catmull-Rom spline through knots evenly spaced along the scale; the knots were chosen by hand
//! for their hues and then moved slightly so that neighbouring steps are equally far apart in
//! CAM02-UCS.

use super::colour::Colour;

/// The colour scales there are.
#[derive(Clone, Copy, Debug, PartialEq, Eq, serde::Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum ColourScale {
    /// For a magnitude: pale sand through reed green to deep water, light to dark.
    Silt,
    /// For a signed value: violet-blue (negative) through neutral to brick and wine (positive),
    /// of equal lightness at equal distance from the middle.
    EbbFlood,
}

type Knots = [[f64; 2]; 7];

const SILT: Knots = [
    [-1.0, 6.7],
    [-7.9, 28.3],
    [-24.0, 29.0],
    [-29.9, 13.9],
    [-25.9, -1.4],
    [-13.5, -13.8],
    [4.4, -19.8],
];
const EBB: Knots = [
    [0.0, 1.4],
    [-4.8, -6.1],
    [-8.5, -16.6],
    [-7.7, -29.5],
    [-0.1, -43.6],
    [15.5, -47.8],
    [18.8, -36.7],
];
const FLOOD: Knots = [
    [0.0, 1.4],
    [1.6, 16.5],
    [9.5, 32.5],
    [23.2, 42.0],
    [34.8, 39.5],
    [38.9, 28.6],
    [37.4, 15.5],
];

/// The point a fraction `t` (0 to 1) along the spline through `knots`.
fn along(knots: &Knots, t: f64) -> [f64; 2] {
    let last = knots.len() - 1;
    let s = t * last as f64;
    let i = (s as usize).min(last - 1);
    let f = s - i as f64;
    std::array::from_fn(|k| {
        let (p1, p2) = (knots[i][k], knots[i + 1][k]);
        let p0 = if i == 0 {
            2.0 * p1 - p2
        } else {
            knots[i - 1][k]
        };
        let p3 = if i + 2 > last {
            2.0 * p2 - p1
        } else {
            knots[i + 2][k]
        };
        0.5 * (2.0 * p1
            + (p2 - p0) * f
            + (2.0 * p0 - 5.0 * p1 + 4.0 * p2 - p3) * f * f
            + (3.0 * p1 - p0 - 3.0 * p2 + p3) * f * f * f)
    })
}

impl ColourScale {
    /// The word used in options.
    pub fn text(self) -> &'static str {
        match self {
            ColourScale::Silt => "silt",
            ColourScale::EbbFlood => "ebb_flood",
        }
    }

    /// Reads what [`ColourScale::text`] writes.
    pub fn parse(text: &str) -> Option<Self> {
        [ColourScale::Silt, ColourScale::EbbFlood]
            .into_iter()
            .find(|s| s.text() == text)
    }

    /// True for a scale with a neutral middle.
    pub fn is_diverging(self) -> bool {
        self == ColourScale::EbbFlood
    }

    /// CIELAB (L*, a*, b*) at `fraction`, which is clamped to 0 to 1; NaN counts as 0.
    pub fn lab(self, fraction: f64) -> [f64; 3] {
        let t = if fraction > 0.0 {
            fraction.min(1.0)
        } else {
            0.0
        };
        let (lightness, [a, b]) = match self {
            ColourScale::Silt => (96.0 - 82.0 * t, along(&SILT, t)),
            ColourScale::EbbFlood => {
                let arm = (2.0 * t - 1.0).abs();
                let knots = if t < 0.5 { &EBB } else { &FLOOD };
                (96.0 - 70.0 * arm, along(knots, arm))
            }
        };
        [lightness, a, b]
    }

    /// The colour at `fraction`, which is clamped to 0 to 1; NaN counts as 0.
    pub fn at(self, fraction: f64) -> Colour {
        Colour::from_lab(self.lab(fraction))
    }
}

#[cfg(test)]
#[path = "scale_tests.rs"]
mod tests;
