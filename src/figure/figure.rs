//! The figure as its maker sees it: layers, words and sizes, put together step by step.

use std::path::Path;
use std::sync::Arc;

use super::arrows::ArrowOptions;
use super::curve::{Bars, Curve};
use super::error::FigureError;
use super::layer::Layer;
use super::marks::MarkSet;
use super::outlines::OutlineSet;
use super::scene::Scene;
use super::shade::ShadeOptions;
use super::{panels, raster, sheet, svg};
use crate::field::{ScalarField, Trace, VectorField};
use crate::store::write_atomically;

/// Dots per inch of a PNG that is saved by name alone, and of shading inside an SVG.
pub const DOTS_PER_INCH: f64 = 300.0;

/// A figure: layers on one pair of axes, or panels beside each other.
///
/// Every step takes the figure and gives the changed one back; a clone costs little and is
/// independent of the original. Nothing is checked or drawn before [`Figure::svg`],
/// [`Figure::png`] or [`Figure::save`]. The same figure gives the same bytes every time.
///
/// ```
/// use kolk::figure::{Curve, Figure};
/// # fn main() -> Result<(), kolk::figure::FigureError> {
/// let decay = Curve::new("circulation", vec![0.0, 1.0, 2.0], vec![1.0, 0.8, 0.7]);
/// let figure = Figure::new().line(decay).title("Decay of the leading eddy");
/// assert!(figure.svg()?.contains("Decay of the leading eddy"));
/// assert!(Figure::new().svg().is_err());
/// # Ok(())
/// # }
/// ```
#[derive(Clone, Debug, Default)]
pub struct Figure {
    pub(crate) layers: Vec<Layer>,
    pub(crate) panels: Vec<Figure>,
    pub(crate) columns: usize,
    pub(crate) title: Option<String>,
    pub(crate) caption: Option<String>,
    pub(crate) x_label: Option<String>,
    pub(crate) y_label: Option<String>,
    pub(crate) width_mm: Option<f64>,
    pub(crate) height_mm: Option<f64>,
    pub(crate) x_range: Option<(f64, f64)>,
    pub(crate) y_range: Option<(f64, f64)>,
    pub(crate) log_x: bool,
    pub(crate) log_y: bool,
}

impl Figure {
    /// An empty sheet.
    pub fn new() -> Self {
        Self::default()
    }

    /// Figures side by side in rows of `columns` (0 counts as 1), read like lines of text.
    ///
    /// Each keeps its own axes and title; the size given to the whole is shared out, sizes given
    /// to the parts do not count.
    pub fn panels(figures: Vec<Figure>, columns: usize) -> Self {
        Self {
            panels: figures,
            columns: columns.max(1),
            ..Self::default()
        }
    }

    fn with(mut self, layer: Layer) -> Self {
        self.layers.push(layer);
        self
    }

    /// Shades a scalar field, with a colour bar; cells without a value are hatched.
    pub fn shade(self, field: impl Into<Arc<ScalarField>>, options: ShadeOptions) -> Self {
        self.with(Layer::Shade(field.into(), options))
    }

    /// Draws vectors as arrows, each with its middle at its node, and a reference arrow beside
    /// the plot. Replaced vectors are hollow, masked ones are left out, and so are those that
    /// would point over the frame or cross the mark or label of an outline.
    pub fn arrows(self, field: impl Into<Arc<VectorField>>, options: ArrowOptions) -> Self {
        self.with(Layer::Arrows(field.into(), options))
    }

    /// Draws closed outlines with centre, sense of rotation and label.
    pub fn outlines(self, outlines: impl Into<Arc<OutlineSet>>) -> Self {
        self.with(Layer::Outlines(outlines.into()))
    }

    /// Draws numbered places, and rectangles that bound a part of a map.
    pub fn marks(self, marks: impl Into<Arc<MarkSet>>) -> Self {
        self.with(Layer::Marks(marks.into()))
    }

    /// Draws a curve, with a band where it has one.
    pub fn line(self, curve: impl Into<Arc<Curve>>) -> Self {
        self.with(Layer::Line(curve.into()))
    }

    /// Draws points, with upright bars where the curve has a band.
    pub fn points(self, curve: impl Into<Arc<Curve>>) -> Self {
        self.with(Layer::Points(curve.into()))
    }

    /// Draws points with the line that was fitted to them, in one colour and as one entry of the
    /// legend, which has the points' name.
    pub fn fitted(self, points: impl Into<Arc<Curve>>, line: impl Into<Arc<Curve>>) -> Self {
        self.with(Layer::Fitted(points.into(), line.into()))
    }

    /// Draws values along a line through a field against the distance along it.
    pub fn trace(self, trace: &Trace) -> Self {
        self.line(Curve::from(trace))
    }

