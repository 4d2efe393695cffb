//! The windows and passes that fit a recording, with the reasons.

use super::AdviceError;
use super::finding::WANTED;
use super::images::{Images, Particles, particles};
use super::look::{Look, SIDES, look, side_holding};
use super::motion::Motion;
use super::pattern::Sums;
use super::trial::Trial;
use crate::frames::Pair;
use crate::quantity::plain_number;
use crate::task::Task;

/// Largest last window that is advised, px.
const LARGEST_LAST: usize = 64;

/// Passes at the last window that trials of its size have, and the fewest and most that are
/// advised.
const PASSES: usize = 5;
const LEAST_PASSES: usize = 2;
const MOST_PASSES: usize = 7;

/// The sides of the passes that fit these pairs, and why, a sentence each.
pub(super) fn choose(
    pairs: &[Pair],
    of: usize,
    task: &Task,
) -> Result<(Vec<usize>, Vec<String>), AdviceError> {
    let images = pairs
        .iter()
        .map(|pair| Images::load(pair, task))
        .collect::<Result<Vec<_>, _>>()?;
    let mut whole = Sums::default();
    for images in &images {
        let quarters = images.quarters(task)?;
        whole = quarters.into_iter().fold(whole, Sums::plus);
    }
    let seen = particles(&whole).ok_or_else(|| AdviceError::NoParticles {
        label: images[0].label.clone(),
    })?;
    let looks = images
        .iter()
        .map(|images| look(images, &seen, task))
        .collect::<Result<Vec<_>, _>>()?;
    let motions: Vec<Motion> = looks.iter().map(|look| look.motion).collect();
    let motion = Motion::with(&motions).unwrap_or(looks[0].motion);
    let kept = looks.iter().map(|look| look.kept).sum::<f64>() / looks.len() as f64;
    let seen_so_far = Seen {
        particles: seen,
        look: Look { motion, kept },
        side: images.iter().map(|i| i.size().0.min(i.size().1)).min().unwrap_or(64),
    };
    let (first, why_first) = seen_so_far.first();
    let tried = |side, passes| {
        Trial::new(&images, seen_so_far.per_px2(), (first, side, passes), task)
    };
    let (mut best, why_last) = seen_so_far.last(&tried, task)?;
    let why_passes = passes(&mut best, &tried, task)?;
    let sides = super::look::stairs(first, best.side, best.passes);
    let pairs = match (images.len(), of) {
        (1, 1) => "on the pair looked at".to_owned(),
        (n, of) => format!("on {n} of {of} pairs looked at"),
    };
    let why_all = format!(
        "{pairs} it measures {} % of the vectors, with noise of {} px",
        plain_number((1000.0 * best.measured).floor() / 10.0, 3),
        plain_number(best.noise(), 2)
    );
    let why_overlap = "overlap 0.75: four vectors on a window's side, so that the passes can follow what a window resolves".to_owned();
    Ok((sides, vec![why_first, why_last, why_passes, why_overlap, why_all]))
}

/// What is known before plans are tried.
struct Seen {
    particles: Particles,
    look: Look,
    /// Shorter side of an image, px.
    side: usize,
}

impl Seen {
    /// Particle images that both exposures have, a px².
    fn per_px2(&self) -> f64 {
        self.particles.seeding.per_px2 * self.look.kept
    }

    /// Particle images that stay in a window of the first pass and move alike in it: what is left
    /// of their number by the way they move, and of the correlation peak by how differently
    /// (N_I F_I F_O of Keane & Adrian 1992; the last factor for a Gaussian peak spread by a
    /// gradient over windows weighted 1 - t², whose standard deviation is side/√20).
    fn useful(&self, side: usize) -> f64 {
        let side = side as f64;
        let stays = (1.0 - self.look.motion.largest / side).max(0.0).powi(2);
        let spread = self.look.motion.gradient * side / 20f64.sqrt();
        // The peak's own variance: twice that of the images.
        let own = self.particles.width.mean().powi(2) / 8.0 + 1.0 / 6.0;
        self.per_px2() * side * side * stays / (1.0 + spread * spread / own)
    }

