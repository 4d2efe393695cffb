//! From a figure to a scene: axes settled, margins measured, layers drawn from the back.

use super::arrows::{Arrows, Fitted};
use super::axis::{Axis, Plot, Span};
use super::colour::{FAINT, INK, MUTED};
use super::error::{FigureError, UnitName};
use super::figure::Figure;
use super::font::CAPITAL;
use super::key::{Key, Legend, with_unit};
use super::layer::Layer;
use super::outlines;
use super::placement::{Placement, base_line, text_box};
use super::scene::{Anchor, Item, Path, Rect, Scene, Stroke, Style};
use super::shade::{self, Shading};
use super::ticks::Ticks;
use crate::field::Status;
use crate::quantity::Unit;

/// Width of a figure nobody gave one.
pub(crate) const WIDTH_MM: f64 = 120.0;
/// Margin around everything.
pub(crate) const PAD: f64 = 2.5;
/// Size of titles, of labels and of numbers: 9.6, 7.9 and 7.1 points.
const TITLE_MM: f64 = 3.4;
pub(crate) const LABEL_MM: f64 = 2.8;
pub(crate) const NUMBER_MM: f64 = 2.5;
const TITLE_LINE: f64 = 4.6;
/// Room for a label over or under the plot, and for the numbers along x.
const LABEL_LINE: f64 = 4.4;
const NUMBER_LINE: f64 = 4.0;
/// Gap between the plot and its key.
const KEY_GAP: f64 = 4.0;
/// Half of a long and of a short mark, which straddle the axis.
const LONG: f64 = 0.8;
const SHORT: f64 = 0.4;
/// Least width and height of the plot.
const LEAST_PLOT: f64 = 12.0;
/// A map more slender than this is not drawn to one scale: it would be a thread.
const MOST_SLENDER: f64 = 8.0;

/// What is settled before anything is measured.
struct Settled<'a> {
    figure: &'a Figure,
    x: Axis,
    y: Axis,
    units: (Unit, Unit),
    is_map: bool,
    shadings: Vec<Option<Shading>>,
    arrows: Vec<Option<Arrows>>,
    key: Key,
}

pub(crate) fn scene(figure: &Figure, dots_per_mm: f64) -> Result<Scene, FigureError> {
    let settled = settle(figure)?;
    let (plot, ticks, size) = settled.measure()?;
    Ok(settled.draw(plot, ticks, size, dots_per_mm))
}

fn settle(figure: &Figure) -> Result<Settled<'_>, FigureError> {
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
    let drawn = layers.iter().filter(|l| l.units().is_some());
    if drawn
        .clone()
        .all(|l| l.spans((false, false)).1.is_nothing())
    {
        let names: Vec<String> = drawn.map(Layer::name).collect();
        return Err(FigureError::NothingFinite(names.join(", ")));
    }
    let is_map = layers.iter().any(Layer::is_map);
    let room = if is_map { 0.0 } else { 0.06 };
    let lines_only = !layers.iter().any(|l| matches!(l, Layer::Points(_)));
    let side_room = if is_map || lines_only { 0.0 } else { 0.03 };
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

