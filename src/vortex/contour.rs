//! The line round a centre on which a field has a given value, to less than a cell.
//!
//! The field is sampled on a lattice finer than the grid (see `field::sample`), the lattice nodes above the level that hang together with the centre are collected, and the
//! line is drawn round them by interpolating linearly across each lattice edge it crosses
//! (marching squares, walked from crossing to crossing).

use std::cmp::Ordering;

use ndarray::Array2;

use crate::field::{Grid, on_lattice};

/// Lattice steps the radius of the region should have. Linear interpolation puts the 25 % line of
/// a Gaussian core 0.15 / n² of its radius too far out, n being the steps in that radius.
const STEPS: f64 = 16.0;

/// Most lattice steps in a cell; more would only resolve the interpolation.
const MOST: usize = 4;

/// A closed line and what is inside.
#[derive(Clone, Debug)]
pub(super) struct Contour {
    /// Corners, counter-clockwise, in grid lengths; the last joins the first.
    pub points: Vec<[f64; 2]>,
    /// Grid nodes (j, i) above the level and connected with the centre.
    pub inside: Vec<(usize, usize)>,
    /// The region reaches the outermost nodes: the line is closed along them.
    pub cut_by_edge: bool,
    /// The region meets cells without a value.
    pub cut_by_mask: bool,
}

impl Contour {
    /// Enclosed area.
    pub(super) fn area(&self) -> f64 {
        let next = self.points.iter().cycle().skip(1);
        let pairs = self.points.iter().zip(next);
        0.5 * pairs.map(|(a, b)| a[0] * b[1] - b[0] * a[1]).sum::<f64>()
    }

    /// True when the point lies inside the line.
    pub(super) fn encloses(&self, x: f64, y: f64) -> bool {
        let next = self.points.iter().cycle().skip(1);
        let crossings = self.points.iter().zip(next).filter(|(a, b)| {
            (a[1] > y) != (b[1] > y) && x < a[0] + (y - a[1]) / (b[1] - a[1]) * (b[0] - a[0])
        });
        crossings.count() % 2 == 1
    }
}

/// The contour of `values` at `level` that encloses the connected region above it around
/// (x, y); `None` when the values there are not above the level. `cells` is about how many cells
/// its radius has: it decides how fine the lattice is and where the search begins, not where it
/// ends.
pub(super) fn around(
    values: &Array2<f64>,
    grid: &Grid,
    (x, y): (f64, f64),
    level: f64,
    cells: f64,
) -> Option<Contour> {
    let fine = ((STEPS / cells).ceil() as usize).clamp(1, MOST);
    let mut half_width = (1.5 * cells) as usize + 3;
    loop {
        let patch = Patch::around(values, grid, (x, y), half_width, fine);
        let region = patch.region(level, patch.nearest(x, y))?;
        if !region.leaves_patch {
            return Some(patch.walk_round(&region, level));
        }
        half_width *= 2;
    }
}

/// A rectangle of cells sampled on the fine lattice.
struct Patch {
    grid: Grid,
    /// The lower left node of the grid in the patch: column, row.
    corner: (usize, usize),
    /// Lattice steps in a cell.
    fine: usize,
    lattice: Array2<f64>,
}

/// Lattice nodes above the level that hang together.
struct Region {
    members: Array2<bool>,
    /// Reaches a side of the patch that is not the edge of the grid.
    leaves_patch: bool,
    reaches_edge: bool,
    meets_gap: bool,
}

impl Patch {
    fn around(
        values: &Array2<f64>,
        grid: &Grid,
        (x, y): (f64, f64),
        half_width: usize,
        fine: usize,
    ) -> Patch {
        let (i, j) = grid.cell(x, y);
        let bounds = |t: f64, n: usize| {
            let node = (t.round().max(0.0) as usize).min(n - 1);
            let first = node.saturating_sub(half_width);
            (first, (node + half_width).min(n - 1) - first)
        };
        let (i0, wide) = bounds(i, grid.nx);
        let (j0, high) = bounds(j, grid.ny);
        let mut patch = Patch {
            grid: *grid,
            corner: (i0, j0),
            fine,
            lattice: Array2::zeros((0, 0)),
        };
        let columns: Vec<f64> = (0..=wide * fine).map(|a| patch.point(0, a)[0]).collect();
        let rows: Vec<f64> = (0..=high * fine).map(|b| patch.point(b, 0)[1]).collect();
        patch.lattice = on_lattice(values, grid, &columns, &rows);
        patch
    }

