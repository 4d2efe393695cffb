//! What follows from the numbers: verdicts in words, each with what to do about it.
//!
//! The limits are common practice where no source is named.

use super::health::Health;
use crate::quantity::{Measured, plain_number};

/// How a finding is meant.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Verdict {
    /// Results suffer.
    Warning,
    /// Worth knowing.
    Note,
    /// As it should be.
    Good,
}

impl Verdict {
    /// The word used in reports.
    pub fn text(self) -> &'static str {
        match self {
            Verdict::Warning => "warning",
            Verdict::Note => "note",
            Verdict::Good => "good",
        }
    }
}

/// One thing that is said of a recording.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// What it is about, in a word or two.
    pub subject: &'static str,
    /// How it is meant.
    pub verdict: Verdict,
    /// What is found.
    pub text: String,
    /// What to do about it; empty where all is well.
    pub remedy: String,
}

impl Finding {
    fn new(subject: &'static str, text: String, judged: (Verdict, &str)) -> Self {
        let (verdict, remedy) = judged;
        Finding {
            subject,
            verdict,
            text,
            remedy: remedy.to_owned(),
        }
    }
}

/// Particle images that a window needs, and below which it often fails: 5 after all losses give a
/// valid vector in 95 of 100 windows (Keane & Adrian 1992, from memory); 8 leave a margin.
pub(super) const WANTED: f64 = 8.0;
const NEEDED: f64 = 5.0;

const GOOD: (Verdict, &str) = (Verdict::Good, "");

/// All findings, warnings first.
pub(super) fn findings(health: &Health) -> Vec<Finding> {
    let mut all = vec![vectors(health), lit(health), saturation(health)];
    match diameter(health) {
        Some(found) => all.push(found),
        None => all.push(Finding::new(
            "particle images",
            "none are seen: nothing in the exposures is alike over 1 or 2 px".to_owned(),
            (
                Verdict::Warning,
                "look at the images, their focus and light, and hide what is no flow",
            ),
        )),
    }
    all.extend(elongation(health));
    all.extend(seeding(health));
    all.extend(noise(health));
    all.extend(range(health));
    all.extend(kept(health));
    // Where the exposures have little in common, vectors are chance.
    if useful_share(health) > 0.3 {
        all.push(displacement(health));
        all.extend(gradient(health));
    }
    all.extend(locking(health));
    // Stable: within a verdict the order above is kept.
    all.sort_by_key(|finding| finding.verdict);
    all
}

/// Share of the pattern that both exposures have, between 0 and 1; 1 where it is not known.
fn useful_share(health: &Health) -> f64 {
    health.kept().map_or(1.0, |kept| kept.value().clamp(0.0, 1.0))
}

fn number(value: f64, digits: usize) -> String {
    plain_number(value, digits)
}

fn percent(share: f64) -> String {
    let percent = 100.0 * share;
    match percent {
        p if p > 0.0 && p < 1.0 => format!("{} %", number(p, 1)),
        // 99.96 % is not all.
        p if p > 99.0 && p < 100.0 => format!("{} %", (10.0 * p).floor() / 10.0),
        p => format!("{p:.0} %"),
    }
}

/// A value with its uncertainty where that is known.
fn with_doubt(value: &Measured) -> String {
    match value.unc() {
        Some(_) => value.number_text(),
        None => number(value.value(), 3),
    }
}

fn vectors(health: &Health) -> Finding {
    let share = health.measured();
    let judged = match share {
        s if s < 0.7 => (
            Verdict::Warning,
            "see whether the order \"pairs\" or \"series\" is right and the windows large enough; advise_plan() looks for a better plan",
        ),
        s if s < 0.95 => (
            Verdict::Note,
            "larger windows, more particle images or a shorter time between the exposures; advise_plan() looks for a better plan",
        ),
        _ => GOOD,
    };
    Finding::new("vectors", format!("{} measured", percent(share)), judged)
}

fn lit(health: &Health) -> Finding {
    let share = health.lit();
    let judged = match share {
        s if s < 0.6 => (
            Verdict::Warning,
            "spread the sheet or hide what is dark; vectors there are noise",
        ),
        s if s < 0.9 => (Verdict::Note, "hide what is dark; vectors there are noise"),
        _ => GOOD,
    };
    let text = format!(
        "{} of the image has a pattern of at least a quarter of the best contrast",
        percent(share)
    );
    Finding::new("light", text, judged)
}

