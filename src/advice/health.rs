//! What the images of a recording say of themselves, gathered.

use super::AdviceError;
use super::finding::{Finding, Verdict, findings};
use super::images::{Images, Particles, particles};
use super::kept::kept;
use super::levels::levels;
use super::locking::{Fits, Locking};
use super::motion::Motion;
use super::pattern::Sums;
use super::rehearsal::{Rehearsal, rehearse};
use crate::frames::{Pair, Recording};
use crate::interrogate::Plan;
use crate::quantity::{Measured, Unit};
use crate::task::Task;

/// What one pair's images and vectors say. Lengths are px of the image, grey levels those of the
/// file; a number that cannot be told is `None`.
#[derive(Clone, Debug)]
pub struct PairHealth {
    /// Number of the pair in its recording, from 0.
    pub index: usize,
    /// What the pair is called.
    pub label: String,
    /// e⁻² diameter of the particle images, px; its uncertainty is that of a quarter of the image,
    /// halved.
    pub diameter: Option<Measured>,
    /// The same along x and along y, px.
    pub diameters: Option<(f64, f64)>,
    /// Standard deviation of the diameter among the quarters of the image, px.
    pub diameter_spread: Option<f64>,
    /// Particle images a px²: those brighter than e⁻² of the brightest.
    pub seeding: Option<Measured>,
    /// Centre of the brightest particle images above the background, grey levels.
    pub peak: Option<f64>,
    /// Grey level between particle images, averaged over the image.
    pub background: Option<f64>,
    /// Standard deviation of what differs from pixel to pixel, grey levels.
    pub noise: Option<f64>,
    /// That over the standard deviation of the particle pattern.
    pub noise_to_pattern: Option<f64>,
    /// Share of the pixels that are saturated.
    pub saturated: f64,
    /// Share of the particle images that are.
    pub saturated_images: Option<f64>,
    /// Share of the grey levels that is used.
    pub used_range: f64,
    /// Background over full scale.
    pub background_of_full: Option<f64>,
    /// Share of the image that is lit.
    pub lit: f64,
    /// Share of the particle pattern that both exposures have.
    pub kept: Option<Measured>,
    /// Largest displacement along an axis, px.
    pub displacement: f64,
    /// Largest difference of displacement per px of distance.
    pub gradient: f64,
    /// Share of the vectors that are measured.
    pub measured: f64,
}

impl PairHealth {
    /// Share of the particle pattern that is not in both exposures.
    pub fn lost(&self) -> Option<Measured> {
        self.kept.as_ref().and_then(lost)
    }
}

/// One less the share that is kept.
fn lost(kept: &Measured) -> Option<Measured> {
    Measured::exact(1.0, kept.unit()).minus(kept).ok()
}

/// What is said of a recording, or of one pair, under a plan.
#[derive(Clone, Debug)]
pub struct Health {
    /// The pairs that were looked at.
    pub pairs: Vec<PairHealth>,
    /// How many the recording has.
    pub of: usize,
    /// Width and height of an exposure, px.
    pub size: (usize, usize),
    /// The plan that the vectors were measured by.
    pub plan: Plan,
    /// What the plan does on synthetic images like these; `None` without particle images.
    pub rehearsal: Option<Rehearsal>,
    /// What the vectors show of a pull to whole px.
    pub locking: Locking,
    /// What follows: warnings first.
    pub findings: Vec<Finding>,
}

/// Looks at one pair and its vectors by this plan.
///
/// # Errors
/// [`AdviceError`] where the pair cannot be read or interrogated, or is smaller than 64 px.
pub fn pair_health(pair: &Pair, plan: &Plan, task: &Task) -> Result<Health, AdviceError> {
    of_pairs(std::slice::from_ref(pair), 1, plan, task)
}

/// Looks at up to `most` pairs of a recording, evenly spread over it, and their vectors by this
/// plan.
///
/// # Errors
/// As [`pair_health`]; [`AdviceError::NoPairs`] without pairs and [`AdviceError::NoneAskedFor`]
/// for `most` = 0.
pub fn recording_health(
    recording: &Recording,
    plan: &Plan,
    most: usize,
    task: &Task,
) -> Result<Health, AdviceError> {
    let pairs = spread(recording, most)?;
    of_pairs(&pairs, recording.len(), plan, task)
}

