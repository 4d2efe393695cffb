//! The fast kernel against the slow one, against an outside library, and against itself.

use multiversion::multiversion;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::axis::{Axis, along};
use super::lanes::{Buffer, LANES, Phasor, Transform, Whole};
use super::*;

/// Every fast length, and one of each kind for the general kernel (odd, one two, several fives).
const SHAPES: [(usize, usize); 16] = [
    (8, 8),
    (16, 16),
    (24, 24),
    (32, 32),
    (48, 48),
    (64, 64),
    (2, 96),
    (128, 4),
    (3, 256),
    (24, 40),
    (15, 25),
    (32, 12),
    (5, 64),
    (20, 18),
    (2, 2),
    (75, 6),
];

/// Grey levels like those of a camera: a background with specks far brighter than it.
fn pixels(random: &mut ChaCha8Rng, length: usize) -> Vec<f32> {
    (0..length)
        .map(|_| 100.0 + 4000.0 * random.random::<f32>().powi(8))
        .collect()
}

fn lane_of(values: &[f32], lane: usize) -> Vec<f64> {
    let values = values.iter().skip(lane).step_by(LANES);
    values.map(|&x| f64::from(x)).collect()
}

fn dirty(scratch: &mut Scratch) {
    let nan = [f32::NAN; LANES];
    scratch.spectrum.fill(Phasor { re: nan, im: nan });
    scratch.work.fill(Phasor { re: nan, im: nan });
    scratch.maxima.fill(nan);
}

/// Correlates interleaved windows on scratch space and planes full of NaN.
fn run(
    correlator: &Correlator,
    (first, second): (&[f32], &[f32]),
    lit: Option<&[f32]>,
    reach: usize,
) -> (Vec<f32>, Moments) {
    let mut scratch = correlator.scratch();
    dirty(&mut scratch);
    let mut planes = vec![f32::NAN; correlator.planes_length()];
    let layout = Layout::interleaved(correlator.width());
    let windows = Windows {
        first,
        second,
        lit,
        start: 0,
        layout: &layout,
    };
    let moments = correlator.correlate(&windows, reach, &mut planes, &mut scratch);
    (planes, moments)
}

/// Checks one lane's plane against the defining sum. Single precision rounds each of the log2(n)
/// steps by 6e-8 of the energy that the plane's greatest possible value is; 2e-6 of it is ten times
/// what that makes for the largest windows here.
fn assert_plane(got: &[f64], first: &[f64], second: &[f64], (height, width): (usize, usize)) {
    let expected = correlate_directly(first, second, height, width);
    let energy = |x: &[f64]| x.iter().map(|x| x * x).sum::<f64>();
    let greatest = (energy(first) * energy(second)).sqrt();
    for (place, (got, expected)) in got.iter().zip(&expected).enumerate() {
        let error = (got - expected).abs();
        assert!(
            error <= 2e-6 * greatest,
            "{height} x {width}, place {place}: {got} instead of {expected}"
        );
    }
}

#[test]
fn planes_agree_with_the_defining_sum_for_all_kinds_of_sizes() {
    let mut random = ChaCha8Rng::seed_from_u64(1);
    for (height, width) in SHAPES {
        let correlator = Correlator::new(height, width).unwrap();
        let first = pixels(&mut random, correlator.planes_length());
        let second = pixels(&mut random, correlator.planes_length());
        let (planes, moments) = run(&correlator, (&first, &second), None, usize::MAX);
        let ones = vec![1.0; height * width];
        for lane in [0, 5, LANES - 1] {
            let a = centred(&lane_of(&first, lane), &ones);
            let b = centred(&lane_of(&second, lane), &ones);
            assert_plane(&lane_of(&planes, lane), &a, &b, (height, width));
            let energy: f64 = a.iter().map(|x| x * x).sum();
            let got = f64::from(moments.first_energy[lane]);
            assert!(
                (got / energy - 1.0).abs() < 1e-5,
                "{got} instead of {energy}"
            );
        }
    }
}

