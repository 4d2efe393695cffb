//! Curves with their bands, and points with their bars.

use super::axis::{Plot, Span};
use super::colour::{CURVES, Colour, PAPER};
use super::error::FigureError;
use super::placement::Placement;
use super::scene::{Path, Point, Rect, Scene, Stroke};
use super::ticks::{decimal, step_near};
use crate::field::Trace;
use crate::quantity::Unit;

/// Numbers along an axis: a curve, or points.
#[derive(Clone, Debug, PartialEq)]
pub struct Curve {
    /// What it is called in the legend.
    pub name: String,
    /// Abscissae.
    pub x: Vec<f64>,
    /// Ordinates, as many; NaN leaves a gap.
    pub y: Vec<f64>,
    /// Half width of the band about the curve, or of the bar through each point, in the unit of
    /// `y`; as many, NaN where unknown.
    pub band: Option<Vec<f64>>,
    /// What x is: "distance".
    pub x_name: String,
    /// Unit of `x`.
    pub x_unit: Unit,
    /// Unit of `y` and `band`.
    pub y_unit: Unit,
}

impl Curve {
    /// A curve of plain numbers.
    pub fn new(name: &str, x: Vec<f64>, y: Vec<f64>) -> Self {
        Self {
            name: name.to_owned(),
            x,
            y,
            band: None,
            x_name: String::new(),
            x_unit: Unit::ONE,
            y_unit: Unit::ONE,
        }
    }

    /// The same curve with its units.
    pub fn units(self, x_unit: Unit, y_unit: Unit) -> Self {
        Self {
            x_unit,
            y_unit,
            ..self
        }
    }

    /// The same curve with the name of its abscissa.
    pub fn x_name(self, name: &str) -> Self {
        Self {
            x_name: name.to_owned(),
            ..self
        }
    }

    /// The same curve with a band `half_width` to each side.
    pub fn band(self, half_width: Vec<f64>) -> Self {
        Self {
            band: Some(half_width),
            ..self
        }
    }

    pub(crate) fn check(&self) -> Result<(), FigureError> {
        let equal = |what, found: usize| {
            if found == self.x.len() {
                return Ok(());
            }
            let name = match self.name.as_str() {
                "" => "the curve".to_owned(),
                name => name.to_owned(),
            };
            Err(FigureError::LengthsDiffer {
                name,
                what,
                expected: self.x.len(),
                found,
            })
        };
        equal("y", self.y.len())?;
        equal("band", self.band.as_ref().map_or(self.x.len(), Vec::len))
    }

    /// Spans of what can be shown; numbers not above zero do not count on an axis of decades.
    pub(crate) fn spans(&self, log: (bool, bool)) -> (Span, Span) {
        let (mut x_span, mut y_span) = (Span::NOTHING, Span::NOTHING);
        let shown = |v: f64, log: bool| v.is_finite() && (!log || v > 0.0);
        for (k, (&x, &y)) in self.x.iter().zip(&self.y).enumerate() {
            if !shown(x, log.0) || !shown(y, log.1) {
                continue;
            }
            x_span.take(x);
            y_span.take(y);
            let half = self.half_width(k);
            for v in [y - half, y + half]
                .into_iter()
                .filter(|v| shown(*v, log.1))
            {
                y_span.take(v);
            }
        }
        (x_span, y_span)
    }

    fn half_width(&self, k: usize) -> f64 {
        let half = self.band.as_ref().map_or(0.0, |b| b[k].abs());
        if half.is_finite() { half } else { 0.0 }
    }

