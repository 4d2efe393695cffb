//! Looking at one correlation.

use std::sync::Arc;

use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::interrogate::given;
use super::place::Length;
use crate::figure::plane_figure;
use crate::frames::Pair;
use crate::interrogate::{CorrelationPlane, Plan, PlanePeak, correlation_plane};
use crate::quantity::{Measured, plain_number};
use crate::table::plane_peaks;

/// Peaks a table has where nobody asks for another number.
const PEAKS: usize = 5;

impl Kind for CorrelationPlane {
    const NAME: &'static str = "correlation plane";
    const ABOUT: &'static str = "How well the two exposures of one window match, a correlation \
        coefficient from -1 to 1, for every displacement, in px/frame or mm/s: what one vector was \
        read from.";

    fn show(&self) -> String {
        let (x, y) = self.centre;
        let about = format!(
            "correlation plane of {} x {} px about ({}, {}) {}",
            self.window.width,
            self.window.height,
            plain_number(x, 6),
            plain_number(y, 6),
            self.length
        );
        let Some(peak) = self.peaks().first() else {
            return format!("{about}: no contrast, no peak");
        };
        let place = |peak: &PlanePeak| {
            let (u, v) = peak.displacement;
            let (u, v) = (plain_number(u, 4), plain_number(v, 4));
            format!("({u}, {v}) {}", self.field.grid.length)
        };
        let mut text = format!(
            "{about}: peak {} at {}",
            plain_number(peak.height, 3),
            place(peak)
        );
        if let Some(ratio) = peak.ratio {
            text += &format!(", {} times the second", plain_number(ratio, 3));
        }
        if let Some(noise) = self.noise() {
            text += &format!(", noise {}", plain_number(noise, 2));
        }
        match self.vector() {
            Some(_) if self.vector_is_highest() => text,
            Some(read) => format!(
                "{text}; it lies beyond the search limit, the vector is read at {}",
                place(read)
            ),
            None => format!("{text}; beyond the search limit, no vector"),
        }
    }
}

/// A noisy pair the examples look at.
macro_rules! with_a_plane {
    ($code:literal) => {
        concat!(
            "let p = uniform(#{ u_px_per_frame: 3.3, v_px_per_frame: -1.2 }).pair(#{ width_px: 128, height_px: 128, noise_of_full_scale: 0.03 });\n",
            "let c = p.plane(64, 64, plan(#{ windows_px: [64, 32, 32] }));\n",
            $code
        )
    };
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<CorrelationPlane>();
    room.method::<Pair>("plane")
        .about(
            "The correlation plane of the window of the plan's last pass whose centre is nearest \
             to a point, after all passes before it: what the vector there is read from.",
        )
        .words("correlation peak look window evidence signal noise quality")
        .input("x", "px or mm", "x of the point, from the bottom-left pixel")
        .input("y", "px or mm", "y of the point, upwards")
        .input("plan", "", "how; the default plan when left out")
        .unit("correlation coefficient")
        .errors(
            "the point is outside the image, or a frame cannot be read or is smaller than the window",
        )
        .source("Scarano 2002; Wereley & Meinhart 2001")
        .example(
            with_a_plane!("c"),
            "correlation plane of 32 x 32 px about (63.5, 63.5) px: peak 0.939 at (3.263, -1.158) px/frame, 3.88 times the second, noise 0.05",
        )
        .does(
            |pair: &Pair, x: Length, y: Length, plan: Option<Arc<Plan>>, call: Call| {
                let (unit, _) = pair.scale().length();
                let at = (x.within(unit)?, y.within(unit)?);
                Ok::<_, Fault>(correlation_plane(pair, at, &*given(plan)?, &call.task())?)
            },
        );
    of_the_vector(room);
    of_the_peaks(room);
    of_the_window(room);
}

fn read(plane: &CorrelationPlane) -> Result<&PlanePeak, Fault> {
    plane.vector().ok_or_else(|| {
        Fault::new(
            "nothing within the search limit of this window correlates: there is no vector to read",
        )
    })
}

fn highest(plane: &CorrelationPlane) -> Result<&PlanePeak, Fault> {
    plane.peaks().first().ok_or_else(|| {
        Fault::new(
            "the window has no contrast: its correlation plane is zero everywhere and has no peak",
        )
    })
}

fn of_the_vector(room: &mut Room) {
    room.property::<CorrelationPlane>("u")
        .about(
            "Displacement along x read from the plane: that of the highest sample within the \
             search limit, which is the vector before validation.",
        )
        .words("velocity displacement vector peak place")
        .unit("px/frame or mm/s")
        .errors("nothing within the search limit correlates")
        .example(with_a_plane!("c.u.unit"), "\"px/frame\"")
        .does(|plane: &CorrelationPlane| {
            let (u, _) = read(plane)?.displacement;
            Ok::<_, Fault>(Measured::without_uncertainty(u, plane.field.grid.length))
        });
    room.property::<CorrelationPlane>("v")
        .about("Displacement along y, upwards, read from the plane as u is.")
        .words("velocity displacement vector peak place")
        .unit("px/frame or mm/s")
        .errors("nothing within the search limit correlates")
        .example(with_a_plane!("decimals(c.v.value, 1)"), "\"-1.2\"")
        .does(|plane: &CorrelationPlane| {
            let (_, v) = read(plane)?.displacement;
            Ok::<_, Fault>(Measured::without_uncertainty(v, plane.field.grid.length))
        });
    room.property::<CorrelationPlane>("predicted")
        .about(
            "Displacement [u, v] that the passes before had predicted here, the middle of the \
             plane; [0, 0] in a plan of one pass.",
        )
        .words("predictor prediction earlier passes")
        .unit("px/frame or mm/s")
        .example(
            with_a_plane!("p.plane(64, 64, plan(#{ windows_px: [32] })).predicted"),
            "[0 px/frame, 0 px/frame]",
        )
        .does(|plane: &CorrelationPlane| {
            let (u, v) = plane.predicted;
            [u, v]
                .map(|d| Measured::exact(d, plane.field.grid.length))
                .to_vec()
        });
}

