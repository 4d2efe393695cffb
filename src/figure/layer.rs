//! What lies on a figure, and what each layer asks of the axes.

use std::sync::Arc;

use super::arrows::ArrowOptions;
use super::axis::Span;
use super::curve::{Bars, Curve, Look};
use super::error::FigureError;
use super::marks::MarkSet;
use super::outlines::OutlineSet;
use super::shade::ShadeOptions;
use crate::field::{Grid, ScalarField, VectorField};
use crate::quantity::Unit;

/// One layer; its data are shared, so copies of a figure cost little.
#[derive(Clone, Debug)]
pub(crate) enum Layer {
    Shade(Arc<ScalarField>, ShadeOptions),
    Arrows(Arc<VectorField>, ArrowOptions),
    Outlines(Arc<OutlineSet>),
    Marks(Arc<MarkSet>),
    Line(Arc<Curve>),
    Points(Arc<Curve>),
    /// Points with the line fitted to them.
    Fitted(Arc<Curve>, Arc<Curve>),
    Bars(Arc<Bars>),
    /// An upright line at x with its label.
    Marker(f64, String),
    /// A level line at y with its label.
    Level(f64, String),
}

/// The spans of x and y that show a grid whole: half a cell beyond its outermost nodes.
fn grid_spans(grid: &Grid) -> (Span, Span) {
    let half = |lo: f64, hi: f64, d: f64| Span {
        lo: lo - 0.5 * d,
        hi: hi + 0.5 * d,
    };
    (
        half(grid.x0, grid.x1(), grid.dx),
        half(grid.y0, grid.y1(), grid.dy),
    )
}

impl Layer {
    /// What the layer is called in messages.
    pub fn name(&self) -> String {
        match self {
            Layer::Shade(field, _) => field.name.clone(),
            Layer::Arrows(..) => "the vector field".to_owned(),
            Layer::Outlines(_) => "the outlines".to_owned(),
            Layer::Marks(_) => "the marks".to_owned(),
            Layer::Line(c) | Layer::Points(c) | Layer::Fitted(c, _) => c.name.clone(),
            Layer::Bars(b) => b.name.clone(),
            Layer::Marker(..) => "the marker".to_owned(),
            Layer::Level(..) => "the level".to_owned(),
        }
    }

    /// True for layers in the plane of the light sheet, whose axes are lengths of equal scale.
    pub fn is_map(&self) -> bool {
        matches!(
            self,
            Layer::Shade(..) | Layer::Arrows(..) | Layer::Outlines(_) | Layer::Marks(_)
        )
    }

    /// Units of x and y; `None` for lines that take the axes as they find them.
    pub fn units(&self) -> Option<(Unit, Unit)> {
        match self {
            Layer::Shade(f, _) => Some((f.grid.length, f.grid.length)),
            Layer::Arrows(f, _) => Some((f.grid.length, f.grid.length)),
            Layer::Outlines(set) => Some((set.length, set.length)),
            Layer::Marks(set) => Some((set.unit, set.unit)),
            Layer::Line(c) | Layer::Points(c) | Layer::Fitted(c, _) => Some((c.x_unit, c.y_unit)),
            Layer::Bars(b) => Some((b.x_unit, b.y_unit)),
            Layer::Marker(..) | Layer::Level(..) => None,
        }
    }

    /// What the layer needs of x and of y.
    pub fn spans(&self, log: (bool, bool)) -> (Span, Span) {
        match self {
            Layer::Shade(f, _) => grid_spans(&f.grid),
            Layer::Arrows(f, _) => grid_spans(&f.grid),
            Layer::Outlines(set) => {
                let points = || {
                    set.list
                        .iter()
                        .flat_map(|o| o.polygon.iter().chain([&o.centre]))
                };
                (
                    Span::of(points().map(|p| p[0])),
                    Span::of(points().map(|p| p[1])),
                )
            }
            Layer::Marks(set) => set.spans(),
            Layer::Line(c) | Layer::Points(c) => c.spans(log),
            Layer::Fitted(points, line) => {
                let ((mut x, mut y), line) = (points.spans(log), line.spans(log));
                x.join(line.0);
                y.join(line.1);
                (x, y)
            }
            Layer::Bars(b) => b.spans(log),
            Layer::Marker(x, _) => (Span::of([*x]), Span::NOTHING),
            Layer::Level(y, _) => (Span::NOTHING, Span::of([*y])),
        }
    }

    /// Names of x and y as the axes show them; empty where there is none.
    pub fn axis_names(&self) -> (&str, &str) {
        match self {
            Layer::Line(c) | Layer::Points(c) | Layer::Fitted(c, _) => (&c.x_name, &c.name),
            Layer::Bars(b) => (&b.x_name, &b.name),
            layer if layer.is_map() => ("x", "y"),
            _ => ("", ""),
        }
    }

    /// What a legend shows of it.
    pub fn legend(&self) -> Option<(Look, &str)> {
        match self {
            Layer::Line(c) => Some((Look::Line, &c.name)),
            Layer::Points(c) => Some((Look::Points, &c.name)),
            Layer::Fitted(c, _) => Some((Look::Fitted, &c.name)),
            Layer::Bars(b) => Some((Look::Bars, &b.name)),
            _ => None,
        }
    }

    pub fn check(&self) -> Result<(), FigureError> {
        match self {
            Layer::Line(c) | Layer::Points(c) => c.check(),
            Layer::Fitted(points, line) => points.check().and_then(|()| line.check()),
            Layer::Bars(b) => b.check(),
            Layer::Marker(v, label) | Layer::Level(v, label) if !v.is_finite() => {
                Err(FigureError::NothingFinite(format!("the line {label:?}")))
            }
            _ => Ok(()),
        }
    }
}