    fn point(&self, b: usize, a: usize) -> [f64; 2] {
        let at = |first: usize, k: usize| first as f64 + k as f64 / self.fine as f64;
        let (i, j) = (at(self.corner.0, a), at(self.corner.1, b));
        [
            self.grid.x0 + i * self.grid.dx,
            self.grid.y0 + j * self.grid.dy,
        ]
    }

    fn nearest(&self, x: f64, y: f64) -> (usize, usize) {
        let (i, j) = self.grid.cell(x, y);
        let (high, wide) = self.lattice.dim();
        let index = |t: f64, first: usize, count: usize| {
            let k = ((t - first as f64) * self.fine as f64).round();
            (k.max(0.0) as usize).min(count - 1)
        };
        (index(j, self.corner.1, high), index(i, self.corner.0, wide))
    }

    /// Which sides of the patch (left, lower, right, upper) are edges of the grid.
    fn edges(&self) -> [bool; 4] {
        let (high, wide) = self.lattice.dim();
        let (i, j) = self.corner;
        let right = i + (wide - 1) / self.fine + 1 == self.grid.nx;
        let upper = j + (high - 1) / self.fine + 1 == self.grid.ny;
        [i == 0, j == 0, right, upper]
    }

    fn region(&self, level: f64, start: (usize, usize)) -> Option<Region> {
        let (high, wide) = self.lattice.dim();
        let mut region = Region {
            members: Array2::from_elem((high, wide), false),
            leaves_patch: false,
            reaches_edge: false,
            meets_gap: false,
        };
        if self.lattice[start].partial_cmp(&level) != Some(Ordering::Greater) {
            return None;
        }
        region.members[start] = true;
        let mut open = vec![start];
        while let Some(node) = open.pop() {
            let (b, a) = node;
            let sides = [a == 0, b == 0, a + 1 == wide, b + 1 == high];
            for (is_here, is_edge) in sides.into_iter().zip(self.edges()) {
                region.reaches_edge |= is_here && is_edge;
                region.leaves_patch |= is_here && !is_edge;
            }
            for n in super::find::neighbours(node, (high, wide)) {
                let value = self.lattice[n];
                region.meets_gap |= value.is_nan();
                if value > level && !region.members[n] {
                    region.members[n] = true;
                    open.push(n);
                }
            }
        }
        Some(region)
    }

    /// Walks round the region counter-clockwise, from its rightmost node on.
    ///
    /// A step goes from one pair (member, outside neighbour) to the next: the two nodes ahead of
    /// the pair decide whether the line turns round the member, runs straight, or turns round
    /// the outside node. Members that touch only by their corners stay apart.
    fn walk_round(&self, region: &Region, level: f64) -> Contour {
        let (high, wide) = self.lattice.dim();
        let is_member = |(b, a): (isize, isize)| {
            let inside = b >= 0 && a >= 0 && b < high as isize && a < wide as isize;
            inside && region.members[(b as usize, a as usize)]
        };
        let members = region.members.indexed_iter().filter(|(_, m)| **m);
        let rightmost = members.clone().map(|(node, _)| node).max_by_key(|n| n.1);
        let (b, a) = rightmost.unwrap_or((0, 0));
        let start = ((b as isize, a as isize), (0, 1));
        let mut points = Vec::new();
        let (mut member, mut out) = start;
        loop {
            points.push(self.crossing(member, out, level));
            let ahead = (out.1, -out.0);
            let straight = (member.0 + ahead.0, member.1 + ahead.1);
            let outer = (straight.0 + out.0, straight.1 + out.1);
            (member, out) = if !is_member(straight) {
                (member, ahead)
            } else if !is_member(outer) {
                (straight, out)
            } else {
                (outer, (-ahead.0, -ahead.1))
            };
            if (member, out) == start {
                break;
            }
        }
        let inside = members
            .filter(|((b, a), _)| b % self.fine == 0 && a % self.fine == 0)
            .map(|((b, a), _)| (self.corner.1 + b / self.fine, self.corner.0 + a / self.fine))
            .collect();
        Contour {
            points,
            inside,
            cut_by_edge: region.reaches_edge,
            cut_by_mask: region.meets_gap,
        }
    }

