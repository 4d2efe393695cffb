//! Vector fields, scalar fields, gradients and traces.

use std::sync::Arc;

use super::super::argument::NumberOr;
use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::super::options::Optional;
use super::super::wording::nearest;
use super::place::{Length, Point};
use super::table::table_name;
use crate::field::{Gradient, ScalarField, Scheme, Status, Trace, VectorField};
use crate::quantity::{Measured, Unit, plain_number};
use crate::store::{read_vectors, save_vectors};
use crate::vortex::EddyOptions;

/// Options of `gradient`.
#[derive(Clone, Debug, serde::Deserialize)]
#[serde(default, deny_unknown_fields)]
pub(super) struct GradientOptions {
    scheme: Scheme,
}

impl Default for GradientOptions {
    fn default() -> Self {
        Self {
            scheme: EddyOptions::DEFAULT_SCHEME,
        }
    }
}

crate::option_keys! {
    GradientOptions {
        scheme: "one of \"forward\", \"central\", \"richardson\", \"least_squares\", \"eight_neighbours\" or \"cubic_fit\"",
            "", "\"cubic_fit\"",
            "The difference scheme: noise falls and truncation grows with its reach.";
    }
}

crate::options! {
    /// Options of `along`.
    pub(super) struct AlongOptions {
        points: usize = 101, "whole number", "count", "How many points along the line, both ends included.";
    }
}

impl Kind for VectorField {
    const NAME: &'static str = "vector field";
    const ABOUT: &'static str = "Velocities on a regular grid, in px/frame, or in mm/s once dt_s and \
        mm_per_px are known, each measured, replaced, masked or outside.";

    fn show(&self) -> String {
        let total = self.status.len().max(1);
        let share = 100.0 * self.count(Status::Measured) as f64 / total as f64;
        format!(
            "vector field, {}; {}, {} % measured",
            self.grid.describe(),
            span(&self.speed()),
            plain_number(share, 3)
        )
    }
}

impl Kind for ScalarField {
    const NAME: &'static str = "scalar field";
    const ABOUT: &'static str = "One number at every node of a regular grid, in one unit. Arithmetic \
        and comparison work on the whole field at once; a comparison gives a field of 1 and 0.";

    fn show(&self) -> String {
        format!("scalar field, {}; {}", self.grid.describe(), span(self))
    }
}

impl Kind for Gradient {
    const NAME: &'static str = "gradient field";
    const ABOUT: &'static str =
        "The four first derivatives of a velocity field, in 1/frame or 1/s.";

    fn show(&self) -> String {
        format!(
            "gradient field, {}; by {}",
            self.grid.describe(),
            self.scheme.text()
        )
    }
}

impl Kind for Trace {
    const NAME: &'static str = "trace";
    const ABOUT: &'static str = "Values of a field along a straight line, with their positions and \
        their distance from its first point.";

    fn show(&self) -> String {
        let length = self.distance.last().copied().unwrap_or(0.0);
        format!(
            "trace of {}, {} points over {}{}",
            self.name,
            self.values.len(),
            plain_number(length, 4),
            spaced(self.length)
        )
    }
}

fn spaced(unit: Unit) -> String {
    if unit.is_one() {
        String::new()
    } else {
        format!(" {unit}")
    }
}

/// `vorticity -12.3 to 14.1 1/s`.
fn span(field: &ScalarField) -> String {
    match field.range() {
        None => format!("{} has no values", field.name),
        Some((lo, hi)) => format!(
            "{} {} to {}{}",
            field.name,
            plain_number(lo, 4),
            plain_number(hi, 4),
            spaced(field.unit)
        ),
    }
}

/// A small exact field the examples look at.
macro_rules! with_a_flow {
    ($code:literal) => {
        concat!(
            "let flow = taylor_green(#{ wavelength_px: 40, peak_vorticity_per_frame: 0.2 }).field(#{ nx: 33, ny: 33, spacing_px: 2.5 });\n",
            $code
        )
    };
}
pub(super) use with_a_flow;

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<VectorField>();
    room.kind::<ScalarField>();
    room.kind::<Gradient>();
    room.kind::<Trace>();
    of_vectors(room);
    files(room);
    sampling(room);
    of_gradients(room);
    of_scalars(room);
    of_traces(room);
    super::field_arithmetic::records(room);
}

