//! Masks held against exact areas, and vectors beside what they hide against exact flows.
//!
//! The images are those of `synth`, with reflections and bodies painted over; the default plan
//! (last window 32 px at an overlap of 0.75) unless a test says otherwise.
#![allow(missing_docs, clippy::unwrap_used)]

use std::f64::consts::PI;

use kolk::field::{Status, VectorField};
use kolk::frames::{BrightOptions, Frame, Mask, MaskUnit, Pair, Recording, Scale};
use kolk::interrogate::{Plan, PlanOptions, interrogate};
use kolk::series::{default_name, interrogate_series};
use kolk::store::write_tiff;
use kolk::synth::{Flow, ImageOptions, LambOseen, Uniform, particle_images};
use kolk::task::Task;
use ndarray::Array2;
use proptest::prelude::*;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const SIDE: usize = 256;
/// Full scale of a 12-bit camera.
const WHITE: f32 = 4095.0;

fn dark(width: usize, height: usize) -> Frame {
    Frame {
        pixels: Array2::zeros((height, width)),
        bits: 12,
    }
}

fn count(hidden: &Array2<bool>) -> f64 {
    hidden.iter().filter(|hidden| **hidden).count() as f64
}

#[test]
fn a_shape_hides_as_many_pixels_as_its_area() {
    // A pixel on the edge counts whole or not at all: an error of 0.29 px each (uniform within
    // half a pixel), of as many as the edge is long. Four standard deviations.
    let tolerance = |edge: f64| 4.0 * 0.29 * edge.sqrt();
    let scale = Scale {
        dt_s: Some(0.01),
        mm_per_px: Some(0.0731),
    };
    let hidden = |mask: &Mask| mask.hidden(&dark(220, 180), &scale).unwrap();
    let stars: [&[[f64; 2]]; 3] = [
        &[[10.3, 12.8], [201.7, 33.1], [120.4, 170.2]],
        &[
            [20.1, 20.7],
            [190.3, 41.9],
            [188.2, 160.4],
            [101.5, 70.3],
            [33.8, 155.5],
        ],
        &[
            [110.2, 170.9],
            [80.7, 101.3],
            [9.4, 99.8],
            [70.1, 60.6],
            [60.3, 5.2],
            [150.9, 55.7],
        ],
    ];
    for corners in stars {
        let next = corners.iter().cycle().skip(1);
        let (mut area, mut edge) = (0.0, 0.0);
        for (a, b) in corners.iter().zip(next) {
            area += 0.5 * (a[0] * b[1] - b[0] * a[1]);
            edge += (b[0] - a[0]).hypot(b[1] - a[1]);
        }
        let in_mm = corners.iter().map(|c| c.map(|x| x * 0.0731)).collect();
        let px = hidden(&Mask::polygon(corners.to_vec(), MaskUnit::Px).unwrap());
        let mm = hidden(&Mask::polygon(in_mm, MaskUnit::Recording).unwrap());
        println!("{} for {:.1}, edge {edge:.0}", count(&px), area.abs());
        assert!((count(&px) - area.abs()).abs() < tolerance(edge));
        assert_eq!(px, mm);
    }
    for (x, y, radius) in [(100.3, 80.9, 60.0), (90.0, 90.0, 33.3), (110.5, 89.5, 75.2)] {
        let circle = hidden(&Mask::circle([x, y], radius, MaskUnit::Px).unwrap());
        let area = PI * radius * radius;
        println!("{} for {area:.1}", count(&circle));
        assert!((count(&circle) - area).abs() < tolerance(2.0 * PI * radius));
    }
    let rectangle = Mask::rectangle([10.5, 20.5], [60.5, 50.5], MaskUnit::Px).unwrap();
    assert_eq!(count(&hidden(&rectangle)), 50.0 * 30.0);
}

/// Masks of every kind on frames of 24 x 16 px.
fn any_mask() -> impl Strategy<Value = Mask> {
    let at = || (-4.0..28.0, -4.0..20.0).prop_map(|(x, y)| [x, y]);
    let circle = (at(), 0.5..12.0)
        .prop_map(|(centre, radius)| Mask::circle(centre, radius, MaskUnit::Px).unwrap());
    let rectangle = (at(), at()).prop_map(|(a, b)| Mask::rectangle(a, b, MaskUnit::Px).unwrap());
    let triangle = (at(), at(), at())
        .prop_map(|(a, b, c)| Mask::polygon(vec![a, b, c], MaskUnit::Px).unwrap());
    let pixels = prop::collection::vec(any::<bool>(), 24 * 16)
        .prop_map(|all| Mask::from_pixels(Array2::from_shape_vec((16, 24), all).unwrap()));
    let bright = (0.0..255.0, 0.0..4.0, 0.0..9.0).prop_map(|(above, grow_px, least_area_px2)| {
        Mask::bright(BrightOptions {
            above,
            grow_px,
            least_area_px2,
        })
        .unwrap()
    });
    prop_oneof![circle, rectangle, triangle, pixels, bright]
}

