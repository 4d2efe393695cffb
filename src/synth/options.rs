//! What the camera, the light and the seeding are like.

use serde::{Deserialize, Serialize};

/// Why particle images cannot be made.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SynthError {
    /// An option out of its range.
    #[error("{option} is {value}: it must be {range}")]
    Option {
        /// The option.
        option: &'static str,
        /// What it is.
        value: String,
        /// What it may be.
        range: &'static str,
    },
    /// So much seeding that it would fill the memory.
    #[error(
        "the images would need {particles:.0} particles; the most is {most}: make the images smaller or seeding_per_px2 less"
    )]
    TooManyParticles {
        /// Particles asked for.
        particles: f64,
        /// Particles there may be.
        most: usize,
    },
    /// A flow that is too fast for a pair of images.
    #[error(
        "the flow reaches {speed} px/frame: in images of {width} x {height} px it must stay finite and below {limit} px/frame"
    )]
    #[allow(missing_docs)]
    TooFast {
        speed: f64,
        width: usize,
        height: usize,
        limit: f64,
    },
}

/// How the light varies through the thickness of the sheet.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Sheet {
    /// Gaussian, cut where it falls to e^-2 of its middle: particles differ in brightness by up
    /// to that.
    #[default]
    Gaussian,
    /// The same everywhere: all particles are equally bright.
    Flat,
}

/// How particle images are made. Every default is a clean, well-seeded recording by a 12-bit
/// camera; noise, background and uneven light are off.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(default, deny_unknown_fields)]
pub struct ImageOptions {
    /// Columns, 1 to 32768; 512 by default.
    pub width_px: usize,
    /// Rows, 1 to 32768; 512 by default.
    pub height_px: usize,
    /// Particle images a px², in each exposure; 0.06 by default.
    pub seeding_per_px2: f64,
    /// Diameter of a particle image where its light falls to e^-2 of its peak, px; 2.4 by
    /// default.
    pub particle_diameter_px: f64,
    /// Standard deviation of the diameters (normal, cut at 3 deviations and at a quarter of the
    /// mean), px; 0 by default.
    pub diameter_spread_px: f64,
    /// Peak of a particle image in the middle of the sheet, as a fraction of full scale; 0.6 by
    /// default. Where images overlap their light adds.
    pub peak_of_full_scale: f64,
    /// How the light varies through the sheet; "gaussian" by default.
    pub sheet: Sheet,
    /// Motion across the sheet between the exposures, as a fraction (0 to 1) of its thickness:
    /// that share of the particles leaves and as many others enter; 0 by default.
    pub out_of_plane_loss: f64,
    /// How much less light (0 to 1) the darkest corner gets than the brightest place, for
    /// particles and background alike; 0 by default. The light is a Gaussian about a place left
    /// of and above the middle.
    pub light_falloff: f64,
    /// Light scattered by walls and haze where the light is brightest, as a fraction of full
    /// scale; 0 by default.
    pub background_of_full_scale: f64,
    /// Standard deviation of the camera's own pattern, pixel by pixel the same in every
    /// exposure, as a fraction of full scale; 0 by default.
    pub fixed_pattern_of_full_scale: f64,
    /// Which pattern: keep it for all pairs of one recording; 0 by default.
    pub fixed_pattern_seed: u64,
    /// Standard deviation of the noise of reading the camera out (normal), as a fraction of full
    /// scale; 0 by default.
    pub noise_of_full_scale: f64,
    /// Electrons at full scale: photons then arrive at random (Poisson); none by default, for
    /// light without shot noise.
    pub full_well_electrons: Option<f64>,
    /// Bits of the camera, 8 to 16; 12 by default.
    pub bits: u8,
    /// Whether grey levels are whole numbers, as a camera's are; true by default. Levels end at
    /// 0 and full scale either way.
    pub quantised: bool,
    /// Which particles and which noise: another number, another pair; 1 by default.
    pub seed: u64,
}

impl Default for ImageOptions {
    fn default() -> Self {
        ImageOptions {
            width_px: 512,
            height_px: 512,
            seeding_per_px2: 0.06,
            particle_diameter_px: 2.4,
            diameter_spread_px: 0.0,
            peak_of_full_scale: 0.6,
            sheet: Sheet::Gaussian,
            out_of_plane_loss: 0.0,
            light_falloff: 0.0,
            background_of_full_scale: 0.0,
            fixed_pattern_of_full_scale: 0.0,
            fixed_pattern_seed: 0,
            noise_of_full_scale: 0.0,
            full_well_electrons: None,
            bits: 12,
            quantised: true,
            seed: 1,
        }
    }
}

impl ImageOptions {
    /// Grey level of full scale, 2^bits - 1.
    pub fn full_scale(&self) -> f64 {
        2f64.powi(i32::from(self.bits)) - 1.0
    }

    /// Checks every option.
    ///
    /// # Errors
    /// [`SynthError::Option`] for the first one out of its range.
    pub fn check(&self) -> Result<(), SynthError> {
        let sides = [("width_px", self.width_px), ("height_px", self.height_px)];
        for (option, value) in sides {
            within(option, value as f64, 1.0, 32768.0, "from 1 to 32768")?;
        }
        let diameter = self.particle_diameter_px;
        within(
            "particle_diameter_px",
            diameter,
            0.1,
            100.0,
            "from 0.1 to 100",
        )?;
        let spread = self.diameter_spread_px;
        within("diameter_spread_px", spread, 0.0, 100.0, "from 0 to 100")?;
        let seeding = self.seeding_per_px2;
        within("seeding_per_px2", seeding, 0.0, 100.0, "from 0 to 100")?;
        let fractions = [
            ("peak_of_full_scale", self.peak_of_full_scale),
            ("out_of_plane_loss", self.out_of_plane_loss),
            ("light_falloff", self.light_falloff),
            ("background_of_full_scale", self.background_of_full_scale),
            (
                "fixed_pattern_of_full_scale",
                self.fixed_pattern_of_full_scale,
            ),
            ("noise_of_full_scale", self.noise_of_full_scale),
        ];
        for (option, value) in fractions {
            within(option, value, 0.0, 1.0, "from 0 to 1")?;
        }
        let well = self.full_well_electrons.unwrap_or(1.0);
        within(
            "full_well_electrons",
            well,
            1.0,
            1e9,
            "from 1 to 1e9, or left out",
        )?;
        within("bits", f64::from(self.bits), 8.0, 16.0, "from 8 to 16")
    }
}

fn within(
    option: &'static str,
    value: f64,
    least: f64,
    most: f64,
    range: &'static str,
) -> Result<(), SynthError> {
    if (least..=most).contains(&value) {
        return Ok(());
    }
    Err(SynthError::Option {
        option,
        value: value.to_string(),
        range,
    })
}
