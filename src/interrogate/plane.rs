//! The correlation plane of one window: what one vector was read from.

use ndarray::Array2;

use super::layout::Layout;
use super::peak::Peak;
use super::plan::{Plan, WindowSize};
use super::raw_plane::RawPlane;
use super::run::{Images, InterrogateError, before_last_pass};
use crate::field::{Grid, ScalarField};
use crate::frames::{Pair, Scale};
use crate::quantity::{Unit, plain_number};
use crate::task::Task;

/// Least half side, px, of the square about the highest peak that is no noise.
const LEAST_CLEARANCE: f64 = 3.0;

/// Why there is no correlation plane.
#[derive(Debug, thiserror::Error)]
pub enum PlaneError {
    /// A point that is not in the image.
    #[error(
        "{label}: the point ({x}, {y}) {unit} is outside the image, which covers x {x0} to {x1} and y {y0} to {y1} {unit}"
    )]
    #[allow(missing_docs)]
    Outside {
        label: String,
        x: f64,
        y: f64,
        x0: f64,
        x1: f64,
        y0: f64,
        y1: f64,
        unit: Unit,
    },
    /// The pair cannot be interrogated.
    #[error(transparent)]
    Interrogate(#[from] InterrogateError),
}

/// The correlation of one window of a plan's last pass, after all passes before it.
///
/// Coefficients are sum f g / √(sum f² sum g²) over the window, f and g the exposures less their
/// weighted means and times the root of the window's weights; -1 to 1 by the inequality of Cauchy
/// and Schwarz, and circular as the transforms are. They are what the pass sought its peak in. The
/// weights leave less of a pattern the farther it has moved; that is **not** divided out of the
/// coefficients, where it would blow up the noise at the rim up to 400 times, but only of the few
/// samples about a peak from which its place and width are read, as the pass does.
///
/// A window without contrast in one of the exposures has a plane of zeros, and no peak.
#[derive(Clone, Debug)]
pub struct CorrelationPlane {
    /// The coefficients over displacement: u along x, v upwards along y, in px/frame or mm/s. The
    /// middle is what the passes before had predicted.
    pub field: ScalarField,
    /// Centre of the window, in `length`.
    pub centre: (f64, f64),
    /// Unit of the centre: px or mm.
    pub length: Unit,
    /// Size of the window, px.
    pub window: WindowSize,
    /// Displacement that the passes before had predicted for the centre (u, v), in the unit of the
    /// axes; zero where the plan has one pass.
    pub predicted: (f64, f64),
    /// How far from the prediction, along x and y, the pass sought its peak, px.
    pub reach_px: (usize, usize),
    /// Share of the window, 0 to 1, that could be read in both exposures.
    pub lit: f64,
    /// The pair it belongs to.
    pub label: String,
    vector: Option<PlanePeak>,
    peaks: Vec<PlanePeak>,
}

impl CorrelationPlane {
    /// Every peak of the plane, the highest first, whether the pass could have reached it or not.
    pub fn peaks(&self) -> &[PlanePeak] {
        &self.peaks
    }

    /// What the pass read: the highest sample within its reach, which need be no peak where it
    /// lies at the limit. Its displacement is the vector before validation. `None` where nothing
    /// there is above zero, as in a window without contrast.
    pub fn vector(&self) -> Option<&PlanePeak> {
        self.vector.as_ref()
    }

    /// True where the highest peak of the whole plane is what the pass read.
    pub fn vector_is_highest(&self) -> bool {
        let highest = self.peaks.first().map(|peak| peak.sample);
        highest.is_some() && highest == self.vector.map(|read| read.sample)
    }

    /// Height of the highest peak over that of the second; `None` where there are not two.
    pub fn ratio(&self) -> Option<f64> {
        self.peaks.first()?.ratio
    }

    /// Root of the mean square of the plane away from its highest peak: farther than the peak's
    /// e⁻² width from its highest sample in columns or in rows, and no less than 3 px, where the
    /// Gaussian through its top has fallen to 0.0003 of its height. `None` where there is no peak or
    /// nothing is left.
    pub fn noise(&self) -> Option<f64> {
        let peak = self.peaks.first()?;
        let clear = |width: Option<f64>| width.unwrap_or(0.0).max(LEAST_CLEARANCE);
        let (x, y) = (clear(peak.width_px.0), clear(peak.width_px.1));
        let (rows, columns) = self.field.values.dim();
        // The plane is circular: the way round the rim may be shorter.
        let apart = |a: usize, b: usize, n: usize| a.abs_diff(b).min(n - a.abs_diff(b)) as f64;
        let away = self.field.values.indexed_iter().filter(|((j, i), _)| {
            apart(*i, peak.sample.0, columns) > x || apart(*j, peak.sample.1, rows) > y
        });
        let (count, sum) = away.fold((0u32, 0.0), |(n, sum), (_, r)| (n + 1, sum + r * r));
        (count > 0).then(|| (sum / f64::from(count)).sqrt())
    }