fn saturation(health: &Health) -> Finding {
    let share = health.saturated();
    let images = health.plain(|pair| pair.saturated_images);
    let judged = match (share, images) {
        (s, Some(i)) if s > 0.01 && i < 0.05 => (
            Verdict::Warning,
            "large patches are saturated, not particle images: hide them, by mask_bright() or a shape",
        ),
        (_, Some(i)) if i > 0.2 => (
            Verdict::Warning,
            "less light or gain: saturated particle images have no centre",
        ),
        (_, Some(i)) if i > 0.05 => (Verdict::Note, "a little less light or gain"),
        (s, _) if s > 0.01 => (Verdict::Note, "less light or gain, or hide reflections"),
        _ => GOOD,
    };
    let mut text = format!("{} of the pixels", percent(share));
    if let Some(images) = images.filter(|images| *images > 0.0) {
        text += &format!(", some {} of the particle images", percent(images));
    }
    Finding::new("saturation", text, judged)
}

fn diameter(health: &Health) -> Option<Finding> {
    const REMEDY: &str =
        "close the lens aperture, go a little out of focus or come nearer: 2 to 3 px are best";
    let diameter = health.diameter()?;
    let d = diameter.value();
    let mut text = format!("{} px across (e⁻²)", with_doubt(&diameter));
    if let Some(spread) = health.plain(|pair| pair.diameter_spread) {
        text += &format!(
            ", {} px from quarter to quarter of the image",
            number(spread, 1)
        );
    }
    let pull = health.rehearsal.map(|r| r.pulls_px[0].abs());
    let pulled = pull.map_or(String::new(), |pull| {
        format!(
            ": at risk of locking; on synthetic images like these this plan errs by up to {} px towards whole px",
            number(pull, 1)
        )
    });
    let judged = if d < 1.5 {
        text += &pulled;
        (Verdict::Warning, REMEDY)
    } else if d < 1.8 {
        text += &pulled;
        (Verdict::Note, REMEDY)
    } else if d > 4.5 {
        let wide = "focus, open the aperture or step back: wide images overlap and place vectors less well";
        (Verdict::Note, wide)
    } else {
        GOOD
    };
    Some(Finding::new("particle images", text, judged))
}

fn elongation(health: &Health) -> Option<Finding> {
    let along = |read: fn(&(f64, f64)) -> f64| health.plain(|p| p.diameters.as_ref().map(read));
    let (x, y) = (along(|d| d.0)?, along(|d| d.1)?);
    let (axis, ratio) = if x > y { ("x", x / y) } else { ("y", y / x) };
    (ratio > 1.3).then(|| {
        let text = format!("{} times longer along {axis}", number(ratio, 2));
        let remedy = "a shorter pulse or exposure if they move while lit; else the lens is tilted or astigmatic";
        Finding::new("shape", text, (Verdict::Note, remedy))
    })
}

fn seeding(health: &Health) -> Option<Finding> {
    let seeding = health.seeding()?;
    let d = health.diameter()?.value();
    let (_, side) = health.windows();
    let inside = seeding.value() * side * side;
    let useful = inside * useful_share(health).max(0.05);
    let cover = seeding.value() * std::f64::consts::PI * d * d / 4.0;
    let holds = (WANTED / (useful / (side * side))).sqrt().ceil();
    let larger = format!("a last window of some {holds} px would hold 8, or add particles");
    let judged = if useful < NEEDED {
        (Verdict::Warning, larger.as_str())
    } else if useful < WANTED {
        (Verdict::Note, larger.as_str())
    } else if cover > 1.5 {
        let fewer = "their number is uncertain where they overlap so much; fewer would be sharper";
        (Verdict::Note, fewer)
    } else {
        GOOD
    };
    let text = format!(
        "{} a px², {} particle images in the last window of {} px",
        with_doubt(&seeding),
        number(inside, 2),
        number(side, 3)
    );
    Some(Finding::new("seeding", text, judged))
}

fn noise(health: &Health) -> Option<Finding> {
    let noise = health.noise()?.value();
    let ratio = health.plain(|pair| pair.noise_to_pattern)?;
    let judged = match ratio {
        r if r > 0.8 => (
            Verdict::Warning,
            "more light, larger particles or a smaller aperture number; larger windows help",
        ),
        r if r > 0.4 => (Verdict::Note, "more light, or larger windows"),
        _ => GOOD,
    };
    let text = format!(
        "{} grey levels from pixel to pixel, {} of the pattern",
        number(noise, 2),
        percent(ratio)
    );
    Some(Finding::new("noise", text, judged))
}

fn range(health: &Health) -> Option<Finding> {
    let background = health.background()?.value();
    let of_full = health.plain(|pair| pair.background_of_full)?;
    let used = health.plain(|pair| Some(pair.used_range))?;
    let judged = match (of_full, used) {
        (b, _) if b > 0.3 => (
            Verdict::Note,
            "it takes the range that particle images need: shield stray light, or lower the camera's offset",
        ),
        (_, u) if u < 0.1 => (Verdict::Note, "more light or gain would lift them out of the camera's steps"),
        _ => GOOD,
    };
    let text = format!(
        "background of {} grey levels ({} of full scale); the brightest particle images reach {}",
        number(background, 3),
        percent(of_full),
        percent(used)
    );
    Some(Finding::new("grey levels", text, judged))
}

