//! Transforms of the usual window sizes, each written for its length alone.
//!
//! With the length known to the compiler, indices become constants and most bounds need no check
//! while it runs; the arithmetic is that of the general kernel in `factors.rs`.

use super::butterfly::{Radix3, Radix4, Radix8, Sample};
use super::lanes::{Buffer, Phasor, Sink, Source, Transform, Whole, step, turns};

/// 8 samples: one butterfly.
#[derive(Clone, Debug)]
pub(super) struct Length8;

impl Transform for Length8 {
    #[inline(always)]
    fn length(&self) -> usize {
        8
    }
    #[inline(always)]
    fn apply<S: Source, T: Sink>(&self, source: &mut S, _work: &mut [Phasor], sink: &mut T) {
        step::<8, false, Radix8, S, T>(1, 1, &[], source, sink);
    }
}

macro_rules! two_steps {
    ($name:ident, $length:literal = $a:literal $first:ident $b:literal $last:ident) => {
        #[doc = concat!(stringify!($length), " samples in two steps.")]
        #[derive(Clone, Debug)]
        pub(super) struct $name {
            turns: [[Sample; $a]; $b],
        }

        impl $name {
            pub(super) fn new() -> Self {
                let mut plan = Self {
                    turns: [[(1.0, 0.0); $a]; $b],
                };
                plan.turns.copy_from_slice(&turns::<$a>($b));
                plan
            }
        }

        impl Transform for $name {
            #[inline(always)]
            fn length(&self) -> usize {
                $length
            }
            #[inline(always)]
            fn apply<S: Source, T: Sink>(&self, source: &mut S, work: &mut [Phasor], sink: &mut T) {
                let work = &mut work[..$length];
                step::<$a, true, $first, S, Whole>($b, 1, &self.turns, source, &mut Whole(work));
                step::<$b, false, $last, Buffer, T>(1, $a, &[], &mut Buffer(work), sink);
            }
        }
    };
}

macro_rules! three_steps {
    ($name:ident, $length:literal = $a:literal $first:ident $b:literal $middle:ident $c:literal $last:ident) => {
        #[doc = concat!(stringify!($length), " samples in three steps.")]
        #[derive(Clone, Debug)]
        pub(super) struct $name {
            first: [[Sample; $a]; $length / $a],
            middle: [[Sample; $b]; $c],
        }

        impl $name {
            pub(super) fn new() -> Self {
                let mut plan = Self {
                    first: [[(1.0, 0.0); $a]; $length / $a],
                    middle: [[(1.0, 0.0); $b]; $c],
                };
                plan.first.copy_from_slice(&turns::<$a>($length / $a));
                plan.middle.copy_from_slice(&turns::<$b>($c));
                plan
            }
        }

        impl Transform for $name {
            #[inline(always)]
            fn length(&self) -> usize {
                $length
            }
            #[inline(always)]
            fn apply<S: Source, T: Sink>(&self, source: &mut S, work: &mut [Phasor], sink: &mut T) {
                let (here, there) = work[..2 * $length].split_at_mut($length);
                step::<$a, true, $first, S, Whole>(
                    $length / $a,
                    1,
                    &self.first,
                    source,
                    &mut Whole(here),
                );
                step::<$b, true, $middle, Buffer, Whole>(
                    $c,
                    $a,
                    &self.middle,
                    &mut Buffer(here),
                    &mut Whole(there),
                );
                step::<$c, false, $last, Buffer, T>(1, $a * $b, &[], &mut Buffer(there), sink);
            }
        }
    };
}

two_steps!(Length16, 16 = 4 Radix4 4 Radix4);
two_steps!(Length24, 24 = 3 Radix3 8 Radix8);
two_steps!(Length32, 32 = 4 Radix4 8 Radix8);
three_steps!(Length48, 48 = 3 Radix3 4 Radix4 4 Radix4);
two_steps!(Length64, 64 = 8 Radix8 8 Radix8);
three_steps!(Length96, 96 = 3 Radix3 4 Radix4 8 Radix8);
three_steps!(Length128, 128 = 4 Radix4 4 Radix4 8 Radix8);
three_steps!(Length256, 256 = 4 Radix4 8 Radix8 8 Radix8);