    /// Left, right, lower and upper end, on the axes, of where the pass sought its peak: half a px
    /// beyond the outermost samples.
    pub fn searched(&self) -> [f64; 4] {
        let (u, v) = self.predicted;
        let x = (self.reach_px.0 as f64 + 0.5) * self.field.grid.dx;
        let y = (self.reach_px.1 as f64 + 0.5) * self.field.grid.dy;
        [u - x, u + x, v - y, v + y]
    }
}

/// A place where the plane is higher than everywhere up to 2 px away.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PlanePeak {
    /// Displacement (u, v) in the unit of the axes, by the same fit as that of a vector.
    pub displacement: (f64, f64),
    /// Highest sample, a correlation coefficient.
    pub height: f64,
    /// Diameter along x and y, px, at which the Gaussian through the three samples about the
    /// highest has fallen to e⁻² of its top: four of its standard deviations. Particle images of
    /// diameter d at e⁻² make a peak √2 √(d² + 4/3 px²) wide, 4/3 being what a pixel adds. `None`
    /// where the samples allow no Gaussian.
    pub width_px: (Option<f64>, Option<f64>),
    /// Height over that of the next lower peak; `None` for the lowest.
    pub ratio: Option<f64>,
    /// Column and row of the highest sample in [`CorrelationPlane::field`].
    pub sample: (usize, usize),
}

/// The correlation plane of the window, among those of the plan's last pass, whose centre is
/// nearest to the point `at` (x, y): px from the centre of the bottom-left pixel with y up, or mm
/// for a calibrated pair.
///
/// All passes before the last are run over the whole pair, so that the plane is exactly the one from
/// which [`interrogate`](super::interrogate) reads the vector of that window.
///
/// # Errors
/// [`PlaneError::Outside`] for a point that is not in the image; otherwise as
/// [`interrogate`](super::interrogate).
pub fn correlation_plane(
    pair: &Pair,
    at: (f64, f64),
    plan: &Plan,
    task: &Task,
) -> Result<CorrelationPlane, PlaneError> {
    let (first, second) = pair.load().map_err(InterrogateError::from)?;
    let (height, scale) = (first.height(), pair.scale());
    let (column, row) = place(at, (first.width(), height), &scale, pair.label())?;
    let hidden = pair
        .hidden(&first, &second)
        .map_err(InterrogateError::from)?;
    let masks = [hidden[0].as_ref(), hidden[1].as_ref()];
    let mut images = Images::new([&first.pixels, &second.pixels], masks, plan, pair.label())?;
    let view = before_last_pass(&mut images, plan, pair.label(), task)?;
    let window = nearest(&view.layout, column, row);
    let exposures = images.exposures(view.predictor.as_ref());
    let raw = RawPlane::of(&view, &exposures, window).map_err(InterrogateError::from)?;
    let (column, row) = centre(&view.layout, window);
    let ((length, mm), (time, dt)) = (scale.length(), scale.time());
    let shift = Shift {
        predicted: view
            .predictor
            .as_ref()
            .map_or((0.0, 0.0), |p| p.at(column, row)),
        px: mm / dt,
    };
    Ok(CorrelationPlane {
        field: shift.field(&raw, length.per(time)),
        centre: (column * mm, (height as f64 - 1.0 - row) * mm),
        length,
        window: view.layout.window,
        predicted: shift.of((0.0, 0.0)),
        reach_px: view.reach,
        lit: raw.lit,
        label: pair.label().to_owned(),
        vector: Some(shift.peak(&raw, raw.highest)).filter(|peak| peak.height > 0.0),
        peaks: shift.peaks(&raw),
    })
}

/// Column and row (fractional) of the point in an image of `width` x `height` px.
fn place(
    (x, y): (f64, f64),
    (width, height): (usize, usize),
    scale: &Scale,
    label: &str,
) -> Result<(f64, f64), PlaneError> {
    let (unit, mm) = scale.length();
    let (column, row) = (x / mm, height as f64 - 1.0 - y / mm);
    let inside = |p: f64, n: usize| (-0.5..=n as f64 - 0.5).contains(&p);
    if inside(column, width) && inside(row, height) {
        return Ok((column, row));
    }
    let rounded = |v: f64| plain_number(v, 6).parse().unwrap_or(v);
    Err(PlaneError::Outside {
        label: label.to_owned(),
        x,
        y,
        x0: rounded(-0.5 * mm),
        x1: rounded((width as f64 - 0.5) * mm),
        y0: rounded(-0.5 * mm),
        y1: rounded((height as f64 - 0.5) * mm),
        unit,
    })
}

