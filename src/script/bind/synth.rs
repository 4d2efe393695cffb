//! Known flows and the particle images they would give.

use std::sync::Arc;

use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::super::options::{Needed, Optional, Options};
use super::place::Length;
use crate::field::Grid;
use crate::frames::{Pair, Scale};
use crate::quantity::{Measured, Unit};
use crate::synth::{
    Element, Flow, ImageOptions, LambChaplygin, LambOseen, Rankine, Shear, ShieldedGaussian,
    SineWave, SolidRotation, TaylorGreen, Uniform, particle_images,
};

impl Kind for Flow {
    const NAME: &'static str = "known flow";
    const ABOUT: &'static str = "A flow known exactly, in px and frames: a sum of elements, written \
        with +. It gives exact fields and the particle images a camera would see.";

    fn show(&self) -> String {
        match self.elements().len() {
            0 => "known flow, at rest".to_owned(),
            1 => "known flow of 1 element".to_owned(),
            n => format!("known flow of {n} elements"),
        }
    }
}

crate::option_keys! {
    Uniform {
        u_px_per_frame: "number", "px/frame", "needed", "Velocity to the right.";
        v_px_per_frame: "number", "px/frame", "needed", "Velocity upwards.";
    }
}
crate::option_keys! {
    Shear {
        y_px: "number", "px", "0.0", "Height of the line at rest.";
        rate_per_frame: "number", "1/frame", "needed", "du/dy.";
    }
}
crate::option_keys! {
    SolidRotation {
        x_px: "number", "px", "needed", "x of the centre.";
        y_px: "number", "px", "needed", "y of the centre.";
        rate_per_frame: "number", "rad/frame", "needed", "Rate of rotation, counter-clockwise; vorticity is twice that.";
    }
}
crate::option_keys! {
    SineWave {
        x_px: "number", "px", "0.0", "Where the wave rises through 0.";
        wavelength_px: "number", "px", "needed", "Length of one wave along x.";
        amplitude_px_per_frame: "number", "px/frame", "needed", "Largest v.";
    }
}
crate::option_keys! {
    LambOseen {
        x_px: "number", "px", "needed", "x of the centre.";
        y_px: "number", "px", "needed", "y of the centre.";
        core_radius_px: "number", "px", "needed", "Where vorticity is 1/e of its peak.";
        circulation_px2_per_frame: "number", "px²/frame", "needed", "Total circulation, positive counter-clockwise.";
    }
}
crate::option_keys! {
    ShieldedGaussian {
        x_px: "number", "px", "needed", "x of the centre.";
        y_px: "number", "px", "needed", "y of the centre.";
        core_radius_px: "number", "px", "needed", "Where vorticity passes through 0 and circulation is largest.";
        peak_vorticity_per_frame: "number", "1/frame", "needed", "Vorticity at the centre.";
    }
}
crate::option_keys! {
    Rankine {
        x_px: "number", "px", "needed", "x of the centre.";
        y_px: "number", "px", "needed", "y of the centre.";
        core_radius_px: "number", "px", "needed", "Radius of the core that rotates as a solid.";
        circulation_px2_per_frame: "number", "px²/frame", "needed", "Circulation, positive counter-clockwise.";
    }
}
crate::option_keys! {
    TaylorGreen {
        x_px: "number", "px", "0.0", "x of the centre of one counter-clockwise eddy.";
        y_px: "number", "px", "0.0", "y of that centre.";
        wavelength_px: "number", "px", "needed", "Distance between eddies of one sense.";
        peak_vorticity_per_frame: "number", "1/frame", "needed", "Vorticity at that centre.";
    }
}
crate::option_keys! {
    LambChaplygin {
        x_px: "number", "px", "needed", "x of the centre of the pair.";
        y_px: "number", "px", "needed", "y of that centre.";
        radius_px: "number", "px", "needed", "Radius of the circle that holds all vorticity.";
        speed_px_per_frame: "number", "px/frame", "needed", "How fast it travels.";
        heading_deg: "number", "°", "0.0", "Where it travels to, counter-clockwise from x.";
    }
}
crate::option_keys! {
    ImageOptions {
        width_px: "whole number", "px", "512", "Columns.";
        height_px: "whole number", "px", "512", "Rows.";
        seeding_per_px2: "number", "1/px²", "0.06", "Particle images a px² in each exposure.";
        particle_diameter_px: "number", "px", "2.4", "Diameter of a particle image, where its light falls to e^-2.";
        diameter_spread_px: "number", "px", "0.0", "Standard deviation of the diameters.";
        peak_of_full_scale: "number", "fraction", "0.6", "Peak of a particle image in the middle of the sheet.";
        sheet: "one of \"gaussian\" or \"flat\"", "", "\"gaussian\"", "How the light varies through the sheet.";
        out_of_plane_loss: "number", "fraction", "0.0", "Share of the particles that leave the sheet between the exposures.";
        light_falloff: "number", "fraction", "0.0", "How much less light the darkest corner gets.";
        background_of_full_scale: "number", "fraction", "0.0", "Light scattered by walls and haze.";
        fixed_pattern_of_full_scale: "number", "fraction", "0.0", "Standard deviation of the camera's own pattern.";
        fixed_pattern_seed: "whole number", "count", "0", "Which pattern; the same for all pairs of one recording.";
        noise_of_full_scale: "number", "fraction", "0.0", "Standard deviation of the read-out noise.";
        full_well_electrons: "number", "electrons", "none", "Electrons at full scale; left out, light has no shot noise.";
        bits: "whole number", "count", "12", "Bits of the camera, 8 to 16.";
        quantised: "true/false", "", "true", "Whether grey levels are whole numbers.";
        seed: "whole number", "count", "1", "Which particles and which noise.";
    }
}

