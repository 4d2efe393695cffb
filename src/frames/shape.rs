//! Polygons, circles and rectangles that hide pixels: x right, y up, in px, the centre of the
//! bottom-left pixel at (0, 0).
//!
//! A pixel is hidden when its centre lies inside the shape or on its edge. What lies within a
//! millionth of a px of the edge counts as on it, so that a shape in mm hides the pixels that the
//! same shape in px hides.

use ndarray::Array2;

use super::FrameError;

/// Half the width of an edge, px.
const EDGE: f64 = 1e-6;

/// Largest coordinate, in whatever unit; beyond it no camera sees.
const FARTHEST: f64 = 1e9;

/// Corners of a polygon: every two of its sides are compared once.
const MOST_CORNERS: usize = 10_000;

/// A shape in the plane of the light sheet.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Shape {
    /// Corners in order round it; the last is joined to the first.
    Polygon(Vec<[f64; 2]>),
    /// Centre and radius.
    Circle([f64; 2], f64),
    /// Lower left and upper right corner, sides along x and y.
    Rectangle([f64; 2], [f64; 2]),
}

impl Shape {
    /// A polygon.
    ///
    /// # Errors
    /// Fewer than 3 corners or more than 10 000, a coordinate that is no place, all corners on
    /// one line, or two sides that cross.
    pub fn polygon(corners: Vec<[f64; 2]>) -> Result<Self, FrameError> {
        let n = corners.len();
        if !(3..=MOST_CORNERS).contains(&n) {
            return refuse(format!(
                "a polygon has 3 to {MOST_CORNERS} corners, not {n}"
            ));
        }
        for (k, corner) in corners.iter().enumerate() {
            check_place(&format!("corner {k} of the polygon"), *corner)?;
        }
        if let Some((i, k)) = crossing(&corners) {
            return refuse(format!(
                "the sides of the polygon from corner {i} to {} and from corner {k} to {} cross: give the corners in their order round it",
                (i + 1) % n,
                (k + 1) % n
            ));
        }
        if area(&corners) == 0.0 {
            return refuse(
                "the polygon has no area: its corners lie on one line, or its sides go there and back"
                    .to_owned(),
            );
        }
        Ok(Shape::Polygon(corners))
    }

    /// A circle.
    ///
    /// # Errors
    /// A centre that is no place, or a radius that is not above zero.
    pub fn circle(centre: [f64; 2], radius: f64) -> Result<Self, FrameError> {
        check_place("the centre of the circle", centre)?;
        if !(radius > 0.0 && radius <= FARTHEST) {
            return refuse(format!(
                "the radius of the circle is {radius}: it must be above 0, and at most {FARTHEST}"
            ));
        }
        Ok(Shape::Circle(centre, radius))
    }

    /// A rectangle by two opposite corners.
    ///
    /// # Errors
    /// A corner that is no place, or corners that do not span an area.
    pub fn rectangle(a: [f64; 2], b: [f64; 2]) -> Result<Self, FrameError> {
        check_place("a corner of the rectangle", a)?;
        check_place("a corner of the rectangle", b)?;
        if a[0] == b[0] || a[1] == b[1] {
            return refuse(format!(
                "the rectangle from ({}, {}) to ({}, {}) has no area: give two opposite corners",
                a[0], a[1], b[0], b[1]
            ));
        }
        Ok(Shape::Rectangle(
            [a[0].min(b[0]), a[1].min(b[1])],
            [a[0].max(b[0]), a[1].max(b[1])],
        ))
    }

    /// The same with all lengths multiplied by `factor`.
    pub fn times(&self, factor: f64) -> Self {
        let point = |p: &[f64; 2]| p.map(|c| c * factor);
        match self {
            Shape::Polygon(corners) => Shape::Polygon(corners.iter().map(point).collect()),
            Shape::Circle(centre, radius) => Shape::Circle(point(centre), radius * factor),
            Shape::Rectangle(low, high) => Shape::Rectangle(point(low), point(high)),
        }
    }

