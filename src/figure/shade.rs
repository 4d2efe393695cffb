//! A scalar field as shades of a colour scale.

use super::axis::{Axis, Plot, Span};
use super::colour::{Colour, PAPER};
use super::error::FigureError;
use super::scale::ColourScale;
use super::scene::{Dots, Rect};
use crate::field::ScalarField;

/// How a field is shaded.
#[derive(Clone, Debug, Default, PartialEq, serde::Deserialize)]
#[serde(default, deny_unknown_fields)]
pub struct ShadeOptions {
    /// The colour scale; by default `ebb_flood` where the field takes both signs, else `silt`.
    pub scale: Option<ColourScale>,
    /// Values at the ends of the scale, in the field's unit; by default the field's own range,
    /// made symmetric about zero on a diverging scale. Values beyond take the end's colour.
    pub range: Option<(f64, f64)>,
    /// Draw every cell in one colour rather than smoothly between the nodes.
    pub cells: bool,
    /// Words over the colour bar; by default the field's name and unit.
    pub label: Option<String>,
}

/// A shading settled: which scale, between which values.
#[derive(Clone, Debug)]
pub(crate) struct Shading {
    pub scale: ColourScale,
    pub bar: Axis,
    pub label: String,
    /// Some values lie below or above the bar.
    pub beyond: (bool, bool),
    /// Some cells hold no value.
    pub gaps: bool,
}

/// A field whose smaller side is below this share of the larger is taken as one-sided.
const ONE_SIDED: f64 = 0.02;

impl Shading {
    pub fn new(field: &ScalarField, options: &ShadeOptions) -> Result<Self, FigureError> {
        let span = Span::of(field.values.iter().copied());
        if span.is_nothing() {
            return Err(FigureError::NothingFinite(field.name.clone()));
        }
        let size = span.lo.abs().max(span.hi.abs());
        let signed =
            span.lo < 0.0 && span.hi > 0.0 && span.lo.abs().min(span.hi.abs()) > ONE_SIDED * size;
        let scale = options.scale.unwrap_or(if signed {
            ColourScale::EbbFlood
        } else {
            ColourScale::Silt
        });
        let shown = if scale.is_diverging() {
            let half = if size > 0.0 { size } else { 1.0 };
            Span {
                lo: -half,
                hi: half,
            }
        } else {
            span
        };
        let bar = Axis::new("colour", shown, options.range, false, 0.0)?;
        Ok(Self {
            scale,
            bar,
            label: options.label.clone().unwrap_or_else(|| field.name.clone()),
            beyond: (span.lo < bar.lo, span.hi > bar.hi),
            gaps: field.values.iter().any(|v| !v.is_finite()),
        })
    }

    /// Palette index of a value.
    fn index(&self, value: f64) -> u8 {
        let t = self.bar.fraction(value).clamp(0.0, 1.0);
        (t * (SHADES - 1) as f64).round() as u8
    }

    fn palette(&self) -> Vec<Colour> {
        let shades = (0..SHADES).map(|k| self.scale.at(k as f64 / (SHADES - 1) as f64));
        let hatch = (0..HATCH).map(|k| {
            let t = k as f64 / (HATCH - 1) as f64;
            let mix = |a: f64, b: f64| (a + t * (b - a)).round() as u8;
            Colour::solid(mix(236.0, 196.0), mix(236.0, 198.0), mix(235.0, 199.0))
        });
        shades.chain(hatch).chain([PAPER]).collect()
    }
}

/// Colours of the palette that are shades of the scale, an odd number so that the middle has one;
/// the rest are hatching and paper.
const SHADES: usize = 241;
/// Colours from the ground of the hatching to its lines.
const HATCH: usize = 8;
const BLANK: u8 = (SHADES + HATCH) as u8;

/// Hatching that says "no value": palette index at a place on the sheet in mm.
fn hatch(x: f64, y: f64, dot: f64) -> u8 {
    // Lines 0.22 mm wide, 1.1 mm apart, rising to the right, their rims blurred over one dot.
    let across = ((x + y) * std::f64::consts::FRAC_1_SQRT_2).rem_euclid(1.1) - 0.55;
    let covered = ((0.11 - across.abs()) / dot.max(0.02) + 0.5).clamp(0.0, 1.0);
    SHADES as u8 + (covered * (HATCH - 1) as f64).round() as u8
}

