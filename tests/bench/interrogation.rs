//! One whole 1024 x 1024 pair: windows 64, 32, 32 px, overlap 0.5, with deformation, validation
//! and uncertainty. Prints the least and the median time on one thread and on all, and on request
//! where the time goes. `fftw_bare.c` beside it times the bare transforms of the same windows by a
//! general-purpose C library, `script.py` the whole by a numerical script; `tests/bench/compare.sh`
//! runs all in turn and prints the ratios.
//!
//! `cargo bench --bench interrogation [-- repeats] [folder]`; the pair is left in the folder as
//! `first.tif` and `second.tif`.

#![allow(
    clippy::print_stdout,
    clippy::expect_used,
    reason = "a benchmark prints, and has nobody to report an error to"
)]

use std::path::Path;
use std::time::Instant;

use kolk::frames::{Pair, Scale};
use kolk::interrogate::{Plan, PlanOptions, WindowSize, interrogate};
use kolk::store::write_tiff;
use kolk::synth::{Flow, ImageOptions, LambOseen, Uniform, particle_images};
use kolk::task::Task;

fn main() {
    let repeats = std::env::args()
        .filter_map(|a| a.parse().ok())
        .next()
        .unwrap_or(7);
    let eddy = LambOseen {
        x: 500.0,
        y: 520.0,
        core_radius: 90.0,
        circulation: 4000.0,
    };
    let flow = Flow::from(eddy) + Uniform { u: 1.3, v: -0.6 };
    let options = ImageOptions {
        width_px: 1024,
        height_px: 1024,
        noise_of_full_scale: 0.02,
        ..ImageOptions::default()
    };
    let (first, second) = particle_images(&flow, &options).expect("good options");
    if let Some(folder) = std::env::args().skip(1).find(|a| Path::new(a).is_dir()) {
        for (frame, name) in [(&first, "first.tif"), (&second, "second.tif")] {
            write_tiff(&Path::new(&folder).join(name), frame).expect("a file written");
        }
    }
    let pair = Pair::from_frames(first, second, Scale::default(), "bench");
    let windows_px = [64, 32, 32].map(|side| WindowSize {
        width: side,
        height: side,
    });
    let plan = Plan::new(&PlanOptions {
        windows_px: windows_px.to_vec(),
        overlap: 0.5,
        ..PlanOptions::default()
    })
    .expect("a good plan");
    for threads in [
        1,
        std::thread::available_parallelism().map_or(1, usize::from),
    ] {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .expect("threads");
        let mut times: Vec<f64> = (0..repeats)
            .map(|_| {
                let start = Instant::now();
                let field = pool.install(|| interrogate(&pair, &plan, &Task::quiet()));
                assert!(field.is_ok());
                1e3 * start.elapsed().as_secs_f64()
            })
            .collect();
        times.sort_by(f64::total_cmp);
        println!(
            "kolk, {threads} thread(s): least {:.1} ms, median {:.1} ms",
            times[0],
            times[times.len() / 2]
        );
    }
}
