//! Mean grey level and energy of each window of a batch.

use multiversion::multiversion;

use super::lanes::{LANES, Lanes, Phasor};
use super::spectrum::lanes_at;
use super::windows::Windows;

/// What a correlation has to be judged against, by lane.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Moments {
    /// Weighted mean grey level of the first windows.
    pub first_mean: [f32; LANES],
    /// Weighted mean grey level of the second windows.
    pub second_mean: [f32; LANES],
    /// Sum of squares of the first windows after mean removal and weighting; 0 where it is no more
    /// than rounding can make of a window without contrast.
    pub first_energy: [f32; LANES],
    /// The same of the second windows.
    pub second_energy: [f32; LANES],
}

impl Moments {
    /// From means and energies (first, second) of windows of `pixels` px.
    pub(super) fn new(means: &Phasor, energies: &Phasor, pixels: usize) -> Moments {
        // A mean is rounded to about 1e-7 of itself, and so is each difference from it.
        let contrast = |energy: f32, mean: f32| {
            let rounding = 1e-6 * mean;
            if energy > pixels as f32 * rounding * rounding {
                energy
            } else {
                0.0
            }
        };
        Moments {
            first_mean: means.re,
            second_mean: means.im,
            first_energy: std::array::from_fn(|l| contrast(energies.re[l], means.re[l])),
            second_energy: std::array::from_fn(|l| contrast(energies.im[l], means.im[l])),
        }
    }

    /// The factor that turns a plane of window `lane` into correlation coefficients:
    /// 1 / sqrt(first energy x second energy), or 0 where a window has no contrast.
    pub fn normalization(&self, lane: usize) -> f32 {
        let energies = f64::from(self.first_energy[lane]) * f64::from(self.second_energy[lane]);
        if energies > 0.0 {
            (1.0 / energies.sqrt()) as f32
        } else {
            0.0
        }
    }
}

/// Columns summed at a time, each in a chain of its own.
const CHAINS: usize = 4;

/// Weighted means (first, second) of windows of `height` x `width`; 0 where nothing is lit.
pub(super) fn means(windows: &Windows, (height, width): (usize, usize), weights: &[f32]) -> Phasor {
    if weights.is_empty() && windows.lit.is_none() {
        plain_means(windows, height, width)
    } else {
        weighted_means(windows, height, width, weights)
    }
}

#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
fn plain_means(windows: &Windows, height: usize, width: usize) -> Phasor {
    let columns = &windows.layout.columns[..width];
    let mut sum = Phasor::ZERO;
    for r in 0..height {
        let (first, second) = (
            windows.row(windows.first, r),
            windows.row(windows.second, r),
        );
        let mut row = [Phasor::ZERO; CHAINS];
        let mut fours = columns.chunks_exact(CHAINS);
        for four in &mut fours {
            let mut x = [Phasor::ZERO; CHAINS];
            for k in 0..CHAINS {
                x[k].re = lanes_at(first, four[k]);
                x[k].im = lanes_at(second, four[k]);
            }
            for l in 0..LANES {
                for k in 0..CHAINS {
                    row[k].re[l] += x[k].re[l];
                    row[k].im[l] += x[k].im[l];
                }
            }
        }
        for &column in fours.remainder() {
            let (a, b) = (lanes_at(first, column), lanes_at(second, column));
            for l in 0..LANES {
                row[0].re[l] += a[l];
                row[0].im[l] += b[l];
            }
        }
        for l in 0..LANES {
            sum.re[l] += (row[0].re[l] + row[1].re[l]) + (row[2].re[l] + row[3].re[l]);
            sum.im[l] += (row[0].im[l] + row[1].im[l]) + (row[2].im[l] + row[3].im[l]);
        }
    }
    let share = 1.0 / (height * width) as f32;
    for l in 0..LANES {
        sum.re[l] *= share;
        sum.im[l] *= share;
    }
    sum
}

#[multiversion(targets(
    "x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma",
    "x86_64+avx2+fma"
))]
fn weighted_means(windows: &Windows, height: usize, width: usize, weights: &[f32]) -> Phasor {
    let columns = &windows.layout.columns[..width];
    let mut sum = Phasor::ZERO;
    let mut total: Lanes = [0.0; LANES];
    for r in 0..height {
        let (first, second) = (
            windows.row(windows.first, r),
            windows.row(windows.second, r),
        );
        let lit = windows.lit.map(|lit| windows.row(lit, r));
        let mut row = Phasor::ZERO;
        let mut row_total: Lanes = [0.0; LANES];
        for (c, &column) in columns.iter().enumerate() {
            let weight = weights.get(r * width + c).copied().unwrap_or(1.0);
            let (a, b) = (lanes_at(first, column), lanes_at(second, column));
            let lit = lit.map_or([1.0; LANES], |lit| lanes_at(lit, column));
            for l in 0..LANES {
                let w = weight * lit[l];
                row_total[l] += w;
                row.re[l] += w * a[l];
                row.im[l] += w * b[l];
            }
        }
        for l in 0..LANES {
            total[l] += row_total[l];
            sum.re[l] += row.re[l];
            sum.im[l] += row.im[l];
        }
    }
    for l in 0..LANES {
        let share = if total[l] > 0.0 { 1.0 / total[l] } else { 0.0 };
        sum.re[l] *= share;
        sum.im[l] *= share;
    }
    sum
}
