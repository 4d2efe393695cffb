//! Bad images: interrogating them neither panics nor gives a quiet number.
//!
//! A vector is *wild* when it is given as measured and is more than 1 px off. Images of 256 x 256
//! px and an overlap of 0.75 unless a test says otherwise.
#![allow(missing_docs, clippy::unwrap_used)]

use kolk::field::{Status, VectorField};
use kolk::frames::{Frame, Scale};
use kolk::interrogate::{InterrogateError, Plan, PlanOptions, WindowSize, interrogate_images};
use kolk::synth::{Flow, ImageOptions, LambOseen, Uniform, particle_images};
use kolk::task::Task;
use ndarray::{Array2, s};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

const SIDE: usize = 256;
/// Full scale of a 12-bit camera.
const WHITE: f32 = 4095.0;

const PLANS: [&[usize]; 3] = [&[64, 32, 32, 32], &[32, 16, 16], &[32]];

fn options(sides: &[usize]) -> PlanOptions {
    let square = |&side: &usize| WindowSize {
        width: side,
        height: side,
    };
    PlanOptions {
        windows_px: sides.iter().map(square).collect(),
        ..PlanOptions::default()
    }
}

/// The plans, with lighting made even and with images as they are.
fn plans() -> impl Iterator<Item = Plan> {
    PLANS.into_iter().flat_map(|sides| {
        [25, 0].map(|flatten_px| {
            Plan::new(&PlanOptions {
                flatten_px,
                ..options(sides)
            })
            .unwrap()
        })
    })
}

fn plan(sides: &[usize]) -> Plan {
    Plan::new(&options(sides)).unwrap()
}

/// Side of the windows of the last pass, px.
fn window(plan: &Plan) -> f64 {
    plan.windows().last().unwrap().width as f64
}

fn tried(
    first: &Array2<f32>,
    second: &Array2<f32>,
    mask: Option<&Array2<bool>>,
    plan: &Plan,
) -> Result<VectorField, InterrogateError> {
    interrogate_images(
        first,
        second,
        [mask; 2],
        plan,
        &Scale::default(),
        "bad pair",
        &Task::quiet(),
    )
}

/// The field of a pair; whatever the images are, there is a number exactly where the status says
/// there is one, and an uncertainty only where it was measured.
fn found(first: &Array2<f32>, second: &Array2<f32>, plan: &Plan) -> VectorField {
    let field = tried(first, second, None, plan).unwrap();
    let (u_unc, v_unc) = field.unc.as_ref().unwrap();
    for (at, status) in field.status.indexed_iter() {
        assert_eq!(field.u[at].is_finite(), status.has_vector());
        assert_eq!(field.v[at].is_finite(), status.has_vector());
        let told = u_unc[at].is_finite() || v_unc[at].is_finite();
        assert!(*status == Status::Measured || !told);
    }
    field
}

fn share(field: &VectorField) -> f64 {
    field.count(Status::Measured) as f64 / field.status.len() as f64
}

fn images(seed: u64, seeding: f64, noise: f64) -> ImageOptions {
    ImageOptions {
        width_px: SIDE,
        height_px: SIDE,
        seed,
        seeding_per_px2: seeding,
        noise_of_full_scale: noise,
        ..ImageOptions::default()
    }
}

fn uniform() -> Flow {
    Flow::from(Uniform { u: 4.0, v: -2.0 })
}

/// An eddy in the middle that turns by 0.09 rad a frame and reaches 2.3 px.
fn eddy() -> Flow {
    Flow::from(LambOseen {
        x: 127.5,
        y: 127.5,
        core_radius: 40.0,
        circulation: 900.0,
    })
}

fn pair(flow: &Flow, images: &ImageOptions) -> [Array2<f32>; 2] {
    let (first, second) = particle_images(flow, images).unwrap();
    [first, second].map(|frame: Frame| frame.pixels)
}

/// The image as a camera with this noise would see it.
fn noisy(image: &Array2<f32>, noise: f32, seed: u64) -> Array2<f32> {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    image.mapv(|level| {
        let deviation: f32 = random.sample(StandardNormal);
        (level + WHITE * noise * deviation)
            .round()
            .clamp(0.0, WHITE)
    })
}