fn of_vectors(room: &mut Room) {
    room.property::<VectorField>("u")
        .about("Velocity along x, to the right, as a scalar field.")
        .words("component horizontal velocity")
        .unit("px/frame or mm/s")
        .example(with_a_flow!("flow.u.unit"), "\"px/frame\"")
        .does(|flow: &VectorField| flow.u());
    room.property::<VectorField>("v")
        .about("Velocity along y, upwards, as a scalar field.")
        .words("component vertical velocity")
        .unit("px/frame or mm/s")
        .example(with_a_flow!("flow.v.name"), "\"v\"")
        .does(|flow: &VectorField| flow.v());
    room.method::<VectorField>("speed")
        .about("Magnitude of the velocity.")
        .words("absolute magnitude velocity")
        .unit("px/frame or mm/s")
        .example(with_a_flow!("flow.speed().max()"), "0.6366 ± ? px/frame")
        .does(|flow: &VectorField| flow.speed());
    room.property::<VectorField>("label")
        .about("What the field is of: a pair, a file, a flow.")
        .words("name title")
        .example(with_a_flow!("flow.label"), "\"exact flow\"")
        .does(|flow: &VectorField| flow.label.clone());
    room.property::<VectorField>("unit")
        .about("Unit of the velocities, as text.")
        .words("dimension")
        .example(with_a_flow!("flow.unit"), "\"px/frame\"")
        .does(|flow: &VectorField| flow.unit().to_string());
    room.method::<VectorField>("status_count")
        .about("How many vectors are \"measured\", \"replaced\", \"masked\" or \"outside\".")
        .words("valid replaced masked count validation")
        .input("status", "", "one of these four words")
        .unit("count")
        .errors("there is no such status")
        .example(with_a_flow!("flow.status_count(\"measured\")"), "1089")
        .does(|flow: &VectorField, status: String| {
            let known = ["measured", "replaced", "masked", "outside"];
            let status =
                Status::parse(&status).ok_or_else(|| unknown_word("status", &status, &known))?;
            Ok::<_, Fault>(flow.count(status))
        });
    room.method::<VectorField>("gradient")
        .about("The velocity gradient, from which vorticity, swirl, strain and divergence follow.")
        .words("derivative tensor vorticity swirl")
        .unit("1/frame or 1/s")
        .errors("the grid has fewer than 2 x 2 nodes")
        .source("Savitzky & Golay 1964, in two directions, for the default scheme")
        .example(
            with_a_flow!("flow.gradient(#{ scheme: \"central\" })"),
            "gradient field, 33 x 33 nodes, 2.5 px apart, from (0, 0) px; by central",
        )
        .does(|flow: &VectorField, options: Optional<GradientOptions>| {
            flow.gradient(options.0.scheme)
        });
}

/// The fault for a word that is none of those known.
pub(super) fn unknown_word(what: &str, given: &str, known: &[&str]) -> Fault {
    let fault = Fault::new(format!("there is no {what} \"{given}\""));
    match nearest(given, known.iter().copied()) {
        Some(word) => fault.hint(format!("did you mean \"{word}\"?")),
        None => fault.hint(format!("there is: {}", known.join(", "))),
    }
}

fn files(room: &mut Room) {
    room.method::<VectorField>("save")
        .about(
            "Writes the field as CSV: x, y, u, v, their uncertainties where known, and status, \
             with units in the header.",
        )
        .words("write export csv file table")
        .input("file", "", "file name, below the output folder")
        .errors("the name does not end in .csv, .txt or .dat, or the file cannot be written")
        .example(with_a_flow!("flow.save(\"flow.csv\")"), "")
        .does(|flow: &VectorField, file: String, call: Call| {
            call.write(table_name(&file)?, |path| save_vectors(flow, path))
        });
    room.function("read_vectors")
        .about(
            "The vector field in a table of x, y, u, v on a regular grid: comma-separated or in \
             columns, rows in any order. Gaps become masked cells.",
        )
        .words("read open load import csv table file vectors")
        .input("file", "", "file name")
        .unit("as the header says; px/frame where it is silent")
        .errors("the file is no such table, or its points lie on no regular grid")
        .example(
            with_a_flow!("flow.save(\"flow.csv\");\nread_vectors(\"out/flow.csv\").status_count(\"measured\")"),
            "1089",
        )
        .does(|file: String, call: Call| {
            let path = call.existing(&file)?;
            Ok::<_, Fault>(read_vectors(&path)?)
        });
}

