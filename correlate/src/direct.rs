//! The reference: circular correlation as its defining sum, in double precision, one pair at a time.

/// R(m, n) = sum over (i, j) of first(i, j) second(i + m, j + n), indices circular.
///
/// Both windows and the result have shape (height, width), rows one after the other. Slow and
/// obvious; the fast kernel is checked against it.
pub fn correlate_directly(first: &[f64], second: &[f64], height: usize, width: usize) -> Vec<f64> {
    let mut plane = vec![0.0; height * width];
    for m in 0..height {
        for n in 0..width {
            let mut sum = 0.0;
            for i in 0..height {
                for j in 0..width {
                    let there = ((i + m) % height) * width + (j + n) % width;
                    sum += first[i * width + j] * second[there];
                }
            }
            plane[m * width + n] = sum;
        }
    }
    plane
}

/// The window with its weighted mean removed and the weights applied: w (x - sum w x / sum w), or
/// zeros where nothing weighs.
pub fn centred(window: &[f64], weights: &[f64]) -> Vec<f64> {
    let total: f64 = weights.iter().sum();
    let sum: f64 = window.iter().zip(weights).map(|(x, w)| w * x).sum();
    let mean = if total > 0.0 { sum / total } else { 0.0 };
    window
        .iter()
        .zip(weights)
        .map(|(x, w)| w * (x - mean))
        .collect()
}