/// Errors of the measured vectors of a field, each with its place: x, y, length.
fn errors(field: &VectorField, flow: &Flow) -> Vec<(f64, f64, f64)> {
    let measured = field.status.indexed_iter();
    let measured = measured.filter(|(_, status)| **status == Status::Measured);
    let error = |((j, i), _)| {
        let (x, y) = (field.grid.x(i), field.grid.y(j));
        let (u, v) = flow.displacement(x, y, 1.0);
        (x, y, (field.u[(j, i)] - u).hypot(field.v[(j, i)] - v))
    };
    measured.map(error).collect()
}

fn root_mean_square(errors: impl Iterator<Item = f64>) -> f64 {
    let (n, sum) = errors.fold((0.0, 0.0), |(n, sum), e| (n + 1.0, sum + e * e));
    (sum / (2.0 * n)).sqrt()
}

#[test]
fn images_without_a_pattern_give_no_vector_and_all_is_outside() {
    let level = |level: f32| Array2::from_elem((SIDE, SIDE), level);
    let [particles, _] = pair(&uniform(), &images(1, 0.06, 0.01));
    let mut pixel = level(0.0);
    pixel[(100, 100)] = WHITE;
    let pairs = [
        [level(0.0), level(0.0)],
        [level(117.0), level(117.0)],
        [level(WHITE), level(WHITE)],
        [level(0.0), level(WHITE)],
        [level(300.0), particles.clone()],
        [particles, level(0.0)],
        [pixel.clone(), pixel],
    ];
    for plan in plans() {
        for [first, second] in &pairs {
            let field = found(first, second, &plan);
            assert_eq!(field.count(Status::Outside), field.status.len(), "{plan}");
        }
    }
}

#[test]
fn where_a_mask_hides_all_there_is_no_vector() {
    let [first, second] = pair(&uniform(), &images(1, 0.06, 0.01));
    let mask = Array2::from_elem((SIDE, SIDE), true);
    for plan in plans() {
        let field = tried(&first, &second, Some(&mask), &plan).unwrap();
        assert_eq!(field.count(Status::Masked), field.status.len());
        assert!(field.u.iter().chain(&field.v).all(|value| value.is_nan()));
    }
}

#[test]
fn an_image_of_one_window_is_interrogated_and_a_smaller_one_refused() {
    let mut random = ChaCha8Rng::seed_from_u64(3);
    let [first, second] = [(); 2]
        .map(|()| Array2::from_shape_fn((8, 8), |_| (random.random::<f32>() * 255.0).round()));
    for sides in [vec![8], vec![4], vec![8, 4, 4]] {
        found(&first, &second, &plan(&sides));
        found(&first, &first, &plan(&sides));
    }
    for (height, width) in [(8, 8), (8, 40), (40, 8), (1, 1), (0, 0)] {
        let image = Array2::from_elem((height, width), 1.0);
        for sides in [vec![16], vec![64, 32, 16], vec![4, 16]] {
            let error = tried(&image, &image, None, &plan(&sides)).unwrap_err();
            let InterrogateError::ImageTooSmall { window_width, .. } = error else {
                panic!("{error}")
            };
            let said = format!(
                "bad pair: the image is {width} x {height} px, smaller than the window of \
                 {window_width} x {window_width} px; choose a smaller window in windows_px"
            );
            assert_eq!(error.to_string(), said);
        }
    }
}

#[test]
fn a_level_that_is_no_number_gives_no_vector_that_is_none() {
    // No file holds one, but a program may hand over anything.
    let [first, second] = pair(&uniform(), &images(1, 0.06, 0.01));
    for level in [f32::NAN, f32::INFINITY, f32::NEG_INFINITY, f32::MAX] {
        let mut first = first.clone();
        first[(77, 99)] = level;
        for plan in plans() {
            for (_, _, error) in errors(&found(&first, &second, &plan), &uniform()) {
                assert!(error < 1.0, "{plan}, {level}: {error}");
            }
        }
    }
}

#[test]
fn exposures_farther_apart_than_a_window_have_no_vectors() {
    // One long image, of which the exposures see parts that far apart.
    let long = ImageOptions {
        width_px: 2 * SIDE,
        ..images(3, 0.06, 0.0)
    };
    let [long, _] = pair(&Flow::from(Uniform { u: 0.0, v: 0.0 }), &long);
    let part = |from: usize| long.slice(s![.., from..from + SIDE]).to_owned();
    for plan in plans() {
        for shift in [70, 100, 150] {
            for noise in [0.0, 0.03] {
                let second = noisy(&part(shift), noise, 2);
                let field = found(&noisy(&part(0), noise, 1), &second, &plan);
                assert!(share(&field) < 0.02, "{plan}, {shift}: {}", share(&field));
            }
        }
    }
}