fn common_units(layers: &[Layer]) -> Result<(Unit, Unit), FigureError> {
    let mut found = layers.iter().filter_map(|l| Some((l, l.units()?)));
    let Some((first, units)) = found.next() else {
        return Ok((Unit::ONE, Unit::ONE));
    };
    for (layer, other) in found {
        for (axis, left, right) in [("x", units.0, other.0), ("y", units.1, other.1)] {
            if left != right {
                return Err(FigureError::UnitsDiffer {
                    axis,
                    first: first.name(),
                    left: UnitName(left),
                    second: layer.name(),
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

/// The title broken into lines that fit a sheet `width` wide.
pub(crate) fn title_lines(figure: &Figure, width: f64) -> Vec<String> {
    let style = Style::plain(TITLE_MM).medium();
    let mut lines: Vec<String> = Vec::new();
    for word in figure.title.as_deref().unwrap_or("").split_whitespace() {
        match lines.last_mut() {
            Some(line) if style.width(&format!("{line} {word}")) <= width - 2.0 * PAD => {
                line.push(' ');
                line.push_str(word);
            }
            _ => lines.push(word.to_owned()),
        }
    }
    lines
}

pub(crate) fn draw_title(scene: &mut Scene, lines: &[String]) {
    for (k, line) in lines.iter().enumerate() {
        let y = PAD + TITLE_MM * 0.8 + TITLE_LINE * k as f64;
        scene.text([PAD, y], line, Style::plain(TITLE_MM).medium());
    }
}

fn widest(ticks: &Ticks) -> f64 {
    let style = Style::plain(NUMBER_MM);
    ticks
        .major
        .iter()
        .map(|(_, t)| style.width(t))
        .fold(0.0, f64::max)
}

/// Marks along x as many as stand clear of each other on `width` mm.
fn x_ticks(axis: &Axis, width: f64) -> Ticks {
    let mut about = width / 13.0;
    loop {
        let ticks = axis.ticks(about);
        let style = Style::plain(NUMBER_MM);
        let clear = ticks.major.windows(2).all(|pair| {
            let apart = (axis.fraction(pair[1].0) - axis.fraction(pair[0].0)) * width;
            let need = 0.5 * (style.width(&pair[0].1) + style.width(&pair[1].1)) + 1.5;
            apart >= need
        });
        if clear || about < 1.5 {
            return ticks;
        }
        about *= 0.75;
    }
}

impl Settled<'_> {
    fn legend(&self) -> Legend<'_> {
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

    /// Places the plot on the sheet: the plot, its marks, and the sheet's width and height.
    fn measure(&self) -> Result<(Plot, (Ticks, Ticks), (f64, f64)), FigureError> {
        let width = self.figure.width_mm.unwrap_or(WIDTH_MM);
        let given = self.figure.height_mm;
        for side in [Some(width), given].into_iter().flatten() {
            if !(side.is_finite() && side > 0.0 && side <= 3000.0) {
                return Err(FigureError::Size(format!(
                    "a figure {side} mm large cannot be drawn; give 30 to 3000 mm"
                )));
            }
        }
        let key = self.key.width();
        let ratio = (self.y.hi - self.y.lo) / (self.x.hi - self.x.lo);
        let even = self.is_map
            && !(self.x.log || self.y.log)
            && (1.0 / MOST_SLENDER..=MOST_SLENDER).contains(&ratio);
        // The left margin depends on the numbers along y, those on the height, that on the width
        // and so on the left margin: a few rounds settle it.
        let (mut left, mut end) = (8.0, 1.5);
        let mut rect = Rect {
            x: 0.0,
            y: 0.0,
            w: 1.0,
            h: 1.0,
        };
        let (mut tx, mut ty) = (self.x.ticks(4.0), self.y.ticks(4.0));
        let mut height = 0.0;
        for _ in 0..4 {
            let right = PAD
                + if key > 0.0 {
                    key + KEY_GAP.max(end)
                } else {
                    end
                };
            let room = width - left - right;
            let titles = title_lines(self.figure, width).len() as f64;
            let legend = self.legend().height(room.max(1.0));
            let top = PAD + titles * TITLE_LINE + legend + LABEL_LINE;
            let bottom = NUMBER_LINE + LABEL_LINE + PAD;
            let wanted = match (even, self.is_map) {
                (true, _) => room * ratio,
                (false, true) if ratio < 1.0 => room / MOST_SLENDER,
                (false, true) => room,
                (false, false) => 0.55 * room,
            };
            let column = self.key.least_height();
            let high = match given {
                Some(h) => h - top - bottom,
                None => wanted.clamp(LEAST_PLOT, 1.5 * width),
            };
            if room < LEAST_PLOT || high < LEAST_PLOT {
                return Err(FigureError::Size(format!(
                    "{:.0} x {:.0} mm leaves no room for the plot; give at least {:.0} x {:.0} mm",
                    width,
                    given.unwrap_or(top + high + bottom),
                    (left + right + 2.0 * LEAST_PLOT).ceil(),
                    (top + bottom + 2.0 * LEAST_PLOT).ceil(),
                )));
            }
            let (mut w, mut h) = (room, high);
            if even {
                (w, h) = if h / w > ratio {
                    (w, w * ratio)
                } else {
                    (h / ratio, h)
                };
            }
            rect = Rect {
                x: left + 0.5 * (room - w),
                y: top,
                w,
                h,
            };
            height = given.unwrap_or(top + bottom + h.max(column - 0.5 * LABEL_LINE));
            tx = x_ticks(&self.x, w);
            ty = self.y.ticks(h / if self.is_map { 13.0 } else { 10.0 });
            left = PAD + widest(&ty) + LONG + 1.2;
            end = tx.major.last().map_or(1.5, |(v, text)| {
                let over = 0.5 * Style::plain(NUMBER_MM).width(text);
                (over - (1.0 - self.x.fraction(*v)) * w).max(1.5)
            });
        }
        let plot = Plot {
            rect,
            x: self.x,
            y: self.y,
        };
        Ok((plot, (tx, ty), (width, height)))
    }

    fn draw(
        &self,
        plot: Plot,
        (tx, ty): (Ticks, Ticks),
        (width, height): (f64, f64),
        dots_per_mm: f64,
    ) -> Scene {
        let mut scene = Scene::new(width, height);
        if !self.is_map {
            draw_ground(&mut scene, &plot, &ty);
        }
        let fitted = self.draw_layers(&mut scene, &plot, dots_per_mm);
        draw_axes(&mut scene, &plot, &tx, &ty, self.is_map);
        self.draw_lines(&mut scene, &plot);
        self.draw_words(&mut scene, &plot, &tx, &ty);
        let at = [plot.rect.right() + KEY_GAP, plot.rect.y];
        let column = plot.rect.h.max(self.key.least_height());
        self.key.draw(&mut scene, at, column, fitted, dots_per_mm);
        scene
    }

    fn draw_layers(&self, scene: &mut Scene, plot: &Plot, dots_per_mm: f64) -> Option<Fitted> {
        let mut fitted = None;
        let mut index = 0;
        let parts = self.shadings.iter().zip(&self.arrows);
        for (layer, (shading, arrows)) in self.figure.layers.iter().zip(parts) {
            let number = index;
            index += usize::from(layer.legend().is_some());
            match (layer, shading, arrows) {
                (Layer::Shade(field, options), Some(shading), _) => {
                    let dots = shade::dots(field, shading, plot, options.cells, dots_per_mm);
                    let rect = plot.rect;
                    scene.items.push(Item::Dots { rect, dots });
                }
                (Layer::Arrows(field, _), _, Some(arrows)) => {
                    let fit = arrows.fit(field, plot);
                    fit.draw(scene, field, plot);
                    fitted = Some(fit);
                }
                (Layer::Outlines(set), ..) => outlines::draw(scene, set, plot),
                (Layer::Line(c), ..) => {
                    scene.clipped(plot.rect, |s| c.draw_line(s, plot, number));
                }
                (Layer::Points(c), ..) => {
                    scene.clipped(plot.rect.grown(1.0), |s| c.draw_points(s, plot, number));
                }
                (Layer::Bars(b), ..) => {
                    scene.clipped(plot.rect, |s| b.draw(s, plot, number));
                }
                _ => {}
            }
        }
        fitted
    }

    /// Markers and levels, their labels where they hide least.
    fn draw_lines(&self, scene: &mut Scene, plot: &Plot) {
        let rect = plot.rect;
        let mut placement = Placement::new(rect.grown(-0.4));
        for layer in &self.figure.layers {
            if let Layer::Line(c) | Layer::Points(c) = layer {
                c.take(&mut placement, plot);
            }
        }
        let mut labels = Vec::new();
        for layer in &self.figure.layers {
            let (from, to, label) = match layer {
                Layer::Marker(x, label) if plot.x.holds(*x) => {
                    let x = plot.x_mm(*x);
                    ([x, rect.bottom()], [x, rect.y], label)
                }
                Layer::Level(y, label) if plot.y.holds(*y) => {
                    let y = plot.y_mm(*y);
                    ([rect.x, y], [rect.right(), y], label)
                }
                _ => continue,
            };
            let line = Stroke::new(MUTED, 0.28).dashed(&[1.1, 0.9]);
            scene.stroke(Path::segment(from, to), line);
            placement.take_line(&[from, to]);
            labels.push((from, to, label));
        }
        let style = Style::plain(NUMBER_MM).coloured(MUTED).haloed();
        for (from, to, label) in labels {
            let size = text_box(label, &style);
            let upright = from[0] == to[0];
            let candidates = (0..24).flat_map(|k| {
                let t = f64::from(k / 2) / 11.0;
                let side = if k % 2 == 0 { 0.0 } else { 1.0 };
                [if upright {
                    let y = rect.y + 0.6 + t * (rect.h - size.h - 1.2);
                    let x = from[0] + 0.7 - side * (size.w + 1.4);
                    Rect { x, y, ..size }
                } else {
                    let x = rect.right() - 0.8 - size.w - t * (rect.w - size.w - 1.6);
                    let y = from[1] - size.h - 0.45 + side * (size.h + 0.9);
                    Rect { x, y, ..size }
                }]
            });
            if let Some(place) = placement.choose(candidates) {
                scene.text(base_line(&place), label, style);
            }
        }
    }

    fn draw_words(&self, scene: &mut Scene, plot: &Plot, tx: &Ticks, ty: &Ticks) {
        let rect = plot.rect;
        let (mut x_names, mut y_names): (Vec<&str>, Vec<&str>) = (Vec::new(), Vec::new());
        for layer in &self.figure.layers {
            let (x, y) = layer.axis_names();
            for (names, name) in [(&mut x_names, x), (&mut y_names, y)] {
                if !name.is_empty() && !names.contains(&name) {
                    names.push(name);
                }
            }
        }
        // The names of several curves stand in the legend; the axis then shows their unit.
        let words = |asked: &Option<String>, names: Vec<&str>| match (asked, &names[..]) {
            (Some(words), _) => words.clone(),
            (None, [alone]) => (*alone).to_owned(),
            _ => String::new(),
        };
        let x_words = with_unit(
            &words(&self.figure.x_label, x_names),
            self.units.0,
            tx.exponent,
        );
        let y_words = with_unit(
            &words(&self.figure.y_label, y_names),
            self.units.1,
            ty.exponent,
        );
        let style = Style::plain(LABEL_MM);
        let foot = rect.bottom() + NUMBER_LINE + 0.75 * LABEL_LINE;
        scene.text([rect.right(), foot], &x_words, style.anchored(Anchor::End));
        // Over the numbers along y, so that it reads as their heading.
        let left = rect.x - LONG - 1.2 - widest(ty);
        scene.text([left, rect.y - 2.0], &y_words, style);
        draw_title(scene, &title_lines(self.figure, scene.width));
        let legend = self.legend();
        let top = rect.y - LABEL_LINE - legend.height(rect.w);
        legend.draw(scene, [left, top - 0.3], rect.w);
    }
}

/// Level hairlines behind the data, and a clearer one at zero.
fn draw_ground(scene: &mut Scene, plot: &Plot, ty: &Ticks) {
    let rect = plot.rect;
    let level = |v: f64| Path::segment([rect.x, plot.y_mm(v)], [rect.right(), plot.y_mm(v)]);
    for (value, _) in &ty.major {
        scene.stroke(level(*value), Stroke::new(FAINT, 0.18));
    }
    if !plot.y.log && plot.y.lo < 0.0 && plot.y.hi > 0.0 {
        scene.stroke(level(0.0), Stroke::new(MUTED, 0.22));
    }
}

/// Axis lines with marks across them and numbers beside them: a full frame around a map, the two
/// axes alone for curves.
fn draw_axes(scene: &mut Scene, plot: &Plot, tx: &Ticks, ty: &Ticks, is_map: bool) {
    let rect = plot.rect;
    let mut marks = Path::new();
    let mut mark = |from, to| marks.add(&Path::segment(from, to), |p| p);
    let number = Style::plain(NUMBER_MM);
    let long = tx.major.iter().map(|(v, _)| (*v, LONG));
    for (value, half) in long.chain(tx.minor.iter().map(|v| (*v, SHORT))) {
        let x = plot.x_mm(value);
        mark([x, rect.bottom() - half], [x, rect.bottom() + half]);
        if is_map {
            mark([x, rect.y - half], [x, rect.y + half]);
        }
    }
    let long = ty.major.iter().map(|(v, _)| (*v, LONG));
    for (value, half) in long.chain(ty.minor.iter().map(|v| (*v, SHORT))) {
        let y = plot.y_mm(value);
        mark([rect.x - half, y], [rect.x + half, y]);
        if is_map {
            mark([rect.right() - half, y], [rect.right() + half, y]);
        }
    }
    let line = Stroke::new(INK, 0.2);
    scene.stroke(marks, line.clone());
    if is_map {
        scene.stroke(Path::rect(rect), line);
    } else {
        let corner = [rect.x, rect.bottom()];
        scene.stroke(
            Path::polyline([[rect.x, rect.y], corner, [rect.right(), corner[1]]], false),
            line,
        );
    }
    for (value, text) in &tx.major {
        let at = [
            plot.x_mm(*value),
            rect.bottom() + LONG + 0.9 + CAPITAL * NUMBER_MM,
        ];
        scene.text(at, text, number.anchored(Anchor::Middle));
    }
    for (value, text) in &ty.major {
        let at = [
            rect.x - LONG - 1.2,
            plot.y_mm(*value) + 0.5 * CAPITAL * NUMBER_MM,
        ];
        scene.text(at, text, number.anchored(Anchor::End));
    }
}