    /// Lower left and upper right corner of the rectangle round it.
    pub fn bounds(&self) -> ([f64; 2], [f64; 2]) {
        match self {
            Shape::Polygon(corners) => {
                let all = |axis: usize, pick: fn(f64, f64) -> f64, start: f64| {
                    corners.iter().map(|c| c[axis]).fold(start, pick)
                };
                let (far, near) = (f64::INFINITY, f64::NEG_INFINITY);
                (
                    [all(0, f64::min, far), all(1, f64::min, far)],
                    [all(0, f64::max, near), all(1, f64::max, near)],
                )
            }
            Shape::Circle(c, r) => (c.map(|x| x - r), c.map(|x| x + r)),
            Shape::Rectangle(low, high) => (*low, *high),
        }
    }

    /// Hides the pixels it covers; lengths in px.
    pub fn cover(&self, hidden: &mut Array2<bool>) {
        match self {
            Shape::Polygon(corners) => cover_polygon(corners, hidden),
            Shape::Circle([x, y], radius) => {
                for_rows(hidden, y - radius, y + radius, |hidden, at| {
                    let half = (radius * radius - (at - y).powi(2)).max(0.0).sqrt();
                    cover_span(hidden, at, x - half, x + half);
                });
            }
            Shape::Rectangle([left, low], [right, high]) => {
                for_rows(hidden, *low, *high, |hidden, at| {
                    cover_span(hidden, at, *left, *right);
                });
            }
        }
    }
}

fn refuse<T>(why: String) -> Result<T, FrameError> {
    Err(FrameError::Mask(why))
}

fn check_place(what: &str, [x, y]: [f64; 2]) -> Result<(), FrameError> {
    if x.abs() <= FARTHEST && y.abs() <= FARTHEST {
        return Ok(());
    }
    refuse(format!(
        "{what} is at ({x}, {y}): its coordinates must be finite numbers, at most {FARTHEST}"
    ))
}

/// Area by the shoelace formula.
fn area(corners: &[[f64; 2]]) -> f64 {
    let sides = corners.iter().zip(corners.iter().cycle().skip(1));
    (0.5 * sides.map(|(a, b)| a[0] * b[1] - b[0] * a[1]).sum::<f64>()).abs()
}

