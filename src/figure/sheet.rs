//! The settled, laid-out figure drawn from the back to the front.

use super::arrows::Fitted;
use super::axis::Plot;
use super::caption;
use super::colour::{FAINT, INK, MUTED};
use super::error::FigureError;
use super::figure::Figure;
use super::font::CAPITAL;
use super::key::with_unit;
use super::layer::Layer;
use super::layout::{
    FOOT, KEY_GAP, LABEL_LINE, LABEL_MM, LEAST_PLOT, LONG, Layout, NUMBER_LINE, NUMBER_MM, SHORT,
    WIDTH_MM, draw_title, lay_out, least_height, title_lines, widest,
};
use super::outlines::{self, Placed};
use super::placement::{Placement, base_line, text_box};
use super::scene::{Anchor, Item, Path, Rect, Scene, Stroke, Style};
use super::settle::{Settled, settle};
use super::shade;
use super::ticks::Ticks;

pub(crate) fn scene(figure: &Figure, dots_per_mm: f64) -> Result<Scene, FigureError> {
    let settled = settle(figure)?;
    let layout = lay_out(&settled)?;
    Ok(settled.draw(&layout, dots_per_mm))
}

/// How the plot of a single figure stands on its sheet.
pub(crate) struct Stand {
    /// Upper edge of the plot, and the plot's height.
    pub top: f64,
    pub height: f64,
    pub is_map: bool,
    /// Least height it can be drawn with, its key beside it.
    pub least: f64,
    /// Room under the plot.
    pub foot: f64,
}

pub(crate) fn stand(figure: &Figure) -> Result<Stand, FigureError> {
    let settled = settle(figure)?;
    let rect = lay_out(&settled)?.plot.rect;
    Ok(Stand {
        top: rect.y,
        height: rect.h,
        is_map: settled.is_map,
        least: least_height(&settled).max(LEAST_PLOT),
        foot: FOOT + caption::height(figure, figure.width_mm.unwrap_or(WIDTH_MM)),
    })
}

impl Settled<'_> {
    fn draw(&self, layout: &Layout, dots_per_mm: f64) -> Scene {
        let mut scene = Scene::new(layout.size.0, layout.size.1);
        let (plot, tx, ty) = (layout.plot, &layout.x_ticks, &layout.y_ticks);
        if !self.is_map {
            draw_ground(&mut scene, &plot, ty);
        }
        let fitted = self.draw_layers(&mut scene, &plot, dots_per_mm);
        draw_axes(&mut scene, &plot, tx, ty, self.is_map);
        self.draw_lines(&mut scene, &plot);
        self.draw_words(&mut scene, &plot, tx, ty);
        let at = [plot.rect.right() + KEY_GAP, plot.rect.y];
        let column = plot.rect.h.max(self.key.least_height());
        self.key.draw(&mut scene, at, column, fitted, dots_per_mm);
        scene
    }

    fn draw_layers(&self, scene: &mut Scene, plot: &Plot, dots_per_mm: f64) -> Option<Fitted> {
        let outlines: Vec<Option<Placed>> = self
            .figure
            .layers
            .iter()
            .map(|layer| match layer {
                Layer::Outlines(set) => Some(outlines::place(set, plot)),
                _ => None,
            })
            .collect();
        let clear: Vec<Rect> = outlines.iter().flatten().flat_map(Placed::boxes).collect();
        let mut fitted = None;
        let mut index = 0;
        let parts = self.shadings.iter().zip(&self.arrows);
        let layers = self.figure.layers.iter().zip(&outlines);
        for ((layer, outlines), (shading, arrows)) in layers.zip(parts) {
            if let Some(placed) = outlines {
                placed.draw(scene, plot);
            }
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
                    fit.draw(scene, field, plot, &clear);
                    fitted = Some(fit);
                }
                (Layer::Line(c), ..) => {
                    scene.clipped(plot.rect, |s| c.draw_line(s, plot, number));
                }
                (Layer::Points(c), ..) => {
                    scene.clipped(plot.rect.grown(1.0), |s| c.draw_points(s, plot, number));
                }
                (Layer::Fitted(points, line), ..) => {
                    scene.clipped(plot.rect, |s| line.draw_line(s, plot, number));
                    let rect = plot.rect.grown(1.0);
                    scene.clipped(rect, |s| points.draw_points(s, plot, number));
                }
                (Layer::Marks(set), ..) => set.draw(scene, plot),
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
            if let Layer::Line(c) | Layer::Points(c) | Layer::Fitted(_, c) = layer {
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
        caption::draw(scene, self.figure);
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
