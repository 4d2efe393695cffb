//! Short transforms written out: the steps of which longer ones are made.
//!
//! Each takes the `R` complex samples x_j of one lane as (real, imaginary) and returns
//! X_k = sum_j x_j exp(-2 pi i j k / R). Only sums, differences and products, in a fixed order and
//! never fused, so a result is the same to the last bit on every machine.

use std::f32::consts::FRAC_1_SQRT_2;

/// One complex sample of one lane: real and imaginary part.
pub(super) type Sample = (f32, f32);

#[inline(always)]
fn add(a: Sample, b: Sample) -> Sample {
    (a.0 + b.0, a.1 + b.1)
}

#[inline(always)]
fn sub(a: Sample, b: Sample) -> Sample {
    (a.0 - b.0, a.1 - b.1)
}

#[inline(always)]
fn scale(a: Sample, factor: f32) -> Sample {
    (a.0 * factor, a.1 * factor)
}

/// a times -i.
#[inline(always)]
fn quarter_turn(a: Sample) -> Sample {
    (a.1, -a.0)
}

/// Complex product.
#[inline(always)]
pub(super) fn product(a: Sample, w: Sample) -> Sample {
    (a.0 * w.0 - a.1 * w.1, a.0 * w.1 + a.1 * w.0)
}

#[inline(always)]
pub(super) fn butterfly2(x: [Sample; 2]) -> [Sample; 2] {
    [add(x[0], x[1]), sub(x[0], x[1])]
}

#[inline(always)]
pub(super) fn butterfly3(x: [Sample; 3]) -> [Sample; 3] {
    const SINE: f32 = 0.866_025_4;
    let sum = add(x[1], x[2]);
    let side = quarter_turn(scale(sub(x[1], x[2]), SINE));
    let middle = sub(x[0], scale(sum, 0.5));
    [add(x[0], sum), add(middle, side), sub(middle, side)]
}

#[inline(always)]
pub(super) fn butterfly4(x: [Sample; 4]) -> [Sample; 4] {
    let (even, even_difference) = (add(x[0], x[2]), sub(x[0], x[2]));
    let (odd, odd_difference) = (add(x[1], x[3]), quarter_turn(sub(x[1], x[3])));
    [
        add(even, odd),
        add(even_difference, odd_difference),
        sub(even, odd),
        sub(even_difference, odd_difference),
    ]
}

#[inline(always)]
pub(super) fn butterfly5(x: [Sample; 5]) -> [Sample; 5] {
    // Cosine and sine of 72 and 144 degrees.
    const C1: f32 = 0.309_017;
    const C2: f32 = -0.809_017;
    const S1: f32 = 0.951_056_5;
    const S2: f32 = 0.587_785_25;
    let (outer, inner) = (add(x[1], x[4]), add(x[2], x[3]));
    let (outer_difference, inner_difference) = (sub(x[1], x[4]), sub(x[2], x[3]));
    let first = add(x[0], add(scale(outer, C1), scale(inner, C2)));
    let second = add(x[0], add(scale(outer, C2), scale(inner, C1)));
    let first_side = quarter_turn(add(
        scale(outer_difference, S1),
        scale(inner_difference, S2),
    ));
    let second_side = quarter_turn(sub(
        scale(outer_difference, S2),
        scale(inner_difference, S1),
    ));
    [
        add(x[0], add(outer, inner)),
        add(first, first_side),
        add(second, second_side),
        sub(second, second_side),
        sub(first, first_side),
    ]
}

#[inline(always)]
pub(super) fn butterfly8(x: [Sample; 8]) -> [Sample; 8] {
    let even = butterfly4([x[0], x[2], x[4], x[6]]);
    let odd = butterfly4([x[1], x[3], x[5], x[7]]);
    // Odd outputs times exp(-2 pi i k / 8).
    let odd1 = scale((odd[1].0 + odd[1].1, odd[1].1 - odd[1].0), FRAC_1_SQRT_2);
    let odd2 = quarter_turn(odd[2]);
    let odd3 = scale((odd[3].1 - odd[3].0, -odd[3].0 - odd[3].1), FRAC_1_SQRT_2);
    [
        add(even[0], odd[0]),
        add(even[1], odd1),
        add(even[2], odd2),
        add(even[3], odd3),
        sub(even[0], odd[0]),
        sub(even[1], odd1),
        sub(even[2], odd2),
        sub(even[3], odd3),
    ]
}

/// A transform of `R` points.
pub(super) trait Butterfly<const R: usize> {
    fn apply(x: [Sample; R]) -> [Sample; R];
}

macro_rules! butterflies {
    ($($name:ident $radix:literal $function:ident),*) => {$(
        pub(super) struct $name;
        impl Butterfly<$radix> for $name {
            #[inline(always)]
            fn apply(x: [Sample; $radix]) -> [Sample; $radix] {
                $function(x)
            }
        }
    )*};
}

butterflies!(Radix2 2 butterfly2, Radix3 3 butterfly3, Radix4 4 butterfly4, Radix5 5 butterfly5, Radix8 8 butterfly8);
