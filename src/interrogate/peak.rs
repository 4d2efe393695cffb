//! Where a correlation peak stands, to a fraction of a pixel.

/// Offset of the true maximum from the middle of three samples, within -1 to 1.
///
/// The Gaussian three-point fit, d = (ln R- - ln R+) / (2 ln R- - 4 ln R0 + 2 ln R+), exact for a
/// Gaussian peak. Where a sample is not positive the logarithm has no meaning and a parabola
/// through the same three samples is used; where the samples show no peak at all the offset is 0.
pub(crate) fn three_point([before, middle, after]: [f32; 3]) -> f64 {
    let [b, m, a] = [before, middle, after].map(f64::from);
    let fit = |b: f64, m: f64, a: f64| {
        let bend = 2.0 * b - 4.0 * m + 2.0 * a;
        if bend < 0.0 { (b - a) / bend } else { 0.0 }
    };
    let d = if b > 0.0 && m > 0.0 && a > 0.0 {
        fit(b.ln(), m.ln(), a.ln())
    } else {
        fit(b, m, a)
    };
    if d.is_finite() {
        d.clamp(-1.0, 1.0)
    } else {
        0.0
    }
}

/// The 5 x 5 samples of a correlation plane round its highest one, row after row.
pub(crate) type Patch = [[f32; 5]; 5];

/// A peak read from its patch.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Peak {
    /// Offset (along the rows of the patch, across them) of the true maximum from its middle.
    pub offset: (f64, f64),
    /// The middle sample of the smoothed plane.
    pub top: f32,
    /// Mean of the smoothed samples on either side, along the rows and across them.
    pub sides: (f32, f32),
}

impl Peak {
    /// Reads a peak.
    ///
    /// The plane is first smoothed by a kernel of variance 1/4 px² on each axis. What images of
    /// particles hold close to half a cycle a px is folded there by the pixels themselves and
    /// pulls every peak towards whole px; smoothing takes a third off that pull, and nearly a
    /// half where particle images are small, for 8 % more noise.
    pub fn of(patch: &Patch) -> Peak {
        const NEAR: f32 = 0.125;
        let soft = |a: f32, b: f32, c: f32| b + NEAR * (a - 2.0 * b + c);
        let smooth = |r: usize, c: usize| {
            let along = |r: usize| soft(patch[r][c - 1], patch[r][c], patch[r][c + 1]);
            soft(along(r - 1), along(r), along(r + 1))
        };
        let top = smooth(2, 2);
        let (left, right) = (smooth(2, 1), smooth(2, 3));
        let (above, below) = (smooth(1, 2), smooth(3, 2));
        Peak {
            offset: (
                three_point([left, top, right]),
                three_point([above, top, below]),
            ),
            top,
            sides: ((left + right) / 2.0, (above + below) / 2.0),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn a_gaussian_peak_is_found_exactly(d in -0.5f64..0.5, width in 0.6f64..3.0, height in 0.01f64..1e6) {
            let g = |x: f64| (height * (-(x - d).powi(2) / (2.0 * width * width)).exp()) as f32;
            // Single precision samples: their rounding, 6e-8, over the smallest bend, 0.11.
            prop_assert!((three_point([g(-1.0), g(0.0), g(1.0)]) - d).abs() < 2e-6);
        }

        #[test]
        fn any_samples_give_a_finite_offset(b: f32, m: f32, a: f32) {
            let d = three_point([b, m, a]);
            prop_assert!(d.is_finite() && d.abs() <= 1.0);
        }
    }

    #[test]
    fn a_negative_neighbour_falls_back_to_the_parabola() {
        // Samples of 1 - (x - 0.1)²·0.9 at -1, 0, 1, exact for a parabola: -0.089, 0.991, 0.271.
        let d = three_point([-0.089, 0.991, 0.271]);
        assert!((d - 0.1).abs() < 1e-6);
    }
}
