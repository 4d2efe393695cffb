//! Numbered places on a map, and rectangles that bound a part of it.

use super::axis::{Plot, Span};
use super::colour::{INK, PAPER};
use super::labels::{self, Traced};
use super::layout::NUMBER_MM;
use super::placement::{Placement, base_line, text_box};
use super::scene::{Path, Point, Rect, Scene, Stroke, Style};
use crate::quantity::Unit;

/// One place.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Mark {
    /// Where it is (x, y).
    pub at: [f64; 2],
    /// What is written beside it; may be empty.
    pub label: String,
    /// A ring with a dot in it, to stand out among rings.
    pub chosen: bool,
}

/// A rectangle drawn as a dashed line.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Bounds {
    /// Left, right, lower and upper end.
    pub ends: [f64; 4],
    /// What is written along it; may be empty.
    pub label: String,
}

/// Places and bounds whose coordinates have one unit.
#[derive(Clone, Debug, PartialEq)]
pub struct MarkSet {
    /// Unit of all coordinates.
    pub unit: Unit,
    /// The places.
    pub marks: Vec<Mark>,
    /// The rectangles, drawn under the marks.
    pub bounds: Vec<Bounds>,
}

/// Radius of a ring.
const RING_MM: f64 = 0.95;

impl MarkSet {
    pub(crate) fn spans(&self) -> (Span, Span) {
        let (mut x, mut y) = (Span::NOTHING, Span::NOTHING);
        for mark in &self.marks {
            x.take(mark.at[0]);
            y.take(mark.at[1]);
        }
        for Bounds { ends, .. } in &self.bounds {
            x.join(Span::of([ends[0], ends[1]]));
            y.join(Span::of([ends[2], ends[3]]));
        }
        (x, y)
    }

    pub(crate) fn draw(&self, scene: &mut Scene, plot: &Plot) {
        let seen = |m: &&Mark| plot.x.holds(m.at[0]) && plot.y.holds(m.at[1]);
        let marks: Vec<(&Mark, Point)> = self
            .marks
            .iter()
            .filter(seen)
            .filter_map(|m| Some((m, plot.at(m.at[0], m.at[1])?)))
            .collect();
        let mut placement = Placement::new(plot.rect.grown(-0.6));
        for (_, at) in &marks {
            placement.take(box_about(*at));
        }
        let bounds: Vec<(&Bounds, Vec<Point>)> = self
            .bounds
            .iter()
            .map(|bounds| (bounds, corners(bounds, plot)))
            .collect();
        for (_, line) in &bounds {
            scene.clipped(plot.rect, |scene| draw_bounds(scene, line));
            let closed: Vec<Point> = line.iter().chain(line.first()).copied().collect();
            placement.take_line(&closed);
        }
        scene.clipped(plot.rect, |scene| {
            for (mark, at) in &marks {
                draw_ring(scene, *at, mark.chosen);
            }
        });
        let traced: Vec<Traced> = marks
            .iter()
            .map(|(_, centre)| Traced {
                centre: *centre,
                line: Vec::new(),
            })
            .collect();
        for (own, (mark, _)) in marks.iter().enumerate() {
            let size = text_box(&mark.label, &number_style());
            let place = labels::choose(&mut placement, &traced, own, size, RING_MM + 0.25);
            scene.text(base_line(&place), &mark.label, number_style());
        }
        for (bounds, line) in bounds.iter().filter(|(b, _)| !b.label.is_empty()) {
            let size = text_box(&bounds.label, &words_style());
            if let Some(place) = placement.choose(beside(line, size)) {
                scene.text(base_line(&place), &bounds.label, words_style());
            }
        }
    }
}

fn number_style() -> Style {
    Style::plain(NUMBER_MM).medium().haloed()
}

fn words_style() -> Style {
    Style::plain(NUMBER_MM).haloed()
}

fn box_about([x, y]: Point) -> Rect {
    let (w, h) = (0.0, 0.0);
    Rect { x, y, w, h }.grown(RING_MM)
}

/// Corners on the sheet: upper left, upper right, lower right, lower left.
fn corners(bounds: &Bounds, plot: &Plot) -> Vec<Point> {
    let [left, right, low, high] = bounds.ends;
    [(left, high), (right, high), (right, low), (left, low)]
        .into_iter()
        .filter_map(|(x, y)| plot.at(x, y))
        .collect()
}

/// Places for words along the upper and the lower side, outside and inside.
fn beside(corners: &[Point], size: Rect) -> Vec<Rect> {
    let [upper, right, _, lower] = corners[..] else {
        return Vec::new();
    };
    let (left, far) = (upper[0] + 0.9, right[0] - 0.9 - size.w);
    let heights = [
        upper[1] - size.h - 0.6,
        lower[1] + 0.6,
        upper[1] + 0.9,
        lower[1] - size.h - 0.9,
    ];
    let places = heights.into_iter().flat_map(|y| [(left, y), (far, y)]);
    places.map(|(x, y)| Rect { x, y, ..size }).collect()
}

fn draw_bounds(scene: &mut Scene, line: &[Point]) {
    let dash = [1.1, 0.9];
    let path = Path::polyline(line.iter().copied(), true);
    let halo = Stroke::new(PAPER.faded(210), 0.8);
    scene.stroke(path.clone(), halo);
    scene.stroke(path, Stroke::new(INK, 0.3).dashed(&dash));
}

fn draw_ring(scene: &mut Scene, at: Point, chosen: bool) {
    let ring = Path::circle(at, RING_MM);
    scene.stroke(ring.clone(), Stroke::new(PAPER.faded(225), 0.85));
    scene.stroke(ring, Stroke::new(INK, 0.3));
    if chosen {
        let dot = Path::circle(at, 0.32);
        scene.stroke(dot.clone(), Stroke::new(PAPER.faded(225), 0.4));
        scene.fill(dot, INK);
    }
}