proptest! {
    #[test]
    fn union_and_inverse_follow_de_morgan(
        a in any_mask(),
        b in any_mask(),
        levels in prop::collection::vec(any::<u8>(), 24 * 16),
    ) {
        let levels = levels.into_iter().map(f32::from).collect();
        let pixels = Array2::from_shape_vec((16, 24), levels).unwrap();
        let frame = Frame { pixels, bits: 8 };
        let hidden = |mask: &Mask| mask.hidden(&frame, &Scale::default()).unwrap();
        let both = hidden(&a.union(&b).unwrap());
        let (in_a, in_b) = (hidden(&a), hidden(&b));
        prop_assert_eq!(&both, &(&in_a | &in_b));
        prop_assert_eq!(&both, &hidden(&b.union(&a).unwrap()));
        prop_assert_eq!(hidden(&a.inverse()), in_a.mapv(|h| !h));
        prop_assert_eq!(hidden(&a.inverse().inverse()), in_a.clone());
        // All but (a or b) is all but a and all but b; the other way round too.
        let neither = hidden(&a.union(&b).unwrap().inverse());
        prop_assert_eq!(neither, &hidden(&a.inverse()) & &hidden(&b.inverse()));
        let common = hidden(&a.inverse().union(&b.inverse()).unwrap().inverse());
        prop_assert_eq!(common, &in_a & &in_b);
    }
}

fn noisy(seed: u64) -> ImageOptions {
    ImageOptions {
        width_px: SIDE,
        height_px: SIDE,
        noise_of_full_scale: 0.02,
        background_of_full_scale: 0.03,
        seed,
        ..ImageOptions::default()
    }
}

fn found(pair: &Pair) -> VectorField {
    let plan = Plan::new(&PlanOptions::default()).unwrap();
    interrogate(pair, &plan, &Task::quiet()).unwrap()
}

fn pair_of((first, second): (Frame, Frame)) -> Pair {
    Pair::from_frames(first, second, Scale::default(), "painted")
}

fn bits(field: &VectorField) -> Vec<u64> {
    field
        .u
        .iter()
        .chain(&field.v)
        .map(|x| x.to_bits())
        .collect()
}

/// Error of each component of the measured vectors at places that `counts`: root mean square
/// and number of vectors.
fn rms(
    field: &VectorField,
    flow: &Flow,
    counts: impl Fn((usize, usize), f64, f64) -> bool,
) -> (f64, usize) {
    let (mut square, mut n) = (0.0, 0);
    for (at, status) in field.status.indexed_iter() {
        let (x, y) = (field.grid.x(at.1), field.grid.y(at.0));
        if *status == Status::Measured && counts(at, x, y) {
            let (u, v) = flow.displacement(x, y, 1.0);
            square += (field.u[at] - u).powi(2) + (field.v[at] - v).powi(2);
            n += 1;
        }
    }
    ((square / (2.0 * n as f64)).sqrt(), n)
}

/// A tenth of the image: a disc about this place of this radius.
const REFLECTION: (f64, f64, f64) = (110.0, 140.0, 46.2);

fn from_reflection(x: f64, y: f64) -> f64 {
    (x - REFLECTION.0).hypot(y - REFLECTION.1) - REFLECTION.2
}

/// Paints the reflection, the same in both exposures: saturated throughout, or of a fixed texture
/// between `least` of full scale and all of it that fades out over some px.
fn paint(frames: &mut (Frame, Frame), least: f32) {
    let mut random = ChaCha8Rng::seed_from_u64(5);
    let texture = Array2::from_shape_fn((SIDE, SIDE), |_| {
        least + (1.0 - least) * random.random::<f32>()
    });
    for frame in [&mut frames.0, &mut frames.1] {
        for ((row, column), level) in frame.pixels.indexed_iter_mut() {
            let out = from_reflection(column as f64, (SIDE - 1 - row) as f64);
            let light = if out <= 0.0 {
                texture[(row, column)]
            } else if least < 1.0 {
                (0.6 * (-out * out / 4.0).exp()) as f32
            } else {
                0.0
            };
            *level = (*level + (WHITE * light).round()).min(WHITE);
        }
    }
}

