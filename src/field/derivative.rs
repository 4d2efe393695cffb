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
/// Whole rows are combined at once wherever the stencil fits the array. A NaN among the nodes
/// makes the sum NaN; those cells, cells that are NaN themselves, and the edges are then done one
/// by one.
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
        let here = &nodes[j * nx..(j + 1) * nx];
        let singly = |i: usize| one_by_one(nodes, (ny, nx), (j, i), axis, scheme) / spacing;
        if j < margin || j + margin >= ny || nx <= 2 * margin {
            for (i, value) in row.iter_mut().enumerate() {
                *value = singly(i);
            }
            continue;
        }
        combine(nodes, nx, j, margin, &taps, row);
        if has_nan(row) || has_nan(here) {
            for (i, value) in row.iter_mut().enumerate() {
                if value.is_nan() || here[i].is_nan() {
                    *value = singly(i);
                }
            }
        }
        for i in (0..margin).chain(nx - margin..nx) {
            row[i] = singly(i);
        }
    }
    out
}

/// Looks at every value rather than stopping at the first NaN, which lets the compiler take
/// several at a time.
fn has_nan(row: &[f64]) -> bool {
    row.iter()
        .fold(false, |found, value| found | value.is_nan())
}

/// A row offset, a column offset and a weight.
type Tap = (isize, isize, f64);

/// The scheme's taps in groups of four, filled up with taps of no weight.
fn stencil(axis: Axis, scheme: Scheme, spacing: f64) -> Vec<[Tap; 4]> {
    let mut taps: Vec<Tap> = Vec::new();
    for &(along, weight) in scheme.along() {
        for &(across, share) in scheme.across() {
            let weight = weight * share / spacing;
            match axis {
                Axis::X => taps.push((across, along, weight)),
                Axis::Y => taps.push((along, across, weight)),
            }
        }
    }
    taps.resize(taps.len().next_multiple_of(4), (0, 0, 0.0));
    taps.as_chunks().0.to_vec()
}

/// Weighted sum of shifted rows into the columns that are `margin` or more from the edge.
fn combine(nodes: &[f64], nx: usize, j: usize, margin: usize, taps: &[[Tap; 4]], row: &mut [f64]) {
    let row = &mut row[margin..nx - margin];
    for four in taps {
        let [a, b, c, d] = four.map(|(dj, di, _)| {
            let start = j.wrapping_add_signed(dj) * nx + margin.wrapping_add_signed(di);
            &nodes[start..start + row.len()]
        });
        let [wa, wb, wc, wd] = four.map(|(_, _, weight)| weight);
        for (k, sum) in row.iter_mut().enumerate() {
            *sum += wa * a[k] + wb * b[k] + wc * c[k] + wd * d[k];
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
