//! The transform kernel on the work of one 1024 x 1024 pair: 31 x 31 windows of 64 px, then twice
//! 63 x 63 windows of 32 px, overlap 0.5. One thread; regrouping, mean removal, correlation and both
//! peaks of every window. `fftw_bare.c` beside it times the bare transforms of a general-purpose C
//! library for the same windows; run the two in turn.
//!
//! `cargo bench --bench transforms [-- repeats]`

use std::time::Instant;

use kolk::interrogate::transform::{
    Correlator, LANES, Layout, Polyphase, Scratch, Search, Windows,
};

const SIZE: usize = 1024;

/// An image of uniform noise.
fn image(mut seed: u32) -> Vec<f32> {
    (0..SIZE * SIZE)
        .map(|_| {
            seed = seed.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            (seed >> 16) as f32
        })
        .collect()
}

/// What one pass over the pair needs, made once.
struct Pass {
    side: usize,
    reach: usize,
    count: usize,
    correlator: Correlator,
    scratch: Scratch,
    planes: Vec<f32>,
    images: [Polyphase; 2],
    layout: Layout,
    /// Least time so far of each part of the work, ms.
    regroup: Least,
    correlate: Least,
    peaks: Least,
}

/// The least time of every piece of a part; other programs on the machine then disturb little.
struct Least(Vec<f64>);

impl Least {
    fn new(pieces: usize) -> Least {
        Least(vec![f64::INFINITY; pieces])
    }

    fn note(&mut self, piece: usize, start: Instant) {
        let time = 1e3 * start.elapsed().as_secs_f64();
        self.0[piece] = self.0[piece].min(time);
    }

    fn sum(&self) -> f64 {
        self.0.iter().sum()
    }
}

impl Pass {
    fn new(side: usize, reach: usize) -> Pass {
        let spacing = side / 2;
        let count = (SIZE - side) / spacing + 1;
        let batches = count * count.div_ceil(LANES);
        let correlator = Correlator::new(side, side).expect("a usual size");
        let images = [(); 2].map(|()| Polyphase::new(SIZE, SIZE, spacing));
        Pass {
            side,
            reach,
            count,
            scratch: correlator.scratch(),
            planes: vec![0.0; correlator.planes_length()],
            correlator,
            layout: images[0].layout(0, side),
            images,
            regroup: Least::new(2),
            correlate: Least::new(batches),
            peaks: Least::new(batches),
        }
    }

    /// Goes over the pair once and returns a number that depends on all results.
    fn run(&mut self, exposures: &[Vec<f32>; 2]) -> f64 {
        for (i, (image, exposure)) in self.images.iter_mut().zip(exposures).enumerate() {
            let start = Instant::now();
            image.fill(exposure, SIZE);
            self.regroup.note(i, start);
        }
        let search = Search {
            reach_x: self.reach,
            reach_y: self.reach,
            exclusion: 1,
        };
        let (mut batch, mut sum) = (0, 0.0);
        for row in 0..self.count {
            for index in (0..self.count).step_by(LANES) {
                let windows = Windows {
                    first: self.images[0].pixels(),
                    second: self.images[1].pixels(),
                    lit: None,
                    start: self.images[0].start(row * self.side / 2, 0, index),
                    layout: &self.layout,
                };
                let start = Instant::now();
                let moments = self.correlator.correlate(
                    &windows,
                    self.reach + 2,
                    &mut self.planes,
                    &mut self.scratch,
                );
                self.correlate.note(batch, start);
                let start = Instant::now();
                let peaks = self.correlator.peaks(&self.planes, &search, &mut self.scratch);
                for lane in 0..LANES.min(self.count - index) {
                    let near: [[f32; 3]; 3] =
                        self.correlator
                            .neighbourhood(&self.planes, lane, &peaks.first[lane]);
                    let second = peaks.second[lane].height;
                    sum += f64::from((near[1][1] + second) * moments.normalization(lane));
                }
                self.peaks.note(batch, start);
                batch += 1;
            }
        }
        sum
    }

    fn total(&self) -> f64 {
        self.regroup.sum() + self.correlate.sum() + self.peaks.sum()
    }
}

fn main() {
    let repeats = std::env::args().find_map(|a| a.parse().ok()).unwrap_or(20);
    let exposures = [image(1), image(2)];
    for (name, share) in [("whole planes", 2), ("a quarter of the window", 4)] {
        let mut passes = [64, 32, 32].map(|side| Pass::new(side, side / share));
        let mut sum = 0.0;
        for _ in 0..repeats {
            sum = passes.iter_mut().map(|pass| pass.run(&exposures)).sum();
        }
        for pass in &passes[..2] {
            println!(
                "{name}: {} px: regroup {:.2} + correlate {:.2} + peaks {:.2} ms, {:.2} us a window",
                pass.side,
                pass.regroup.sum(),
                pass.correlate.sum(),
                pass.peaks.sum(),
                1e3 * pass.total() / (pass.count * pass.count) as f64
            );
        }
        let total: f64 = passes.iter().map(Pass::total).sum();
        println!("{name}: total {total:.2} ms (checksum {sum:.4})");
    }
}
