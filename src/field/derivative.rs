//! The kernel under the gradient: one first derivative of one array.

use ndarray::Array2;

use super::Scheme;
use super::scheme::{STAND_INS, Taps};

/// The direction a derivative is taken along.
#[derive(Clone, Copy, PartialEq)]
pub(super) enum Axis {
    /// Along the rows.
    X,
    /// From row to row.
    Y,
}

/// Derivative of `f` along `axis` at node spacing `spacing`.
///
/// Whole rows are combined at once wherever the stencil fits the array; a NaN among the nodes
/// makes the sum NaN, and those cells, with the edges, are then done one by one.
pub(super) fn derivative(f: &Array2<f64>, axis: Axis, spacing: f64, scheme: Scheme) -> Array2<f64> {
    let (ny, nx) = f.dim();
    let f = f.as_standard_layout();
    let nodes = f.as_slice().unwrap_or(&[]);
    let taps = stencil(axis, scheme, spacing);
    let margin = scheme.reach();
    let mut out = Array2::zeros((ny, nx));
    for (j, mut row) in out.outer_iter_mut().enumerate() {
        let Some(row) = row.as_slice_mut() else {
            continue;
        };
        let whole = j >= margin && j + margin < ny && nx > 2 * margin;
        if whole {
            combine(nodes, nx, j, margin, &taps, row);
        }
        let beside = if whole { margin } else { nx };
        for i in 0..nx {
            let edge = i < beside || i + beside >= nx;
            if edge || row[i].is_nan() {
                row[i] = one_by_one(nodes, (ny, nx), (j, i), axis, scheme) / spacing;
            }
        }
    }
    out
}

/// Row and column offsets with weights; the centre is always among them, so that a cell without
/// a value gets no derivative.
fn stencil(axis: Axis, scheme: Scheme, spacing: f64) -> Vec<(isize, isize, f64)> {
    let mut taps = vec![(0, 0, 0.0)];
    for &(along, weight) in scheme.along() {
        for &(across, share) in scheme.across() {
            let weight = weight * share / spacing;
            match axis {
                Axis::X => taps.push((across, along, weight)),
                Axis::Y => taps.push((along, across, weight)),
            }
        }
    }
    taps
}

/// Weighted sum of shifted rows into the columns that are `margin` or more from the edge.
fn combine(
    nodes: &[f64],
    nx: usize,
    j: usize,
    margin: usize,
    taps: &[(isize, isize, f64)],
    row: &mut [f64],
) {
    let row = &mut row[margin..nx - margin];
    for &(dj, di, weight) in taps {
        let start = j.wrapping_add_signed(dj) * nx + margin.wrapping_add_signed(di);
        let shifted = &nodes[start..start + row.len()];
        for (sum, value) in row.iter_mut().zip(shifted) {
            *sum += weight * value;
        }
    }
}

/// Derivative at one node and unit spacing by the best stencil that finds its nodes.
fn one_by_one(
    nodes: &[f64],
    (ny, nx): (usize, usize),
    (j, i): (usize, usize),
    axis: Axis,
    scheme: Scheme,
) -> f64 {
    let at = |offset: isize| {
        let (j, i) = match axis {
            Axis::X => (Some(j), i.checked_add_signed(offset)),
            Axis::Y => (j.checked_add_signed(offset), Some(i)),
        };
        match (j, i) {
            (Some(j), Some(i)) if j < ny && i < nx => nodes[j * nx + i],
            _ => f64::NAN,
        }
    };
    if at(0).is_nan() {
        return f64::NAN;
    }
    let sum = |taps: Taps| taps.iter().map(|&(k, w)| w * at(k)).sum::<f64>();
    std::iter::once(scheme.along())
        .chain(STAND_INS)
        .map(sum)
        .find(|d| !d.is_nan())
        .unwrap_or(f64::NAN)
}
