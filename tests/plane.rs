//! Correlation planes held against the vectors read from them, the defining sum, and what the
//! correlation of particle images is exactly.
#![allow(missing_docs, clippy::unwrap_used)]

use kolk::field::{Status, VectorField};
use kolk::frames::{Frame, Pair, Scale};
use kolk::interrogate::transform::{centred, correlate_directly};
use kolk::interrogate::{
    CorrelationPlane, Plan, PlanOptions, WindowSize, correlation_plane, interrogate,
};
use kolk::synth::{Flow, ImageOptions, Shear, Uniform, particle_images};
use kolk::task::Task;
use ndarray::Array2;

const SIDE: usize = 192;

fn images() -> ImageOptions {
    ImageOptions {
        width_px: SIDE,
        height_px: SIDE,
        ..ImageOptions::default()
    }
}

fn pair(flow: &Flow, images: &ImageOptions, scale: Scale) -> Pair {
    let (first, second) = particle_images(flow, images).unwrap();
    Pair::from_frames(first, second, scale, "synthetic")
}

fn plan(windows: &[[usize; 2]], overlap: f64) -> Plan {
    let window = |&[width, height]: &[usize; 2]| WindowSize { width, height };
    Plan::new(&PlanOptions {
        windows_px: windows.iter().map(window).collect(),
        overlap,
        ..PlanOptions::default()
    })
    .unwrap()
}

fn plane(pair: &Pair, at: (f64, f64), plan: &Plan) -> CorrelationPlane {
    correlation_plane(pair, at, plan, &Task::quiet()).unwrap()
}

/// A plan of one pass without overlap, and the planes of all its windows.
fn every_plane(pair: &Pair, side: usize) -> Vec<CorrelationPlane> {
    let plan = plan(&[[side, side]], 0.0);
    let (width, _) = pair.size();
    let centre = |k: usize| (k * side) as f64 + side as f64 / 2.0 - 0.5;
    let count = width / side;
    (0..count * count)
        .map(|k| plane(pair, (centre(k % count), centre(k / count)), &plan))
        .collect()
}

#[test]
fn the_peak_of_the_plane_is_the_vector_of_the_field() {
    // Noisy, uniform and sheared, square windows and others, in px and frames and in mm and s.
    let flow = Flow::from(Uniform { u: 3.3, v: -1.7 })
        + Shear {
            y: 90.0,
            rate: 0.03,
        };
    let noisy = ImageOptions {
        noise_of_full_scale: 0.04,
        out_of_plane_loss: 0.1,
        ..images()
    };
    let calibrated = Scale {
        dt_s: Some(0.01),
        mm_per_px: Some(0.2),
    };
    let plans = [
        plan(&[[64, 64]], 0.5),
        plan(&[[64, 64], [32, 32], [32, 32]], 0.5),
        plan(&[[64, 64], [48, 24]], 0.75),
    ];
    for (plan, scale) in plans
        .iter()
        .zip([Scale::default(), calibrated, Scale::default()])
    {
        let pair = pair(&flow, &noisy, scale);
        let field: VectorField = interrogate(&pair, plan, &Task::quiet()).unwrap();
        let ((_, mm), (_, dt)) = (scale.length(), scale.time());
        let mut compared = 0;
        for k in 0..12 {
            let (j, i) = (k * (field.grid.ny - 1) / 11, (k * 5) % field.grid.nx);
            let (x, y) = (field.grid.x(i), field.grid.y(j));
            // Anywhere nearer to this window than to the next.
            let at = (x + 0.4 * field.grid.dx, y - 0.4 * field.grid.dy);
            let at = if field.grid.holds(at.0, at.1) {
                at
            } else {
                (x, y)
            };
            let plane = plane(&pair, at, plan);
            assert!((plane.centre.0 - x).abs() < 1e-9 && (plane.centre.1 - y).abs() < 1e-9);
            assert_eq!(plane.field.grid.length, field.unit());
            if field.status[(j, i)] != Status::Measured {
                continue;
            }
            compared += 1;
            let found = plane.vector().unwrap();
            let px = dt / mm;
            let off = |a: f64, b: f64| ((a - b) * px).abs();
            let off = [
                off(found.displacement.0, field.u[(j, i)]),
                off(found.displacement.1, field.v[(j, i)]),
            ];
            // The same arithmetic: nothing but the last bits of the units may differ.
            assert!(off.iter().all(|off| *off < 1e-9), "{off:?} px at {x}, {y}");
            // Among the peaks it is the highest that the pass could reach.
            let [left, right, low, high] = plane.searched();
            let within = plane.peaks().iter().find(|peak| {
                let (i, j) = peak.sample;
                let (u, v) = (plane.field.grid.x(i), plane.field.grid.y(j));
                u > left && u < right && v > low && v < high
            });
            assert_eq!(within.unwrap().displacement, found.displacement);
        }
        assert!(compared > 8, "{compared}");
    }
}

