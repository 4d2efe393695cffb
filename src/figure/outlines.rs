//! Closed outlines with a centre, a sense of rotation and a label: how eddies are shown.

use std::f64::consts::{FRAC_PI_2, PI};

use super::axis::Plot;
use super::colour::{INK, PAPER};
use super::placement::{Placement, base_line, text_box};
use super::scene::{Path, Point, Rect, Scene, Stroke, Style};
use crate::quantity::Unit;

/// One outline.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Outline {
    /// Corners (x, y) of the boundary, not repeated at its end; may be empty.
    pub polygon: Vec<[f64; 2]>,
    /// The centre (x, y).
    pub centre: [f64; 2],
    /// What is written beside the centre; may be empty.
    pub label: String,
    /// True when what is outlined turns clockwise.
    pub clockwise: bool,
    /// Drawn dashed: its size is in doubt.
    pub flagged: bool,
}

/// Outlines in one unit of length.
#[derive(Clone, Debug, PartialEq)]
pub struct OutlineSet {
    /// Unit of all coordinates: px or mm.
    pub length: Unit,
    /// The outlines.
    pub list: Vec<Outline>,
}

/// The dash of an outline in doubt.
pub(crate) const DOUBT: [f64; 2] = [1.5, 1.0];
const LABEL_MM: f64 = 2.7;
const MARK_MM: f64 = 1.25;

pub(crate) fn draw(scene: &mut Scene, set: &OutlineSet, plot: &Plot) {
    let mut placement = Placement::new(plot.rect.grown(-0.6));
    let visible = |o: &&Outline| plot.x.holds(o.centre[0]) && plot.y.holds(o.centre[1]);
    scene.clipped(plot.rect, |scene| {
        for outline in &set.list {
            let points: Vec<Point> = outline
                .polygon
                .iter()
                .filter_map(|p| plot.at(p[0], p[1]))
                .collect();
            placement.take_line(&points);
            draw_line(scene, Path::polyline(points, true), outline.flagged);
        }
        for outline in set.list.iter().filter(visible) {
            if let Some(centre) = plot.at(outline.centre[0], outline.centre[1]) {
                draw_mark(scene, centre, outline.clockwise);
                placement.take(
                    Rect {
                        x: centre[0],
                        y: centre[1],
                        w: 0.0,
                        h: 0.0,
                    }
                    .grown(MARK_MM),
                );
            }
        }
    });
    for outline in set.list.iter().filter(visible) {
        if let Some(centre) = plot.at(outline.centre[0], outline.centre[1]) {
            draw_label(scene, &mut placement, centre, &outline.label);
        }
    }
}

pub(crate) fn draw_line(scene: &mut Scene, path: Path, doubtful: bool) {
    scene.stroke(path.clone(), Stroke::new(PAPER.faded(210), 0.95).rounded());
    let line = Stroke::new(INK, 0.4);
    scene.stroke(path, if doubtful { line.dashed(&DOUBT) } else { line });
}

/// A dot with a three-quarter arc about it, its arrow head turning the eddy's way.
fn draw_mark(scene: &mut Scene, centre: Point, clockwise: bool) {
    let turn = if clockwise { 1.0 } else { -1.0 };
    let (from, sweep) = (FRAC_PI_2 - turn * 0.3, turn * 1.45 * PI);
    let mut arc = Path::new();
    arc.add_arc(centre, MARK_MM, from, sweep, false);
    let end = from + sweep;
    let radial = [end.cos(), end.sin()];
    let ahead = [-turn * radial[1], turn * radial[0]];
    let at = |r: f64, s: f64| {
        [
            centre[0] + r * radial[0] + s * ahead[0],
            centre[1] + r * radial[1] + s * ahead[1],
        ]
    };
    let mut solid = Path::circle(centre, 0.3);
    let head = [
        at(MARK_MM, 0.75),
        at(MARK_MM + 0.5, -0.15),
        at(MARK_MM - 0.5, -0.15),
    ];
    solid.add_polyline(head, true);
    let halo = PAPER.faded(225);
    scene.stroke(arc.clone(), Stroke::new(halo, 0.85).rounded());
    scene.stroke(solid.clone(), Stroke::new(halo, 0.55).rounded());
    scene.stroke(arc, Stroke::new(INK, 0.28));
    scene.fill(solid, INK);
}

fn draw_label(scene: &mut Scene, placement: &mut Placement, centre: Point, label: &str) {
    let style = Style::plain(LABEL_MM).medium().haloed();
    let size = text_box(label, &style);
    let candidates = [1.0, 1.8, 2.8].into_iter().flat_map(|far| {
        [
            (1.0, -1.0),
            (-1.0, -1.0),
            (1.0, 1.0),
            (-1.0, 1.0),
            (0.0, -1.2),
            (0.0, 1.2),
        ]
        .into_iter()
        .map(move |(sx, sy)| {
            let reach = far * (MARK_MM + 0.25);
            Rect {
                x: centre[0] + sx * (reach + 0.5 * size.w) - 0.5 * size.w,
                y: centre[1] + sy * (reach + 0.3 * size.h) - 0.5 * size.h,
                ..size
            }
        })
    });
    if let Some(rect) = placement.choose(candidates) {
        scene.text(base_line(&rect), label, style);
    }
}
