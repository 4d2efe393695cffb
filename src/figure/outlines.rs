//! Closed outlines with a centre, a sense of rotation and a label: how eddies are shown.

use std::f64::consts::{FRAC_PI_2, PI};

use super::axis::Plot;
use super::colour::{INK, PAPER};
use super::labels::{self, Traced};
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

/// Outlines with the places of their marks and labels settled.
pub(crate) struct Placed<'a> {
    lines: Vec<(Path, bool)>,
    marks: Vec<Mark<'a>>,
}

struct Mark<'a> {
    outline: &'a Outline,
    centre: Point,
    /// The box of the label.
    label: Rect,
}

pub(crate) fn place<'a>(set: &'a OutlineSet, plot: &Plot) -> Placed<'a> {
    let mut placement = Placement::new(plot.rect.grown(-0.6));
    let (mut lines, mut owners, mut traced) = (Vec::new(), Vec::new(), Vec::new());
    for outline in &set.list {
        let corners = outline.polygon.iter();
        let line: Vec<Point> = corners.filter_map(|p| plot.at(p[0], p[1])).collect();
        placement.take_line(&line);
        lines.push((Path::polyline(line.clone(), true), outline.flagged));
        let [x, y] = outline.centre;
        if let Some(centre) = plot.at(x, y) {
            if plot.x.holds(x) && plot.y.holds(y) {
                placement.take(mark_box(centre));
            }
            owners.push(outline);
            traced.push(Traced { centre, line });
        }
    }
    let mut marks = Vec::new();
    for (own, outline) in owners.into_iter().enumerate() {
        if plot.x.holds(outline.centre[0]) && plot.y.holds(outline.centre[1]) {
            let size = text_box(&outline.label, &label_style());
            marks.push(Mark {
                outline,
                centre: traced[own].centre,
                label: labels::choose(&mut placement, &traced, own, size, MARK_MM + 0.25),
            });
        }
    }
    Placed { lines, marks }
}

impl Placed<'_> {
    /// The boxes of marks and labels, which arrows keep off.
    pub fn boxes(&self) -> impl Iterator<Item = Rect> + '_ {
        self.marks.iter().flat_map(|mark| {
            let label = (!mark.outline.label.is_empty()).then_some(mark.label);
            std::iter::once(mark_box(mark.centre)).chain(label)
        })
    }

    pub fn draw(&self, scene: &mut Scene, plot: &Plot) {
        scene.clipped(plot.rect, |scene| {
            for (line, flagged) in &self.lines {
                draw_line(scene, line.clone(), *flagged);
            }
            for mark in &self.marks {
                draw_mark(scene, mark.centre, mark.outline.clockwise);
            }
        });
        for mark in &self.marks {
            scene.text(base_line(&mark.label), &mark.outline.label, label_style());
        }
    }
}

fn label_style() -> Style {
    Style::plain(LABEL_MM).medium().haloed()
}

fn mark_box(centre: Point) -> Rect {
    let [x, y] = centre;
    Rect {
        x,
        y,
        w: 0.0,
        h: 0.0,
    }
    .grown(MARK_MM)
}

pub(crate) fn draw_line(scene: &mut Scene, path: Path, doubtful: bool) {
    let halo = Stroke::new(PAPER.faded(210), 0.95);
    let line = Stroke::new(INK, 0.4);
    // Round ends would close the gaps of a dashed halo to a ring of its own.
    let (halo, line) = if doubtful {
        (halo.dashed(&DOUBT), line.dashed(&DOUBT))
    } else {
        (halo.rounded(), line)
    };
    scene.stroke(path.clone(), halo);
    scene.stroke(path, line);
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
