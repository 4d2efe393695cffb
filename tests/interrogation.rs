//! Interrogation held against synthetic pairs whose displacement is exact.
//!
//! The images are those of `synth`: pixel-integrated Gaussian particle images of 2.4 px and 0.06
//! particles a px², final window 32 px at an overlap of 0.75 unless a test says otherwise.
#![allow(missing_docs, clippy::unwrap_used)]

use kolk::field::{Status, VectorField};
use kolk::frames::{Pair, Scale};
use kolk::interrogate::{Plan, PlanOptions, interrogate};
use kolk::synth::{Flow, ImageOptions, Shear, SineWave, SolidRotation, Uniform, particle_images};
use kolk::task::Task;

const SIDE: usize = 256;

fn images() -> ImageOptions {
    ImageOptions {
        width_px: SIDE,
        height_px: SIDE,
        ..ImageOptions::default()
    }
}

fn found(flow: &Flow, images: &ImageOptions, plan: &PlanOptions) -> VectorField {
    let (first, second) = particle_images(flow, images).unwrap();
    let pair = Pair::from_frames(first, second, Scale::default(), "synthetic");
    interrogate(&pair, &Plan::new(plan).unwrap(), &Task::quiet()).unwrap()
}

fn windows(sides: &[usize]) -> PlanOptions {
    PlanOptions {
        windows_px: sides
            .iter()
            .map(|&side| kolk::interrogate::WindowSize {
                width: side,
                height: side,
            })
            .collect(),
        ..PlanOptions::default()
    }
}

/// Mean error (u, v), scatter about it and root mean square of measured vectors at least `margin`
/// px from the edge, and the share of vectors there that are measured.
struct Errors {
    bias: (f64, f64),
    random: f64,
    rms: f64,
    measured: f64,
}

fn errors(field: &VectorField, flow: &Flow, margin: f64) -> Errors {
    let mut off = Vec::new();
    let mut all = 0.0;
    let inside = |x: f64| x >= margin && x <= SIDE as f64 - 1.0 - margin;
    for ((j, i), status) in field.status.indexed_iter() {
        let (x, y) = (field.grid.x(i), field.grid.y(j));
        if inside(x) && inside(y) {
            all += 1.0;
            if *status == Status::Measured {
                let (u, v) = flow.displacement(x, y, 1.0);
                off.push((field.u[(j, i)] - u, field.v[(j, i)] - v));
            }
        }
    }
    let n = off.len() as f64;
    let bias = (
        off.iter().map(|o| o.0).sum::<f64>() / n,
        off.iter().map(|o| o.1).sum::<f64>() / n,
    );
    let mean_square = |about: (f64, f64)| {
        let square = |o: &(f64, f64)| (o.0 - about.0).powi(2) + (o.1 - about.1).powi(2);
        (off.iter().map(square).sum::<f64>() / (2.0 * n)).sqrt()
    };
    Errors {
        bias,
        random: mean_square(bias),
        rms: mean_square((0.0, 0.0)),
        measured: n / all,
    }
}

#[test]
fn uniform_shifts_are_found_without_bias_at_every_fraction_of_a_px() {
    // Mean over seeds: 3 pairs of 841 vectors leave a standard error below 0.0002 px.
    for step in 0..=10 {
        let d = f64::from(step) / 10.0;
        let flow = Flow::from(Uniform { u: d, v: 0.4 - d });
        let (mut bias, mut random) = ((0.0, 0.0), 0.0);
        for seed in 1..=3 {
            let options = ImageOptions { seed, ..images() };
            let e = errors(&found(&flow, &options, &PlanOptions::default()), &flow, 0.0);
            assert!(e.measured > 0.999);
            bias = (bias.0 + e.bias.0 / 3.0, bias.1 + e.bias.1 / 3.0);
            random += e.random / 3.0;
        }
        println!("{d}: bias {bias:.4?} random {random:.4}");
        assert!(
            bias.0.abs() <= 0.005 && bias.1.abs() <= 0.005,
            "{d}: {bias:?}"
        );
        assert!(random <= 0.003, "{d}: {random}");
    }
}

#[test]
fn strong_shear_and_rotation_are_followed() {
    let middle = (SIDE as f64 - 1.0) / 2.0;
    let shear = Flow::from(Shear {
        y: middle,
        rate: 0.08,
    });
    let plan = windows(&[64, 32, 32, 32, 32]);
    let e = errors(&found(&shear, &images(), &plan), &shear, 0.0);
    println!("shear rms {:.4} measured {:.3}", e.rms, e.measured);
    assert!(
        e.rms <= 0.01 && e.measured > 0.99,
        "{} {}",
        e.rms,
        e.measured
    );
    // 0.2 of vorticity: a rotation by 0.1 rad a frame.
    let rotation = Flow::from(SolidRotation {
        x: middle,
        y: middle,
        rate: 0.1,
    });
    let e = errors(&found(&rotation, &images(), &plan), &rotation, 32.0);
    println!("rotation rms {:.4} measured {:.3}", e.rms, e.measured);
    assert!(
        e.rms <= 0.03 && e.measured > 0.99,
        "{} {}",
        e.rms,
        e.measured
    );
}