    /// Unbroken runs of the curve on the sheet, each point with the ends of its band.
    fn runs(&self, plot: &Plot) -> Vec<Vec<[Point; 3]>> {
        let mut runs = vec![Vec::new()];
        for k in 0..self.x.len() {
            let (x, y, half) = (self.x[k], self.y[k], self.half_width(k));
            match plot.at(x, y) {
                Some(p) => {
                    // A band that reaches zero on an axis of decades ends at the axis.
                    let low = plot.at(x, y - half).unwrap_or([p[0], plot.rect.bottom()]);
                    let high = plot.at(x, y + half).unwrap_or(p);
                    if let Some(run) = runs.last_mut() {
                        run.push([p, low, high]);
                    }
                }
                None => runs.push(Vec::new()),
            }
        }
        runs.retain(|run| !run.is_empty());
        runs
    }

    /// Draws the curve in the `index`-th manner, cut off at the plot.
    pub(crate) fn draw_line(&self, scene: &mut Scene, plot: &Plot, index: usize) {
        let (colour, stroke) = manner(index);
        for run in self.runs(plot) {
            if self.band.is_some() {
                let upper = run.iter().map(|p| p[2]);
                let lower = run.iter().rev().map(|p| p[1]);
                let band = Path::polyline(upper.chain(lower), true);
                scene.fill(band, colour.faded(46));
            }
            if let [alone] = run[..] {
                // A single point between gaps would vanish as a line.
                scene.fill(Path::circle(alone[0], stroke.width), colour);
            }
            let line: Vec<Point> = run.iter().map(|p| p[0]).collect();
            scene.stroke(within(&line, plot.rect.grown(5.0)), stroke.clone());
        }
    }

    /// Draws points in the `index`-th manner, cut off at the plot.
    pub(crate) fn draw_points(&self, scene: &mut Scene, plot: &Plot, index: usize) {
        let (colour, _) = manner(index);
        let (mut bars, mut marks) = (Path::new(), Path::new());
        for [p, low, high] in self.runs(plot).into_iter().flatten() {
            if self.band.is_some() {
                bars.add(&Path::segment(low, high), |p| p);
            }
            add_mark(&mut marks, p, index);
        }
        scene.stroke(bars, Stroke::new(colour, 0.25));
        draw_marks(scene, marks, colour);
    }

    /// Keeps labels off the curve.
    pub(crate) fn take(&self, placement: &mut Placement, plot: &Plot) {
        for run in self.runs(plot) {
            let line: Vec<Point> = run.iter().map(|p| p[0]).collect();
            placement.take_line(&line);
        }
    }
}

impl From<&Trace> for Curve {
    /// Values against the distance along the line.
    fn from(trace: &Trace) -> Self {
        Curve::new(&trace.name, trace.distance.clone(), trace.values.clone())
            .units(trace.length, trace.unit)
            .x_name("distance")
    }
}

/// The parts of the line through `points` that pass through `rect`, so that a close look at a long
/// curve keeps its slopes and does not dash what nobody sees.
///
/// Each piece is cut by the method of Liang & Barsky 1984 (from memory).
pub(crate) fn within(points: &[Point], rect: Rect) -> Path {
    let mut path = Path::new();
    let mut pen: Option<Point> = None;
    for pair in points.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        let d = [b[0] - a[0], b[1] - a[1]];
        let (mut t0, mut t1) = (0.0f64, 1.0f64);
        let sides = [(0, rect.x, rect.right()), (1, rect.y, rect.bottom())];
        for (k, low, high) in sides {
            if d[k] == 0.0 {
                if !(low..=high).contains(&a[k]) {
                    t1 = -1.0;
                }
                continue;
            }
            let (p, q) = ((low - a[k]) / d[k], (high - a[k]) / d[k]);
            t0 = t0.max(p.min(q));
            t1 = t1.min(p.max(q));
        }
        if t0 > t1 {
            continue;
        }
        let at = |t: f64| [a[0] + t * d[0], a[1] + t * d[1]];
        let (from, to) = (
            if t0 == 0.0 { a } else { at(t0) },
            if t1 == 1.0 { b } else { at(t1) },
        );
        if pen != Some(from) {
            path.move_to(from);
        }
        path.line_to(to);
        pen = Some(to);
    }
    path
}

