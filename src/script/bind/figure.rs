//! Figures.

use std::sync::Arc;

use super::super::argument::NumberOr;
use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::super::options::Optional;
use super::field::quantity;
use super::quantity::unit;
use super::values::AlongAxis;
use super::vortex::{Found, FoundEddies};
use crate::field::{ScalarField, Trace, VectorField};
use crate::figure::{
    ArrowOptions, Bars, Curve, Figure, FigureError, OutlineSet, ShadeOptions, eddy_transect,
};
use crate::quantity::Measured;

impl Kind for Figure {
    const NAME: &'static str = "figure";
    const ABOUT: &'static str = "Layers on one pair of axes, put together step by step; each step gives \
        a new figure. Nothing is drawn before it is saved.";

    fn show(&self) -> String {
        "figure; save(\"name.svg\") or save(\"name.png\") writes it".to_owned()
    }
}

crate::option_keys! {
    ShadeOptions {
        scale: "one of \"silt\" or \"ebb_flood\"", "", "none",
            "The colour scale; left out, \"ebb_flood\" where the field takes both signs, else \"silt\".";
        range: "list [low, high] of numbers", "the field's unit", "none",
            "Values at the ends of the scale; left out, the field's own range.";
        cells: "true/false", "", "false",
            "Draw every cell in one colour rather than smoothly between the nodes.";
        label: "text", "", "none", "Words over the colour bar; left out, the field's name.";
    }
}
crate::option_keys! {
    ArrowOptions {
        every: "whole number", "count", "none", "Draw every n-th vector along each axis.";
        spacing_mm: "number", "mm on paper", "none", "Least distance between arrows; left out, 3.4.";
        reference_mm: "number", "mm on paper", "none", "Length of the reference arrow.";
        reference: "number", "the field's unit", "none", "Speed the reference arrow stands for.";
    }
}
crate::options! {
    /// What a curve is called and measured in.
    pub(super) struct CurveOptions {
        name: String = String::new(), "text", "", "What it is called in the key.";
        x_name: String = String::new(), "text", "", "What x is.";
        y_name: String = String::new(), "text", "", "What y is; left out, the name.";
        x_unit: String = String::new(), "text", "", "Unit of x, such as \"mm\"; left out, that of the measured values.";
        y_unit: String = String::new(), "text", "", "Unit of y, such as \"mm/s\"; left out, that of the measured values.";
        band: Vec<f64> = Vec::new(), "list of numbers", "that of y", "Half width of the band or bar at each point; left out, the standard uncertainty where every y has one.";
    }
}

/// A small map the examples draw.
macro_rules! with_a_map {
    ($code:literal) => {
        concat!(
            "let flow = taylor_green(#{ wavelength_px: 40, peak_vorticity_per_frame: 0.2 }).field(#{ nx: 33, ny: 33, spacing_px: 2.5 });\n",
            $code
        )
    };
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Figure>();
    room.function("figure")
        .about("An empty sheet to put layers on.")
        .words("plot draw map graph image picture")
        .example(
            with_a_map!("figure().shade(flow.speed()).arrows(flow).save(\"map.svg\")"),
            "",
        )
        .does(Figure::new);
    maps(room);
    curves(room);
    words(room);
    sheet(room);
    evidence(room);
}

fn maps(room: &mut Room) {
    room.method::<Figure>("shade")
        .about("Shades a scalar field, with a colour bar; cells without a value are hatched.")
        .words("colour map contour background")
        .input("field", "any", "the field")
        .example(
            with_a_map!("figure().shade(flow.u, #{ scale: \"ebb_flood\" }).save(\"u.png\")"),
            "",
        )
        .does(
            |figure: &Figure, field: Arc<ScalarField>, options: Optional<ShadeOptions>| {
                figure.clone().shade(field, options.0)
            },
        );
    room.method::<Figure>("arrows")
        .about("Draws vectors as arrows, with a reference arrow beside the plot; replaced vectors are hollow.")
        .words("vectors velocity direction field")
        .input("field", "px/frame or mm/s", "the vector field")
        .example(with_a_map!("figure().arrows(flow, #{ every: 2 }).save(\"flow.svg\")"), "")
        .does(|figure: &Figure, field: Arc<VectorField>, options: Optional<ArrowOptions>| {
            figure.clone().arrows(field, options.0)
        });
    room.method::<Figure>("outlines")
        .about("Draws the boundaries of eddies with their numbers; dashed where a flag casts doubt on one.")
        .words("eddies boundary contour")
        .input("eddies", "", "the eddies of a field")
        .example(with_a_map!("figure().shade(flow.speed()).outlines(flow.eddies()).save(\"eddies.svg\")"), "")
        .does(|figure: &Figure, found: Arc<FoundEddies>| {
            figure.clone().outlines(OutlineSet::from(&*found.0))
        });
}