#[test]
fn noise_alone_has_no_vectors() {
    let dark = Array2::from_elem((SIDE, SIDE), 200.0);
    for plan in plans() {
        for noise in [0.001, 0.02, 0.3] {
            let field = found(&noisy(&dark, noise, 7), &noisy(&dark, noise, 8), &plan);
            assert!(share(&field) < 0.01, "{plan}, {noise}: {}", share(&field));
        }
    }
}

#[test]
fn unrelated_exposures_have_no_vectors_and_related_ones_keep_theirs() {
    // Measured share of an eddy's vectors, mean of two pairs, without noise and with 5 %. Where
    // windows of 16 px hold none of 0.005 particles a px² (28 % of them, exp(-1.28)), or one that
    // is lost in the noise, there is nothing to measure.
    let seeding = [0.005, 0.01, 0.02, 0.04, 0.06];
    let kept = [
        [
            [0.994, 0.898],
            [1.0, 0.992],
            [1.0, 0.999],
            [1.0, 1.0],
            [1.0, 1.0],
        ],
        [
            [0.737, 0.260],
            [0.924, 0.670],
            [0.985, 0.916],
            [1.0, 0.996],
            [1.0, 1.0],
        ],
        [
            [0.991, 0.845],
            [1.0, 0.982],
            [1.0, 0.999],
            [1.0, 1.0],
            [1.0, 1.0],
        ],
    ];
    for (sides, kept) in PLANS.iter().zip(kept) {
        let plan = plan(sides);
        // Windows side by side: those that overlap hold the same particles.
        let independent = 2.0 * (SIDE as f64 / window(&plan)).powi(2);
        for (seeding, kept) in seeding.iter().zip(kept) {
            for (noise, kept) in [0.0, 0.05].into_iter().zip(kept) {
                let (mut chance, mut related) = (0.0, 0.0);
                for seed in 1..=2 {
                    let images = images(seed, *seeding, noise);
                    let [first, second] = pair(&eddy(), &images);
                    related += share(&found(&first, &second, &plan)) / 2.0;
                    let other = ImageOptions {
                        seed: seed + 50,
                        ..images
                    };
                    let [_, second] = pair(&eddy(), &other);
                    chance += share(&found(&first, &second, &plan)) / 2.0;
                }
                println!("{sides:?} {seeding} {noise}: {chance:.4}, related {related:.4}");
                assert!(chance <= 0.02, "{sides:?} {seeding} {noise}: {chance}");
                // Two standard deviations of a binomial share, and one window in 200.
                let spread = f64::sqrt(kept * (1.0 - kept) / independent);
                assert!(
                    related >= kept - 2.0 * spread - 0.005,
                    "{sides:?} {seeding} {noise}: {related}"
                );
            }
        }
    }
}

/// What is measured of a pair with a disc in the middle that holds no particles, moved with the
/// flow.
fn with_gap([first, second]: &[Array2<f32>; 2], flow: &Flow, radius: f64) -> [Array2<f32>; 2] {
    let (u, v) = flow.displacement(127.5, 127.5, 1.0);
    [(first, -0.5), (second, 0.5)].map(|(image, time)| {
        let (x, y) = (127.5 + time * u, 127.5 + time * v);
        let mut image = image.clone();
        for ((row, column), level) in image.indexed_iter_mut() {
            let (right, up) = (column as f64 - x, (SIDE - 1 - row) as f64 - y);
            if right.hypot(up) < radius {
                *level = 0.0;
            }
        }
        image
    })
}