#[test]
fn weights_and_masks_act_as_in_the_defining_sum() {
    let mut random = ChaCha8Rng::seed_from_u64(2);
    for (height, width) in [(16, 16), (32, 24), (10, 9)] {
        let weights: Vec<f32> = (0..height * width).map(|_| random.random()).collect();
        let correlator = Correlator::new(height, width).unwrap();
        let weighted = correlator.clone().weighted(weights.clone()).unwrap();
        let first = pixels(&mut random, correlator.planes_length());
        let second = pixels(&mut random, correlator.planes_length());
        let lit: Vec<f32> = (0..correlator.planes_length())
            .map(|_| f32::from(u8::from(random.random::<f32>() > 0.3)))
            .collect();
        let ones = vec![1.0; weights.len()];
        for (plan, weights) in [(&correlator, &ones), (&weighted, &weights)] {
            for mask in [None, Some(lit.as_slice())] {
                let (planes, moments) = run(plan, (&first, &second), mask, usize::MAX);
                let lane = 6;
                let lit = mask.map_or(vec![1.0; weights.len()], |lit| lane_of(lit, lane));
                let by: Vec<f64> = lit
                    .iter()
                    .zip(weights)
                    .map(|(l, &w)| l * f64::from(w))
                    .collect();
                let a = centred(&lane_of(&first, lane), &by);
                let b = centred(&lane_of(&second, lane), &by);
                assert_plane(&lane_of(&planes, lane), &a, &b, (height, width));
                let energy: f64 = b.iter().map(|x| x * x).sum();
                let got = f64::from(moments.second_energy[lane]);
                assert!(
                    (got / energy - 1.0).abs() < 1e-5,
                    "{got} instead of {energy}"
                );
            }
        }
    }
}

// Source of the values: tests/outside/correlation_planes.py, numpy's double-precision FFT.
#[test]
fn planes_agree_with_a_general_purpose_numerical_library() {
    let text = include_str!("../../tests/data/correlation_planes.csv");
    let mut rows = text.lines().skip(1).map(|line| {
        let cells: Vec<&str> = line.split(',').collect();
        cells[5].parse::<f64>().unwrap()
    });
    for (k, (height, width)) in [(16, 16), (16, 16), (32, 24)].into_iter().enumerate() {
        let correlator = Correlator::new(height, width).unwrap();
        let value = |i: usize, j: usize| (7 * i * i + 13 * j * j + 5 * i * j + 31 * k) % 97;
        let mut first = vec![0.0; correlator.planes_length()];
        let mut second = first.clone();
        let lane = 4 + k;
        for i in 0..height {
            for j in 0..width {
                let place = (i * width + j) * LANES + lane;
                first[place] = value(i, j) as f32;
                let moved = value((i + height - 2) % height, (j + 3) % width);
                second[place] = (moved + (3 * i + 11 * j + k) % 19) as f32;
            }
        }
        let (planes, _) = run(&correlator, (&first, &second), None, usize::MAX);
        let got = lane_of(&planes, lane);
        let expected: Vec<f64> = rows.by_ref().take(height * width).collect();
        assert_eq!(expected.len(), height * width);
        let greatest = expected.iter().fold(0.0_f64, |top, x| top.max(x.abs()));
        for (got, expected) in got.iter().zip(&expected) {
            assert!(
                (got - expected).abs() <= 1e-5 * greatest,
                "{got} instead of {expected}"
            );
        }
    }
}

#[test]
fn a_window_is_the_same_to_the_last_bit_in_any_lane_and_company() {
    let mut random = ChaCha8Rng::seed_from_u64(3);
    for (height, width) in SHAPES {
        let correlator = Correlator::new(height, width).unwrap();
        let length = correlator.planes_length();
        let (mut first, mut second) = (pixels(&mut random, length), pixels(&mut random, length));
        let (alone, moments) = run(&correlator, (&first, &second), None, usize::MAX);
        // The window of lane 3 moves to lane 11; all others become useless or enormous.
        for place in (0..length).step_by(LANES) {
            for exposure in [&mut first, &mut second] {
                let kept = exposure[place + 3];
                for lane in 0..LANES {
                    exposure[place + lane] = if lane % 2 == 0 { f32::NAN } else { 1e30 };
                }
                exposure[place + 11] = kept;
            }
        }
        let (beside, others) = run(&correlator, (&first, &second), None, usize::MAX);
        for place in (0..length).step_by(LANES) {
            assert_eq!(alone[place + 3].to_bits(), beside[place + 11].to_bits());
        }
        assert_eq!(moments.first_energy[3], others.first_energy[11]);
        assert_eq!(moments.second_mean[3], others.second_mean[11]);
    }
}