/// Up to `most` pairs evenly spread over a recording, the first and the last among them.
pub(super) fn spread(recording: &Recording, most: usize) -> Result<Vec<Pair>, AdviceError> {
    let pairs = recording.pairs();
    match (pairs.len(), most) {
        (0, _) => Err(AdviceError::NoPairs),
        (_, 0) => Err(AdviceError::NoneAskedFor),
        (n, most) if n <= most => Ok(pairs.to_vec()),
        (n, 1) => Ok(vec![pairs[n / 2].clone()]),
        (n, most) => Ok((0..most)
            .map(|k| pairs[k * (n - 1) / (most - 1)].clone())
            .collect()),
    }
}

fn of_pairs(pairs: &[Pair], of: usize, plan: &Plan, task: &Task) -> Result<Health, AdviceError> {
    let mut fits = Fits::default();
    let mut whole = Sums::default();
    let mut size = (0, 0);
    let mut looked = Vec::new();
    for (k, pair) in pairs.iter().enumerate() {
        task.report("pairs", k, pairs.len());
        let images = Images::load(pair, task)?;
        size = images.size();
        let quarters = images.quarters(task)?;
        let sums = quarters.iter().cloned().fold(Sums::default(), Sums::plus);
        looked.push(of_pair(&images, (&sums, &quarters), plan, &mut fits, task)?);
        whole = whole.plus(sums);
    }
    task.report("pairs", pairs.len(), pairs.len());
    let mut health = Health {
        pairs: looked,
        of,
        size,
        plan: plan.clone(),
        rehearsal: None,
        locking: fits.result(),
        findings: Vec::new(),
    };
    if let Some(particles) = particles(&whole) {
        let kept = health.kept().map_or(1.0, |kept| kept.value().clamp(0.0, 1.0));
        health.rehearsal = Some(rehearse(&particles, kept, plan, task)?);
    }
    health.findings = findings(&health);
    Ok(health)
}

fn of_pair(
    images: &Images,
    (sums, quarters): (&Sums, &[Sums; 4]),
    plan: &Plan,
    fits: &mut Fits,
    task: &Task,
) -> Result<PairHealth, AdviceError> {
    let seen = particles(sums);
    let parts: Vec<Particles> = quarters.iter().filter_map(particles).collect();
    let field = images.interrogate(plan, task)?;
    fits.take(&field);
    let motion = Motion::of(&field)?;
    let noise = seen.map(|p| p.noise());
    let levels = levels(images, noise.unwrap_or(0.0));
    let peak = seen.map(|p| p.peak());
    let background = seen.map(|p| (levels.mean - p.light()).max(0.0));
    let measured = |read: fn(&Particles) -> f64, unit| {
        let value = read(&seen?);
        Some(match scatter(&parts, read) {
            // Two exposures of the same particles: as good as one.
            Some(scatter) => Measured::new(value, scatter / 2.0, unit),
            None => Measured::without_uncertainty(value, unit),
        })
    };
    let kept = seen.and_then(|p| kept(images, &p, &field));
    Ok(PairHealth {
        index: images.index,
        label: images.label.clone(),
        diameter: measured(|p| p.width.mean(), Unit::PX),
        diameters: seen.map(|p| p.width.diameter),
        diameter_spread: seen.and_then(|_| scatter(&parts, |p| p.width.mean())),
        seeding: measured(|p| p.seeding.per_px2, Unit::PX.power(-2)),
        peak,
        background,
        noise,
        noise_to_pattern: seen.map(|p| (p.width.signal.recip() - 1.0).max(0.0).sqrt()),
        saturated: levels.saturated,
        saturated_images: seen.map(|p| (levels.saturated_patches / p.seeding.per_px2).min(1.0)),
        used_range: levels.high / levels.full,
        background_of_full: background.map(|b| b / levels.full),
        lit: levels.lit,
        kept: kept.map(|(share, unc)| Measured::new(share, unc, Unit::ONE)),
        displacement: motion.largest,
        gradient: motion.gradient,
        measured: motion.measured,
    })
}

/// Standard deviation among the quarters; `None` unless all four say something.
fn scatter(parts: &[Particles], read: fn(&Particles) -> f64) -> Option<f64> {
    (parts.len() == 4).then(|| {
        let mean = parts.iter().map(read).sum::<f64>() / 4.0;
        let square = |p: &Particles| (read(p) - mean).powi(2);
        (parts.iter().map(square).sum::<f64>() / 3.0).sqrt()
    })
}

