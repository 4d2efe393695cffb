//! Stand-in.
use rustfft::{Fft, FftPlanner, num_complex::Complex32};
use std::sync::Arc;
pub(crate) struct Correlator {
    height: usize,
    width: usize,
    f: [Arc<dyn Fft<f32>>; 4],
}
pub(crate) struct Scratch;
pub(crate) const BATCH: usize = 8;
impl Correlator {
    pub fn new(height: usize, width: usize) -> Self {
        let mut p = FftPlanner::new();
        Self {
            height,
            width,
            f: [
                p.plan_fft_forward(width),
                p.plan_fft_forward(height),
                p.plan_fft_inverse(width),
                p.plan_fft_inverse(height),
            ],
        }
    }
    pub fn scratch(&self) -> Scratch {
        Scratch
    }
    fn fft2(&self, a: &mut Vec<Complex32>, inv: bool) {
        let (h, w) = (self.height, self.width);
        let k = if inv { 2 } else { 0 };
        self.f[k].process(a);
        let mut t: Vec<Complex32> = (0..h * w).map(|i| a[(i % h) * w + i / h]).collect();
        self.f[k + 1].process(&mut t);
        for i in 0..h * w {
            a[(i % h) * w + i / h] = t[i];
        }
    }
    pub fn correlate(&self, a: &[f32], b: &[f32], planes: &mut [f32], _s: &mut Scratch) {
        let n = self.height * self.width;
        for l in 0..BATCH {
            let get = |s: &[f32]| -> Vec<Complex32> {
                (0..n)
                    .map(|i| Complex32::new(s[i * BATCH + l], 0.0))
                    .collect()
            };
            let (mut fa, mut fb) = (get(a), get(b));
            self.fft2(&mut fa, false);
            self.fft2(&mut fb, false);
            for (a, b) in fa.iter_mut().zip(&fb) {
                *a = a.conj() * b;
            }
            self.fft2(&mut fa, true);
            for i in 0..n {
                planes[i * BATCH + l] = fa[i].re / n as f32;
            }
        }
    }
}