    fn first(&self) -> (usize, String) {
        let far = self.look.motion.largest;
        let fits = |side: &usize| *side >= 16 && (*side <= self.side / 2 || *side == 16);
        let reaches = |side: &usize| 4.0 * far <= *side as f64;
        let sides: Vec<usize> = SIDES.into_iter().filter(fits).collect();
        let quarter: Vec<usize> = sides.iter().copied().filter(reaches).collect();
        let far_text = plain_number(far, 2);
        let largest = sides.last().copied().unwrap_or(16);
        let Some(&least) = quarter.first() else {
            let why = format!(
                "first window {largest} px: the largest displacement found, {far_text} px, is more than a quarter of it, but it is the largest there is or the image allows"
            );
            return (largest, why);
        };
        let most = |a: &&usize, b: &&usize| self.useful(**a).total_cmp(&self.useful(**b));
        let chosen = quarter
            .iter()
            .find(|side| self.useful(**side) >= WANTED)
            .or(quarter.iter().max_by(most))
            .copied()
            .unwrap_or(least);
        let images = plain_number(self.useful(chosen), 2);
        let mut why = format!(
            "first window {chosen} px: the largest displacement found, {far_text} px, is within a quarter of it"
        );
        why += &match chosen {
            c if self.useful(c) < WANTED => format!(", and {images} particle images stay and move alike in it, the most of all sizes"),
            c if c > least => format!(", and {images} particle images stay and move alike in it, fewer than 8 in a smaller one"),
            _ => format!(", and {images} particle images stay and move alike in it"),
        };
        (chosen, why)
    }

    /// The last window: from the smallest that holds enough particle images upwards while the
    /// next larger one is better.
    fn last(
        &self,
        tried: &dyn Fn(usize, usize) -> Result<Trial, AdviceError>,
        task: &Task,
    ) -> Result<(Trial, String), AdviceError> {
        let most = LARGEST_LAST.min(self.side / 4);
        let least = side_holding(WANTED, self.per_px2(), most);
        let mut best = tried(least, PASSES)?;
        let mut end = None;
        for side in SIDES.into_iter().filter(|side| *side > least && *side <= most) {
            task.report("plans", side, most);
            let next = tried(side, PASSES)?;
            if !best.is_bettered_by(&next) {
                end = Some((side, best.difference(&next).sqrt(), next.noise()));
                break;
            }
            best = next;
        }
        let inside = self.per_px2() * (best.side * best.side) as f64;
        let mut why = format!(
            "last window {} px: {} particle images of both exposures lie in it",
            best.side,
            plain_number(inside, 2)
        );
        why += &if inside < WANTED {
            ", fewer than the 8 wanted, but the image allows no larger one".to_owned()
        } else if best.side == least {
            match SIDES.into_iter().rev().find(|side| *side < least) {
                Some(smaller) => format!(", and fewer than 8 would in {smaller} px"),
                None => ", and it is the smallest there is".to_owned(),
            }
        } else {
            ", and a smaller one would add more noise than detail".to_owned()
        };
        why += &match end {
            Some((side, off, noise)) => format!(
                "; at {side} px the noise would be {} instead of {} px, but the vectors would change by {} px, which is detail lost",
                plain_number(noise, 2),
                plain_number(best.noise(), 2),
                plain_number(off, 2)
            ),
            None if best.side == most => "; no larger one is tried".to_owned(),
            None => String::new(),
        };
        let over = self.look.motion.gradient * best.side as f64;
        let d = self.particles.width.mean();
        let (over_text, d_text) = (plain_number(over, 2), plain_number(d, 2));
        why += &if over > d {
            format!(". The displacement differs by up to {over_text} px across it, more than the particle images are wide ({d_text} px), so that it takes the passes to follow")
        } else {
            format!(". The displacement differs by at most {over_text} px across it, less than the particle images are wide ({d_text} px)")
        };
        Ok((best, why))
    }
}

/// How often the last window comes: fewer times while the last of them changes no more than
/// noise does, else more while a further one does.
fn passes(
    best: &mut Trial,
    tried: &dyn Fn(usize, usize) -> Result<Trial, AdviceError>,
    task: &Task,
) -> Result<String, AdviceError> {
    let side = best.side;
    let trial = |passes| {
        task.report("plans", passes, MOST_PASSES);
        tried(side, passes)
    };
    let mut change = None;
    while best.passes > LEAST_PASSES {
        let fewer = trial(best.passes - 1)?;
        // The one with fewer passes is the smoother.
        if !best.is_bettered_by(&fewer) {
            break;
        }
        change = Some(best.difference(&fewer).sqrt());
        *best = fewer;
    }
    while change.is_none() && best.passes < MOST_PASSES {
        let more = trial(best.passes + 1)?;
        let off = more.difference(best).sqrt();
        if more.is_bettered_by(best) {
            change = Some(off);
        } else {
            *best = more;
        }
    }
    let passes = best.passes;
    Ok(match change {
        Some(change) => format!(
            "{passes} passes at the last window: a further one would change the vectors by {} px, which is noise",
            plain_number(change, 1)
        ),
        None => format!("{passes} passes at the last window, the most that are advised: each still changes the vectors by more than noise"),
    })
}
