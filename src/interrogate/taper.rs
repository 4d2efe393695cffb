//! How much each pixel of a window counts.

/// Weights along one side of a window of `side` px, and what they leave of a shifted pattern.
///
/// A pixel at distance t (in half sides) from the middle counts 1 - t² in the correlation sum,
/// so each exposure is multiplied by the root of that. Against an even window this costs 20 % in
/// random error and gives a response to waves that stays positive down to 0.70 of the window's
/// side instead of turning negative at its full length, so that the iteration converges fast and
/// resolves waves of 1.5 sides.
#[derive(Clone, Debug)]
pub(crate) struct Taper {
    /// Weight of each pixel of one exposure.
    pub weights: Vec<f32>,
    /// Share of the weighted pattern left at offset m: sum w(i) w(i + m) / sum w(i)².
    left: Vec<f32>,
}

impl Taper {
    pub fn new(side: usize) -> Self {
        let n = side as f64;
        let weights: Vec<f64> = (0..side)
            .map(|i| {
                let t = (2.0 * i as f64 - n + 1.0) / n;
                (1.0 - t * t).sqrt()
            })
            .collect();
        let sum = |m: usize| -> f64 { weights.iter().zip(&weights[m..]).map(|(a, b)| a * b).sum() };
        let whole = sum(0);
        Self {
            left: (0..side).map(|m| (sum(m) / whole) as f32).collect(),
            weights: weights.iter().map(|w| *w as f32).collect(),
        }
    }

    /// Answer of a window to a wave of displacement of `cycles_per_px`.
    pub fn response(&self, cycles_per_px: f64) -> f64 {
        let middle = (self.weights.len() as f64 - 1.0) / 2.0;
        let (mut sum, mut whole) = (0.0, 0.0);
        for (i, w) in self.weights.iter().enumerate() {
            let g = f64::from(*w).powi(2);
            sum += g * (std::f64::consts::TAU * cycles_per_px * (i as f64 - middle)).cos();
            whole += g;
        }
        sum / whole
    }

    /// What is left of a pattern moved by `offset` px; never below a twentieth, so that noise far
    /// out is not blown up.
    pub fn left(&self, offset: i32) -> f32 {
        let m = offset.unsigned_abs() as usize;
        self.left.get(m).copied().unwrap_or(0.0).max(0.05)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_taper_is_even_positive_and_largest_in_the_middle() {
        for side in [4, 8, 24, 32, 64] {
            let taper = Taper::new(side);
            let w = &taper.weights;
            for i in 0..side / 2 {
                assert!((w[i] - w[side - 1 - i]).abs() < 1e-6 && w[i] > 0.0);
                assert!(w[i] <= w[side / 2]);
            }
            assert_eq!(taper.left(0), 1.0);
            assert!(taper.left(-1) < 1.0 && taper.left(side as i32) == 0.05);
        }
    }
}