#[test]
fn the_plane_is_the_defining_sum_of_the_weighted_windows() {
    let flow = Flow::from(Uniform { u: 1.3, v: 2.2 });
    let pair = pair(&flow, &images(), Scale::default());
    let (first, second) = pair.load().unwrap();
    let (width, height) = (24, 16);
    // On the images as they are.
    let plan = Plan::new(&PlanOptions {
        flatten_px: 0,
        ..plan(&[[width, height]], 0.5).options().clone()
    });
    let found = plane(&pair, (59.0, 131.0), &plan.unwrap());
    // Weight of a pixel of one exposure: root of 1 - t² along each axis, t in half sides.
    let root = |k: usize, n: usize| {
        let t = (2.0 * k as f64 - n as f64 + 1.0) / n as f64;
        (1.0 - t * t).sqrt()
    };
    let pixels = || (0..height * width).map(|k| (k / width, k % width));
    let weights: Vec<f64> = pixels()
        .map(|(r, c)| root(r, height) * root(c, width))
        .collect();
    let left = (found.centre.0 - (width as f64 - 1.0) / 2.0) as usize;
    let top = ((SIDE - 1) as f64 - found.centre.1 - (height as f64 - 1.0) / 2.0) as usize;
    let window = |frame: &Frame| {
        let pixels: Vec<f64> = pixels()
            .map(|(r, c)| f64::from(frame.pixels[(top + r, left + c)]))
            .collect();
        centred(&pixels, &weights)
    };
    let (f, g) = (window(&first), window(&second));
    let energy = |w: &[f64]| w.iter().map(|x| x * x).sum::<f64>();
    let norm = (energy(&f) * energy(&g)).sqrt();
    let sums = correlate_directly(&f, &g, height, width);
    let grid = found.field.grid;
    assert_eq!((grid.nx, grid.ny), (width, height));
    for ((j, i), value) in found.field.values.indexed_iter() {
        // y up: a shift down the image is one of negative v.
        let (right, down) = (grid.x(i).round() as i32, -grid.y(j).round() as i32);
        let row = down.rem_euclid(height as i32) as usize;
        let column = right.rem_euclid(width as i32) as usize;
        let wanted = sums[row * width + column] / norm;
        // Single precision rounds 6e-8 a step; coefficients are 1 at most.
        assert!(
            (value - wanted).abs() < 2e-6,
            "{right} {down}: {value} {wanted}"
        );
    }
}

/// The correlation, along one axis, of the image of a particle of diameter `d` (at e⁻²) with
/// itself, `shift` px apart, the mean over all places of the particle between the pixels.
///
/// A pixel is the mean of the Gaussian (standard deviation d/4) over its square: the Gaussian
/// convolved with a box one px wide. With itself that makes a Gaussian of variance d²/8 convolved
/// with a triangle of half width 1, variance 1/6; Simpson's rule, exact to 1e-8 here.
fn own_correlation(d: f64, shift: f64) -> f64 {
    let gauss = |x: f64| (-4.0 * x * x / (d * d)).exp();
    let n = 2000;
    let at = |k: i32| {
        let t = -1.0 + 2.0 * f64::from(k) / f64::from(n);
        let weight = match k {
            k if k == 0 || k == n => 1.0,
            k if k % 2 == 1 => 4.0,
            _ => 2.0,
        };
        weight * (1.0 - t.abs()) * gauss(shift - t)
    };
    (0..=n).map(at).sum()
}

#[test]
fn the_peak_is_root_two_times_as_wide_as_the_particle_images() {
    for d in [2.0, 2.4, 3.0, 4.0] {
        let options = ImageOptions {
            particle_diameter_px: d,
            // Far from full scale, so that images that overlap add up.
            peak_of_full_scale: 0.1,
            quantised: false,
            ..images()
        };
        // At rest both exposures are one image: its correlation with itself.
        let pair = pair(
            &Flow::from(Uniform { u: 0.0, v: 0.0 }),
            &options,
            Scale::default(),
        );
        let planes = every_plane(&pair, 64);
        let n = 2.0 * planes.len() as f64;
        let both = planes.iter().flat_map(|plane| {
            let peak = plane.peaks()[0];
            assert!((peak.height - 1.0).abs() < 1e-5 && plane.vector_is_highest());
            assert!(peak.displacement.0.abs() < 1e-5 && peak.displacement.1.abs() < 1e-5);
            [peak.width_px.0.unwrap(), peak.width_px.1.unwrap()]
        });
        let width = both.sum::<f64>() / n;
        // The three-point Gaussian of the exact samples; and by the variances alone, 2 (d²/16 +
        // 1/12), as if Gaussian and triangle made a Gaussian.
        let bend = 2.0 * (own_correlation(d, 0.0) / own_correlation(d, 1.0)).ln();
        let exact = 4.0 / bend.sqrt();
        let by_variance = 2f64.sqrt() * (d * d + 4.0 / 3.0).sqrt();
        println!("{d}: {width:.4}, exact {exact:.4}, by variance {by_variance:.4}");
        // Neighbours that happen to overlap scatter the width of one window by 2 to 3 %; the mean
        // of nine, along x and y, by less than 1 %.
        assert!((width / exact - 1.0).abs() < 0.02, "{d}: {width} {exact}");
        assert!(
            (width / by_variance - 1.0).abs() < 0.03,
            "{d}: {width} {by_variance}"
        );
    }
}