#[test]
fn beside_a_bright_reflection_vectors_are_as_good_as_without_it() {
    let flow = Flow::from(LambOseen {
        x: 150.0,
        y: 110.0,
        core_radius: 50.0,
        circulation: 800.0,
    });
    let bright = Mask::bright(BrightOptions {
        above: 3000.0,
        grow_px: 4.0,
        least_area_px2: 200.0,
    })
    .unwrap();
    for least in [1.0, 0.7] {
        let (mut clean2, mut masked2, mut beside_clean2, mut beside2) = (0.0, 0.0, 0.0, 0.0);
        for seed in 1..=3 {
            let mut frames = particle_images(&flow, &noisy(seed)).unwrap();
            let clean = found(&pair_of(frames.clone()));
            paint(&mut frames, least);
            let pair = pair_of(frames).hide(&bright).unwrap();
            let share = pair.hidden_share().unwrap();
            assert!((0.10..0.15).contains(&share), "{share}");
            let field = found(&pair);
            for ((j, i), status) in field.status.indexed_iter() {
                let out = from_reflection(field.grid.x(i), field.grid.y(j));
                if out < 0.0 {
                    assert_eq!(*status, Status::Masked);
                    assert!(field.u[(j, i)].is_nan());
                }
            }
            // A window away from the edge and farther; then the windows the reflection cuts into.
            let both =
                |at| field.status[at] == Status::Measured && clean.status[at] == Status::Measured;
            let far = |at, x, y| both(at) && from_reflection(x, y) > 32.0;
            let beside = |at, x, y| both(at) && (0.0..16.0).contains(&from_reflection(x, y));
            let (of_clean, n) = rms(&clean, &flow, far);
            let (of_masked, _) = rms(&field, &flow, far);
            let (beside_clean, m) = rms(&clean, &flow, beside);
            let (beside_masked, _) = rms(&field, &flow, beside);
            println!(
                "texture from {least}: {n} far {of_clean:.4} {of_masked:.4}, {m} beside {beside_clean:.4} {beside_masked:.4}"
            );
            assert!(n > 350 && m > 50, "{n} {m}");
            clean2 += of_clean * of_clean;
            masked2 += of_masked * of_masked;
            beside_clean2 += beside_clean * beside_clean;
            beside2 += beside_masked * beside_masked;
        }
        let ratio = f64::sqrt(masked2 / clean2);
        let [beside_clean, beside] = [beside_clean2, beside2].map(|sum| f64::sqrt(sum / 3.0));
        println!("texture from {least}: far {ratio:.3}, beside {beside_clean:.4} {beside:.4}");
        assert!((0.9..1.1).contains(&ratio), "{ratio}");
        // At least half of the pixels is lit: random errors grow by up to the root of 2. The lit
        // part lies beside the middle of its window, where the velocity is another by up to 0.3 px;
        // the passes take that out but for a tenth.
        assert!(
            beside < beside_clean.hypot(beside_clean).hypot(0.03),
            "{beside}"
        );
    }
}

#[test]
fn what_is_hidden_has_no_say_to_the_last_bit() {
    let flow = Flow::from(Uniform { u: 3.3, v: 1.7 });
    let mut frames = particle_images(&flow, &noisy(1)).unwrap();
    let (x, y, radius) = REFLECTION;
    let mask = Mask::circle([x, y], radius, MaskUnit::Px).unwrap();
    let clean = found(&pair_of(frames.clone()).hide(&mask).unwrap());
    paint(&mut frames, 1.0);
    let painted = found(&pair_of(frames).hide(&mask).unwrap());
    assert_eq!(bits(&clean), bits(&painted));
    assert_eq!(clean.status, painted.status);
}

#[test]
fn a_mask_that_hides_nothing_changes_nothing_and_one_that_hides_all_leaves_nothing() {
    let flow = Flow::from(Uniform { u: 3.3, v: 1.7 });
    let pair = pair_of(particle_images(&flow, &noisy(1)).unwrap());
    let beside = Mask::circle([-50.0, 40.0], 30.0, MaskUnit::Px).unwrap();
    let field = found(&pair);
    let same = found(&pair.hide(&beside).unwrap());
    assert_eq!(bits(&field), bits(&same));
    let nothing = found(&pair.hide(&beside.inverse()).unwrap());
    assert_eq!(nothing.count(Status::Masked), nothing.status.len());
    assert_eq!(
        pair.hide(&beside.inverse()).unwrap().hidden_share(),
        Ok(1.0)
    );
}

