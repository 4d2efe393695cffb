//! Reading a field between its nodes, at a point or along a line.
//!
//! Between nodes a field is the product of four-point Lagrange polynomials along x and y
//! through the 4 x 4 nodes around the point, moved inwards at the edge: exact for polynomials
//! of third degree in x and in y, fourth-order accurate otherwise. Where one of the sixteen is
//! masked it is bilinear between the four nearest (second order); where one of those that count
//! is masked there is no value (NaN).

use ndarray::Array2;

use super::{FieldError, Grid, ScalarField, VectorField};
use crate::quantity::Unit;

/// Values of a field along a straight line.
#[derive(Clone, Debug)]
pub struct Trace {
    /// x of each point, in `length`.
    pub x: Vec<f64>,
    /// y of each point, in `length`.
    pub y: Vec<f64>,
    /// Distance of each point from the first, in `length`.
    pub distance: Vec<f64>,
    /// The value at each point, in `unit`; NaN where masked.
    pub values: Vec<f64>,
    /// Unit of the positions: px or mm.
    pub length: Unit,
    /// Unit of the values.
    pub unit: Unit,
    /// What the values are, in words.
    pub name: String,
}

/// Nodes and weights along one axis.
#[derive(Clone, Copy)]
struct Span {
    first: usize,
    count: usize,
    weights: [f64; 4],
    /// The lower of the two nearest nodes and the fraction of a cell beyond it.
    cell: (usize, f64),
}

impl Span {
    /// Around the position `t` in cells along an axis of `n` nodes; `None` outside.
    fn around(t: f64, n: usize) -> Option<Span> {
        let last = n as f64 - 1.0;
        if !(t >= -SNAP && t <= last + SNAP) {
            return None;
        }
        let t = t.clamp(0.0, last);
        let lower = (t as usize).min(n.saturating_sub(2));
        let cell = (lower, snapped(t - lower as f64));
        let count = n.min(4);
        let first = lower.saturating_sub(1).min(n - count);
        let s = (lower - first) as f64 + cell.1;
        Some(Span {
            first,
            count,
            weights: lagrange(s, count),
            cell,
        })
    }

    /// The one or two nodes a linear interpolation needs, with their weights.
    fn linear(&self) -> impl Iterator<Item = (usize, f64)> {
        let (lower, t) = self.cell;
        [(lower, 1.0 - t), (lower + 1, t)]
            .into_iter()
            .filter(|(_, w)| *w != 0.0)
    }
}

/// A point that rounding put this part of a cell beside a node or the edge belongs on it.
const SNAP: f64 = 1e-9;

fn snapped(fraction: f64) -> f64 {
    if fraction < SNAP {
        0.0
    } else if fraction > 1.0 - SNAP {
        1.0
    } else {
        fraction
    }
}

/// Weights of the Lagrange polynomial through `count` nodes at 0, 1, ... for the position `s`.
fn lagrange(s: f64, count: usize) -> [f64; 4] {
    let (a, b, c) = (s - 1.0, s - 2.0, s - 3.0);
    match count {
        4 => [
            -a * b * c / 6.0,
            s * b * c / 2.0,
            -s * a * c / 2.0,
            s * a * b / 6.0,
        ],
        3 => [a * b / 2.0, -s * b, s * a / 2.0, 0.0],
        2 => [-a, s, 0.0, 0.0],
        _ => [1.0, 0.0, 0.0, 0.0],
    }
}

/// A point of a grid with the nodes and weights that give a field's value there.
#[derive(Clone, Copy)]
pub(crate) struct Place {
    x: Span,
    y: Span,
}

impl Place {
    /// The point (x, y) of the grid; `None` outside it.
    pub(crate) fn on(grid: &Grid, x: f64, y: f64) -> Option<Place> {
        let (i, j) = grid.cell(x, y);
        Some(Place {
            x: Span::around(i, grid.nx)?,
            y: Span::around(j, grid.ny)?,
        })
    }

    /// Value there of an array on that grid; NaN beside masked cells.
    pub(crate) fn read(&self, values: &Array2<f64>) -> f64 {
        let mut sum = 0.0;
        for (b, wy) in self.y.weights.iter().take(self.y.count).enumerate() {
            let mut line = 0.0;
            for (a, wx) in self.x.weights.iter().take(self.x.count).enumerate() {
                line += wx * values[(self.y.first + b, self.x.first + a)];
            }
            sum += wy * line;
        }
        if sum.is_nan() {
            self.read_bilinear(values)
        } else {
            sum
        }
    }