#[test]
fn unrelated_exposures_have_no_leading_peak_and_the_noise_of_chance() {
    let still = Flow::from(Uniform { u: 0.0, v: 0.0 });
    let options = |seed| ImageOptions {
        seed,
        peak_of_full_scale: 0.1,
        quantised: false,
        ..images()
    };
    let (first, together) = particle_images(&still, &options(1)).unwrap();
    let (other, _) = particle_images(&still, &options(2)).unwrap();
    let unrelated = Pair::from_frames(first.clone(), other, Scale::default(), "unrelated");
    let related = Pair::from_frames(first, together, Scale::default(), "related");
    let side = 32;
    let chance = every_plane(&unrelated, side);
    let mean = |planes: &[CorrelationPlane], of: fn(&CorrelationPlane) -> Option<f64>| {
        planes.iter().map(|plane| of(plane).unwrap()).sum::<f64>() / planes.len() as f64
    };
    let ratio = mean(&chance, CorrelationPlane::ratio);
    // Of n independent heights above a normal floor the highest leads by 1/(2 ln n) of itself on
    // average (extreme values of the normal distribution): 0.09 for the 370 cells of this plane.
    println!("ratio {ratio:.3}");
    assert!((1.02..1.2).contains(&ratio), "{ratio}");
    let leading = mean(&every_plane(&related, side), CorrelationPlane::ratio);
    assert!(leading > 3.0, "{leading}");
    // Independent patterns of correlation rho: the mean square of the circular plane is sum rho² over
    // the pixels of the window, whatever its weights (worked out from the definition: sum over all
    // offsets m of sum over i of w²(i) w²(i + m) is (sum w²)²). rho is a Gaussian of variance
    // s² = 2 (d²/16 + 1/12), so that sum rho² = pi s². Leaving out the highest peak takes out about
    // 3 % of it, the removed means 2 %; a plane is known to 4 %, the mean of 36 to 1 %.
    let s2 = 2.0 * (2.4f64 * 2.4 / 16.0 + 1.0 / 12.0);
    let wanted = (std::f64::consts::PI * s2).sqrt() / side as f64;
    let noise = mean(&chance, CorrelationPlane::noise);
    println!("noise {noise:.4}, by chance {wanted:.4}");
    assert!((noise / wanted - 1.0).abs() < 0.06, "{noise} {wanted}");
}

#[test]
fn a_window_without_contrast_has_a_plane_of_zeros_and_no_peak() {
    let grey = || Frame {
        pixels: Array2::from_elem((64, 64), 700.0),
        bits: 12,
    };
    let pair = Pair::from_frames(grey(), grey(), Scale::default(), "grey");
    let plane = plane(&pair, (10.0, 10.0), &plan(&[[32, 32], [16, 16]], 0.5));
    assert!(plane.field.values.iter().all(|r| *r == 0.0));
    assert!(plane.peaks().is_empty() && plane.vector().is_none());
    assert_eq!((plane.ratio(), plane.noise(), plane.lit), (None, None, 1.0));
}

#[test]
fn a_point_outside_the_image_is_refused_with_what_the_image_covers() {
    let scale = Scale {
        dt_s: Some(0.01),
        mm_per_px: Some(0.2),
    };
    let pair = pair(&Flow::from(Uniform { u: 1.0, v: 0.0 }), &images(), scale);
    for at in [
        (40.0, 10.0),
        (10.0, -0.2),
        (f64::NAN, 1.0),
        (f64::INFINITY, 1.0),
    ] {
        let error = correlation_plane(&pair, at, &plan(&[[32, 32]], 0.5), &Task::quiet())
            .unwrap_err()
            .to_string();
        let wanted = format!(
            "synthetic: the point ({}, {}) mm is outside the image, which covers x -0.1 to 38.3 and y -0.1 to 38.3 mm",
            at.0, at.1
        );
        assert_eq!(error, wanted);
    }
}