fn kept(health: &Health) -> Option<Finding> {
    let lost = health.lost()?;
    let judged = match lost.value() {
        l if l > 0.7 => (
            Verdict::Warning,
            "are these the two exposures of one pair? Look at the order; else a shorter time between them or a thicker sheet",
        ),
        l if l > 0.4 => (Verdict::Warning, "a shorter time between the exposures or a thicker sheet"),
        // The one-quarter rule for motion across the sheet (Keane & Adrian 1990, from memory).
        l if l > 0.25 => (
            Verdict::Note,
            "more than a quarter: a shorter time between the exposures or a thicker sheet would help",
        ),
        _ => GOOD,
    };
    let value = 100.0 * lost.value().clamp(0.0, 1.0);
    let text = match lost.unc() {
        Some(unc) => {
            let lost = Measured::new(value, 100.0 * unc, lost.unit());
            format!("{} % of the pattern is not in both exposures", lost.number_text())
        }
        None => format!("{} of the pattern is not in both exposures", percent(lost.value())),
    };
    Some(Finding::new("pairs lost", text, judged))
}

fn displacement(health: &Health) -> Finding {
    let (first, _) = health.windows();
    let far = health.displacement();
    // The first pass looks that far and no farther.
    let judged = match far {
        d if d > 0.45 * first => (
            Verdict::Warning,
            "at the limit of the first window: a larger one, or a shorter time between the exposures",
        ),
        // The one-quarter rule for motion in the sheet (Keane & Adrian 1990, from memory).
        d if d > 0.25 * first => (
            Verdict::Note,
            "more than a quarter of the first window: a larger one would lose fewer particle images",
        ),
        d if d < 1.0 => (
            Verdict::Note,
            "less than 1 px: a longer time between the exposures would lessen the relative error",
        ),
        _ => GOOD,
    };
    let text = format!(
        "up to {} px, {} of the first window of {} px",
        number(far, 3),
        percent(far / first),
        number(first, 3)
    );
    Finding::new("displacement", text, judged)
}

fn gradient(health: &Health) -> Option<Finding> {
    let d = health.diameter()?.value();
    let (first, last) = health.windows();
    let (over_first, over_last) = (health.gradient() * first, health.gradient() * last);
    let judged = if over_first <= d {
        GOOD
    } else if health.measured() < 0.95 {
        (
            Verdict::Warning,
            "smaller windows, or a shorter time between the exposures",
        )
    } else if over_last > 2.0 * d {
        (
            Verdict::Note,
            "the passes must follow it: four or more at the last window, or smaller windows",
        )
    } else {
        GOOD
    };
    let text = format!(
        "displacement differs by up to {} px across the first window, {} px across the last",
        number(over_first, 2),
        number(over_last, 2)
    );
    Some(Finding::new("gradient", text, judged))
}

fn locking(health: &Health) -> Option<Finding> {
    const REMEDY: &str =
        "wider particle images; until then take no statistics of displacements finer than that";
    let pulls = health.locking.pulls?;
    let [whole, even] = pulls;
    let sure = |amplitude: f64, unc: f64| amplitude > 0.02 && amplitude > 3.0 * unc;
    let value = |amplitude: f64, unc: f64| {
        Measured::new(amplitude, unc, crate::quantity::Unit::PX).number_text()
    };
    let rehearsed = health.rehearsal.map_or(0.0, |r| r.pulls_px[0]);
    let said = value(whole.amplitude_px, whole.unc_px);
    Some(if sure(whole.amplitude_px, whole.unc_px) {
        let text = format!("vectors are locked: pulled by up to {said} px to whole px");
        Finding::new("locking", text, (Verdict::Warning, REMEDY))
    } else if sure(even.amplitude_px.abs(), even.unc_px) {
        let said = value(even.amplitude_px, even.unc_px);
        let text = format!("vectors are locked: pulled by up to {said} px to even px");
        Finding::new("locking", text, (Verdict::Warning, REMEDY))
    } else if whole.unc_px > 0.02 {
        let text = format!(
            "the vectors cannot tell ({said} px); on synthetic images like these up to {} px",
            number(rehearsed.abs(), 1)
        );
        Finding::new("locking", text, GOOD)
    } else {
        let text = format!("no pull to whole px is seen ({said} px)");
        Finding::new("locking", text, GOOD)
    })
}
