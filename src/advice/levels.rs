//! What grey levels say by themselves: saturation, the range that is used, the share that is lit.

use super::images::Images;

/// A part of the image counts as lit where the pattern has this share of the contrast that its
/// best-lit tenth has.
const LIT: f64 = 0.25;

/// Grey levels of both exposures of a pair.
#[derive(Clone, Copy, Debug)]
pub(super) struct Levels {
    /// Share of the pixels at full scale, or at a lower level at which they pile up.
    pub saturated: f64,
    /// Patches of such pixels a px².
    pub saturated_patches: f64,
    /// Mean grey level.
    pub mean: f64,
    /// Grey level below which 99.9 % of the pixels are.
    pub high: f64,
    /// Grey level of full scale.
    pub full: f64,
    /// Share of the pixels round which there is a pattern to see.
    pub lit: f64,
}

/// Looks at the pixels that are not hidden; `noise` is the share of the variance about the mean
/// that is noise where the light is.
pub(super) fn levels(images: &Images, noise_grey: f64) -> Levels {
    let full = f64::from((1u32 << images.frames[0].bits) - 1);
    let mut counts = vec![0usize; 1 << 16];
    let mut sum = 0.0;
    for (frame, hidden) in images.frames.iter().zip(&images.hidden) {
        for (at, level) in frame.pixels.indexed_iter() {
            if !hidden.as_ref().is_some_and(|hidden| hidden[at]) {
                counts[level.clamp(0.0, 65535.0) as usize] += 1;
                sum += f64::from(*level);
            }
        }
    }
    let all = counts.iter().sum::<usize>().max(1) as f64;
    let limit = limit(&counts, full);
    let mut patches = 0.0;
    for (frame, hidden) in images.frames.iter().zip(&images.hidden) {
        let is = |row: usize, column: usize| {
            f64::from(frame.pixels[(row, column)]) >= limit
                && !hidden.as_ref().is_some_and(|h| h[(row, column)])
        };
        for (row, column) in ndarray::indices(frame.pixels.dim()) {
            // The first pixel of a patch has none above or left of it.
            let above = row > 0 && is(row - 1, column);
            let left = column > 0 && is(row, column - 1);
            patches += f64::from(u8::from(is(row, column) && !above && !left));
        }
    }
    let beyond = |limit: f64| {
        let from = (limit.ceil() as usize).min(counts.len());
        counts[from..].iter().sum::<usize>() as f64
    };
    let mut left = 0.001 * all;
    let high = counts.iter().rposition(|n| {
        left -= *n as f64;
        left < 0.0
    });
    Levels {
        saturated: beyond(limit) / all,
        saturated_patches: patches / all,
        mean: sum / all,
        high: high.unwrap_or(0) as f64,
        full,
        lit: lit(images, noise_grey),
    }
}

/// The level from which pixels count as saturated: full scale, or the highest there is when more
/// than ten pixels, and more than in the whole hundredth below, share it.
fn limit(counts: &[usize], full: f64) -> f64 {
    let Some(top) = counts.iter().rposition(|n| *n > 0) else {
        return full;
    };
    let below = counts[top - top / 100..top].iter().sum::<usize>();
    if top > 0 && counts[top] > 10 && counts[top] > below && top / 100 > 1 {
        (top as f64).min(full)
    } else {
        full
    }
}

fn lit(images: &Images, noise_grey: f64) -> f64 {
    const APART: usize = 8;
    let mut squares = Vec::new();
    let mut all = 0.0;
    for pattern in &images.patterns {
        for (at, contrast) in pattern.contrast.indexed_iter() {
            let hidden = pattern.hidden.as_ref().is_some_and(|hidden| hidden[at]);
            if at.0 % APART == 0 && at.1 % APART == 0 && !hidden {
                all += 1.0;
                squares.push(f64::from(*contrast).powi(2) - noise_grey * noise_grey);
            }
        }
    }
    squares.sort_by(f64::total_cmp);
    let Some(best) = squares.get(squares.len() * 9 / 10) else {
        return 0.0;
    };
    let dark = squares.partition_point(|square| *square <= LIT * LIT * best);
    (squares.len() - dark) as f64 / f64::max(all, 1.0)
}