crate::options! {
    /// The grid an exact field is given on.
    pub(super) struct GridOptions {
        nx: usize = 64, "whole number", "count", "Nodes along x, 2 to 10000.";
        ny: usize = 64, "whole number", "count", "Nodes along y, 2 to 10000.";
        spacing_px: f64 = 8.0, "number", "px", "Distance between nodes.";
        x0_px: f64 = 0.0, "number", "px", "x of the first column.";
        y0_px: f64 = 0.0, "number", "px", "y of the lowest row.";
    }
}

impl GridOptions {
    fn grid(&self) -> Result<Grid, Fault> {
        for (key, n) in [("nx", self.nx), ("ny", self.ny)] {
            if !(2..=10_000).contains(&n) {
                return Err(
                    Fault::new(format!("`{key}` is {n}: it must be 2 to 10000")).at_key(key)
                );
            }
        }
        if !(self.spacing_px > 0.0 && self.spacing_px.is_finite()) {
            let message = format!("`spacing_px` is {}: it must be above 0", self.spacing_px);
            return Err(Fault::new(message).at_key("spacing_px"));
        }
        Ok(Grid {
            nx: self.nx,
            ny: self.ny,
            x0: self.x0_px,
            y0: self.y0_px,
            dx: self.spacing_px,
            dy: self.spacing_px,
            length: Unit::PX,
        })
    }
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Flow>();
    elements(room);
    room.operator::<Flow>("+")
        .about("Both flows at once: velocities add.")
        .words("sum superpose combine")
        .input("other", "", "the other flow")
        .example(
            "uniform(#{ u_px_per_frame: 1, v_px_per_frame: 0 }) + shear(#{ rate_per_frame: 0.1 })",
            "known flow of 2 elements",
        )
        .does(|a: &Flow, b: Arc<Flow>| a.clone() + (*b).clone());
    exact(room);
    room.method::<Flow>("pair")
        .about(
            "The pair of particle images a camera would take of the flow: particles are drawn \
             half a frame before and after, with the noise and light asked for.",
        )
        .words("images synthetic particles camera simulate exposure")
        .errors("an option is out of its range or the flow is too fast for the image")
        .example(
            "uniform(#{ u_px_per_frame: 2, v_px_per_frame: 0 }).pair(#{ width_px: 64, height_px: 48 })",
            "pair 0: synthetic pair, 64 x 48 px; in px and frames",
        )
        .does(|flow: &Flow, options: Optional<ImageOptions>| {
            let (first, second) = particle_images(flow, &options.0)?;
            Ok::<_, Fault>(Pair::from_frames(first, second, Scale::default(), "synthetic pair"))
        });
}

fn element<T: Options + Element + 'static>(
    room: &mut Room,
    name: &'static str,
    about: &'static str,
    words: &'static str,
    source: &'static str,
    example: &'static str,
) {
    room.function(name)
        .about(about)
        .words(words)
        .errors("a number is not finite, or a length not above 0")
        .source(source)
        .example(example, "known flow of 1 element")
        .does(|options: Needed<T>| Flow::from(options.0));
}