fn sampling(room: &mut Room) {
    room.method::<VectorField>("at")
        .about("The velocity at a point, as [u, v].")
        .words("sample value point interpolate")
        .input("x", "the field's length unit", "where, to the right")
        .input("y", "the field's length unit", "where, upwards")
        .unit("px/frame or mm/s")
        .errors("the point is outside the field or beside masked cells")
        .example(with_a_flow!("flow.at(5, 20)[1].unit"), "\"px/frame\"")
        .does(|flow: &VectorField, x: Length, y: Length| {
            let length = flow.grid.length;
            let (u, v) = flow.at(x.within(length)?, y.within(length)?)?;
            Ok::<_, Fault>(vec![present(u, flow.unit())?, present(v, flow.unit())?])
        });
    room.method::<ScalarField>("at")
        .about("The value at a point.")
        .words("sample point interpolate")
        .input("x", "the field's length unit", "where, to the right")
        .input("y", "the field's length unit", "where, upwards")
        .unit("that of the field")
        .errors("the point is outside the field or beside masked cells")
        .example(
            with_a_flow!("flow.gradient().vorticity().at(40, 40)"),
            "0.1994 ± ? 1/frame",
        )
        .does(|field: &ScalarField, x: Length, y: Length| {
            let length = field.grid.length;
            let value = field.at(x.within(length)?, y.within(length)?)?;
            present(value, field.unit)
        });
    room.method::<ScalarField>("along")
        .about("The values along a straight line, evenly spaced.")
        .words("profile line cut transect sample trace")
        .input("from", "the field's length unit", "where the line starts")
        .input("to", "the field's length unit", "where it ends")
        .unit("that of the field")
        .errors("the line leaves the field, or has fewer than two points or more than a million")
        .example(
            with_a_flow!("flow.speed().along([0, 40], [80, 40], #{ points: 41 })"),
            "trace of speed, 41 points over 80 px",
        )
        .does(
            |field: &ScalarField, from: Point, to: Point, options: Optional<AlongOptions>| {
                let length = field.grid.length;
                let (from, to) = (from.within(length)?, to.within(length)?);
                Ok::<_, Fault>(field.along(from, to, options.0.points)?)
            },
        );
    room.method::<VectorField>("along")
        .about("The traces of u and of v along a straight line, as [u, v].")
        .words("profile line cut transect sample trace")
        .input("from", "the field's length unit", "where the line starts")
        .input("to", "the field's length unit", "where it ends")
        .unit("px/frame or mm/s")
        .errors("the line leaves the field, or has fewer than two points or more than a million")
        .example(
            with_a_flow!("flow.along([0, 40], [80, 40])[1].name"),
            "\"v\"",
        )
        .does(
            |flow: &VectorField, from: Point, to: Point, options: Optional<AlongOptions>| {
                let length = flow.grid.length;
                let (from, to) = (from.within(length)?, to.within(length)?);
                let (u, v) = flow.along(from, to, options.0.points)?;
                Ok::<_, Fault>(vec![u, v])
            },
        );
}

/// A value that is there, as a measured value whose uncertainty nothing has said yet.
pub(super) fn present(value: f64, unit: Unit) -> Result<Measured, Fault> {
    if value.is_nan() {
        return Err(Fault::new(
            "the point lies beside masked cells and has no value",
        ));
    }
    Ok(Measured::without_uncertainty(value, unit))
}