/// Colour and line of the `index`-th curve; after six they repeat.
fn manner(index: usize) -> (Colour, Stroke) {
    const DASHES: [&[f64]; 6] = [
        &[],
        &[2.6, 0.9],
        &[0.9, 0.8],
        &[4.0, 0.8, 0.9, 0.8],
        &[1.6, 0.7],
        &[3.2, 0.7, 0.7, 0.7, 0.7, 0.7],
    ];
    let colour = CURVES[index % CURVES.len()];
    let mut stroke = Stroke::new(colour, 0.5).dashed(DASHES[index % DASHES.len()]);
    // Round ends would fill the gaps of a dash.
    stroke.round = stroke.dash.is_empty();
    (colour, stroke)
}

fn draw_marks(scene: &mut Scene, marks: Path, colour: Colour) {
    let rim = Stroke::new(PAPER, 0.16);
    scene.shape(marks, Some(colour), Some(rim));
}

fn add_mark(path: &mut Path, [x, y]: Point, index: usize) {
    match index % 3 {
        0 => path.add(&Path::circle([x, y], 0.75), |p| p),
        1 => path.add_polyline(
            [[x, y - 1.0], [x + 1.0, y], [x, y + 1.0], [x - 1.0, y]],
            true,
        ),
        _ => path.add_polyline(
            [[x - 0.9, y + 0.65], [x + 0.9, y + 0.65], [x, y - 1.0]],
            true,
        ),
    }
}

/// A sample for the legend, 8 mm long with its middle at height `y`.
pub(crate) fn draw_sample(scene: &mut Scene, [x, y]: Point, index: usize, look: Look) {
    let (colour, stroke) = manner(index);
    match look {
        Look::Line => scene.stroke(Path::segment([x, y], [x + SAMPLE_MM, y]), stroke),
        Look::Points | Look::Fitted => {
            if look == Look::Fitted {
                scene.stroke(Path::segment([x, y], [x + SAMPLE_MM, y]), stroke);
            }
            let mut mark = Path::new();
            add_mark(&mut mark, [x + 0.5 * SAMPLE_MM, y], index);
            draw_marks(scene, mark, colour);
        }
        Look::Bars => {
            let rect = Rect {
                x: x + 0.25 * SAMPLE_MM,
                y: y - 0.9,
                w: 0.5 * SAMPLE_MM,
                h: 1.8,
            };
            scene.fill(Path::rect(rect), colour.faded(BAR_OPACITY));
        }
    }
}

/// Length of a legend's sample.
pub(crate) const SAMPLE_MM: f64 = 8.0;

/// What a layer of numbers looks like.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Look {
    Line,
    Points,
    Fitted,
    Bars,
}

const BAR_OPACITY: u8 = 190;

/// Heights over intervals: a histogram, or bars.
#[derive(Clone, Debug, PartialEq)]
pub struct Bars {
    /// What they are called.
    pub name: String,
    /// Edges of the intervals, rising; one more than heights.
    pub edges: Vec<f64>,
    /// Height over each interval; NaN leaves it out.
    pub heights: Vec<f64>,
    /// What the edges measure.
    pub x_name: String,
    /// Unit of the edges.
    pub x_unit: Unit,
    /// Unit of the heights.
    pub y_unit: Unit,
}

