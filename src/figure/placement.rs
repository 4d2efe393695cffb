//! Where a label goes so that it hides as little as possible.

use super::scene::{Point, Rect, Style};

/// What labels should keep clear of.
pub(crate) struct Placement {
    within: Rect,
    taken: Vec<Rect>,
    points: Vec<Point>,
}

impl Placement {
    /// Labels are to stay inside `within`.
    pub fn new(within: Rect) -> Self {
        Self {
            within,
            taken: Vec::new(),
            points: Vec::new(),
        }
    }

    /// Keeps labels off `rect`.
    pub fn take(&mut self, rect: Rect) {
        self.taken.push(rect);
    }

    /// Keeps labels off the line through `points`, noted every millimetre.
    pub fn take_line(&mut self, points: &[Point]) {
        for pair in points.windows(2) {
            let [a, b] = [pair[0], pair[1]];
            let length = (b[0] - a[0]).hypot(b[1] - a[1]);
            let pieces = length.ceil().clamp(1.0, 500.0);
            for k in 0..pieces as usize {
                let t = k as f64 / pieces;
                let p = [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])];
                if self.within.holds(p) {
                    self.points.push(p);
                }
            }
        }
        if let Some(last) = points.last().filter(|p| self.within.holds(**p)) {
            self.points.push(*last);
        }
    }

    fn cost(&self, rect: &Rect) -> f64 {
        let near = rect.grown(0.4);
        let labels: f64 = self.taken.iter().map(|r| near.overlap(r)).sum();
        let line = self.points.iter().filter(|p| near.holds(**p)).count() as f64;
        let outside = rect.w * rect.h - rect.overlap(&self.within);
        10.0 * labels + line + 50.0 * outside
    }

    /// The first of the cheapest among `candidates`, which is then taken itself.
    pub fn choose(&mut self, candidates: impl IntoIterator<Item = Rect>) -> Option<Rect> {
        let best = candidates
            .into_iter()
            .map(|rect| (self.cost(&rect), rect))
            .reduce(|best, next| if next.0 < best.0 { next } else { best })?;
        self.take(best.1);
        Some(best.1)
    }
}

/// The box of `text` whose lower left corner, a little below the base line, is at the origin.
pub(crate) fn text_box(text: &str, style: &Style) -> Rect {
    Rect {
        x: 0.0,
        y: 0.0,
        w: style.width(text),
        h: 0.95 * style.size,
    }
}

/// The start of the base line of a text in `rect`, as sized by [`text_box`].
pub(crate) fn base_line(rect: &Rect) -> Point {
    [rect.x, rect.bottom() - 0.23 * rect.h]
}