#[test]
fn beside_a_body_that_moves_between_the_exposures_vectors_are_those_of_the_flow() {
    // The body lies left of x = 96 in the first exposure and of 106 in the second, and its texture
    // moves with it, as strong a pattern as the particles. The flow moves 4 px.
    let edges = [96, 106];
    let flow = Flow::from(Uniform { u: 4.0, v: -1.5 });
    let mut frames = particle_images(&flow, &noisy(2)).unwrap();
    let clean = found(&pair_of(frames.clone()));
    let mut random = ChaCha8Rng::seed_from_u64(9);
    let texture = Array2::from_shape_fn((SIDE, edges[1]), |_| 0.85 + 0.15 * random.random::<f32>());
    for (frame, edge) in [(&mut frames.0, edges[0]), (&mut frames.1, edges[1])] {
        for ((row, column), level) in frame.pixels.indexed_iter_mut() {
            if column < edge {
                *level = (WHITE * texture[(row, column + edges[1] - edge)]).round();
            }
        }
    }
    let pair = pair_of(frames);
    let body = |edge: usize| {
        let corner = [edge as f64 - 1.0, 999.0];
        Mask::rectangle([-1.0, -1.0], corner, MaskUnit::Px).unwrap()
    };
    let bright = BrightOptions {
        above: 0.84 * 4095.0,
        grow_px: 1.0,
        least_area_px2: 500.0,
    };
    let each = found(&pair.hide_each(&body(edges[0]), &body(edges[1])).unwrap());
    let by_level = found(&pair.hide(&Mask::bright(bright).unwrap()).unwrap());
    let still = found(&pair.hide(&body(edges[0])).unwrap());
    let bare = found(&pair);
    // Of a window beside the edge up to half is hidden. Every such vector is measured.
    let beside = |x: f64| (106.0..122.0).contains(&x);
    for field in [&each, &by_level] {
        for ((_, i), status) in field.status.indexed_iter() {
            let x = field.grid.x(i);
            assert!(!beside(x) || *status == Status::Measured, "{x}: {status:?}");
            assert!(x > 96.0 || *status == Status::Masked, "{x}: {status:?}");
        }
    }
    let off = |field| rms(field, &flow, |_, x, _| beside(x)).0;
    let [clean, each, by_level, still, bare] = [&clean, &each, &by_level, &still, &bare].map(off);
    println!(
        "clean {clean:.4}, body hidden in each exposure {each:.4}, by its brightness {by_level:.4}"
    );
    println!("hidden where it is in the first {still:.4}, not hidden {bare:.4}");
    // Half of the pixels: the root of 2 in random error.
    assert!(each < 1.5 * clean && by_level < 1.5 * clean);
    // Without the right mask it is another matter, or the test would show nothing.
    assert!(still > 4.0 * each && bare > 4.0 * each);
}