fn curve(x: &AlongAxis, y: &AlongAxis, options: &CurveOptions) -> Result<Curve, Fault> {
    let x = x.in_unit_named(&options.x_unit)?;
    let y = y.in_unit_named(&options.y_unit)?;
    let curve = Curve::new(&options.name, x.values, y.values)
        .units(x.unit, y.unit)
        .x_name(&options.x_name);
    Ok(if !options.band.is_empty() {
        curve.band(options.band.clone())
    } else if let Some(unc) = y.unc {
        curve.band(unc)
    } else {
        curve
    })
}

/// The figure with what the options say of its y axis.
fn with_y_name(figure: Figure, options: &CurveOptions) -> Figure {
    if options.y_name.is_empty() {
        figure
    } else {
        figure.y_label(&options.y_name)
    }
}

fn curves(room: &mut Room) {
    room.method::<Figure>("line")
        .about("Draws a curve through points, with a band where one is given or every y has its uncertainty; () leaves a gap.")
        .words("plot graph curve xy")
        .input("x", "as x_unit says, or its own", "abscissae: numbers or measured values")
        .input("y", "as y_unit says, or its own", "ordinates, as many: numbers or measured values")
        .errors("a unit is not known, units measure different things, or a list mixes numbers and measured values")
        .example("figure().line([0, 1, 2], [1, 0.8, 0.7], #{ name: \"decay\", x_unit: \"s\" }).save(\"decay.svg\")", "")
        .does(|figure: &Figure, x: AlongAxis, y: AlongAxis, options: Optional<CurveOptions>| {
            let curve = curve(&x, &y, &options.0)?;
            Ok::<_, Fault>(with_y_name(figure.clone().line(curve), &options.0))
        });
    room.method::<Figure>("points")
        .about("Draws points, with upright bars where a band is given or every y has its uncertainty; () leaves one out.")
        .words("plot scatter dots markers error bars")
        .input("x", "as x_unit says, or its own", "abscissae: numbers or measured values")
        .input("y", "as y_unit says, or its own", "ordinates, as many: numbers or measured values")
        .errors("a unit is not known, units measure different things, or a list mixes numbers and measured values")
        .example("figure().points([0, 1, 2], [1, 0.8, 0.7], #{ band: [0.1, 0.1, 0.1] }).save(\"points.svg\")", "")
        .does(|figure: &Figure, x: AlongAxis, y: AlongAxis, options: Optional<CurveOptions>| {
            let curve = curve(&x, &y, &options.0)?;
            Ok::<_, Fault>(with_y_name(figure.clone().points(curve), &options.0))
        });
    room.method::<Figure>("trace")
        .about("Draws values along a line through a field against the distance along it.")
        .words("profile cut transect line")
        .input("trace", "any", "the trace")
        .example(
            with_a_map!("figure().trace(flow.u.along([0, 40], [80, 40])).save(\"cut.svg\")"),
            "",
        )
        .does(|figure: &Figure, trace: Arc<Trace>| figure.clone().trace(&trace));
    room.method::<Figure>("histogram")
        .about("Draws how many of the numbers fall into each of equal intervals.")
        .words("bars distribution count frequency")
        .input("values", "as the unit says", "the numbers")
        .input("name", "", "what they are")
        .input("unit", "", "their unit; plain numbers when left out")
        .errors("the unit is not known")
        .source("Freedman & Diaconis 1981, for the width of the intervals")
        .example(
            "figure().histogram([1, 2, 2, 3, 3, 3], \"width\", \"mm\").save(\"widths.svg\")",
            "",
        )
        .does(
            |figure: &Figure, values: Vec<f64>, name: String, of: Option<String>| {
                let of = unit(&of.unwrap_or_default())?;
                Ok::<_, Fault>(
                    figure
                        .clone()
                        .bars(Bars::histogram(&values, &name, of, None)),
                )
            },
        );
}