#[test]
fn waves_down_to_one_and_a_half_windows_keep_their_amplitude() {
    for (wavelength, least) in [(128.0, 0.97), (64.0, 0.95), (48.0, 0.85)] {
        let flow = Flow::from(SineWave {
            x: 0.0,
            wavelength,
            amplitude: 2.0,
        });
        let options = ImageOptions {
            seeding_per_px2: 0.1,
            ..images()
        };
        let field = found(&flow, &options, &PlanOptions::default());
        let (mut along, mut whole) = (0.0, 0.0);
        for ((j, i), v) in field.v.indexed_iter() {
            if v.is_finite() && field.status[(j, i)] == Status::Measured {
                let (_, true_v) = flow.displacement(field.grid.x(i), field.grid.y(j), 1.0);
                along += v * true_v;
                whole += true_v * true_v;
            }
        }
        println!("wave {wavelength}: {:.4}", along / whole);
        assert!(along / whole >= least, "{wavelength}: {}", along / whole);
        assert!(along / whole <= 1.01, "{wavelength}: {}", along / whole);
    }
}

#[test]
fn the_field_does_not_depend_on_the_number_of_threads() {
    let flow = Flow::from(SineWave {
        x: 0.0,
        wavelength: 90.0,
        amplitude: 1.5,
    });
    let (first, second) = particle_images(&flow, &images()).unwrap();
    let pair = Pair::from_frames(first, second, Scale::default(), "synthetic");
    let plan = Plan::new(&PlanOptions::default()).unwrap();
    let on = |threads| {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap();
        pool.install(|| interrogate(&pair, &plan, &Task::quiet()).unwrap())
    };
    let (one, three) = (on(1), on(3));
    let bits = |f: &VectorField| {
        f.u.iter()
            .chain(&f.v)
            .map(|x| x.to_bits())
            .collect::<Vec<_>>()
    };
    assert_eq!(bits(&one), bits(&three));
}

#[test]
fn the_vector_belongs_to_the_window_s_centre_with_y_up() {
    // v grows upwards only: a field read with y down, or off by half a px, would show.
    let middle = 100.0;
    let flow = Flow::from(SolidRotation {
        x: 80.0,
        y: middle,
        rate: 0.02,
    });
    let field = found(&flow, &images(), &PlanOptions::default());
    let e = errors(&field, &flow, 0.0);
    assert!(
        e.bias.0.abs() < 0.003 && e.bias.1.abs() < 0.003,
        "{:?}",
        e.bias
    );
}

#[test]
fn the_plan_foretells_the_amplitude_of_a_wave() {
    for (sides, wavelength) in [
        (vec![64, 32, 32, 32], 64.0),
        (vec![32], 64.0),
        (vec![64, 32, 32, 32, 32, 32], 48.0),
    ] {
        let options = windows(&sides);
        let told = Plan::new(&options).unwrap().amplitude(wavelength);
        // A small amplitude, so that the gradient inside a window changes nothing else.
        let flow = Flow::from(SineWave {
            x: 0.0,
            wavelength,
            amplitude: 0.5,
        });
        let dense = ImageOptions {
            seeding_per_px2: 0.1,
            ..images()
        };
        let field = found(&flow, &dense, &options);
        let (mut along, mut whole) = (0.0, 0.0);
        for ((j, i), v) in field.v.indexed_iter() {
            let (_, true_v) = flow.displacement(field.grid.x(i), field.grid.y(j), 1.0);
            along += v * true_v;
            whole += true_v * true_v;
        }
        println!(
            "{sides:?} {wavelength}: {:.3} told {told:.3}",
            along / whole
        );
        assert!(
            (along / whole - told).abs() < 0.04,
            "{sides:?} {wavelength}: {} told {told}",
            along / whole
        );
    }
}