#[test]
fn a_changed_mask_costs_the_frames_in_which_it_hides_other_pixels() {
    let folder = tempfile::tempdir().unwrap();
    let place = folder.path().join("s.zarr");
    let options = serde_json::json!({"windows_px": [32, 16], "overlap": 0.5});
    let plan = Plan::new(&serde_json::from_value::<PlanOptions>(options).unwrap()).unwrap();
    let flow = Flow::from(Uniform { u: 1.0, v: 0.5 });
    // Pairs without a bright patch, with one of level 3500, with one of 4000.
    let pair = |level: f32| {
        let options = ImageOptions {
            width_px: 64,
            height_px: 64,
            peak_of_full_scale: 0.3,
            ..ImageOptions::default()
        };
        let mut frames = particle_images(&flow, &options).unwrap();
        for frame in [&mut frames.0, &mut frames.1] {
            for row in 20..32 {
                for column in 20..32 {
                    frame.pixels[(row, column)] = frame.pixels[(row, column)].max(level);
                }
            }
        }
        Pair::from_frames(frames.0, frames.1, Scale::default(), "made")
    };
    let bare = Recording::from_pairs(vec![pair(0.0), pair(3500.0), pair(4000.0)]);
    let kept = |recording: &Recording| {
        let series = interrogate_series(recording, &plan, &place, &Task::quiet()).unwrap();
        for (pair, field) in recording.pairs().iter().zip(series.fields()) {
            let direct = interrogate(pair, &plan, &Task::quiet()).unwrap();
            assert_eq!(bits(&field.unwrap()), bits(&direct));
        }
        series.kept()
    };
    let hide = |mask: &Mask| bare.hide(mask).unwrap();
    let bright = |above| {
        Mask::bright(BrightOptions {
            above,
            grow_px: 2.0,
            least_area_px2: 60.0,
        })
        .unwrap()
    };
    assert_eq!((kept(&bare), kept(&bare)), (0, 3));
    // The first frame has no bright patch.
    assert_eq!(kept(&hide(&bright(3000.0))), 1);
    assert_eq!(kept(&hide(&bright(3000.0))), 3);
    // The second no longer has one.
    assert_eq!(kept(&hide(&bright(3700.0))), 2);
    assert_eq!(kept(&hide(&bright(3800.0))), 3);
    // A mask for all, and another.
    let rectangle = |right| Mask::rectangle([0.0, 0.0], [right, 30.0], MaskUnit::Px).unwrap();
    assert_eq!(kept(&hide(&rectangle(20.0))), 0);
    assert_eq!(kept(&hide(&rectangle(21.0))), 0);
    // The same pixels from an image, whatever its name; another image of that name.
    let draw = |name: &str, right: f64| {
        let hidden = rectangle(right)
            .hidden(&dark(64, 64), &Scale::default())
            .unwrap();
        let pixels = hidden.mapv(|hidden| if hidden { 1.0 } else { 0.0 });
        let file = folder.path().join(name);
        write_tiff(&file, &Frame { pixels, bits: 8 }).unwrap();
        Mask::image(&file).unwrap()
    };
    let (one, copy) = (draw("one.tif", 21.0), draw("copy.tif", 21.0));
    assert_eq!(one, copy);
    assert_eq!((kept(&hide(&one)), kept(&hide(&copy))), (3, 3));
    assert_eq!(kept(&hide(&draw("one.tif", 22.0))), 0);
    // Hidden in the first exposure only, in one pair only.
    let nothing = rectangle(9.0)
        .inverse()
        .union(&rectangle(9.0))
        .unwrap()
        .inverse();
    let mut pairs = bare.pairs().to_vec();
    pairs[1] = pairs[1].hide_each(&rectangle(9.0), &nothing).unwrap();
    let one_pair = Recording::from_pairs(pairs);
    assert_eq!((kept(&bare), kept(&one_pair)), (0, 2));

    let text = std::fs::read_to_string(place.join("zarr.json")).unwrap();
    let group: serde_json::Value = serde_json::from_str(&text).unwrap();
    let attributes = &group["attributes"];
    assert_eq!(attributes["pair_masks"], serde_json::json!([null, 0, null]));
    let rectangle_px = serde_json::json!({"rectangle": [[0.0, 0.0], [9.0, 30.0]], "unit": "px"});
    assert_eq!(attributes["masks"][0]["first"][0], rectangle_px);

    let name = |recording: &Recording| default_name(recording, &plan).unwrap();
    let names = [
        name(&bare),
        name(&hide(&rectangle(20.0))),
        name(&hide(&rectangle(21.0))),
        name(&hide(&bright(3000.0))),
        name(&one_pair),
    ];
    for (k, name) in names.iter().enumerate() {
        assert!(!names[..k].contains(name));
    }
    assert_eq!(name(&hide(&one)), name(&hide(&copy)));
}

#[test]
fn a_mask_image_of_another_size_is_refused_at_once() {
    let mask = Mask::from_pixels(Array2::from_elem((40, 64), true));
    let pair = Pair::from_frames(dark(64, 48), dark(64, 48), Scale::default(), "dark");
    let expected = "the mask image is 64 x 40 px but the exposures are 64 x 48 px: a mask image must be of their size";
    let wrapped = Mask::circle([9.0, 9.0], 3.0, MaskUnit::Px)
        .unwrap()
        .union(&mask.inverse())
        .unwrap();
    for mask in [mask, wrapped] {
        assert_eq!(pair.hide(&mask).unwrap_err().to_string(), expected);
        let recording = Recording::from_pairs(vec![pair.clone()]);
        assert_eq!(recording.hide(&mask).unwrap_err().to_string(), expected);
    }
}
