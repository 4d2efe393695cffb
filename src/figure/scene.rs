//! What is to be drawn, in millimetres on paper: paths, rasters and clipped groups.
//!
//! x points right and y points **down** from the upper left corner of the sheet. A scene knows
//! nothing of axes or fields; `svg` and `raster` turn one and the same scene into their format, so
//! that both look alike.

use super::colour::{Colour, INK, PAPER};
use super::font::{self, Weight};

/// A point on the sheet.
pub(crate) type Point = [f64; 2];

/// Coordinates beyond this many mm are pulled back to it: far outside any sheet.
const FARTHEST: f64 = 1e6;

/// One step of a path.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum Step {
    Move(Point),
    Line(Point),
    Quad(Point, Point),
    Cubic(Point, Point, Point),
    Close,
}

/// A path; its coordinates are always finite.
#[derive(Clone, Debug, Default, PartialEq)]
pub(crate) struct Path {
    pub steps: Vec<Step>,
}

fn tame(p: Point) -> Point {
    p.map(|c| {
        if c.is_nan() {
            0.0
        } else {
            c.clamp(-FARTHEST, FARTHEST)
        }
    })
}

impl Path {
    pub fn new() -> Self {
        Self::default()
    }

    pub fn is_empty(&self) -> bool {
        self.steps.is_empty()
    }

    pub fn move_to(&mut self, p: Point) {
        self.steps.push(Step::Move(tame(p)));
    }

    pub fn line_to(&mut self, p: Point) {
        self.steps.push(Step::Line(tame(p)));
    }

    pub fn quad_to(&mut self, a: Point, p: Point) {
        self.steps.push(Step::Quad(tame(a), tame(p)));
    }

    pub fn cubic_to(&mut self, a: Point, b: Point, p: Point) {
        self.steps.push(Step::Cubic(tame(a), tame(b), tame(p)));
    }

    pub fn close(&mut self) {
        self.steps.push(Step::Close);
    }

    /// The straight line from `a` to `b`.
    pub fn segment(a: Point, b: Point) -> Self {
        Self::polyline([a, b], false)
    }

    /// The line through `points`, closed or not.
    pub fn polyline(points: impl IntoIterator<Item = Point>, closed: bool) -> Self {
        let mut path = Self::new();
        path.add_polyline(points, closed);
        path
    }

    /// Adds the line through `points`, closed or not.
    pub fn add_polyline(&mut self, points: impl IntoIterator<Item = Point>, closed: bool) {
        let before = self.steps.len();
        for p in points {
            if self.steps.len() == before {
                self.move_to(p);
            } else {
                self.line_to(p);
            }
        }
        if closed && self.steps.len() > before {
            self.close();
        }
    }

    /// The outline of `rect`.
    pub fn rect(rect: Rect) -> Self {
        let Rect { x, y, w, h } = rect;
        Self::polyline([[x, y], [x + w, y], [x + w, y + h], [x, y + h]], true)
    }

    /// Adds a circular arc about `centre` from angle `from`, turning by `turn` (radians, both
    /// positive clockwise on the sheet); starts a new piece unless `joined`.
    pub fn add_arc(&mut self, centre: Point, radius: f64, from: f64, turn: f64, joined: bool) {
        let pieces = (turn.abs() / std::f64::consts::FRAC_PI_4).ceil().max(1.0);
        let d = turn / pieces;
        // Length of the control arms of a cubic that follows the arc (error below 1e-5 radius).
        let arm = 4.0 / 3.0 * (d / 4.0).tan() * radius;
        let at = |t: f64| [centre[0] + radius * t.cos(), centre[1] + radius * t.sin()];
        if joined {
            self.line_to(at(from));
        } else {
            self.move_to(at(from));
        }
        for k in 0..pieces as usize {
            let (t0, t1) = (from + k as f64 * d, from + (k + 1) as f64 * d);
            let (p0, p1) = (at(t0), at(t1));
            self.cubic_to(
                [p0[0] - arm * t0.sin(), p0[1] + arm * t0.cos()],
                [p1[0] + arm * t1.sin(), p1[1] - arm * t1.cos()],
                p1,
            );
        }
    }

    /// The circle about `centre`.
    pub fn circle(centre: Point, radius: f64) -> Self {
        let mut path = Self::new();
        path.add_arc(centre, radius, 0.0, std::f64::consts::TAU, false);
        path.close();
        path
    }

    /// Adds `other`, every point moved by `place`.
    pub fn add(&mut self, other: &Path, place: impl Fn(Point) -> Point) {
        for step in &other.steps {
            match *step {
                Step::Move(p) => self.move_to(place(p)),
                Step::Line(p) => self.line_to(place(p)),
                Step::Quad(a, p) => self.quad_to(place(a), place(p)),
                Step::Cubic(a, b, p) => self.cubic_to(place(a), place(b), place(p)),
                Step::Close => self.close(),
            }
        }
    }
}

/// A rectangle by its upper left corner.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Rect {
    pub x: f64,
    pub y: f64,
    pub w: f64,
    pub h: f64,
}

impl Rect {
    pub fn right(&self) -> f64 {
        self.x + self.w
    }

    pub fn bottom(&self) -> f64 {
        self.y + self.h
    }

    pub fn middle(&self) -> Point {
        [self.x + 0.5 * self.w, self.y + 0.5 * self.h]
    }

    pub fn holds(&self, p: Point) -> bool {
        p[0] >= self.x && p[0] <= self.right() && p[1] >= self.y && p[1] <= self.bottom()
    }

    pub fn grown(&self, by: f64) -> Rect {
        Rect {
            x: self.x - by,
            y: self.y - by,
            w: self.w + 2.0 * by,
            h: self.h + 2.0 * by,
        }
    }