#[rustfmt::skip]
fn elements(room: &mut Room) {
    element::<Uniform>(room, "uniform", "The same velocity everywhere.", "constant parallel stream known flow", "",
        "uniform(#{ u_px_per_frame: 3.2, v_px_per_frame: -1 })");
    element::<Shear>(room, "shear", "Parallel flow whose velocity grows with height.", "gradient couette known flow", "",
        "shear(#{ rate_per_frame: 0.08 })");
    element::<SolidRotation>(room, "solid_rotation", "Rotation as a solid body.", "spin known flow", "",
        "solid_rotation(#{ x_px: 0, y_px: 0, rate_per_frame: 0.01 })");
    element::<SineWave>(room, "sine_wave", "Velocity along y that varies as a sine along x.", "wavelength response known flow", "",
        "sine_wave(#{ wavelength_px: 64, amplitude_px_per_frame: 1 })");
    element::<LambOseen>(room, "lamb_oseen", "Vortex with a Gaussian core; its circulation has no maximum.",
        "vortex eddy gaussian viscous known flow", "Oseen 1912; Lamb 1932, art. 334a",
        "lamb_oseen(#{ x_px: 100, y_px: 100, core_radius_px: 12, circulation_px2_per_frame: 400 })");
    element::<ShieldedGaussian>(room, "shielded_gaussian", "Gaussian vortex in a ring of the other sense: circulation is largest at its core radius.",
        "vortex eddy isolated shield known flow", "",
        "shielded_gaussian(#{ x_px: 100, y_px: 100, core_radius_px: 12, peak_vorticity_per_frame: 0.3 })");
    element::<Rankine>(room, "rankine", "Solid rotation inside a core, free of vorticity outside.",
        "vortex eddy known flow", "Rankine 1872",
        "rankine(#{ x_px: 100, y_px: 100, core_radius_px: 12, circulation_px2_per_frame: 400 })");
    element::<TaylorGreen>(room, "taylor_green", "Chequered array of eddies, neighbours of opposite sense.",
        "vortex eddies array periodic known flow", "Taylor & Green 1937",
        "taylor_green(#{ wavelength_px: 80, peak_vorticity_per_frame: 0.2 })");
    element::<LambChaplygin>(room, "lamb_chaplygin", "Vortex pair that travels unchanged.",
        "dipole pair travelling known flow", "Lamb 1906; Chaplygin 1903",
        "lamb_chaplygin(#{ x_px: 100, y_px: 100, radius_px: 40, speed_px_per_frame: 2 })");
}

fn exact(room: &mut Room) {
    room.method::<Flow>("field")
        .about("The exact velocities on a grid.")
        .words("vectors exact truth grid")
        .unit("px/frame")
        .errors("the grid makes no sense")
        .example(
            "uniform(#{ u_px_per_frame: 3, v_px_per_frame: 4 }).field(#{ nx: 5, ny: 4, spacing_px: 2 })",
            "vector field, 5 x 4 nodes, 2 px apart, from (0, 0) px; speed 5 to 5 px/frame, 100 % measured",
        )
        .does(|flow: &Flow, options: Optional<GridOptions>| {
            Ok::<_, Fault>(flow.field(&options.0.grid()?, Unit::FRAME))
        });
    room.method::<Flow>("velocity_at")
        .about("The exact velocity at a point, as [u, v].")
        .words("exact truth point")
        .input("x", "px", "where, to the right")
        .input("y", "px", "where, upwards")
        .unit("px/frame")
        .example(
            "solid_rotation(#{ x_px: 0, y_px: 0, rate_per_frame: 0.01 }).velocity_at(10, 0)",
            "[0 px/frame, 0.1 px/frame]",
        )
        .does(|flow: &Flow, x: Length, y: Length| {
            let (u, v) = flow.velocity(x.within(Unit::PX)?, y.within(Unit::PX)?);
            let unit = Unit::PX.per(Unit::FRAME);
            Ok::<_, Fault>(vec![Measured::exact(u, unit), Measured::exact(v, unit)])
        });
    room.method::<Flow>("vorticity_at")
        .about("The exact vorticity at a point.")
        .words("exact truth point rotation")
        .input("x", "px", "where, to the right")
        .input("y", "px", "where, upwards")
        .unit("1/frame")
        .example(
            "shear(#{ rate_per_frame: 0.08 }).vorticity_at(0, 0)",
            "-0.08 1/frame",
        )
        .does(|flow: &Flow, x: Length, y: Length| {
            let vorticity = flow.vorticity(x.within(Unit::PX)?, y.within(Unit::PX)?);
            Ok::<_, Fault>(Measured::exact(vorticity, Unit::ONE.per(Unit::FRAME)))
        });
}