impl Bars {
    /// How many of the finite `values` fall into each of `count` equal intervals over their
    /// range; by default into intervals between round numbers (multiples of 1, 2 or 5 times a
    /// power of ten) about as wide as the Freedman-Diaconis rule says, near 5 to 60 of them.
    /// A value on an edge counts above it.
    ///
    /// Freedman & Diaconis 1981 (from memory): width 2 IQR n^(-1/3).
    pub fn histogram(values: &[f64], name: &str, unit: Unit, count: Option<usize>) -> Self {
        let mut sorted: Vec<f64> = values.iter().copied().filter(|v| v.is_finite()).collect();
        sorted.sort_by(f64::total_cmp);
        let edges = match count {
            _ if sorted.is_empty() => Vec::new(),
            Some(count) => equal_edges(&sorted, count.max(1)),
            None => round_edges(&sorted),
        };
        let mut heights = vec![0.0; edges.len().saturating_sub(1)];
        let last = heights.len().saturating_sub(1);
        for v in &sorted {
            let k = edges.partition_point(|edge| edge <= v).saturating_sub(1);
            heights[k.min(last)] += 1.0;
        }
        Self {
            name: "count".to_owned(),
            edges,
            heights,
            x_name: name.to_owned(),
            x_unit: unit,
            y_unit: Unit::ONE,
        }
    }

    pub(crate) fn check(&self) -> Result<(), FigureError> {
        if self.edges.len() == self.heights.len() + 1 || self.edges.len() + self.heights.len() == 0
        {
            return Ok(());
        }
        Err(FigureError::LengthsDiffer {
            name: self.name.clone(),
            what: "heights (one fewer than the edges)",
            expected: self.edges.len().saturating_sub(1),
            found: self.heights.len(),
        })
    }

    pub(crate) fn spans(&self, log: (bool, bool)) -> (Span, Span) {
        let edges = self.edges.iter().copied().filter(|v| !log.0 || *v > 0.0);
        let mut heights = Span::of(self.heights.iter().copied().filter(|v| !log.1 || *v > 0.0));
        if !log.1 && !heights.is_nothing() {
            heights.take(0.0);
        }
        (Span::of(edges), heights)
    }

    pub(crate) fn draw(&self, scene: &mut Scene, plot: &Plot, index: usize) {
        let (colour, _) = manner(index);
        let mut path = Path::new();
        for (edges, height) in self.edges.windows(2).zip(&self.heights) {
            let ends = (plot.at(edges[0], *height), plot.at(edges[1], *height));
            if let (Some(a), Some(b)) = ends {
                let foot = if plot.y.log {
                    plot.rect.bottom()
                } else {
                    plot.y_mm(0.0)
                };
                let gap = (0.12f64).min(0.1 * (b[0] - a[0]));
                let (l, r) = (a[0] + gap, b[0] - gap);
                path.add_polyline([[l, foot], [l, a[1]], [r, b[1]], [r, foot]], true);
            }
        }
        scene.fill(path, colour.faded(BAR_OPACITY));
    }
}

fn equal_edges(sorted: &[f64], count: usize) -> Vec<f64> {
    let span = Span::of(sorted.iter().copied()).opened();
    (0..=count)
        .map(|k| span.lo + span.width() * k as f64 / count as f64)
        .collect()
}

fn round_edges(sorted: &[f64]) -> Vec<f64> {
    let n = sorted.len();
    let span = Span::of(sorted.iter().copied()).opened();
    let quarter = |q: usize| sorted.get(n * q / 4).copied().unwrap_or(0.0);
    let width = 2.0 * (quarter(3) - quarter(1)) / (n as f64).cbrt();
    let wanted = (span.width() / width).ceil();
    let count = if wanted.is_finite() {
        wanted.clamp(5.0, 60.0)
    } else {
        5.0
    };
    if !(1e-150..1e150).contains(&span.width()) {
        // Beyond what an axis carries, which says so when it is drawn.
        return equal_edges(sorted, count as usize);
    }
    let (mantissa, power) = step_near(span.width() / count);
    let step = decimal(mantissa, power);
    let at = |k: i64| decimal(k * mantissa, power);
    let (mut first, mut last) = (
        (span.lo / step).floor() as i64,
        (span.hi / step).ceil() as i64,
    );
    // Division may land on the wrong side of an edge.
    first -= i64::from(at(first) > span.lo);
    last += i64::from(at(last) < span.hi);
    (first..=last).map(at).collect()
}
