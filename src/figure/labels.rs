//! Where the label of an outline goes: to a place that leaves no doubt whose it is.

use std::f64::consts::TAU;

use super::placement::Placement;
use super::scene::{Point, Rect};

/// An outline on the sheet.
pub(crate) struct Traced {
    pub centre: Point,
    /// Its boundary, closed by the way back to the first point; may be empty.
    pub line: Vec<Point>,
}

/// A label may be farther from another centre by no less than this ratio.
const CLEARLY: f64 = 0.8;

/// The gap between label and outline, in mm, at which they still touch to the eye.
const TOUCHING: f64 = 0.4;

fn distance(a: Point, b: Point) -> f64 {
    (a[0] - b[0]).hypot(a[1] - b[1])
}

/// Distance of `p` from the segment between `a` and `b`.
fn from_segment(p: Point, a: Point, b: Point) -> f64 {
    let d = [b[0] - a[0], b[1] - a[1]];
    let square = d[0] * d[0] + d[1] * d[1];
    let along = (p[0] - a[0]) * d[0] + (p[1] - a[1]) * d[1];
    let t = if square > 0.0 {
        (along / square).clamp(0.0, 1.0)
    } else {
        0.0
    };
    distance(p, [a[0] + t * d[0], a[1] + t * d[1]])
}

impl Traced {
    fn sides(&self) -> impl Iterator<Item = (Point, Point)> + '_ {
        let next = self.line.iter().cycle().skip(1);
        self.line.iter().zip(next).map(|(a, b)| (*a, *b))
    }

    /// How far `p` is outside, 0 within; the distance to the centre where there is no boundary.
    fn outside(&self, p: Point) -> f64 {
        if self.line.is_empty() {
            return distance(p, self.centre);
        }
        let crossed = self.sides().filter(|(a, b)| {
            (a[1] < p[1]) != (b[1] < p[1])
                && a[0] + (p[1] - a[1]) / (b[1] - a[1]) * (b[0] - a[0]) > p[0]
        });
        if crossed.count() % 2 == 1 {
            return 0.0;
        }
        self.sides()
            .map(|(a, b)| from_segment(p, a, b))
            .fold(f64::INFINITY, f64::min)
    }
}

/// The box of the label of the `own`-th of `all`, `size` large, beside a mark of radius `mark`.
///
/// Among the places that touch its own outline or the mark, and are nearer to them than to any
/// other's, the one that hides least; where there is none, as close to its centre as it takes.
pub(crate) fn choose(
    placement: &mut Placement,
    all: &[Traced],
    own: usize,
    size: Rect,
    mark: f64,
) -> Rect {
    let candidates: Vec<Rect> = places(all[own].centre, size, mark)
        .filter(|(rect, beside)| belongs(rect, *beside, all, own))
        .map(|(rect, _)| rect)
        .collect();
    placement.choose(candidates).unwrap_or_else(|| {
        let rect = close_by(all, own, size, mark);
        placement.take(rect);
        rect
    })
}

/// Boxes about a centre from near to far, and whether they stand right beside the mark.
fn places(centre: Point, size: Rect, mark: f64) -> impl Iterator<Item = (Rect, bool)> {
    const SIDES: [Point; 8] = [
        [1.0, -1.0],
        [-1.0, -1.0],
        [1.0, 1.0],
        [-1.0, 1.0],
        [0.0, -1.2],
        [0.0, 1.2],
        [1.0, 0.0],
        [-1.0, 0.0],
    ];
    [1.0, 1.8, 2.8].into_iter().flat_map(move |far| {
        SIDES.into_iter().map(move |[sx, sy]| {
            let reach = far * mark;
            let dx = sx * (reach + 0.5 * size.w);
            let dy = sy * (reach + 0.3 * size.h);
            (about([centre[0] + dx, centre[1] + dy], size), far == 1.0)
        })
    })
}

fn about(middle: Point, size: Rect) -> Rect {
    Rect {
        x: middle[0] - 0.5 * size.w,
        y: middle[1] - 0.5 * size.h,
        ..size
    }
}

