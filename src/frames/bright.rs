//! The rule that hides what is too bright and too large to be particle images: reflections, walls
//! in the light, bodies.

use ndarray::Array2;
use serde::{Deserialize, Serialize};

use super::{Frame, FrameError};

/// Which bright patches of an exposure are hidden.
///
/// Pixels brighter than `above` that touch side by side make a patch. A patch smaller than
/// `least_area_px2` is taken for particle images and stays. The others are hidden with every pixel
/// whose centre lies within `grow_px` of one of theirs.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct BrightOptions {
    /// Grey level that a hidden pixel passes, 0 to 65535.
    pub above: f64,
    /// How far past the bright pixels is hidden, px, 0 to 100; 3 by default: the light round a
    /// reflection fades over some px.
    #[serde(default = "three")]
    pub grow_px: f64,
    /// Area of the smallest patch that is hidden, px²; 100 by default, some ten particle images.
    #[serde(default = "hundred")]
    pub least_area_px2: f64,
}

fn three() -> f64 {
    3.0
}

fn hundred() -> f64 {
    100.0
}

impl BrightOptions {
    /// # Errors
    /// An option out of its range.
    pub(super) fn check(&self) -> Result<(), FrameError> {
        for (name, value, most) in [
            ("above", self.above, 65535.0),
            ("grow_px", self.grow_px, 100.0),
            ("least_area_px2", self.least_area_px2, 1e9),
        ] {
            if !(0.0..=most).contains(&value) {
                return Err(FrameError::Mask(format!(
                    "{name} is {value}: it must be 0 to {most}"
                )));
            }
        }
        Ok(())
    }

    /// Hides the bright patches of `frame`.
    pub(super) fn cover(&self, frame: &Frame, hidden: &mut Array2<bool>) {
        let mut bright = Array2::from_shape_fn(frame.pixels.dim(), |at| {
            f64::from(frame.pixels[at]) > self.above
        });
        drop_specks(&mut bright, self.least_area_px2);
        add_grown(&bright, self.grow_px, hidden);
    }
}

/// Clears the patches of fewer pixels than `least`; pixels of a patch touch side by side.
fn drop_specks(bright: &mut Array2<bool>, least: f64) {
    let (height, width) = bright.dim();
    let mut new = bright.clone();
    let mut patch: Vec<(usize, usize)> = Vec::new();
    for row in 0..height {
        for column in 0..width {
            if !std::mem::take(&mut new[(row, column)]) {
                continue;
            }
            patch.clear();
            patch.push((row, column));
            let mut next = 0;
            while let Some(&(r, c)) = patch.get(next) {
                next += 1;
                // Beyond the edge there is no such pixel.
                let beside = [
                    (r.wrapping_sub(1), c),
                    (r + 1, c),
                    (r, c.wrapping_sub(1)),
                    (r, c + 1),
                ];
                for at in beside {
                    if new.get_mut(at).is_some_and(std::mem::take) {
                        patch.push(at);
                    }
                }
            }
            if (patch.len() as f64) < least {
                for at in &patch {
                    bright[*at] = false;
                }
            }
        }
    }
}

/// Hides every pixel whose centre lies within `radius` of the centre of a pixel of `bright`.
///
/// A stretch of pixels in one row hides in the row `dy` away the stretch that is longer at both
/// ends by the half chord of the circle there; the beginnings and ends of stretches are counted,
/// so that the work does not grow with their length.
fn add_grown(bright: &Array2<bool>, radius: f64, hidden: &mut Array2<bool>) {
    let (height, width) = bright.dim();
    let reach = radius.floor() as usize;
    let half_chord = |dy: usize| (radius * radius - (dy * dy) as f64).max(0.0).sqrt() as usize;
    let chords: Vec<usize> = (0..=reach).map(half_chord).collect();
    let mut steps = Array2::<i32>::zeros((height, width + 1));
    for (row, pixels) in bright.rows().into_iter().enumerate() {
        let mut column = 0;
        while column < width {
            if !pixels[column] {
                column += 1;
                continue;
            }
            let from = column;
            while column < width && pixels[column] {
                column += 1;
            }
            for to_row in row.saturating_sub(reach)..=(row + reach).min(height - 1) {
                let longer = chords[to_row.abs_diff(row)];
                steps[(to_row, from.saturating_sub(longer))] += 1;
                steps[(to_row, (column + longer).min(width))] -= 1;
            }
        }
    }
    for (steps, mut hidden) in steps.rows().into_iter().zip(hidden.rows_mut()) {
        let mut over = 0;
        for (step, hidden) in steps.iter().zip(&mut hidden) {
            over += step;
            *hidden |= over > 0;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn picture(rows: &[&str]) -> Array2<bool> {
        let (height, width) = (rows.len(), rows[0].len());
        Array2::from_shape_fn((height, width), |(r, c)| rows[r].as_bytes()[c] == b'#')
    }

    #[test]
    fn patches_touch_side_by_side_and_small_ones_go() {
        let mut bright = picture(&["##..#", "#..#.", "....#", ".###.", ".#.#."]);
        drop_specks(&mut bright, 3.0);
        let left = picture(&["##...", "#....", ".....", ".###.", ".#.#."]);
        assert_eq!(bright, left);
        drop_specks(&mut bright, 3.1);
        let left = picture(&[".....", ".....", ".....", ".###.", ".#.#."]);
        assert_eq!(bright, left);
    }

    proptest! {
        #[test]
        fn growing_hides_what_lies_within_the_radius_of_a_bright_pixel(
            (height, width) in (1usize..14, 1usize..14),
            seeds in prop::collection::vec(any::<prop::sample::Index>(), 0..9),
            radius in prop_oneof![0f64..9.0, (0u8..9).prop_map(f64::from)],
        ) {
            let mut bright = Array2::from_elem((height, width), false);
            for seed in seeds {
                let k = seed.index(height * width);
                bright[(k / width, k % width)] = true;
            }
            let mut hidden = Array2::from_elem((height, width), false);
            add_grown(&bright, radius, &mut hidden);
            for ((r, c), is) in hidden.indexed_iter() {
                let near = bright.indexed_iter().any(|((br, bc), b)| {
                    let (dy, dx) = (br.abs_diff(r) as f64, bc.abs_diff(c) as f64);
                    *b && dx * dx + dy * dy <= radius * radius
                });
                prop_assert_eq!(*is, near, "row {}, column {}", r, c);
            }
        }
    }
}