    /// Area shared with `other`.
    pub fn overlap(&self, other: &Rect) -> f64 {
        let w = self.right().min(other.right()) - self.x.max(other.x);
        let h = self.bottom().min(other.bottom()) - self.y.max(other.y);
        w.max(0.0) * h.max(0.0)
    }
}

/// How a line is drawn; lengths in mm.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Stroke {
    pub colour: Colour,
    pub width: f64,
    /// Lengths drawn and left out in turn; empty for a solid line.
    pub dash: Vec<f64>,
    /// Round ends and corners.
    pub round: bool,
}

impl Stroke {
    pub fn new(colour: Colour, width: f64) -> Self {
        Self {
            colour,
            width,
            dash: Vec::new(),
            round: false,
        }
    }

    pub fn dashed(mut self, dash: &[f64]) -> Self {
        self.dash = dash.to_vec();
        self
    }

    pub fn rounded(mut self) -> Self {
        self.round = true;
        self
    }
}

/// Dots of a palette, row 0 on top.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Dots {
    pub width: usize,
    pub height: usize,
    pub palette: Vec<Colour>,
    pub indices: Vec<u8>,
}

/// One thing to draw.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Item {
    Shape {
        path: Path,
        fill: Option<Colour>,
        stroke: Option<Stroke>,
        /// The words, where the path is words.
        label: Option<String>,
    },
    Dots {
        rect: Rect,
        dots: Dots,
    },
    Clip {
        rect: Rect,
        items: Vec<Item>,
    },
}

/// Which part of a text stands at its point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum Anchor {
    Start,
    Middle,
    End,
}

/// How words are set.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Style {
    /// Size of the em in mm.
    pub size: f64,
    pub weight: Weight,
    pub colour: Colour,
    pub anchor: Anchor,
    /// With a rim of paper colour, to be read on top of data.
    pub halo: bool,
}

impl Style {
    pub fn plain(size: f64) -> Self {
        Self {
            size,
            weight: Weight::Regular,
            colour: INK,
            anchor: Anchor::Start,
            halo: false,
        }
    }

    pub fn anchored(self, anchor: Anchor) -> Self {
        Self { anchor, ..self }
    }

    pub fn coloured(self, colour: Colour) -> Self {
        Self { colour, ..self }
    }

    pub fn medium(self) -> Self {
        Self {
            weight: Weight::Medium,
            ..self
        }
    }

    pub fn haloed(self) -> Self {
        Self { halo: true, ..self }
    }

    /// Width of `text` in mm.
    pub fn width(&self, text: &str) -> f64 {
        font::width(text, self.weight) * self.size
    }
}

/// A sheet and what is on it.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Scene {
    pub width: f64,
    pub height: f64,
    pub items: Vec<Item>,
}

impl Scene {
    pub fn new(width: f64, height: f64) -> Self {
        Self {
            width,
            height,
            items: Vec::new(),
        }
    }

    pub fn fill(&mut self, path: Path, colour: Colour) {
        self.shape(path, Some(colour), None);
    }

    pub fn stroke(&mut self, path: Path, stroke: Stroke) {
        self.shape(path, None, Some(stroke));
    }

    pub fn shape(&mut self, path: Path, fill: Option<Colour>, stroke: Option<Stroke>) {
        if !path.is_empty() {
            self.items.push(Item::Shape {
                path,
                fill,
                stroke,
                label: None,
            });
        }
    }

    /// Sets `text` with its base line through `at`.
    pub fn text(&mut self, at: Point, text: &str, style: Style) {
        let (outline, width) = font::outline(text, style.weight);
        let shift = match style.anchor {
            Anchor::Start => 0.0,
            Anchor::Middle => 0.5 * width,
            Anchor::End => width,
        };
        let mut path = Path::new();
        let s = style.size;
        path.add(&outline, |[x, y]| [at[0] + (x - shift) * s, at[1] - y * s]);
        if path.is_empty() {
            return;
        }
        if style.halo {
            let rim = Stroke::new(PAPER.faded(225), 0.28 * s).rounded();
            self.stroke(path.clone(), rim);
        }
        self.items.push(Item::Shape {
            path,
            fill: Some(style.colour),
            stroke: None,
            label: Some(text.to_owned()),
        });
    }

    /// What `draw` draws, cut off at `rect`.
    pub fn clipped(&mut self, rect: Rect, draw: impl FnOnce(&mut Scene)) {
        let mut inner = Scene::new(self.width, self.height);
        draw(&mut inner);
        if !inner.items.is_empty() {
            let items = inner.items;
            self.items.push(Item::Clip { rect, items });
        }
    }

    /// Adds everything on `other`, moved by (`dx`, `dy`).
    pub fn place(&mut self, other: Scene, dx: f64, dy: f64) {
        self.items
            .extend(other.items.into_iter().map(|item| moved(item, dx, dy)));
    }
}

fn moved(item: Item, dx: f64, dy: f64) -> Item {
    let shift = |rect: Rect| Rect {
        x: rect.x + dx,
        y: rect.y + dy,
        ..rect
    };
    match item {
        Item::Shape {
            path,
            fill,
            stroke,
            label,
        } => {
            let mut there = Path::new();
            there.add(&path, |[x, y]| [x + dx, y + dy]);
            Item::Shape {
                path: there,
                fill,
                stroke,
                label,
            }
        }
        Item::Dots { rect, dots } => Item::Dots {
            rect: shift(rect),
            dots,
        },
        Item::Clip { rect, items } => Item::Clip {
            rect: shift(rect),
            items: items.into_iter().map(|i| moved(i, dx, dy)).collect(),
        },
    }
}