fn words(room: &mut Room) {
    room.method::<Figure>("title")
        .about("Words over the figure.")
        .words("heading caption text")
        .input("words", "", "the title")
        .example(
            "figure().line([0, 1], [0, 1]).title(\"A line\").save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure, words: String| figure.clone().title(&words));
    room.method::<Figure>("caption")
        .about("Words under the figure; long ones are broken into lines.")
        .words("legend note text below")
        .input("words", "", "the caption")
        .example(
            "figure().line([0, 1], [0, 1]).caption(\"Drawn from memory.\").save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure, words: String| figure.clone().caption(&words));
    room.method::<Figure>("x_label")
        .about("Words along the x axis; the unit is added.")
        .words("axis name text")
        .input("words", "", "the label")
        .example(
            "figure().line([0, 1], [0, 1]).x_label(\"time\").save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure, words: String| figure.clone().x_label(&words));
    room.method::<Figure>("y_label")
        .about("Words over the y axis; the unit is added.")
        .words("axis name text")
        .input("words", "", "the label")
        .example(
            "figure().line([0, 1], [0, 1]).y_label(\"height\").save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure, words: String| figure.clone().y_label(&words));
    room.method::<Figure>("marker")
        .about("Marks a place on the x axis with an upright dashed line.")
        .words("vertical line annotate")
        .input("x", "that of the axis", "where")
        .input("words", "", "its label; none when left out")
        .example(
            "figure().line([0, 1], [0, 1]).marker(0.5, \"middle\").save(\"line.svg\")",
            "",
        )
        .does(
            |figure: &Figure, x: NumberOr<Measured>, words: Option<String>| {
                figure
                    .clone()
                    .marker(quantity(x).value(), &words.unwrap_or_default())
            },
        );
    room.method::<Figure>("level")
        .about("Marks a height on the y axis with a level dashed line.")
        .words("horizontal line annotate threshold")
        .input("y", "that of the axis", "where")
        .input("words", "", "its label; none when left out")
        .example(
            "figure().line([0, 1], [0, 1]).level(0.5, \"half\").save(\"line.svg\")",
            "",
        )
        .does(
            |figure: &Figure, y: NumberOr<Measured>, words: Option<String>| {
                figure
                    .clone()
                    .level(quantity(y).value(), &words.unwrap_or_default())
            },
        );
}

fn sheet(room: &mut Room) {
    room.method::<Figure>("size_mm")
        .about("Size on paper; left out, 120 mm wide and as high as the content asks.")
        .words("width height paper")
        .input("width", "mm", "width on paper")
        .input(
            "height",
            "mm",
            "height on paper; as the content asks when left out",
        )
        .example(
            "figure().line([0, 1], [0, 1]).size_mm(85, 60).save(\"line.svg\")",
            "",
        )
        .does(
            |figure: &Figure, width: f64, height: Option<f64>| match height {
                Some(height) => figure.clone().size_mm(width, height),
                None => figure.clone().width_mm(width),
            },
        );
    room.method::<Figure>("x_range")
        .about("Ends of the x axis; left out, all that is drawn.")
        .words("limits axis zoom")
        .input("low", "that of the axis", "its left end")
        .input("high", "that of the axis", "its right end")
        .example(
            "figure().line([0, 1], [0, 1]).x_range(0, 2).save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure, low: f64, high: f64| figure.clone().x_range(low, high));
    room.method::<Figure>("y_range")
        .about("Ends of the y axis; left out, all that is drawn.")
        .words("limits axis zoom")
        .input("low", "that of the axis", "its lower end")
        .input("high", "that of the axis", "its upper end")
        .example(
            "figure().line([0, 1], [0, 1]).y_range(0, 2).save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure, low: f64, high: f64| figure.clone().y_range(low, high));
    room.method::<Figure>("log_x")
        .about("Counts decades along x; numbers not above 0 are left out.")
        .words("logarithmic axis")
        .example(
            "figure().line([1, 10], [0, 1]).log_x().save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure| figure.clone().log_x());
    room.method::<Figure>("log_y")
        .about("Counts decades along y; numbers not above 0 are left out.")
        .words("logarithmic axis")
        .example(
            "figure().line([0, 1], [1, 10]).log_y().save(\"line.svg\")",
            "",
        )
        .does(|figure: &Figure| figure.clone().log_y());
    room.function("panels")
        .about("Figures side by side on one sheet, read like lines of text.")
        .words("grid side by side columns several")
        .input("figures", "", "the figures")
        .input("columns", "count", "how many stand side by side")
        .example(
            "let f = figure().line([0, 1], [0, 1]); panels([f, f], 2).save(\"two.svg\")",
            "",
        )
        .does(|figures: Vec<Arc<Figure>>, columns: usize| {
            Figure::panels(figures.iter().map(|f| (**f).clone()).collect(), columns)
        });
    room.method::<Figure>("save")
        .about("Writes the figure: .svg or .png by the ending of the name.")
        .words("write export file svg png")
        .input("file", "", "file name, below the output folder")
        .errors("there is nothing to draw, units clash, or the file cannot be written")
        .example("figure().line([0, 1], [0, 1]).save(\"line.png\")", "")
        .does(|figure: &Figure, file: String, call: Call| {
            call.write(&file, |path| {
                figure.save(path).map_err(|error| match error {
                    FigureError::Extension(_) => FigureError::Extension((&file).into()),
                    error => error,
                })
            })
        });
}

fn evidence(room: &mut Room) {
    room.method::<Found>("transect")
        .about(
            "The figure a careful person draws to check an eddy's width: vorticity and swirling \
             strength along x through its core, with the level and boundaries that were read off.",
        )
        .words("evidence profile cut width check core figure")
        .example(
            "let flow = shielded_gaussian(#{ x_px: 50, y_px: 50, core_radius_px: 15, peak_vorticity_per_frame: 0.3 }).field(#{ nx: 51, ny: 51, spacing_px: 2 });\nflow.eddies()[0].transect().save(\"transect.svg\")",
            "",
        )
        .does(|e: &Found| eddy_transect(&e.among, &e.eddy));
}