#[test]
fn leaving_out_rows_of_the_plane_changes_no_bit_of_the_others() {
    let mut random = ChaCha8Rng::seed_from_u64(4);
    for (height, width) in SHAPES {
        let correlator = Correlator::new(height, width).unwrap();
        let first = pixels(&mut random, correlator.planes_length());
        let second = pixels(&mut random, correlator.planes_length());
        let (whole, _) = run(&correlator, (&first, &second), None, usize::MAX);
        for reach in [0, 1, height / 4] {
            let (some, _) = run(&correlator, (&first, &second), None, reach);
            for m in (0..height).filter(|&m| m.min(height - m) <= reach) {
                let row = m * width * LANES..(m + 1) * width * LANES;
                assert_eq!(whole[row.clone()], some[row]);
            }
        }
    }
}

/// One transform of every lane, by whatever instructions the caller was compiled for.
#[inline(always)]
fn along_line(axis: &Axis, line: &[Phasor], work: &mut [Phasor], out: &mut [Phasor]) {
    along!(axis, transform => transform.apply(&mut Buffer(line), work, &mut Whole(out)));
}

#[multiversion(targets("x86_64+avx512f+avx512vl+avx512bw+avx512dq+avx2+fma"))]
fn with_the_widest(axis: &Axis, line: &[Phasor], work: &mut [Phasor], out: &mut [Phasor]) {
    along_line(axis, line, work, out);
}

#[multiversion(targets("x86_64+avx2+fma"))]
fn with_the_middle(axis: &Axis, line: &[Phasor], work: &mut [Phasor], out: &mut [Phasor]) {
    along_line(axis, line, work, out);
}

#[test]
fn all_sets_of_instructions_give_the_same_bits() {
    let mut random = ChaCha8Rng::seed_from_u64(5);
    for length in [
        2, 3, 4, 5, 8, 12, 16, 24, 30, 32, 48, 64, 75, 96, 128, 250, 256,
    ] {
        let axis = Axis::new(length).unwrap();
        let line: Vec<Phasor> = (0..length)
            .map(|_| Phasor {
                re: std::array::from_fn(|_| random.random::<f32>() - 0.5),
                im: std::array::from_fn(|_| random.random::<f32>() - 0.5),
            })
            .collect();
        let results = [along_line, with_the_widest, with_the_middle].map(|run| {
            let mut work = vec![Phasor::ZERO; 2 * length];
            let mut out = vec![Phasor::ZERO; length];
            run(&axis, &line, &mut work, &mut out);
            out.iter()
                .flat_map(|p| [p.re, p.im])
                .flatten()
                .collect::<Vec<f32>>()
        });
        assert_eq!(results[0], results[1], "{length}");
        assert_eq!(results[0], results[2], "{length}");
    }
}

#[test]
fn regrouped_and_gathered_windows_are_the_same_windows() {
    let mut random = ChaCha8Rng::seed_from_u64(6);
    let (height, width) = (70, 230);
    let image = pixels(&mut random, height * width);
    for (side, left, spacing) in [
        (32, 0, 16),
        (32, 3, 8),
        (24, 5, 24),
        (16, 1, 5),
        (16, 0, 20),
    ] {
        let count = (width - left - side) / spacing + 1;
        let columns = WindowColumns {
            left,
            spacing,
            count,
            width: side,
        };
        // A band as high as one window, scrolled to window row 1 at image row 7.
        let mut band = Polyphase::new(side, columns);
        band.fill(&image, width, width);
        band.scroll(7);
        for (r, mut row) in band.rows_mut().enumerate().skip(side - 7) {
            row.fill(&image[(r + 7) * width..][..width]);
        }
        let layout = band.layout();
        let mut gathered = vec![f32::NAN; side * side * LANES];
        for batch in 0..columns.batches() {
            let windows = batch * LANES..count.min((batch + 1) * LANES);
            let corners: Vec<_> = windows.map(|i| (7, left + i * spacing)).collect();
            gather(&image, width, &corners, (side, side), &mut gathered);
            for r in 0..side {
                for c in 0..side {
                    for (lane, &(top, edge)) in corners.iter().enumerate() {
                        let pixel = image[(top + r) * width + edge + c];
                        let place = band.start(r, batch) + layout.columns[c] + lane;
                        assert_eq!(band.pixels()[place], pixel);
                        assert_eq!(gathered[(r * side + c) * LANES + lane], pixel);
                    }
                    for lane in corners.len()..LANES {
                        assert_eq!(gathered[(r * side + c) * LANES + lane], 0.0);
                    }
                }
            }
        }
    }
}