    /// Where the level lies between a member and its neighbour outside; on the member itself
    /// where the neighbour is off the grid or has no value.
    fn crossing(&self, member: (isize, isize), out: (isize, isize), level: f64) -> [f64; 2] {
        let node = (member.0 as usize, member.1 as usize);
        let [x, y] = self.point(node.0, node.1);
        let beyond = node
            .0
            .checked_add_signed(out.0)
            .zip(node.1.checked_add_signed(out.1))
            .and_then(|n| self.lattice.get(n));
        let here = self.lattice[node];
        let t = match beyond {
            Some(there) if there.is_finite() => (here - level) / (here - there) / self.fine as f64,
            _ => 0.0,
        };
        [
            x + t * out.1 as f64 * self.grid.dx,
            y + t * out.0 as f64 * self.grid.dy,
        ]
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Unit;
    use proptest::prelude::*;
    use std::f64::consts::PI;

    fn grid() -> Grid {
        Grid {
            nx: 41,
            ny: 31,
            x0: -20.0,
            y0: -15.0,
            dx: 1.0,
            dy: 1.0,
            length: Unit::PX,
        }
    }

    proptest! {
        #[test]
        fn the_area_of_an_ellipse_is_found_to_a_tenth_of_a_per_cent(
            x in -3.0..3.0f64,
            y in -2.0..2.0f64,
            a in 3.0..12.0f64,
            b in 3.0..12.0f64,
        ) {
            let grid = grid();
            let hill = grid.map(|px, py| 2.0 - ((px - x) / a).powi(2) - ((py - y) / b).powi(2));
            let contour = around(&hill, &grid, (x, y), 1.0, a.min(b)).unwrap();
            // A chord of a quarter cell cuts less than 1/(96 r²) off the area, and linear
            // interpolation of a quadratic on it moves the line by at most as much again.
            prop_assert!((contour.area() / (PI * a * b) - 1.0).abs() < 3e-3);
            prop_assert!(!contour.cut_by_edge && !contour.cut_by_mask);
            prop_assert!(contour.encloses(x, y) && !contour.encloses(x + a + 0.1, y));
            let nodes = contour.inside.len() as f64;
            prop_assert!((nodes - PI * a * b).abs() < 4.0 * (a + b));
        }
    }

    #[test]
    fn only_the_hill_with_the_centre_is_drawn() {
        let grid = grid();
        let hill = |x: f64, cx: f64, y: f64| 2.0 - ((x - cx).powi(2) + y * y) / 16.0;
        let two = grid.map(|x, y| hill(x, -8.0, y).max(hill(x, 8.0, y)));
        let contour = around(&two, &grid, (-8.0, 0.0), 1.0, 4.0).unwrap();
        assert!((contour.area() / (16.0 * PI) - 1.0).abs() < 3e-3);
        assert!(contour.encloses(-8.0, 0.0) && !contour.encloses(8.0, 0.0));
        assert!(around(&two, &grid, (0.0, 12.0), 1.0, 4.0).is_none());
    }

    #[test]
    fn edges_and_gaps_close_the_line_and_are_said() {
        let grid = grid();
        let mut hill = grid.map(|x, y| 2.0 - ((x + 20.0).powi(2) + y * y) / 36.0);
        let half = around(&hill, &grid, (-19.0, 0.0), 1.0, 6.0).unwrap();
        assert!(half.cut_by_edge && !half.cut_by_mask);
        assert!((half.area() / (18.0 * PI) - 1.0).abs() < 3e-3);
        hill = grid.map(|x, y| 2.0 - (x * x + y * y) / 36.0);
        for j in 0..grid.ny {
            hill[(j, 22)] = f64::NAN;
        }
        let cut = around(&hill, &grid, (0.0, 0.0), 1.0, 6.0).unwrap();
        assert!(cut.cut_by_mask && !cut.cut_by_edge);
        // A circle of radius 6 cut one node before x = 2.
        let d = 1.0f64;
        let segment = 36.0 * (d / 6.0).acos() - d * (36.0 - d * d).sqrt();
        assert!((cut.area() / (36.0 * PI - segment) - 1.0).abs() < 5e-3);
    }

    #[test]
    fn a_hole_does_not_change_the_outer_line() {
        let grid = grid();
        let ring = grid.map(|x, y| {
            let r = x.hypot(y);
            if r < 3.0 { 0.0 } else { 2.0 - r / 10.0 }
        });
        let contour = around(&ring, &grid, (5.0, 0.0), 1.0, 1.0).unwrap();
        assert!((contour.area() / (100.0 * PI) - 1.0).abs() < 3e-3);
    }
}