#[allow(clippy::type_complexity)] // The table is read once, just below.
fn of_gradients(room: &mut Room) {
    type Read = fn(&Gradient) -> ScalarField;
    let rules: [(&str, &str, &str, &str, &str, (&str, &str), Read); 8] = [
        (
            "vorticity",
            "Vorticity dv/dx - du/dy, positive counter-clockwise.",
            "rotation curl",
            "1/frame or 1/s",
            "",
            (
                with_a_flow!("flow.gradient().vorticity().name"),
                "\"vorticity\"",
            ),
            Gradient::vorticity,
        ),
        (
            "divergence",
            "Divergence du/dx + dv/dy in the plane: what is left in two-dimensional flow is noise or motion through the sheet.",
            "continuity out of plane",
            "1/frame or 1/s",
            "",
            (
                with_a_flow!("flow.gradient().divergence().name"),
                "\"divergence\"",
            ),
            Gradient::divergence,
        ),
        (
            "swirl",
            "Swirling strength, the imaginary part of the gradient's complex eigenvalues, with the sign of the vorticity; 0 where they are real.",
            "swirling strength vortex core eigenvalue rotation",
            "1/frame or 1/s",
            "Zhou, Adrian, Balachandar & Kendall 1999; Wu & Christensen 2006 (sign)",
            (with_a_flow!("flow.gradient().swirl().unit"), "\"1/frame\""),
            Gradient::swirl,
        ),
        (
            "q",
            "Q, half of rotation squared less strain squared: above 0 where rotation outweighs strain.",
            "vortex criterion rotation strain okubo weiss",
            "1/frame² or 1/s²",
            "Hunt, Wray & Moin 1988",
            (with_a_flow!("flow.gradient().q().unit"), "\"1/frame²\""),
            Gradient::q,
        ),
        (
            "strain",
            "Magnitude of the rate of strain, sqrt(2 s_ij s_ij): the shear rate in plain shear, 0 in solid rotation.",
            "deformation shear rate",
            "1/frame or 1/s",
            "",
            (with_a_flow!("flow.gradient().strain().name"), "\"strain\""),
            Gradient::strain,
        ),
        (
            "strain_xx",
            "Rate of strain along x, du/dx.",
            "deformation stretching",
            "1/frame or 1/s",
            "",
            (
                with_a_flow!("flow.gradient().strain_xx().unit"),
                "\"1/frame\"",
            ),
            Gradient::strain_xx,
        ),
        (
            "strain_yy",
            "Rate of strain along y, dv/dy.",
            "deformation stretching",
            "1/frame or 1/s",
            "",
            (
                with_a_flow!("flow.gradient().strain_yy().unit"),
                "\"1/frame\"",
            ),
            Gradient::strain_yy,
        ),
        (
            "strain_xy",
            "Rate of shear strain, half of du/dy + dv/dx.",
            "deformation shear",
            "1/frame or 1/s",
            "",
            (
                with_a_flow!("flow.gradient().strain_xy().unit"),
                "\"1/frame\"",
            ),
            Gradient::strain_xy,
        ),
    ];
    for (name, about, words, unit, source, example, read) in rules {
        room.method::<Gradient>(name)
            .about(about)
            .words(words)
            .unit(unit)
            .source(source)
            .example(example.0, example.1)
            .does(move |gradient: &Gradient| read(gradient));
    }
    room.property::<Gradient>("scheme")
        .about("The difference scheme that made it.")
        .words("derivative method")
        .example(with_a_flow!("flow.gradient().scheme"), "\"cubic_fit\"")
        .does(|gradient: &Gradient| gradient.scheme.text());
}