#[test]
fn peaks_are_those_a_look_at_every_offset_finds() {
    let mut random = ChaCha8Rng::seed_from_u64(7);
    for (height, width) in SHAPES {
        let correlator = Correlator::new(height, width).unwrap();
        let mut scratch = correlator.scratch();
        // Few different values, so that equal ones are common.
        let planes: Vec<f32> = (0..correlator.planes_length())
            .map(|_| (random.random::<f32>() * 50.0).floor() - 25.0)
            .collect();
        for (reach_y, reach_x, exclusion) in [(2, 3, 1), (height / 4, width / 4, 2), (999, 999, 1)]
        {
            let search = Search {
                reach_x,
                reach_y,
                exclusion,
            };
            dirty(&mut scratch);
            let peaks = correlator.peaks(&planes, &search, &mut scratch);
            for lane in 0..LANES {
                let look = |allowed: &dyn Fn(i32, i32) -> bool| {
                    let mut best = (f32::NEG_INFINITY, 0, 0);
                    let (h, w) = (height as i32, width as i32);
                    for row in -(h / 2).min(reach_y as i32)..=((h - 1) / 2).min(reach_y as i32) {
                        for column in
                            -(w / 2).min(reach_x as i32)..=((w - 1) / 2).min(reach_x as i32)
                        {
                            let m = row.rem_euclid(h) as usize;
                            let n = column.rem_euclid(w) as usize;
                            let value = planes[(m * width + n) * LANES + lane];
                            if value > best.0 && allowed(row, column) {
                                best = (value, row, column);
                            }
                        }
                    }
                    best
                };
                let first = look(&|_, _| true);
                let got = peaks.first[lane];
                assert_eq!((got.height, got.row, got.column), first);
                let e = exclusion as i32;
                let second =
                    look(&|row, column| (row - first.1).abs() > e || (column - first.2).abs() > e);
                let got = peaks.second[lane];
                assert_eq!((got.height, got.row, got.column), second);
                let near: [[f32; 5]; 5] =
                    correlator.neighbourhood(&planes, lane, &peaks.first[lane]);
                assert_eq!(near[2][2], first.0);
            }
        }
    }
}

#[test]
fn a_pattern_moved_down_and_right_peaks_at_positive_row_and_column() {
    let mut random = ChaCha8Rng::seed_from_u64(8);
    let correlator = Correlator::new(32, 48).unwrap();
    let first = pixels(&mut random, correlator.planes_length());
    let mut second = first.clone();
    for i in 0..32 {
        for j in 0..48 {
            let (from, to) = (i * 48 + j, (i + 3) % 32 * 48 + (j + 5) % 48);
            second[to * LANES..(to + 1) * LANES]
                .copy_from_slice(&first[from * LANES..(from + 1) * LANES]);
        }
    }
    let (planes, moments) = run(&correlator, (&first, &second), None, 8);
    let search = Search {
        reach_x: 8,
        reach_y: 8,
        exclusion: 1,
    };
    let peaks = correlator.peaks(&planes, &search, &mut correlator.scratch());
    for lane in 0..LANES {
        let peak = peaks.first[lane];
        assert_eq!((peak.row, peak.column), (3, 5));
        // The same pattern: its coefficient is 1 but for rounding.
        assert!((peak.height * moments.normalization(lane) - 1.0).abs() < 1e-5);
        assert!(peaks.second[lane].height < 0.5 * peak.height);
    }
}

#[test]
fn a_window_without_contrast_or_light_has_no_energy() {
    let correlator = Correlator::new(16, 16).unwrap();
    // No number of single precision, so that the mean is off by rounding.
    let even = vec![723.1; correlator.planes_length()];
    let mut random = ChaCha8Rng::seed_from_u64(9);
    let second = pixels(&mut random, correlator.planes_length());
    let dark = vec![0.0; correlator.planes_length()];
    for (first, lit) in [(&even, None), (&second, Some(dark.as_slice()))] {
        let (_, moments) = run(&correlator, (first, &second), lit, usize::MAX);
        assert_eq!(moments.first_energy, [0.0; LANES]);
        assert_eq!(moments.normalization(2), 0.0);
    }
}

#[test]
fn a_side_that_cannot_be_transformed_is_refused_with_its_neighbours() {
    let message = Correlator::new(32, 34).unwrap_err().to_string();
    assert!(
        message.contains("34 px") && message.contains("32 and 36"),
        "{message}"
    );
    for length in [0, 1] {
        let error = Correlator::new(length, 16).unwrap_err();
        assert!(matches!(error, TransformError::Length { above: 2, .. }));
    }
    let error = Correlator::new(4, 4)
        .unwrap()
        .weighted(vec![1.0; 15])
        .unwrap_err();
    assert_eq!(error.to_string(), "15 window weights for a window of 16 px");
}