#[test]
fn a_gap_in_the_seeding_spoils_no_vector_beside_it_and_has_none_inside() {
    let (mut seeing, mut wild) = (0, Vec::new());
    let (mut inside, mut kept_inside) = (0, 0);
    for sides in PLANS {
        let plan = plan(sides);
        let side = window(&plan);
        for (name, flow) in [("uniform", uniform()), ("eddy", eddy())] {
            for (noise, seed) in [
                (0.0, 1),
                (0.0, 2),
                (0.01, 1),
                (0.01, 2),
                (0.03, 1),
                (0.03, 2),
            ] {
                let smooth = ImageOptions {
                    quantised: false,
                    ..images(seed, 0.06, 0.0)
                };
                let whole = pair(&flow, &smooth);
                let seen = |[first, second]: &[Array2<f32>; 2]| {
                    let [a, b] = [10 * seed, 10 * seed + 1];
                    let second = noisy(second, noise, b);
                    errors(&found(&noisy(first, noise, a), &second, &plan), &flow)
                };
                let clean = seen(&whole);
                for radius in [30.0, 60.0] {
                    let gap = seen(&with_gap(&whole, &flow, radius));
                    let case = format!("{sides:?} {name}, noise {noise}, gap of {radius} px");
                    let out = |x: f64, y: f64| (x - 127.5).hypot(y - 127.5) - radius;
                    // Windows that see nothing of the gap. Below 0.001 px it is the rounding of
                    // grey levels that is compared.
                    let clear = |all: &[(f64, f64, f64)]| {
                        let clear = all.iter().filter(|(x, y, _)| out(*x, *y) > 0.75 * side);
                        root_mean_square(clear.map(|error| error.2)).max(0.001)
                    };
                    let ratio = clear(&gap) / clear(&clean);
                    assert!((0.9..1.1).contains(&ratio), "{case}: {ratio}");
                    let within = |all: &[(f64, f64, f64)], least: f64| {
                        all.iter().filter(|(x, y, _)| out(*x, *y) < least).count()
                    };
                    seeing += within(&clean, 0.5 * side);
                    inside += within(&clean, -0.5 * side);
                    kept_inside += within(&gap, -0.5 * side);
                    for (x, y, off) in gap {
                        if off > 1.0 {
                            wild.push(off);
                            let out = out(x, y);
                            println!(
                                "{case}: {off:.2} px off {out:.1} px from its rim at {x}, {y}"
                            );
                        }
                    }
                }
            }
        }
    }
    println!(
        "wild {} of {seeing}; inside {kept_inside} of {inside}",
        wild.len()
    );
    // A window whose centre lies in the gap and whose corner sees a particle or two takes its
    // shift from them, and in an eddy they are displaced otherwise than its centre.
    assert!(1000 * wild.len() < seeing, "{} of {seeing}", wild.len());
    assert!(wild.iter().all(|off| *off < 2.0), "{wild:?}");
    assert!(100 * kept_inside < inside, "{kept_inside} of {inside}");
}

#[test]
fn a_saturated_blob_spoils_no_vector_beside_it_and_has_none_inside() {
    for sides in PLANS {
        let plan = plan(sides);
        let side = window(&plan);
        for flow in [uniform(), eddy()] {
            for radius in [10.0, 45.0] {
                let images = pair(&flow, &images(1, 0.06, 0.02));
                let from = |x: f64, y: f64| (x - 100.0).hypot(y - 140.0) - radius;
                let blotted = images.each_ref().map(|image| {
                    let mut image = image.clone();
                    for ((row, column), level) in image.indexed_iter_mut() {
                        if from(column as f64, (SIDE - 1 - row) as f64) < 0.0 {
                            *level = WHITE;
                        }
                    }
                    image
                });
                let of = |[first, second]: &[Array2<f32>; 2]| {
                    errors(&found(first, second, &plan), &flow)
                };
                let (clean, blot) = (of(&images), of(&blotted));
                // The blob stands still, and so do the rims of what is made even about it, up to
                // 12 px away on either side; the window reaches 0.71 of its side from its centre.
                let reach = 12.0 + 0.71 * side;
                let clear = |all: &[(f64, f64, f64)]| {
                    let clear = all.iter().filter(|(x, y, _)| from(*x, *y) > reach);
                    root_mean_square(clear.map(|error| error.2))
                };
                let ratio = clear(&blot) / clear(&clean);
                println!("{sides:?} {radius}: {ratio:.3}");
                assert!((0.9..1.1).contains(&ratio), "{sides:?}: {ratio}");
                for (x, y, off) in &blot {
                    let out = from(*x, *y);
                    assert!(out > -reach, "{sides:?}: measured {out} px inside the blob");
                    assert!(
                        *off < 1.0 || out < reach,
                        "{sides:?}: {off} px off {out} px away"
                    );
                }
            }
        }
    }
}