/// The first two sides that cross, each by its first corner; sides that only touch do not.
fn crossing(corners: &[[f64; 2]]) -> Option<(usize, usize)> {
    let n = corners.len();
    let side = |k: usize| (corners[k], corners[(k + 1) % n]);
    // Above 0 where c lies to the left of the line from a to b.
    let left = |a: [f64; 2], b: [f64; 2], c: [f64; 2]| {
        (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
    };
    (0..n).find_map(|i| {
        let (a, b) = side(i);
        let cross = |k: &usize| {
            let (c, d) = side(*k);
            left(a, b, c) * left(a, b, d) < 0.0 && left(c, d, a) * left(c, d, b) < 0.0
        };
        (i + 1..n).find(cross).map(|k| (i, k))
    })
}

/// The rows of the image whose y lies between `low` and `high`, each handed to `each` as its y.
fn for_rows(
    hidden: &mut Array2<bool>,
    low: f64,
    high: f64,
    mut each: impl FnMut(&mut Array2<bool>, f64),
) {
    let top = hidden.nrows() as f64 - 1.0;
    let mut y = (low - EDGE).ceil().max(0.0);
    while y <= (high + EDGE).min(top) {
        each(hidden, y);
        y += 1.0;
    }
}

/// Hides the pixels of the row at `y` whose x lies between `from` and `to`.
fn cover_span(hidden: &mut Array2<bool>, y: f64, from: f64, to: f64) {
    let row = hidden.nrows() - 1 - y as usize;
    let first = (from - EDGE).ceil().max(0.0) as usize;
    let past = ((to + EDGE).floor() + 1.0).max(0.0) as usize;
    let past = past.min(hidden.ncols());
    for column in first..past {
        hidden[(row, column)] = true;
    }
}

/// Hides what lies between the first and second, third and fourth, ... side that each row meets,
/// and the sides themselves.
fn cover_polygon(corners: &[[f64; 2]], hidden: &mut Array2<bool>) {
    let mut met: Vec<Vec<f64>> = vec![Vec::new(); hidden.nrows()];
    for (a, b) in corners.iter().zip(corners.iter().cycle().skip(1)) {
        let (low, high) = (a[1].min(b[1]), a[1].max(b[1]));
        let x_at = |y: f64| {
            let part = ((y - a[1]) / (b[1] - a[1])).clamp(0.0, 1.0);
            a[0] + part * (b[0] - a[0])
        };
        for_rows(hidden, low, high, |hidden, y| {
            // A row through a corner meets exactly one of two sides that go on.
            if (a[1] <= y) != (b[1] <= y) {
                met[y as usize].push(x_at(y));
            }
            let (one, other) = if low == high {
                (a[0], b[0])
            } else {
                (x_at(y - EDGE), x_at(y + EDGE))
            };
            cover_span(hidden, y, one.min(other), one.max(other));
        });
    }
    for (y, mut met) in met.into_iter().enumerate() {
        met.sort_by(f64::total_cmp);
        for between in met.chunks_exact(2) {
            cover_span(hidden, y as f64, between[0], between[1]);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn covered(shape: &Shape, width: usize, height: usize) -> Array2<bool> {
        let mut hidden = Array2::from_elem((height, width), false);
        shape.cover(&mut hidden);
        hidden
    }

    /// Distance of a point from a side.
    fn distance([a, b]: [[f64; 2]; 2], [x, y]: [f64; 2]) -> f64 {
        let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
        let length2 = dx * dx + dy * dy;
        let part = if length2 == 0.0 {
            0.0
        } else {
            (((x - a[0]) * dx + (y - a[1]) * dy) / length2).clamp(0.0, 1.0)
        };
        (x - a[0] - part * dx).hypot(y - a[1] - part * dy)
    }

    /// The angle the corners turn through seen from a point: a full turn from inside, none from
    /// outside.
    fn winds_round(corners: &[[f64; 2]], [x, y]: [f64; 2]) -> bool {
        let sides = corners.iter().zip(corners.iter().cycle().skip(1));
        let turn: f64 = sides
            .map(|(a, b)| {
                let (ax, ay, bx, by) = (a[0] - x, a[1] - y, b[0] - x, b[1] - y);
                (ax * by - ay * bx).atan2(ax * bx + ay * by)
            })
            .sum();
        turn.abs() > std::f64::consts::PI
    }

    #[test]
    fn a_polygon_hides_what_its_corners_wind_round_and_its_sides() {
        // Concave, with sides through pixel centres, level, upright and slanted, and corners
        // outside the image.
        let stars: [&[[f64; 2]]; 4] = [
            &[
                [2.0, 2.0],
                [20.0, 2.0],
                [20.0, 15.0],
                [11.0, 6.0],
                [2.0, 15.0],
            ],
            &[
                [-5.0, 3.3],
                [12.7, -4.0],
                [31.0, 8.5],
                [14.0, 9.0],
                [9.2, 40.0],
            ],
            &[
                [5.0, 5.0],
                [10.0, 10.0],
                [15.0, 5.0],
                [15.0, 15.0],
                [10.0, 12.0],
                [5.0, 15.0],
            ],
            &[[3.0, 7.0], [3.5, 7.5], [22.0, 7.0], [13.0, 18.0]],
        ];
        for corners in stars {
            let backwards: Vec<_> = corners.iter().rev().copied().collect();
            for corners in [corners.to_vec(), backwards] {
                let hidden = covered(&Shape::polygon(corners.clone()).unwrap(), 24, 20);
                for ((row, column), is) in hidden.indexed_iter() {
                    let at = [column as f64, 19.0 - row as f64];
                    let sides = corners.iter().zip(corners.iter().cycle().skip(1));
                    let near = sides
                        .map(|(a, b)| distance([*a, *b], at))
                        .fold(f64::INFINITY, f64::min);
                    let expected = near < 1e-9 || winds_round(&corners, at);
                    assert_eq!(*is, expected, "{corners:?} at {at:?}");
                }
            }
        }
    }

    #[test]
    fn circles_and_rectangles_hide_the_pixels_whose_centres_they_hold_edge_included() {
        let circle = covered(&Shape::circle([10.0, 8.0], 5.0).unwrap(), 24, 20);
        let rectangle = covered(&Shape::rectangle([15.2, 12.0], [3.0, 4.5]).unwrap(), 24, 20);
        for ((row, column), is) in circle.indexed_iter() {
            let (x, y) = (column as f64, 19.0 - row as f64);
            // 3, 4, 5: points on the circle count.
            assert_eq!(*is, (x - 10.0).powi(2) + (y - 8.0).powi(2) <= 25.0);
            let inside = (3.0..=15.2).contains(&x) && (4.5..=12.0).contains(&y);
            assert_eq!(rectangle[(row, column)], inside);
        }
    }

    #[test]
    fn a_shape_in_mm_hides_the_pixels_that_it_hides_in_px() {
        let polygon = Shape::polygon(vec![[3.0, 3.0], [17.0, 3.0], [10.0, 17.0]]).unwrap();
        let rectangle = Shape::rectangle([3.0, 3.0], [17.0, 11.0]).unwrap();
        let circle = Shape::circle([9.0, 9.0], 7.0).unwrap();
        for shape in [polygon, rectangle, circle] {
            for mm_per_px in [0.2, 0.0371, 1.0 / 3.0, 7.1] {
                let there_and_back = shape.times(mm_per_px).times(1.0 / mm_per_px);
                assert_eq!(covered(&there_and_back, 24, 20), covered(&shape, 24, 20));
            }
        }
    }

    #[test]
    fn shapes_beside_the_image_hide_nothing_and_huge_ones_all() {
        for shape in [
            Shape::circle([-9.0, 5.0], 8.0),
            Shape::rectangle([30.0, 0.0], [40.0, 9.0]),
            Shape::polygon(vec![[0.0, -9.0], [9.0, -9.0], [4.0, -1.0]]),
            Shape::polygon(vec![[0.0, 29.0], [9.0, 29.0], [4.0, 21.0]]),
        ] {
            assert!(covered(&shape.unwrap(), 24, 20).iter().all(|h| !h));
        }
        for shape in [
            Shape::circle([0.0, 0.0], 1e9),
            Shape::rectangle([-1e9, -1e9], [1e9, 1e9]),
            Shape::polygon(vec![[-1e9, -1e9], [1e9, -1e9], [0.0, 1e9]]),
        ] {
            assert!(covered(&shape.unwrap(), 24, 20).iter().all(|h| *h));
        }
    }

    #[test]
    fn shapes_that_are_none_are_refused_with_the_reason() {
        let text = |shape: Result<Shape, FrameError>| shape.unwrap_err().to_string();
        let bow_tie = vec![[0.0, 0.0], [9.0, 9.0], [9.0, 0.0], [0.0, 9.0]];
        assert!(
            text(Shape::polygon(bow_tie)).contains("from corner 0 to 1 and from corner 2 to 3")
        );
        let line = vec![[0.0, 0.0], [9.0, 9.0], [3.0, 3.0]];
        assert!(text(Shape::polygon(line)).contains("has no area: its corners lie on one line"));
        assert!(text(Shape::polygon(vec![[0.0, 0.0]; 2])).contains("3 to 10000 corners, not 2"));
        let far = vec![[0.0, 0.0], [1.0, f64::NAN], [2.0, 0.0]];
        assert!(text(Shape::polygon(far)).contains("corner 1 of the polygon is at (1, NaN)"));
        for radius in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(text(Shape::circle([0.0, 0.0], radius)).contains("it must be above 0"));
        }
        let flat = Shape::rectangle([0.0, 3.0], [9.0, 3.0]);
        assert!(text(flat).contains("has no area: give two opposite corners"));
    }
}
