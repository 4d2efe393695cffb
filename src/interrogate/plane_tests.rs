use super::*;

/// A Gaussian of this height and these standard deviations about `at` (right, down).
struct Hill {
    height: f64,
    at: (f64, f64),
    sides: (f64, f64),
}

fn hill(height: f64, at: (f64, f64), sides: (f64, f64)) -> Hill {
    Hill { height, at, sides }
}

/// The hills with what the weights leave of a pattern moved that far.
fn gaussians(side: usize, hills: &[Hill]) -> RawPlane {
    let blank = RawPlane::of_coefficients(Array2::zeros((side, side)));
    let n = side as i32;
    let offset = |k: usize| if k < side / 2 { k as i32 } else { k as i32 - n };
    let samples = Array2::from_shape_fn((side, side), |(row, column)| {
        let (x, y) = (offset(column), offset(row));
        let gaussian = |hill: &Hill| {
            let across = (f64::from(x) - hill.at.0) / hill.sides.0;
            let down = (f64::from(y) - hill.at.1) / hill.sides.1;
            hill.height * (-0.5 * (across * across + down * down)).exp()
        };
        let sum: f64 = hills.iter().map(gaussian).sum();
        sum as f32 * blank.left((x, y))
    });
    RawPlane::of_coefficients(samples)
}

#[test]
fn peaks_of_gaussians_have_their_place_width_and_order() {
    let raw = gaussians(
        64,
        &[
            hill(0.3, (-12.0, 9.25), (1.1, 1.1)),
            hill(0.8, (3.25, -2.5), (0.95, 1.4)),
            hill(0.1, (20.5, 20.0), (1.2, 1.2)),
        ],
    );
    let shift = Shift {
        predicted: (10.0, 1.0),
        px: 0.5,
    };
    let peaks = shift.peaks(&raw);
    assert_eq!(peaks.len(), 3);
    let near = |found: (f64, f64), right: f64, down: f64| {
        // The smoothing before the fit makes a Gaussian a little less of one: 0.002 px at most.
        let wanted = ((10.0 + right) * 0.5, -(1.0 + down) * 0.5);
        (found.0 - wanted.0).abs() < 0.002 && (found.1 - wanted.1).abs() < 0.002
    };
    assert!(near(peaks[0].displacement, 3.25, -2.5), "{:?}", peaks[0]);
    assert!(near(peaks[1].displacement, -12.0, 9.25), "{:?}", peaks[1]);
    assert!(near(peaks[2].displacement, 20.5, 20.0), "{:?}", peaks[2]);
    // Exact: a Gaussian is e^-2 of its top at two standard deviations on either side. Samples in
    // single precision, 6e-8, over the least bend, 0.5.
    let sides = [(0.95, 1.4), (1.1, 1.1), (1.2, 1.2)];
    for (peak, (x, y)) in peaks.iter().zip(sides) {
        assert!((peak.width_px.0.unwrap() - 4.0 * x).abs() < 1e-5);
        assert!((peak.width_px.1.unwrap() - 4.0 * y).abs() < 1e-5);
    }
    let ratio = peaks[0].height / peaks[1].height;
    assert_eq!(peaks[0].ratio, Some(ratio));
    assert_eq!(peaks[2].ratio, None);
}

#[test]
fn a_peak_at_the_rim_is_one_and_a_flat_plane_has_none() {
    // The plane is circular: 16.4 px to the right is 15.6 to the left.
    let raw = gaussians(
        32,
        &[
            hill(0.5, (15.6, 0.0), (1.0, 1.0)),
            hill(0.5, (-16.4, 0.0), (1.0, 1.0)),
        ],
    );
    assert_eq!(raw.peaks().len(), 1);
    let flat = RawPlane::of_coefficients(Array2::from_elem((16, 16), 0.2));
    assert!(flat.peaks().is_empty());
    assert_eq!(width([0.2, 0.2, 0.2]), None);
    assert_eq!(width([-0.1, 0.5, 0.2]), None);
    assert_eq!(width([0.6, 0.5, 0.6]), None);
}

#[test]
fn the_nearest_window_is_taken_and_those_at_the_edge_serve_what_lies_beyond() {
    let window = WindowSize {
        width: 32,
        height: 16,
    };
    let layout = Layout::new(window, 0.5, 101, 64).unwrap();
    for j in 0..layout.rows {
        for i in 0..layout.columns {
            let (x, y) = centre(&layout, (j, i));
            assert_eq!(nearest(&layout, x + 7.9, y - 3.9), (j, i));
        }
    }
    assert_eq!(nearest(&layout, -0.5, -0.5), (0, 0));
    let last = (layout.rows - 1, layout.columns - 1);
    assert_eq!(nearest(&layout, 100.5, 63.5), last);
}