/// The field over the whole of `plot`, `dots_per_mm` fine.
pub(crate) fn dots(
    field: &ScalarField,
    shading: &Shading,
    plot: &Plot,
    cells: bool,
    dots_per_mm: f64,
) -> Dots {
    let count = |mm: f64| (mm * dots_per_mm).round().clamp(1.0, 12_000.0) as usize;
    let (width, height) = (count(plot.rect.w), count(plot.rect.h));
    let mut indices = Vec::with_capacity(width * height);
    for row in 0..height {
        let fy = (row as f64 + 0.5) / height as f64;
        let y = plot.y.value(1.0 - fy);
        for column in 0..width {
            let fx = (column as f64 + 0.5) / width as f64;
            let (i, j) = field.grid.cell(plot.x.value(fx), y);
            indices.push(match value(field, i, j, cells) {
                Value::Here(v) => shading.index(v),
                Value::Gap => hatch(fx * plot.rect.w, -fy * plot.rect.h, 1.0 / dots_per_mm),
                Value::Off => BLANK,
            });
        }
    }
    Dots {
        width,
        height,
        palette: shading.palette(),
        indices,
    }
}

/// A patch of the hatching, for the key.
pub(crate) fn hatched(rect: &Rect, shading: &Shading, dots_per_mm: f64) -> Dots {
    let count = |mm: f64| (mm * dots_per_mm).round().max(1.0) as usize;
    let (width, height) = (count(rect.w), count(rect.h));
    let place = |k: usize| (k as f64 + 0.5) / dots_per_mm;
    Dots {
        width,
        height,
        palette: shading.palette(),
        indices: (0..height)
            .flat_map(|r| (0..width).map(move |c| hatch(place(c), -place(r), 1.0 / dots_per_mm)))
            .collect(),
    }
}

enum Value {
    Here(f64),
    Gap,
    Off,
}

/// The value at fractional column `i` and row `j`; every node's cell reaches half way to the next.
fn value(field: &ScalarField, i: f64, j: f64, cells: bool) -> Value {
    let (ny, nx) = field.values.dim();
    let inside = |k: f64, n: usize| k >= -0.5 - 1e-9 && k <= n as f64 - 0.5 + 1e-9;
    if !inside(i, nx) || !inside(j, ny) {
        return Value::Off;
    }
    let (i, j) = (i.clamp(0.0, nx as f64 - 1.0), j.clamp(0.0, ny as f64 - 1.0));
    let node = |i: isize, j: isize| {
        let i = i.clamp(0, nx as isize - 1) as usize;
        let j = j.clamp(0, ny as isize - 1) as usize;
        field.values[(j, i)]
    };
    let nearest = node(i.round() as isize, j.round() as isize);
    if !nearest.is_finite() {
        return Value::Gap;
    }
    if cells {
        return Value::Here(nearest);
    }
    let (i0, j0) = (i.floor(), j.floor());
    let smooth = weighted(&node, i0, j0, cubic(i - i0), cubic(j - j0));
    if smooth.1 == 16 {
        return Value::Here(smooth.0);
    }
    let straight = weighted(&node, i0, j0, linear(i - i0), linear(j - j0));
    Value::Here(straight.0)
}

/// Catmull-Rom weights of the four nodes about a cell.
fn cubic(f: f64) -> [f64; 4] {
    let (f2, f3) = (f * f, f * f * f);
    [
        0.5 * (-f + 2.0 * f2 - f3),
        0.5 * (2.0 - 5.0 * f2 + 3.0 * f3),
        0.5 * (f + 4.0 * f2 - 3.0 * f3),
        0.5 * (-f2 + f3),
    ]
}

/// Weights of the two nodes of a cell, among the same four.
fn linear(f: f64) -> [f64; 4] {
    [0.0, 1.0 - f, f, 0.0]
}

/// Weighted mean of the finite nodes about cell (`i0`, `j0`), and how many of the 16 were finite.
fn weighted(
    node: &impl Fn(isize, isize) -> f64,
    i0: f64,
    j0: f64,
    wx: [f64; 4],
    wy: [f64; 4],
) -> (f64, usize) {
    let (mut sum, mut weight, mut finite) = (0.0, 0.0, 0);
    for (b, wy) in wy.into_iter().enumerate() {
        for (a, wx) in wx.into_iter().enumerate() {
            let v = node(i0 as isize + a as isize - 1, j0 as isize + b as isize - 1);
            if v.is_finite() {
                finite += 1;
                sum += wx * wy * v;
                weight += wx * wy;
            }
        }
    }
    (sum / weight, finite)
}