impl Health {
    /// Mean over the pairs of what is known, with the uncertainty of the mean: from the scatter of
    /// three or more pairs, else from that within them.
    fn mean(&self, read: impl Fn(&PairHealth) -> Option<Measured>) -> Option<Measured> {
        let all: Vec<Measured> = self.pairs.iter().filter_map(read).collect();
        let n = all.len() as f64;
        let unit = all.first()?.unit();
        let mean = all.iter().map(Measured::value).sum::<f64>() / n;
        if all.len() > 2 {
            let square = |m: &Measured| (m.value() - mean).powi(2);
            let scatter = (all.iter().map(square).sum::<f64>() / (n - 1.0) / n).sqrt();
            return Some(Measured::new(mean, scatter, unit));
        }
        let squares: Option<Vec<f64>> = all.iter().map(|m| m.unc().map(|u| u * u)).collect();
        Some(match squares {
            Some(squares) => Measured::new(mean, squares.iter().sum::<f64>().sqrt() / n, unit),
            None => Measured::without_uncertainty(mean, unit),
        })
    }

    /// Mean over the pairs of a plain number that is known.
    pub(super) fn plain(&self, read: impl Fn(&PairHealth) -> Option<f64>) -> Option<f64> {
        self.mean(|pair| read(pair).map(|v| Measured::without_uncertainty(v, Unit::ONE)))
            .map(|mean| mean.value())
    }

    /// e⁻² diameter of the particle images, px.
    pub fn diameter(&self) -> Option<Measured> {
        self.mean(|pair| pair.diameter.clone())
    }

    /// Particle images a px².
    pub fn seeding(&self) -> Option<Measured> {
        self.mean(|pair| pair.seeding.clone())
    }

    /// Noise of a pixel, grey levels.
    pub fn noise(&self) -> Option<Measured> {
        let grey = |v| Measured::without_uncertainty(v, Unit::ONE);
        self.mean(|pair| pair.noise.map(grey))
    }

    /// Level between particle images, grey levels.
    pub fn background(&self) -> Option<Measured> {
        let grey = |v| Measured::without_uncertainty(v, Unit::ONE);
        self.mean(|pair| pair.background.map(grey))
    }

    /// Share of the particle pattern that both exposures of a pair have.
    pub fn kept(&self) -> Option<Measured> {
        self.mean(|pair| pair.kept.clone())
    }

    /// Share that is not in both.
    pub fn lost(&self) -> Option<Measured> {
        self.kept().as_ref().and_then(lost)
    }

    /// Share of the pixels that are saturated.
    pub fn saturated(&self) -> f64 {
        self.plain(|pair| Some(pair.saturated)).unwrap_or(0.0)
    }

    /// Share of the image that is lit.
    pub fn lit(&self) -> f64 {
        self.plain(|pair| Some(pair.lit)).unwrap_or(0.0)
    }

    /// Share of the vectors that are measured.
    pub fn measured(&self) -> f64 {
        self.plain(|pair| Some(pair.measured)).unwrap_or(0.0)
    }

    /// Largest displacement along an axis in any of the pairs, px.
    pub fn displacement(&self) -> f64 {
        self.pairs.iter().map(|p| p.displacement).fold(0.0, f64::max)
    }

    /// Largest difference of displacement per px of distance in any of the pairs.
    pub fn gradient(&self) -> f64 {
        self.pairs.iter().map(|p| p.gradient).fold(0.0, f64::max)
    }

    /// Sides of the plan's first and last window, px: their roots of the area.
    pub fn windows(&self) -> (f64, f64) {
        let side = |k: Option<&crate::interrogate::WindowSize>| {
            k.map_or(f64::NAN, |w| ((w.width * w.height) as f64).sqrt())
        };
        let windows = self.plan.windows();
        (side(windows.first()), side(windows.last()))
    }

    /// Particle images in a window of the plan's last pass.
    pub fn images_in_window(&self) -> Option<Measured> {
        let side = self.windows().1;
        self.seeding()
            .map(|s| s.times(&Measured::exact(side * side, Unit::PX.power(2))))
    }

    /// How many findings have this verdict.
    pub fn count(&self, verdict: Verdict) -> usize {
        self.findings.iter().filter(|f| f.verdict == verdict).count()
    }
}
