//! The demonstration from images to eddies, held against its exact answers.
#![allow(missing_docs, clippy::unwrap_used)]

use kolk::frames::{Pair, Recording, Scale};
use kolk::interrogate::{Plan, PlanOptions};
use kolk::series::interrogate_series;
use kolk::synth::basin;
use kolk::task::Task;
use kolk::vortex::{EddyOptions, find_eddies};

fn recording() -> Recording {
    let scale = Scale {
        dt_s: Some(basin::DT_S),
        mm_per_px: Some(basin::MM_PER_PX),
    };
    let pairs = (0..basin::PAIRS)
        .map(|pair| {
            let (first, second) = basin::exposures(pair).unwrap();
            Pair::from_frames(first, second, scale, &format!("pair {pair}"))
        })
        .collect();
    Recording::from_pairs(pairs)
}

#[test]
fn every_unflagged_eddy_of_the_basin_is_where_and_as_large_and_strong_as_it_is() {
    let plan = Plan::new(&PlanOptions::default()).unwrap();
    let folder = tempfile::tempdir().unwrap();
    let place = folder.path().join("basin.zarr");
    let fields = interrogate_series(&recording(), &plan, &place, &Task::quiet()).unwrap();
    let mut unflagged = 0;
    let mut worst = [0f64; 3];
    for (pair, field) in fields.fields().enumerate() {
        let found = find_eddies(&field.unwrap(), &EddyOptions::default(), &Task::quiet()).unwrap();
        for truth in basin::true_eddies(pair) {
            let near = |e: &&kolk::vortex::Eddy| {
                (e.x.value() - truth.x_mm).hypot(e.y.value() - truth.y_mm) < 4.0
            };
            let eddy = found
                .list
                .iter()
                .find(near)
                .unwrap_or_else(|| panic!("pair {pair}: {} is missing", truth.name));
            let off = [
                (eddy.x.value() - truth.x_mm).hypot(eddy.y.value() - truth.y_mm) / basin::MM_PER_PX,
                (eddy.circulation.value() / truth.circulation_mm2_per_s - 1.0).abs(),
                (eddy.diameter.value() / truth.diameter_mm - 1.0).abs(),
            ];
            println!("{pair} {}: {off:.3?} {:?}", truth.name, eddy.flags);
            let blocking = eddy
                .flags
                .iter()
                .any(|f| f.concerns(kolk::vortex::Method::VorticityFraction));
            if !blocking {
                unflagged += 1;
                for (worst, off) in worst.iter_mut().zip(off) {
                    *worst = worst.max(off);
                }
            }
        }
        println!("found {}", found.list.len());
    }
    println!("worst {worst:?} of {unflagged}");
    assert!(unflagged >= 40, "{unflagged}");
    assert!(worst[0] <= 1.0, "centre {} px", worst[0]);
    assert!(worst[1] <= 0.03, "circulation {}", worst[1]);
    assert!(worst[2] <= 0.05, "diameter {}", worst[2]);
}
