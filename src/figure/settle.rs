//! What is settled before anything is measured: units, axes, shadings, the key.

use super::arrows::Arrows;
use super::axis::{Axis, Span};
use super::error::{FigureError, UnitName};
use super::figure::Figure;
use super::key::{Key, Legend};
use super::layer::Layer;
use super::shade::Shading;
use crate::field::Status;
use crate::quantity::Unit;

/// A figure without contradictions; `shadings` and `arrows` go with the layers one by one.
pub(crate) struct Settled<'a> {
    pub figure: &'a Figure,
    pub x: Axis,
    pub y: Axis,
    pub units: (Unit, Unit),
    pub is_map: bool,
    pub shadings: Vec<Option<Shading>>,
    pub arrows: Vec<Option<Arrows>>,
    pub key: Key,
}

impl Settled<'_> {
    /// Names of the curves, if they are several.
    pub fn legend(&self) -> Legend<'_> {
        let entries: Vec<_> = self
            .figure
            .layers
            .iter()
            .filter_map(Layer::legend)
            .collect();
        let entries = if entries.len() > 1 {
            entries
        } else {
            Vec::new()
        };
        Legend { entries }
    }
}

pub(crate) fn settle(figure: &Figure) -> Result<Settled<'_>, FigureError> {
    let layers = &figure.layers;
    if !layers.iter().any(|l| l.units().is_some()) {
        return Err(FigureError::Empty);
    }
    layers.iter().try_for_each(Layer::check)?;
    let units = common_units(layers)?;
    let (shadings, arrows, key) = settle_fields(layers)?;
    let log = (figure.log_x, figure.log_y);
    let (mut x, mut y) = (Span::NOTHING, Span::NOTHING);
    for layer in layers {
        let (layer_x, layer_y) = layer.spans(log);
        x.join(layer_x);
        y.join(layer_y);
    }
    let mut drawn = layers.iter().filter(|l| l.units().is_some());
    if drawn.all(|l| l.spans((false, false)).1.is_nothing()) {
        let names = names(layers).into_iter().zip(layers);
        let drawn = names.filter(|(_, l)| l.units().is_some());
        let names: Vec<String> = drawn.map(|(name, _)| name).collect();
        return Err(FigureError::NothingFinite(names.join(", ")));
    }
    if x.is_nothing() || y.is_nothing() {
        let axis = if log.1 { "y" } else { "x" };
        return Err(FigureError::NothingAboveZero(axis));
    }
    let is_map = layers.iter().any(Layer::is_map);
    let room = if is_map { 0.0 } else { 0.06 };
    let ends_free = |l: &Layer| matches!(l, Layer::Line(_) | Layer::Points(_) | Layer::Fitted(..));
    let side_room = if !is_map && layers.iter().any(ends_free) {
        0.03
    } else {
        0.0
    };
    let on_floor = layers.iter().any(|l| matches!(l, Layer::Bars(_))) && y.lo == 0.0;
    let x = Axis::new("x", x, figure.x_range, log.0, side_room)?;
    let mut y = Axis::new("y", y, figure.y_range, log.1, room)?;
    if on_floor && figure.y_range.is_none() && !log.1 {
        y.lo = 0.0;
    }
    Ok(Settled {
        figure,
        x,
        y,
        units,
        is_map,
        shadings,
        arrows,
        key,
    })
}

/// What the layers are called in messages; a curve without a name by its number.
fn names(layers: &[Layer]) -> Vec<String> {
    let mut curves = 0;
    let name = |layer: &Layer| {
        curves += usize::from(layer.legend().is_some());
        match layer.name() {
            name if name.is_empty() => format!("curve {curves}"),
            name => name,
        }
    };
    layers.iter().map(name).collect()
}

fn common_units(layers: &[Layer]) -> Result<(Unit, Unit), FigureError> {
    let names = names(layers);
    let mut found = names
        .iter()
        .zip(layers)
        .filter_map(|(name, l)| Some((name, l.units()?)));
    let Some((first, units)) = found.next() else {
        return Ok((Unit::ONE, Unit::ONE));
    };
    for (name, other) in found {
        for (axis, left, right) in [("x", units.0, other.0), ("y", units.1, other.1)] {
            if left != right {
                return Err(FigureError::UnitsDiffer {
                    axis,
                    first: first.clone(),
                    left: UnitName(left),
                    second: name.clone(),
                    right: UnitName(right),
                });
            }
        }
    }
    Ok(units)
}

type Fields = (Vec<Option<Shading>>, Vec<Option<Arrows>>, Key);

fn settle_fields(layers: &[Layer]) -> Result<Fields, FigureError> {
    let (mut shadings, mut arrows, mut key) = (Vec::new(), Vec::new(), Key::default());
    let mut shaded: Option<&str> = None;
    for layer in layers {
        let (mut shading, mut vectors) = (None, None);
        match layer {
            Layer::Shade(field, options) => {
                if let Some(first) = shaded.replace(&field.name) {
                    return Err(FigureError::TwoShades {
                        first: first.to_owned(),
                        second: field.name.clone(),
                    });
                }
                let settled = Shading::new(field, options)?;
                key.bar = Some((settled.clone(), field.unit));
                shading = Some(settled);
            }
            Layer::Arrows(field, options) => {
                let settled = Arrows::new(field, options)?;
                key.reference = Some((settled.reference, field.unit()));
                key.replaced |= field.count(Status::Replaced) > 0;
                vectors = Some(settled);
            }
            Layer::Outlines(set) => key.doubtful |= set.list.iter().any(|o| o.flagged),
            _ => {}
        }
        shadings.push(shading);
        arrows.push(vectors);
    }
    Ok((shadings, arrows, key))
}