/// Row and column of the window whose centre is nearest.
fn nearest(layout: &Layout, column: f64, row: f64) -> (usize, usize) {
    let along = |p: f64, first: f64, step: usize, count: usize| {
        // A negative number becomes 0.
        (((p - first) / step as f64).round() as usize).min(count - 1)
    };
    (
        along(row, layout.first_y(), layout.step_y, layout.rows),
        along(column, layout.first_x(), layout.step_x, layout.columns),
    )
}

/// Column and row of the centre of a window.
fn centre(layout: &Layout, (j, i): (usize, usize)) -> (f64, f64) {
    (
        layout.first_x() + (i * layout.step_x) as f64,
        layout.first_y() + (j * layout.step_y) as f64,
    )
}

/// From offsets in a plane to displacement.
struct Shift {
    /// Displacement that offsets are added to (right, down), px.
    predicted: (f64, f64),
    /// Length of one px of shift on the axes.
    px: f64,
}

impl Shift {
    /// Displacement (u, v) of an offset (right, down), which may lie between samples.
    fn of(&self, (right, down): (f64, f64)) -> (f64, f64) {
        // Subtracted, so that no displacement is 0 and not -0.
        let v = 0.0 - (self.predicted.1 + down);
        ((self.predicted.0 + right) * self.px, v * self.px)
    }

    fn field(&self, raw: &RawPlane, unit: Unit) -> ScalarField {
        let [(left, right), (top, bottom)] = raw.limits();
        let (x0, y0) = self.of((f64::from(left), f64::from(bottom)));
        let grid = Grid {
            nx: (right - left + 1) as usize,
            ny: (bottom - top + 1) as usize,
            x0,
            y0,
            dx: self.px,
            dy: self.px,
            length: unit,
        };
        ScalarField {
            values: Array2::from_shape_fn(grid.shape(), |(j, i)| {
                raw.coefficient((left + i as i32, bottom - j as i32))
            }),
            grid,
            unit: Unit::ONE,
            name: "correlation".to_owned(),
        }
    }

    /// Reads the peak whose highest sample has this offset, as the passes do.
    fn peak(&self, raw: &RawPlane, offset: (i32, i32)) -> PlanePeak {
        let patch = raw.patch(offset);
        let (x, y) = Peak::of(&patch).offset;
        let [(left, _), (_, bottom)] = raw.limits();
        PlanePeak {
            displacement: self.of((f64::from(offset.0) + x, f64::from(offset.1) + y)),
            height: raw.coefficient(offset),
            width_px: (
                width([patch[2][1], patch[2][2], patch[2][3]]),
                width([patch[1][2], patch[2][2], patch[3][2]]),
            ),
            ratio: None,
            sample: ((offset.0 - left) as usize, (bottom - offset.1) as usize),
        }
    }

    /// Every peak, the highest first.
    fn peaks(&self, raw: &RawPlane) -> Vec<PlanePeak> {
        let offsets = raw.peaks().into_iter();
        let mut peaks: Vec<PlanePeak> = offsets.map(|offset| self.peak(raw, offset)).collect();
        peaks.sort_by(|a, b| b.height.total_cmp(&a.height));
        for k in 1..peaks.len() {
            peaks[k - 1].ratio = Some(peaks[k - 1].height / peaks[k].height);
        }
        peaks
    }
}

/// Diameter at e⁻² of the Gaussian through three neighbouring samples, in samples; `None` where
/// one is not above zero or they do not bend down.
///
/// With R = R0 exp(-(x - d)²/(2 s²)) the second difference of ln R is -1/s², whatever d is; the
/// Gaussian is e⁻² of its top at 2 s on either side.
fn width(samples: [f32; 3]) -> Option<f64> {
    let [before, middle, after] = samples.map(|r| f64::from(r).ln());
    let bend = 2.0 * middle - before - after;
    // Logarithms of what is not above zero are not finite.
    (bend.is_finite() && bend > 0.0).then(|| 4.0 / bend.sqrt())
}

#[cfg(test)]
#[path = "plane_tests.rs"]
mod tests;