    fn read_bilinear(&self, values: &Array2<f64>) -> f64 {
        let mut sum = 0.0;
        for (j, wy) in self.y.linear() {
            for (i, wx) in self.x.linear() {
                sum += wy * wx * values[(j, i)];
            }
        }
        sum
    }
}

/// Values at every crossing of the columns `x` and the rows `y`, shape (y, x); NaN outside the
/// grid and beside masked cells.
pub(crate) fn on_lattice(values: &Array2<f64>, grid: &Grid, x: &[f64], y: &[f64]) -> Array2<f64> {
    let columns: Vec<_> = x
        .iter()
        .map(|&x| Span::around(grid.cell(x, 0.0).0, grid.nx))
        .collect();
    let mut lattice = Array2::from_elem((y.len(), x.len()), f64::NAN);
    for (&y, mut row) in y.iter().zip(lattice.outer_iter_mut()) {
        let Some(y) = Span::around(grid.cell(0.0, y).1, grid.ny) else {
            continue;
        };
        for (x, value) in columns.iter().zip(row.iter_mut()) {
            *value = x.map_or(f64::NAN, |x| Place { x, y }.read(values));
        }
    }
    lattice
}

fn place(grid: &Grid, x: f64, y: f64) -> Result<Place, FieldError> {
    Place::on(grid, x, y).ok_or(FieldError::Outside {
        x,
        y,
        x0: grid.x0,
        x1: grid.x1(),
        y0: grid.y0,
        y1: grid.y1(),
        unit: grid.length,
    })
}

/// Points a line can have: more than any figure shows, few enough for any memory.
const MOST_POINTS: usize = 1_000_000;

/// `points` places evenly from `from` to `to`, both included.
fn line(
    grid: &Grid,
    from: (f64, f64),
    to: (f64, f64),
    points: usize,
) -> Result<Vec<(f64, f64, Place)>, FieldError> {
    if !(2..=MOST_POINTS).contains(&points) {
        return Err(FieldError::Option(format!(
            "a line takes 2 to {MOST_POINTS} points, not {points}"
        )));
    }
    (0..points)
        .map(|k| {
            let t = k as f64 / (points - 1) as f64;
            let x = from.0 * (1.0 - t) + to.0 * t;
            let y = from.1 * (1.0 - t) + to.1 * t;
            Ok((x, y, place(grid, x, y)?))
        })
        .collect()
}

fn trace(
    line: &[(f64, f64, Place)],
    grid: &Grid,
    values: &Array2<f64>,
    unit: Unit,
    name: &str,
) -> Trace {
    let start = line.first().map_or((0.0, 0.0), |p| (p.0, p.1));
    Trace {
        x: line.iter().map(|p| p.0).collect(),
        y: line.iter().map(|p| p.1).collect(),
        distance: line
            .iter()
            .map(|p| (p.0 - start.0).hypot(p.1 - start.1))
            .collect(),
        values: line.iter().map(|p| p.2.read(values)).collect(),
        length: grid.length,
        unit,
        name: name.to_owned(),
    }
}

impl ScalarField {
    /// The value at the point (x, y), in the field's unit; NaN beside masked cells.
    ///
    /// # Errors
    /// [`FieldError::Outside`] beyond the outermost nodes.
    pub fn at(&self, x: f64, y: f64) -> Result<f64, FieldError> {
        Ok(place(&self.grid, x, y)?.read(&self.values))
    }

    /// The values at `points` places evenly from one point to another, both included.
    ///
    /// # Errors
    /// [`FieldError::Outside`] when the line leaves the grid, [`FieldError::Option`] for fewer
    /// than two points or more than a million.
    pub fn along(
        &self,
        from: (f64, f64),
        to: (f64, f64),
        points: usize,
    ) -> Result<Trace, FieldError> {
        let line = line(&self.grid, from, to, points)?;
        Ok(trace(
            &line,
            &self.grid,
            &self.values,
            self.unit,
            &self.name,
        ))
    }
}

