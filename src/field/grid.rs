//! A regular grid in the plane.

use ndarray::Array2;

use crate::quantity::Unit;

/// A regular grid of `nx` by `ny` nodes; lengths are in `length`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Grid {
    /// Nodes along x.
    pub nx: usize,
    /// Nodes along y.
    pub ny: usize,
    /// x of column 0.
    pub x0: f64,
    /// y of row 0, the lowest row.
    pub y0: f64,
    /// Spacing along x, above zero.
    pub dx: f64,
    /// Spacing along y, above zero.
    pub dy: f64,
    /// Unit of the four lengths above: px or mm.
    pub length: Unit,
}

/// What can go wrong when fields meet.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum FieldError {
    /// Two fields that do not share a grid.
    #[error("the fields are on different grids: {0} and {1}")]
    GridsDiffer(String, String),
    /// Two units that do not go together.
    #[error(transparent)]
    Units(#[from] crate::quantity::UnitMismatch),
    /// A grid too small for what was asked.
    #[error("{what} needs a grid of at least {least} x {least} nodes; this one has {nx} x {ny}")]
    TooSmall {
        /// What was asked.
        what: &'static str,
        /// Nodes needed along each axis.
        least: usize,
        /// Nodes there are along x.
        nx: usize,
        /// Nodes there are along y.
        ny: usize,
    },
    /// A point outside the grid.
    #[error(
        "the point ({x}, {y}) {unit} is outside the field, which covers x {x0} to {x1} and y {y0} to {y1} {unit}"
    )]
    #[allow(missing_docs)]
    Outside {
        x: f64,
        y: f64,
        x0: f64,
        x1: f64,
        y0: f64,
        y1: f64,
        unit: Unit,
    },
    /// An option that makes no sense.
    #[error("{0}")]
    Option(String),
}

impl Grid {
    /// x of column `i`.
    pub fn x(&self, i: usize) -> f64 {
        self.x0 + i as f64 * self.dx
    }

    /// y of row `j`.
    pub fn y(&self, j: usize) -> f64 {
        self.y0 + j as f64 * self.dy
    }

    /// x of the last column.
    pub fn x1(&self) -> f64 {
        self.x(self.nx.saturating_sub(1))
    }

    /// y of the last row.
    pub fn y1(&self) -> f64 {
        self.y(self.ny.saturating_sub(1))
    }

    /// Shape of the arrays on this grid: (ny, nx).
    pub fn shape(&self) -> (usize, usize) {
        (self.ny, self.nx)
    }

    /// Position in cells: x, y to fractional (column, row).
    pub fn cell(&self, x: f64, y: f64) -> (f64, f64) {
        ((x - self.x0) / self.dx, (y - self.y0) / self.dy)
    }

    /// True when the point lies on or between nodes.
    pub fn holds(&self, x: f64, y: f64) -> bool {
        let (i, j) = self.cell(x, y);
        let slack = 1e-9;
        i >= -slack
            && j >= -slack
            && i <= self.nx as f64 - 1.0 + slack
            && j <= self.ny as f64 - 1.0 + slack
    }

    /// Values of `f(x, y)` at every node.
    pub fn map(&self, f: impl Fn(f64, f64) -> f64) -> Array2<f64> {
        Array2::from_shape_fn(self.shape(), |(j, i)| f(self.x(i), self.y(j)))
    }

    /// True when the nodes of both grids are the same to within a thousandth of a cell, so that
    /// a field read back from a file meets the one that wrote it.
    pub fn coincides_with(&self, other: &Grid) -> bool {
        let near = |a: f64, b: f64, cell: f64| (a - b).abs() <= 1e-3 * cell;
        self.shape() == other.shape()
            && self.length == other.length
            && near(self.x0, other.x0, self.dx)
            && near(self.y0, other.y0, self.dy)
            && near(self.x1(), other.x1(), self.dx)
            && near(self.y1(), other.y1(), self.dy)
    }

    /// One line for messages and summaries: `63 x 63 nodes, 0.4 mm apart, from (0.8, 0.8) mm`.
    pub fn describe(&self) -> String {
        use crate::quantity::plain_number;
        let spacing = if self.dx == self.dy {
            plain_number(self.dx, 4)
        } else {
            format!(
                "{} and {}",
                plain_number(self.dx, 4),
                plain_number(self.dy, 4)
            )
        };
        format!(
            "{} x {} nodes, {spacing} {length} apart, from ({}, {}) {length}",
            self.nx,
            self.ny,
            plain_number(self.x0, 6),
            plain_number(self.y0, 6),
            length = self.length
        )
    }
}
