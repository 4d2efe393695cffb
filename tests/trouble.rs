//! Images that hold no flow, or hardly any: a status or one clear error, never a panic and never a
//! quiet number.
#![allow(missing_docs, clippy::unwrap_used)]

use kolk::field::{Status, VectorField};
use kolk::frames::{Frame, Pair, Scale};
use kolk::interrogate::{Plan, PlanOptions, WindowSize, interrogate};
use kolk::synth::{Flow, ImageOptions, Uniform, particle_images};
use kolk::task::Task;
use ndarray::Array2;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

fn plan(sides: &[usize]) -> Plan {
    let square = |&side: &usize| WindowSize {
        width: side,
        height: side,
    };
    Plan::new(&PlanOptions {
        windows_px: sides.iter().map(square).collect(),
        ..PlanOptions::default()
    })
    .unwrap()
}

fn found(first: Frame, second: Frame, sides: &[usize]) -> VectorField {
    let pair = Pair::from_frames(first, second, Scale::default(), "trouble");
    interrogate(&pair, &plan(sides), &Task::quiet()).unwrap()
}

fn frame(pixels: Array2<f32>) -> Frame {
    Frame { pixels, bits: 12 }
}

/// Nothing is measured, and no vector has a value that could be taken for one.
fn says_nothing(field: &VectorField) {
    assert_eq!(field.count(Status::Measured), 0);
    for (at, status) in field.status.indexed_iter() {
        if !status.has_vector() {
            assert!(field.u[at].is_nan() && field.v[at].is_nan());
        }
    }
}

#[test]
fn images_without_contrast_give_no_vector() {
    for level in [0.0, 1.0, 2000.0, 4095.0] {
        let flat = || frame(Array2::from_elem((128, 160), level));
        let field = found(flat(), flat(), &[32, 16]);
        says_nothing(&field);
        assert_eq!(field.count(Status::Outside), field.status.len());
    }
}

#[test]
fn one_exposure_without_contrast_gives_no_vector() {
    let options = ImageOptions {
        width_px: 128,
        height_px: 128,
        ..ImageOptions::default()
    };
    let (first, _) = particle_images(&Flow::from(Uniform { u: 1.0, v: 0.0 }), &options).unwrap();
    let dark = frame(Array2::zeros((128, 128)));
    says_nothing(&found(first.clone(), dark.clone(), &[64, 32, 32]));
    says_nothing(&found(dark, first, &[64, 32, 32]));
}

#[test]
fn the_smallest_images_are_measured_or_refused_in_one_sentence() {
    let options = ImageOptions {
        width_px: 8,
        height_px: 8,
        ..ImageOptions::default()
    };
    let pair = || particle_images(&Flow::from(Uniform { u: 0.0, v: 0.0 }), &options).unwrap();
    let (first, second) = pair();
    assert_eq!(found(first, second, &[8, 4]).status.len(), 25);
    let (first, second) = pair();
    let pair = Pair::from_frames(first, second, Scale::default(), "tiny");
    let message = interrogate(&pair, &plan(&[16]), &Task::quiet())
        .unwrap_err()
        .to_string();
    assert_eq!(
        message,
        "tiny: the image is 8 x 8 px, smaller than the window of 16 x 16 px; choose a smaller window in windows_px"
    );
}

#[test]
fn noise_alone_gives_hardly_a_vector() {
    let mut random = ChaCha8Rng::seed_from_u64(4);
    let mut noise = || {
        frame(Array2::from_shape_fn((256, 256), |_| {
            random.random::<f32>() * 400.0
        }))
    };
    for sides in [&[64, 32, 32][..], &[32, 16, 16], &[32]] {
        let field = found(noise(), noise(), sides);
        let share = field.count(Status::Measured) as f64 / field.status.len() as f64;
        println!("noise {sides:?}: {share:.4}");
        assert!(share <= 0.02, "{sides:?}: {share}");
    }
}

#[test]
fn unrelated_exposures_give_hardly_a_vector_and_related_ones_theirs() {
    let flow = Flow::from(Uniform { u: 3.3, v: 1.7 });
    for (sides, side) in [
        (&[64, 32, 32, 32][..], 32.0),
        (&[32, 16, 16], 16.0),
        (&[32], 32.0),
    ] {
        for seeding in [0.005, 0.01, 0.02, 0.06] {
            for noise in [0.0, 0.05] {
                let options = |seed| ImageOptions {
                    width_px: 384,
                    height_px: 384,
                    seeding_per_px2: seeding,
                    noise_of_full_scale: noise,
                    seed,
                    ..ImageOptions::default()
                };
                let (first, second) = particle_images(&flow, &options(1)).unwrap();
                let (other, _) = particle_images(&flow, &options(77)).unwrap();
                let share = |field: VectorField| {
                    field.count(Status::Measured) as f64 / field.status.len() as f64
                };
                let unrelated = share(found(first.clone(), other, sides));
                let related = share(found(first, second, sides));
                println!("{sides:?} {seeding} {noise}: {unrelated:.4} {related:.4}");
                assert!(
                    unrelated <= 0.02,
                    "{sides:?} {seeding} {noise}: {unrelated}"
                );
                // Ten particle images a window: enough for the published detection curve's 95 %
                // with half of them matched.
                if seeding * side * side >= 10.0 {
                    assert!(related >= 0.98, "{sides:?} {seeding} {noise}: {related}");
                }
            }
        }
    }
}

#[test]
fn a_shift_beyond_the_window_gives_no_quiet_number() {
    // 40 px a frame, windows of 32.
    let flow = Flow::from(Uniform { u: 40.0, v: 0.0 });
    let options = ImageOptions {
        width_px: 256,
        height_px: 256,
        ..ImageOptions::default()
    };
    let (first, second) = particle_images(&flow, &options).unwrap();
    let field = found(first, second, &[32, 16]);
    let share = field.count(Status::Measured) as f64 / field.status.len() as f64;
    println!("beyond the window: {share:.4}");
    assert!(share <= 0.02, "{share}");
}