impl VectorField {
    /// The velocity (u, v) at the point (x, y); NaN beside masked cells.
    ///
    /// # Errors
    /// [`FieldError::Outside`] beyond the outermost nodes.
    pub fn at(&self, x: f64, y: f64) -> Result<(f64, f64), FieldError> {
        let place = place(&self.grid, x, y)?;
        Ok((place.read(&self.u), place.read(&self.v)))
    }

    /// The traces of u and of v at `points` places evenly from one point to another.
    ///
    /// # Errors
    /// [`FieldError::Outside`] when the line leaves the grid, [`FieldError::Option`] for fewer
    /// than two points or more than a million.
    pub fn along(
        &self,
        from: (f64, f64),
        to: (f64, f64),
        points: usize,
    ) -> Result<(Trace, Trace), FieldError> {
        let line = line(&self.grid, from, to, points)?;
        let unit = self.unit();
        Ok((
            trace(&line, &self.grid, &self.u, unit, "u"),
            trace(&line, &self.grid, &self.v, unit, "v"),
        ))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn field(nx: usize, ny: usize, f: impl Fn(f64, f64) -> f64) -> ScalarField {
        let grid = Grid {
            nx,
            ny,
            x0: -1.5,
            y0: 4.0,
            dx: 0.5,
            dy: 0.8,
            length: Unit::MM,
        };
        ScalarField {
            grid,
            values: grid.map(f),
            unit: Unit::ONE,
            name: "f".to_owned(),
        }
    }

    proptest! {
        #[test]
        fn sampling_is_exact_for_cubics_in_x_and_y_up_to_the_edge(
            c in prop::array::uniform4(-1.0..1.0f64),
            d in prop::array::uniform4(-1.0..1.0f64),
            s in 0.0..=1.0f64,
            t in 0.0..=1.0f64,
        ) {
            let cubic = |c: [f64; 4], x: f64| c[0] + x * (c[1] + x * (c[2] + x * c[3]));
            let f = |x: f64, y: f64| cubic(c, x) * cubic(d, y / 4.0);
            let field = field(7, 5, f);
            let grid = field.grid;
            let x = grid.x0 + s * (grid.x1() - grid.x0);
            let y = grid.y0 + t * (grid.y1() - grid.y0);
            prop_assert!((field.at(x, y).unwrap() - f(x, y)).abs() < 1e-12);
        }
    }

    #[test]
    fn beside_a_masked_cell_sampling_is_bilinear_and_inside_its_cells_there_is_none() {
        let f = |x: f64, y: f64| 2.0 + 3.0 * x - y + 0.5 * x * y;
        let mut field = field(8, 8, f);
        field.values[(3, 3)] = f64::NAN;
        let grid = field.grid;
        let at = |i: f64, j: f64| (grid.x0 + i * grid.dx, grid.y0 + j * grid.dy);
        let (x, y) = at(4.3, 4.6);
        assert!((field.at(x, y).unwrap() - f(x, y)).abs() < 1e-12);
        let (x, y) = at(3.4, 3.4);
        assert!(field.at(x, y).unwrap().is_nan());
        // On the line between two nodes that have values, the masked third does not matter.
        let (x, y) = at(4.0, 3.5);
        assert!((field.at(x, y).unwrap() - f(x, y)).abs() < 1e-12);
    }

    #[test]
    fn a_line_has_its_ends_and_its_length() {
        let trace = field(8, 8, |x, _| x)
            .along((-1.0, 5.0), (2.0, 9.0), 11)
            .unwrap();
        assert_eq!(trace.values.len(), 11);
        assert!((trace.distance[10] - 5.0).abs() < 1e-12);
        assert!((trace.values[10] - 2.0).abs() < 1e-12);
    }

    #[test]
    fn points_outside_are_refused_with_the_extent() {
        let field = field(4, 4, |x, _| x);
        let message = field.at(9.0, 5.0).unwrap_err().to_string();
        assert!(message.contains("(9, 5) mm is outside"), "{message}");
        assert!(message.contains("x -1.5 to 0"), "{message}");
        assert!(field.at(f64::NAN, 5.0).is_err());
        assert!(field.along((-1.0, 5.0), (0.0, 5.0), 1).is_err());
    }

    #[test]
    fn a_grid_of_two_nodes_is_read_linearly() {
        let field = field(2, 2, |x, y| x - 2.0 * y);
        let (x, y) = (-1.3, 4.5);
        assert!((field.at(x, y).unwrap() - (x - 2.0 * y)).abs() < 1e-12);
    }
}