/// The others, without those about the very same centre, which no place could tell apart.
fn others(all: &[Traced], own: usize) -> impl Iterator<Item = &Traced> {
    let centre = all[own].centre;
    all.iter().filter(move |o| distance(o.centre, centre) > 0.0)
}

fn belongs(rect: &Rect, beside: bool, all: &[Traced], own: usize) -> bool {
    let p = rect.middle();
    let away = distance(p, all[own].centre);
    if others(all, own).any(|o| away >= CLEARLY * distance(p, o.centre)) {
        return false;
    }
    let outside = all[own].outside(p);
    (beside || outside <= 0.5 * rect.h + TOUCHING)
        && others(all, own).all(|o| outside <= o.outside(p))
}

/// The box beside the mark farthest from the other centres, moved onto the mark as far as it takes
/// to be nearest to its own.
fn close_by(all: &[Traced], own: usize, size: Rect, mark: f64) -> Rect {
    let centre = all[own].centre;
    let nearest = |p: Point| {
        others(all, own)
            .map(|o| distance(p, o.centre))
            .fold(f64::INFINITY, f64::min)
    };
    let lead = |by: &Point| nearest([centre[0] + by[0], centre[1] + by[1]]) - by[0].hypot(by[1]);
    let best = (0..16)
        .map(|k| {
            let (sin, cos) = (f64::from(k) / 16.0 * TAU).sin_cos();
            [cos * (mark + 0.5 * size.w), sin * (mark + 0.4 * size.h)]
        })
        .max_by(|a, b| lead(a).total_cmp(&lead(b)))
        .unwrap_or_default();
    let share = if lead(&best) > 0.0 {
        1.0
    } else {
        (0.45 * nearest(centre) / best[0].hypot(best[1])).min(1.0)
    };
    about(
        [centre[0] + share * best[0], centre[1] + share * best[1]],
        size,
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const SIZE: Rect = Rect {
        x: 0.0,
        y: 0.0,
        w: 1.6,
        h: 2.6,
    };

    fn ring(x: f64, y: f64, radius: f64) -> Traced {
        let corner = |k: i32| {
            let (sin, cos) = (f64::from(k) / 24.0 * TAU).sin_cos();
            [x + radius * cos, y + radius * sin]
        };
        Traced {
            centre: [x, y],
            line: (0..24).map(corner).collect(),
        }
    }

    /// Every label of `all` on a small map.
    fn labels(all: &[Traced]) -> Vec<Rect> {
        let mut placement = Placement::new(Rect {
            x: 0.0,
            y: 0.0,
            w: 40.0,
            h: 30.0,
        });
        for one in all {
            placement.take_line(&one.line);
            placement.take(about(
                one.centre,
                Rect {
                    w: 2.5,
                    h: 2.5,
                    ..SIZE
                },
            ));
        }
        (0..all.len())
            .map(|own| choose(&mut placement, all, own, SIZE, 1.5))
            .collect()
    }

    #[test]
    fn a_label_is_inside_or_touches_its_outline_where_there_is_room() {
        let all = [
            ring(10.0, 15.0, 5.0),
            ring(21.0, 15.0, 4.0),
            ring(33.0, 8.0, 2.0),
        ];
        for (label, one) in labels(&all).iter().zip(&all) {
            let away = distance(label.middle(), one.centre);
            // 24 corners: the boundary lies within 1 % of the circle.
            let radius = distance(one.line[0], one.centre);
            assert!(away <= radius + 0.5 * SIZE.h + TOUCHING + 0.1, "{away}");
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(300))]

        #[test]
        fn a_label_is_nearer_to_its_own_centre_than_to_any_other(
            rings in proptest::collection::vec((0.0..40.0, 0.0..30.0, 0.0..9.0), 1..25),
        ) {
            let all: Vec<Traced> = rings.iter().map(|(x, y, r)| ring(*x, *y, *r)).collect();
            for (own, label) in labels(&all).iter().enumerate() {
                let p = label.middle();
                for other in others(&all, own) {
                    prop_assert!(distance(p, all[own].centre) < distance(p, other.centre));
                }
            }
        }
    }
}
