//! Pairs of a steady flow correlated together, and windows together with their neighbours.
#![allow(missing_docs, clippy::unwrap_used)]

use kolk::field::{Status, VectorField};
use kolk::frames::{Pair, Scale};
use kolk::interrogate::{
    Plan, PlanOptions, TogetherError, WindowSize, correlate_together, interrogate,
};
use kolk::synth::{Flow, ImageOptions, Shear, Uniform, particle_images};
use kolk::task::Task;

const SIDE: usize = 192;

fn plan(sides: &[usize], join_neighbours: bool) -> Plan {
    let square = |&side: &usize| WindowSize {
        width: side,
        height: side,
    };
    Plan::new(&PlanOptions {
        windows_px: sides.iter().map(square).collect(),
        overlap: 0.5,
        join_neighbours,
        ..PlanOptions::default()
    })
    .unwrap()
}

fn flow() -> Flow {
    let shear = Shear {
        y: 96.0,
        rate: 0.01,
    };
    Flow::from(shear) + Uniform { u: 2.4, v: -1.3 }
}

fn pair(seeding_per_px2: f64, seed: u64) -> Pair {
    let options = ImageOptions {
        width_px: SIDE,
        height_px: SIDE,
        seeding_per_px2,
        noise_of_full_scale: 0.02,
        out_of_plane_loss: 0.2,
        seed,
        ..ImageOptions::default()
    };
    let (first, second) = particle_images(&flow(), &options).unwrap();
    Pair::from_frames(first, second, Scale::default(), "thin")
}

/// Errors in units of the stated uncertainty, and the share of vectors that are measured and right
/// to 0.5 px.
fn against_truth(field: &VectorField) -> (Vec<f64>, f64) {
    let (u_unc, v_unc) = field.unc.as_ref().unwrap();
    let (mut off, mut right) = (Vec::new(), 0.0);
    for (at, status) in field.status.indexed_iter() {
        let (u, v) = flow().displacement(field.grid.x(at.1), field.grid.y(at.0), 1.0);
        let (du, dv) = (field.u[at] - u, field.v[at] - v);
        if *status == Status::Measured {
            off.extend([du / u_unc[at], dv / v_unc[at]]);
            right += f64::from(u8::from(du.hypot(dv) < 0.5));
        }
    }
    (off, right / field.status.len() as f64)
}

#[test]
fn many_pairs_give_the_steady_flow_that_one_cannot() {
    // Two particles a window and pair.
    let pairs: Vec<Pair> = (1..=24).map(|seed| pair(0.002, seed)).collect();
    let plan = plan(&[32, 32, 32], false);
    let one = interrogate(&pairs[0], &plan, &Task::quiet()).unwrap();
    let all = correlate_together(&pairs, &plan, "all", &Task::quiet()).unwrap();
    let (_, alone) = against_truth(&one);
    let (off, together) = against_truth(&all);
    println!("right alone {alone:.3}, together {together:.3}");
    assert!(alone < 0.7 && together > 0.99, "{alone} {together}");
    let within = |k: f64| off.iter().filter(|o| o.abs() < k).count() as f64 / off.len() as f64;
    println!("within 1 u {:.3}, 2 u {:.3}", within(1.0), within(2.0));
    // 242 vectors with neighbours that share pixels: a standard error of 0.05 or so at 1 u.
    assert!((0.56..=0.80).contains(&within(1.0)), "{}", within(1.0));
    assert!(within(2.0) > 0.88, "{}", within(2.0));
}

#[test]
fn one_pair_together_is_that_pair() {
    let pair = pair(0.05, 3);
    let plan = plan(&[64, 32, 32], false);
    let one = interrogate(&pair, &plan, &Task::quiet()).unwrap();
    let all =
        correlate_together(std::slice::from_ref(&pair), &plan, "all", &Task::quiet()).unwrap();
    assert_eq!(one.status, all.status);
    for (a, b) in one.u.iter().chain(&one.v).zip(all.u.iter().chain(&all.v)) {
        // Sums of coefficients are rounded otherwise than sums of grey levels.
        assert!((a - b).abs() < 1e-4, "{a} {b}");
    }
}

#[test]
fn the_sum_does_not_depend_on_the_number_of_threads() {
    let pairs: Vec<Pair> = (1..=3).map(|seed| pair(0.01, seed)).collect();
    let on = |threads| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads);
        let plan = plan(&[64, 32, 32], true);
        pool.build()
            .unwrap()
            .install(|| correlate_together(&pairs, &plan, "all", &Task::quiet()).unwrap())
    };
    let bits = |f: VectorField| f.u.iter().map(|x| x.to_bits()).collect::<Vec<_>>();
    assert_eq!(bits(on(1)), bits(on(3)));
}

#[test]
fn pairs_that_are_not_alike_are_refused_and_so_is_none() {
    let plan = plan(&[32], false);
    let none = correlate_together(&[], &plan, "all", &Task::quiet());
    assert!(matches!(none, Err(TogetherError::NoPairs)));
    let (first, second) = particle_images(&flow(), &ImageOptions::default()).unwrap();
    let other = Pair::from_frames(first, second, Scale::default(), "another");
    let both = correlate_together(&[pair(0.05, 1), other], &plan, "all", &Task::quiet());
    let message = both.unwrap_err().to_string();
    assert!(message.contains("thin and another differ"), "{message}");
}

#[test]
fn neighbours_together_find_more_where_seeding_is_thin() {
    // What the last window holds is the limit; the passes before it no longer lead it astray.
    for (seeding, sides) in [(0.002, [64, 32, 32]), (0.008, [16, 16, 16])] {
        let (mut alone, mut joined) = (0.0, 0.0);
        for seed in 1..=6 {
            let pair = pair(seeding, seed);
            let right = |join| {
                let plan = plan(&sides, join);
                against_truth(&interrogate(&pair, &plan, &Task::quiet()).unwrap()).1 / 6.0
            };
            alone += right(false);
            joined += right(true);
        }
        println!("{seeding} {sides:?}: right alone {alone:.3}, joined {joined:.3}");
        assert!(joined > alone + 0.01, "{alone} {joined}");
    }
}