#[allow(clippy::type_complexity)] // The table is read once, just below.
fn of_scalars(room: &mut Room) {
    room.property::<ScalarField>("name")
        .about("What the values are, in words.")
        .words("label title")
        .example(with_a_flow!("(flow.u * 2).name"), "\"u * 2\"")
        .does(|field: &ScalarField| field.name.clone());
    room.property::<ScalarField>("unit")
        .about("Unit of the values, as text.")
        .words("dimension")
        .example(
            with_a_flow!("flow.gradient().vorticity().unit"),
            "\"1/frame\"",
        )
        .does(|field: &ScalarField| field.unit.to_string());
    type Reduce = fn(&ScalarField) -> Option<f64>;
    let rules: [(&str, &str, &str, (&str, &str), Reduce); 4] = [
        (
            "min",
            "The least value.",
            "smallest lowest",
            (with_a_flow!("flow.u.min()"), "-0.6366 ± ? px/frame"),
            ScalarField::min,
        ),
        (
            "max",
            "The greatest value.",
            "largest highest",
            (with_a_flow!("flow.u.max()"), "0.6366 ± ? px/frame"),
            ScalarField::max,
        ),
        (
            "mean",
            "The mean over the cells that have a value.",
            "average",
            (
                with_a_flow!("(flow.u * 0 + 1 * flow.u.max()).mean()"),
                "0.6366 ± ? px/frame",
            ),
            ScalarField::mean,
        ),
        (
            "rms",
            "Root of the mean square over the cells that have a value.",
            "root mean square fluctuation",
            (
                with_a_flow!("(flow.u * 0 + flow.u.max()).rms()"),
                "0.6366 ± ? px/frame",
            ),
            ScalarField::rms,
        ),
    ];
    for (name, about, words, example, reduce) in rules {
        room.method::<ScalarField>(name)
            .about(about)
            .words(words)
            .unit("that of the field")
            .errors("no cell has a value")
            .example(example.0, example.1)
            .does(move |field: &ScalarField| {
                reduce(field)
                    .map(|value| Measured::without_uncertainty(value, field.unit))
                    .ok_or_else(|| Fault::new(format!("no cell of {} has a value", field.name)))
            });
    }
}

fn of_traces(room: &mut Room) {
    type Read = fn(&Trace) -> Vec<f64>;
    let rules: [(&str, &str, &str, &str, &str, Read); 4] = [
        (
            "x",
            "x of each point.",
            "position",
            "the field's length unit",
            "[0, 40, 80]",
            |t| t.x.clone(),
        ),
        (
            "y",
            "y of each point.",
            "position",
            "the field's length unit",
            "[40, 40, 40]",
            |t| t.y.clone(),
        ),
        (
            "distance",
            "Distance of each point from the first.",
            "length abscissa",
            "the field's length unit",
            "[0, 40, 80]",
            |t| t.distance.clone(),
        ),
        (
            "values",
            "The value at each point; NaN beside masked cells.",
            "numbers ordinate",
            "that of the field",
            "[0, 0, 0]",
            |t| t.values.clone(),
        ),
    ];
    for (name, about, words, unit, output, read) in rules {
        let code = match name {
            "x" => with_a_flow!("flow.u.along([0, 40], [80, 40], #{ points: 3 }).x"),
            "y" => with_a_flow!("flow.u.along([0, 40], [80, 40], #{ points: 3 }).y"),
            "distance" => with_a_flow!("flow.u.along([0, 40], [80, 40], #{ points: 3 }).distance"),
            _ => with_a_flow!("(flow.u * 0).along([0, 40], [80, 40], #{ points: 3 }).values"),
        };
        room.property::<Trace>(name)
            .about(about)
            .words(words)
            .unit(unit)
            .example(code, output)
            .does(move |trace: &Trace| read(trace));
    }
    room.property::<Trace>("name")
        .about("What the values are, in words.")
        .words("label title")
        .example(
            with_a_flow!("flow.u.along([0, 40], [80, 40]).name"),
            "\"u\"",
        )
        .does(|trace: &Trace| trace.name.clone());
    room.property::<Trace>("unit")
        .about("Unit of the values, as text.")
        .words("dimension")
        .example(
            with_a_flow!("flow.u.along([0, 40], [80, 40]).unit"),
            "\"px/frame\"",
        )
        .does(|trace: &Trace| trace.unit.to_string());
}

/// A number or measured value, as a measured value.
pub(super) fn quantity(value: NumberOr<Measured>) -> Arc<Measured> {
    match value {
        NumberOr::Number(x) => Arc::new(Measured::exact(x, Unit::ONE)),
        NumberOr::Other(m) => m,
    }
}