#[test]
fn the_uncertainty_is_that_of_the_errors() {
    let clean = images();
    let noisy = |noise: f64| ImageOptions {
        noise_of_full_scale: noise,
        ..clean.clone()
    };
    let shifted = || Flow::from(Uniform { u: 0.3, v: 0.7 });
    let cases = [
        ("3 % noise", noisy(0.03), shifted()),
        ("6 % noise", noisy(0.06), shifted()),
        (
            "a quarter leaves",
            ImageOptions {
                out_of_plane_loss: 0.25,
                ..noisy(0.03)
            },
            shifted(),
        ),
        (
            "dense",
            ImageOptions {
                seeding_per_px2: 0.12,
                ..noisy(0.03)
            },
            shifted(),
        ),
        (
            "large images",
            ImageOptions {
                particle_diameter_px: 3.5,
                ..noisy(0.03)
            },
            shifted(),
        ),
        (
            "small images",
            ImageOptions {
                particle_diameter_px: 1.8,
                ..noisy(0.03)
            },
            shifted(),
        ),
        (
            "sheared",
            noisy(0.03),
            Flow::from(Shear {
                y: 127.5,
                rate: 0.05,
            }),
        ),
        (
            "turning",
            noisy(0.03),
            Flow::from(SolidRotation {
                x: 127.5,
                y: 127.5,
                rate: 0.05,
            }),
        ),
    ];
    for (name, options, flow) in cases {
        let (mut within1, mut within2, mut n) = (0.0, 0.0, 0.0);
        let (mut error2, mut told2) = (0.0, 0.0);
        for seed in 1..=4 {
            let options = ImageOptions {
                seed,
                ..options.clone()
            };
            let field = found(&flow, &options, &PlanOptions::default());
            let (u_unc, v_unc) = field.unc.as_ref().unwrap();
            for ((j, i), status) in field.status.indexed_iter() {
                if *status != Status::Measured {
                    continue;
                }
                let (u, v) = flow.displacement(field.grid.x(i), field.grid.y(j), 1.0);
                for (error, told) in [
                    (field.u[(j, i)] - u, u_unc[(j, i)]),
                    (field.v[(j, i)] - v, v_unc[(j, i)]),
                ] {
                    if told.is_finite() {
                        within1 += f64::from(u8::from(error.abs() < told));
                        within2 += f64::from(u8::from(error.abs() < 2.0 * told));
                        error2 += error * error;
                        told2 += told * told;
                        n += 1.0;
                    }
                }
            }
        }
        let ratio = f64::sqrt(told2 / error2);
        println!("{name}: {:.3} {:.3} {ratio:.3}", within1 / n, within2 / n);
        // A normal error of known size: 68.3 % and 95.4 %.
        assert!(
            (0.64..=0.72).contains(&(within1 / n)),
            "{name}: {}",
            within1 / n
        );
        assert!(
            (0.93..=0.97).contains(&(within2 / n)),
            "{name}: {}",
            within2 / n
        );
        assert!((0.85..=1.15).contains(&ratio), "{name}: {ratio}");
    }
}

#[test]
fn errors_of_neighbours_go_together_as_the_field_says() {
    let flow = Flow::from(Uniform { u: 0.3, v: 0.0 });
    let (mut square, mut product) = ([0.0; 4], [0.0; 4]);
    let mut told = [0.0; 4];
    for seed in 1..=4 {
        let options = ImageOptions {
            noise_of_full_scale: 0.05,
            seed,
            ..images()
        };
        let field = found(&flow, &options, &PlanOptions::default());
        let correlation = field.error_correlation.clone().unwrap();
        let off = |j: usize, i: usize| field.u[(j, i)] - 0.3;
        for lag in 0..4 {
            told[lag] = correlation.at(0, lag as isize);
            for j in 3..field.grid.ny - 3 {
                for i in 3..field.grid.nx - 3 - lag {
                    product[lag] += off(j, i) * off(j, i + lag);
                    square[lag] += (off(j, i).powi(2) + off(j, i + lag).powi(2)) / 2.0;
                }
            }
        }
    }
    for lag in 0..4 {
        let measured: f64 = product[lag] / square[lag];
        println!("{lag}: {measured:.3} told {:.3}", told[lag]);
        assert!(
            (measured - told[lag]).abs() < 0.1,
            "{lag}: {measured} told {}",
            told[lag]
        );
    }
}

#[test]
fn windows_behind_a_mask_are_masked_and_those_over_the_edge_are_outside() {
    let flow = Flow::from(Uniform { u: 0.4, v: -0.2 });
    let (first, second) = particle_images(&flow, &images()).unwrap();
    // The left 100 columns are hidden, so that windows deep inside have nothing left.
    let mask = ndarray::Array2::from_shape_fn((SIDE, SIDE), |(_, column)| column < 100);
    let plan = Plan::new(&PlanOptions::default()).unwrap();
    let field = kolk::interrogate::interrogate_images(
        &first.pixels,
        &second.pixels,
        [Some(&mask); 2],
        &plan,
        &Scale::default(),
        "masked",
        &Task::quiet(),
    )
    .unwrap();
    for ((j, i), status) in field.status.indexed_iter() {
        let x = field.grid.x(i);
        if x < 95.0 {
            assert_eq!(*status, Status::Masked, "{x}");
            assert!(field.u[(j, i)].is_nan());
        } else if x > 105.0 {
            assert_eq!(*status, Status::Measured, "{x}");
            assert!((field.u[(j, i)] - 0.4).abs() < 0.05);
        }
    }
}