fn of_the_peaks(room: &mut Room) {
    room.property::<CorrelationPlane>("height")
        .about("Height of the highest peak: the correlation coefficient of its highest sample.")
        .words("peak correlation coefficient maximum signal")
        .unit("correlation coefficient")
        .errors("the window has no contrast")
        .example(with_a_plane!("c.height > 0.5"), "true")
        .does(|plane: &CorrelationPlane| Ok::<_, Fault>(highest(plane)?.height));
    room.property::<CorrelationPlane>("ratio")
        .about(
            "Height of the highest peak over that of the second, anywhere in the plane: near 1 \
             where chance decides.",
        )
        .words("detectability signal noise quality first second peak")
        .unit("plain number")
        .errors("the window has no contrast, or only one peak")
        .example(with_a_plane!("c.ratio > 2"), "true")
        .does(|plane: &CorrelationPlane| {
            highest(plane)?
                .ratio
                .ok_or_else(|| Fault::new("this plane has one peak only: there is no ratio"))
        });
    room.property::<CorrelationPlane>("noise")
        .about(
            "Root of the mean square of the plane away from its highest peak, farther than the \
             peak's width.",
        )
        .words("rms background floor signal quality")
        .unit("correlation coefficient")
        .errors("the window has no contrast, or is not larger than its peak")
        .example(with_a_plane!("c.noise < 0.1"), "true")
        .does(|plane: &CorrelationPlane| {
            highest(plane)?;
            plane.noise().ok_or_else(|| {
                Fault::new("the peak fills this plane: nothing of it is left to call noise")
            })
        });
    room.method::<CorrelationPlane>("peaks")
        .about(
            "The highest peaks as a table: place by the same fit as a vector's, height, ratio to \
             the next, and diameter along x and y at e⁻² of the Gaussian through the three \
             highest samples: √2 times that of the particle images as the pixels show them. A \
             peak is higher than everything up to 2 px away.",
        )
        .words("maxima second peak width diameter list table")
        .input("most", "count", "how many at most; 5 when left out")
        .example(
            with_a_plane!("c.peaks(3).headings"),
            "[\"peak\", \"u_px_per_frame\", \"v_px_per_frame\", \"height\", \"ratio_to_next\", \"width_x_px\", \"width_y_px\"]",
        )
        .does(|plane: &CorrelationPlane, most: Option<usize>| {
            plane_peaks(plane, most.unwrap_or(PEAKS))
        });
    room.property::<CorrelationPlane>("field")
        .about(
            "The plane as a field over displacement, u along x and v along y; the weights' loss is \
             not divided out of it.",
        )
        .words("coefficients values map shade")
        .unit("correlation coefficient")
        .example(with_a_plane!("c.field.max() == c.height"), "true")
        .does(|plane: &CorrelationPlane| plane.field.clone());
    room.method::<CorrelationPlane>("figure")
        .about(
            "The figure a careful person looks at: the plane with its highest peaks and the search \
             limit, and the cuts along x and y through the highest with the Gaussian through three \
             samples.",
        )
        .words("draw plot map evidence picture")
        .example(with_a_plane!("c.figure().save(\"plane.png\")"), "")
        .does(plane_figure);
}

fn of_the_window(room: &mut Room) {
    room.property::<CorrelationPlane>("x")
        .about("x of the window's centre.")
        .words("position place node")
        .unit("px or mm")
        .example(with_a_plane!("c.x"), "63.5 px")
        .does(|plane: &CorrelationPlane| Measured::exact(plane.centre.0, plane.length));
    room.property::<CorrelationPlane>("y")
        .about("y of the window's centre, upwards.")
        .words("position place node")
        .unit("px or mm")
        .example(with_a_plane!("c.y"), "63.5 px")
        .does(|plane: &CorrelationPlane| Measured::exact(plane.centre.1, plane.length));
    room.property::<CorrelationPlane>("window_px")
        .about("Width and height of the window.")
        .words("size pixels")
        .unit("px")
        .example(with_a_plane!("c.window_px"), "[32, 32]")
        .does(|plane: &CorrelationPlane| vec![plane.window.width, plane.window.height]);
    room.property::<CorrelationPlane>("reach_px")
        .about("How far from the prediction, along x and y, the pass sought its peak.")
        .words("search limit range")
        .unit("px")
        .example(with_a_plane!("c.reach_px"), "[8, 8]")
        .does(|plane: &CorrelationPlane| vec![plane.reach_px.0, plane.reach_px.1]);
    room.property::<CorrelationPlane>("lit")
        .about("Share of the window that could be read in both exposures.")
        .words("edge mask outside share")
        .unit("fraction")
        .example(with_a_plane!("c.lit"), "1")
        .does(|plane: &CorrelationPlane| plane.lit);
}
