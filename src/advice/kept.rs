//! How much of the particle pattern the two exposures have in common.

use super::images::{Images, Particles};
use super::pattern::Summed;
use crate::field::VectorField;

/// Blocks along each axis whose scatter is the uncertainty.
const BLOCKS: usize = 4;

/// The share of the particle pattern, weighed by brightness, that is in both exposures, and its
/// standard uncertainty.
///
/// The volume of the correlation peak of the exposures over that of each with itself, noise taken
/// out of the latter. The volume, unlike the height, is not lessened by displacement that varies
/// within the window, nor by its fraction of a px. Motion within the image is not counted as loss:
/// the second exposure is looked at where the pattern has gone. With a flat sheet this is the
/// share of the particles that stay in it; in a Gaussian one those near its edges count less.
///
/// `field` is in px and frames. `None` where nothing can be compared.
pub(super) fn kept(
    images: &Images,
    particles: &Particles,
    field: &VectorField,
) -> Option<(f64, f64)> {
    let [first, second] = &images.patterns;
    let reach = particles.width.mean().ceil() as usize + 1;
    let about = [first, second].map(|pattern| Summed::of(&pattern.levelled, None));
    let noise = 1.0 - particles.width.signal;
    let (width, height) = images.size();
    // Of both, of the first, of the second with itself, block by block.
    let mut sums = [[0.0; 3]; BLOCKS * BLOCKS];
    let half = |step: f64| (step / 2.0) as isize;
    let (half_x, half_y) = (half(field.grid.dx), half(field.grid.dy));
    for ((j, i), status) in field.status.indexed_iter() {
        if !status.has_vector() {
            continue;
        }
        let (u, v) = (field.u[(j, i)], -field.v[(j, i)]);
        let (x, y) = (field.grid.x(i), height as f64 - 1.0 - field.grid.y(j));
        let start = ((x - 0.5 * u).round() as isize, (y - 0.5 * v).round() as isize);
        let shift = (u.round() as isize, v.round() as isize);
        let block = |at: f64, n: usize| ((at / n as f64 * BLOCKS as f64) as usize).min(BLOCKS - 1);
        let sums = &mut sums[block(y, height) * BLOCKS + block(x, width)];
        for row in start.1 - half_y..start.1 - half_y + field.grid.dy as isize {
            for column in start.0 - half_x..start.0 - half_x + field.grid.dx as isize {
                let place = |row: isize, column: isize| {
                    let (row, column) = (usize::try_from(row).ok()?, usize::try_from(column).ok()?);
                    (row < height && column < width).then_some((row, column))
                };
                let here = place(row, column);
                let there = place(row + shift.1, column + shift.0);
                let (Some(here), Some(there)) = (here, there) else {
                    continue;
                };
                let (a, b) = (first.levelled[here], second.levelled[there]);
                let (a, b) = (f64::from(a), f64::from(b));
                sums[0] += 0.5 * (a * about[1].about(there, reach).0);
                sums[0] += 0.5 * (b * about[0].about(here, reach).0);
                // Hidden pixels are 0, and have no noise.
                let noisy = |value: f64| if value == 0.0 { 0.0 } else { noise };
                sums[1] += a * about[0].about(here, reach).0 - noisy(a);
                sums[2] += b * about[1].about(there, reach).0 - noisy(b);
            }
        }
    }
    let total = |without: Option<usize>| {
        let left = sums.iter().enumerate().filter(|(k, _)| Some(*k) != without);
        left.fold([0.0; 3], |t, (_, s)| [t[0] + s[0], t[1] + s[1], t[2] + s[2]])
    };
    let share = |[both, one, two]: [f64; 3]| {
        (one > 0.0 && two > 0.0).then(|| both / (one * two).sqrt())
    };
    let whole = share(total(None))?;
    // The jackknife: each block left out in turn.
    let used: Vec<f64> = (0..sums.len())
        .filter(|k| sums[*k] != [0.0; 3])
        .filter_map(|k| share(total(Some(k))))
        .collect();
    let n = used.len() as f64;
    let square = used.iter().map(|s| (s - whole) * (s - whole)).sum::<f64>();
    Some((whole, ((n - 1.0) / n * square).sqrt()))
}