    /// Draws bars, such as those of a histogram.
    pub fn bars(self, bars: impl Into<Arc<Bars>>) -> Self {
        self.with(Layer::Bars(bars.into()))
    }

    /// Marks a place on the x axis with an upright dashed line; `x` is in the axis' unit.
    pub fn marker(self, x: f64, label: &str) -> Self {
        self.with(Layer::Marker(x, label.to_owned()))
    }

    /// Marks a height on the y axis with a level dashed line; `y` is in the axis' unit.
    pub fn level(self, y: f64, label: &str) -> Self {
        self.with(Layer::Level(y, label.to_owned()))
    }

    /// Words over the figure; long ones are broken into lines.
    pub fn title(mut self, words: &str) -> Self {
        self.title = Some(words.to_owned());
        self
    }

    /// Words under the figure; long ones are broken into lines.
    pub fn caption(mut self, words: &str) -> Self {
        self.caption = Some(words.to_owned());
        self
    }

    /// Words along the x axis, in place of its name; the unit is added.
    pub fn x_label(mut self, words: &str) -> Self {
        self.x_label = Some(words.to_owned());
        self
    }

    /// Words over the y axis, in place of its name; the unit is added.
    pub fn y_label(mut self, words: &str) -> Self {
        self.y_label = Some(words.to_owned());
        self
    }

    /// Size on paper in mm. By default 120 mm wide and as high as the content asks.
    ///
    /// A map, having one scale along both axes, may need less than the height; the sheet then ends
    /// below it.
    pub fn size_mm(mut self, width: f64, height: f64) -> Self {
        self.width_mm = Some(width);
        self.height_mm = Some(height);
        self
    }

    /// Width on paper in mm; the height follows from the content.
    pub fn width_mm(mut self, width: f64) -> Self {
        self.width_mm = Some(width);
        self
    }

    /// Ends of the x axis, in its unit; by default all that is drawn.
    pub fn x_range(mut self, lo: f64, hi: f64) -> Self {
        self.x_range = Some((lo, hi));
        self
    }

    /// Ends of the y axis, in its unit; by default all that is drawn.
    pub fn y_range(mut self, lo: f64, hi: f64) -> Self {
        self.y_range = Some((lo, hi));
        self
    }

    /// Counts decades along x; numbers not above zero are left out.
    pub fn log_x(mut self) -> Self {
        self.log_x = true;
        self
    }

    /// Counts decades along y; numbers not above zero are left out.
    pub fn log_y(mut self) -> Self {
        self.log_y = true;
        self
    }

    pub(crate) fn scene(&self, dots_per_mm: f64) -> Result<Scene, FigureError> {
        if self.panels.is_empty() {
            sheet::scene(self, dots_per_mm)
        } else {
            panels::scene(self, dots_per_mm)
        }
    }

    /// The figure as an SVG document: sized in mm, all words as outlines (each with the words
    /// themselves in its `aria-label`), shading as an embedded PNG.
    ///
    /// # Errors
    /// [`FigureError`] when there is nothing to draw, units clash, or an option makes no sense.
    pub fn svg(&self) -> Result<String, FigureError> {
        let scene = self.scene(DOTS_PER_INCH / 25.4)?;
        svg::write(&scene, self.title.as_deref().unwrap_or("figure"))
    }

    /// The figure as PNG with `dots_per_inch` dots per inch (20 to 2400).
    ///
    /// # Errors
    /// As [`Figure::svg`], and when the dots would be too many.
    pub fn png(&self, dots_per_inch: f64) -> Result<Vec<u8>, FigureError> {
        if !(20.0..=2400.0).contains(&dots_per_inch) {
            return Err(FigureError::Option {
                option: "dots_per_inch",
                value: dots_per_inch.to_string(),
                right: "20 to 2400",
            });
        }
        let dots_per_mm = dots_per_inch / 25.4;
        raster::write(&self.scene(dots_per_mm)?, dots_per_mm)
    }

    /// Writes the figure to `path` as its extension says: `.svg`, or `.png` with
    /// [`DOTS_PER_INCH`]. The file appears whole or not at all.
    ///
    /// # Errors
    /// As [`Figure::svg`]; an extension that is neither; a file that cannot be written.
    pub fn save(&self, path: &Path) -> Result<(), FigureError> {
        let extension = path.extension().and_then(|e| e.to_str()).unwrap_or("");
        let bytes = match extension.to_ascii_lowercase().as_str() {
            "svg" => self.svg()?.into_bytes(),
            "png" => self.png(DOTS_PER_INCH)?,
            _ => return Err(FigureError::Extension(path.to_owned())),
        };
        write_atomically(path, |file| file.write_all(&bytes))?;
        Ok(())
    }
}
