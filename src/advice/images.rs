//! The exposures of one pair, loaded and with their background taken out.

use std::sync::Arc;

use ndarray::Array2;

use super::AdviceError;
use super::blob::Blob;
use super::diameter::{Width, width};
use super::pattern::{Pattern, Sums};
use super::seeding::{Seeding, seeding};
use crate::field::VectorField;
use crate::frames::{Frame, Pair, Scale};
use crate::interrogate::{InterrogateError, Plan, interrogate_images};
use crate::task::Task;

/// Least side of an exposure, px.
const LEAST_SIDE: usize = 64;

/// What one pair has in its two exposures.
pub(super) struct Images {
    pub frames: [Arc<Frame>; 2],
    /// Hidden pixels of each.
    pub hidden: [Option<Array2<bool>>; 2],
    pub patterns: [Pattern; 2],
    pub label: String,
    pub index: usize,
}

/// What the particle images of a pair are like.
#[derive(Clone, Copy, Debug)]
pub(super) struct Particles {
    pub width: Width,
    pub seeding: Seeding,
    /// Grey levels that the levelled value 1 stands for, on average and for noise.
    pub contrast: (f64, f64),
}

impl Particles {
    /// Standard deviation of what differs from pixel to pixel, grey levels.
    pub fn noise(&self) -> f64 {
        (1.0 - self.width.signal).max(0.0).sqrt() * self.contrast.1
    }

    /// Centre of the brightest particle images above what is behind them, grey levels.
    pub fn peak(&self) -> f64 {
        self.seeding.peak * self.contrast.0
    }

    /// Mean grey level that particle images make.
    pub fn light(&self) -> f64 {
        let one = self.peak() * self.seeding.mean_brightness;
        self.seeding.per_px2 * one * Blob::new(self.width.mean()).area()
    }
}

impl Images {
    pub fn load(pair: &Pair, task: &Task) -> Result<Images, AdviceError> {
        let (width, height) = pair.size();
        if width.min(height) < LEAST_SIDE {
            return Err(AdviceError::TooSmall {
                label: pair.label().to_owned(),
                width,
                height,
            });
        }
        task.check()?;
        let (first, second) = pair.load()?;
        let hidden = pair.hidden(&first, &second)?;
        let of = |frame: &Frame, hidden: &Option<Array2<bool>>| {
            Pattern::of(&frame.pixels, hidden.as_ref())
        };
        let one = of(&first, &hidden[0]);
        task.check()?;
        let two = of(&second, &hidden[1]);
        Ok(Images {
            patterns: [one, two],
            frames: [first, second],
            hidden,
            label: pair.label().to_owned(),
            index: pair.index(),
        })
    }

    /// Width and height, px.
    pub fn size(&self) -> (usize, usize) {
        (self.frames[0].width(), self.frames[0].height())
    }

    /// Sums over both exposures, quarter by quarter of the image.
    pub fn quarters(&self, task: &Task) -> Result<[Sums; 4], AdviceError> {
        let (width, height) = self.size();
        let mut quarters: [Sums; 4] = Default::default();
        for (k, sums) in quarters.iter_mut().enumerate() {
            task.check()?;
            let half = |second: bool, n: usize| if second { n / 2..n } else { 0..n / 2 };
            let (rows, columns) = (half(k >= 2, height), half(k % 2 == 1, width));
            let [one, two] = &self.patterns;
            *sums = one.sums(rows.clone(), columns.clone());
            *sums = std::mem::take(sums).plus(two.sums(rows, columns));
        }
        Ok(quarters)
    }

    /// The vector field in px and frames.
    pub fn interrogate(&self, plan: &Plan, task: &Task) -> Result<VectorField, InterrogateError> {
        let [first, second] = &self.frames;
        let [a, b] = &self.hidden;
        interrogate_images(
            &first.pixels,
            &second.pixels,
            [a.as_ref(), b.as_ref()],
            plan,
            &Scale::default(),
            &self.label,
            task,
        )
    }
}

/// What the particle images are like by these sums; `None` where none are seen.
pub(super) fn particles(sums: &Sums) -> Option<Particles> {
    let width = width(sums)?;
    Some(Particles {
        width,
        seeding: seeding(sums, &width),
        contrast: sums.contrast(),
    })
}
