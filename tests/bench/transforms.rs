//! The transform kernel on the work of one 1024 x 1024 pair: 31 x 31 windows of 64 px, then twice
//! 63 x 63 windows of 32 px, overlap 0.5. One thread; regrouping, mean removal, correlation and both
//! peaks of every window. `fftw_bare.c` beside it times the bare transforms of a general-purpose C
//! library for the same windows; run the two in turn.
//!
//! `cargo bench --bench transforms [-- repeats]`

#![allow(
    clippy::print_stdout,
    clippy::expect_used,
    reason = "a benchmark prints, and has nobody to report an error to"
)]

use std::time::Instant;

use kolk::interrogate::transform::{
    Correlator, LANES, Layout, Planes, Polyphase, Scratch, Search, WindowColumns, Windows,
};

const SIZE: usize = 1024;

/// Two exposures of one pattern, the second moved by (3, 2) px, each with noise of its own.
fn exposures() -> [Vec<f32>; 2] {
    let mut seed = 1_u32;
    let mut noise = || {
        seed = seed.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        (seed >> 16) as f32 / 65536.0
    };
    let specks: Vec<f32> = (0..SIZE * SIZE).map(|_| (noise() - 0.9).max(0.0)).collect();
    let speck = |r: usize, c: usize| specks[(r % SIZE) * SIZE + c % SIZE];
    [(0, 0), (SIZE - 2, SIZE - 3)].map(|(down, right)| {
        let mut image = vec![0.0; SIZE * SIZE];
        for (place, value) in image.iter_mut().enumerate() {
            let (r, c) = (place / SIZE + down, place % SIZE + right);
            let near = speck(r, c + 1) + speck(r + 1, c) + speck(r, c) + speck(r + 1, c + 1);
            *value = 200.0 + 20000.0 * near + 100.0 * noise();
        }
        image
    })
}

/// What one pass over the pair needs, made once.
struct Pass {
    side: usize,
    reach: usize,
    count: usize,
    correlator: Correlator,
    scratch: Scratch,
    planes: Planes,
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
        let columns = WindowColumns {
            left: 0,
            spacing,
            count,
            width: side,
        };
        let images = [(); 2].map(|()| Polyphase::new(side, columns));
        Pass {
            side,
            reach,
            count,
            scratch: correlator.scratch(),
            planes: correlator.planes(),
            correlator,
            layout: images[0].layout(),
            images,
            regroup: Least::new(count),
            correlate: Least::new(batches),
            peaks: Least::new(batches),
        }
    }

    /// Goes over the pair once and returns a number that depends on all results.
    fn run(&mut self, exposures: &[Vec<f32>; 2]) -> f64 {
        let search = Search {
            reach_x: self.reach,
            reach_y: self.reach,
            exclusion: 1,
        };
        let (mut batch, mut sum) = (0, 0.0);
        for row in 0..self.count {
            let start = Instant::now();
            self.advance(row, exposures);
            self.regroup.note(row, start);
            for batch_in_row in 0..self.count.div_ceil(LANES) {
                let windows = Windows {
                    first: self.images[0].pixels(),
                    second: self.images[1].pixels(),
                    lit: None,
                    start: self.images[0].start(0, batch_in_row),
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
                let peaks = self
                    .correlator
                    .peaks(&self.planes, &search, &mut self.scratch);
                for lane in 0..LANES.min(self.count - batch_in_row * LANES) {
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

    /// Brings the bands of pixels to row `row` of windows.
    fn advance(&mut self, row: usize, exposures: &[Vec<f32>; 2]) {
        let spacing = self.side / 2;
        let fresh = if row == 0 { self.side } else { spacing };
        for (image, exposure) in self.images.iter_mut().zip(exposures) {
            image.scroll(fresh);
            let kept = self.side - fresh;
            for (r, mut place) in image.rows_mut().enumerate().skip(kept) {
                place.fill(&exposure[(row * spacing + r) * SIZE..][..SIZE]);
            }
        }
    }

    fn total(&self) -> f64 {
        self.regroup.sum() + self.correlate.sum() + self.peaks.sum()
    }
}

fn main() {
    let repeats = std::env::args().find_map(|a| a.parse().ok()).unwrap_or(20);
    let exposures = exposures();
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
