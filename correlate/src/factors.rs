//! A transform of any length with factors 2, 3 and 5.

use super::butterfly::{Radix2, Radix3, Radix4, Radix5, Radix8, Sample};
use super::lanes::{Buffer, LANES, Phasor, Sink, Source, Transform, Whole, step, turns};

/// The turning factors of one step, by its radix.
#[derive(Clone, Debug)]
enum Turns {
    Two(Vec<[Sample; 2]>),
    Three(Vec<[Sample; 3]>),
    Four(Vec<[Sample; 4]>),
    Five(Vec<[Sample; 5]>),
    Eight(Vec<[Sample; 8]>),
}

#[derive(Clone, Debug)]
struct Step {
    groups: usize,
    stride: usize,
    turns: Turns,
}

/// The steps and turning factors of a transform of one length; immutable once made.
#[derive(Clone, Debug)]
pub(super) struct Factors {
    length: usize,
    steps: Vec<Step>,
}

impl Factors {
    /// The plan for `length` samples, or `None` where it has a prime factor above 5 or is below 2.
    pub(super) fn new(length: usize) -> Option<Factors> {
        let (mut rest, mut stride) = (length, 1);
        let mut steps = Vec::new();
        for radix in radices(length)? {
            let groups = rest / radix;
            let turns = match radix {
                2 => Turns::Two(turns(groups)),
                3 => Turns::Three(turns(groups)),
                4 => Turns::Four(turns(groups)),
                5 => Turns::Five(turns(groups)),
                _ => Turns::Eight(turns(groups)),
            };
            steps.push(Step {
                groups,
                stride,
                turns,
            });
            rest = groups;
            stride *= radix;
        }
        Some(Factors { length, steps })
    }
}

/// Factors of a length: threes and fives, at most one two, fours, eights.
fn radices(length: usize) -> Option<Vec<usize>> {
    if length < 2 {
        return None;
    }
    let mut found = Vec::new();
    let mut rest = length;
    for radix in [3, 5] {
        while rest.is_multiple_of(radix) {
            found.push(radix);
            rest /= radix;
        }
    }
    if !rest.is_power_of_two() {
        return None;
    }
    let twos = rest.trailing_zeros() as usize;
    let (fours, eights) = match (twos, twos % 3) {
        (1, _) => {
            found.push(2);
            (0, 0)
        }
        (_, 0) => (0, twos / 3),
        (_, 1) => (2, (twos - 4) / 3),
        _ => (1, (twos - 2) / 3),
    };
    found.extend(std::iter::repeat_n(4, fours));
    found.extend(std::iter::repeat_n(8, eights));
    Some(found)
}

impl Transform for Factors {
    #[inline(always)]
    fn length(&self) -> usize {
        self.length
    }

    #[inline(always)]
    fn apply<S: Source, T: Sink>(&self, source: &mut S, work: &mut [Phasor], sink: &mut T) {
        let (mut here, mut there) = work[..2 * self.length].split_at_mut(self.length);
        for (index, place) in here.iter_mut().enumerate() {
            let (x, partner) = (source.fetch(index), source.partner(index));
            let factor = source.factor(index);
            for l in 0..LANES {
                let (here, other) = ((x.re[l], x.im[l]), (partner.re[l], partner.im[l]));
                (place.re[l], place.im[l]) = source.lane(here, other, factor, l);
            }
        }
        for part in &self.steps {
            let (m, s, source, sink) = (
                part.groups,
                part.stride,
                &mut Buffer(here),
                &mut Whole(there),
            );
            match &part.turns {
                Turns::Two(t) => step::<2, true, Radix2, _, _>(m, s, t, source, sink),
                Turns::Three(t) => step::<3, true, Radix3, _, _>(m, s, t, source, sink),
                Turns::Four(t) => step::<4, true, Radix4, _, _>(m, s, t, source, sink),
                Turns::Five(t) => step::<5, true, Radix5, _, _>(m, s, t, source, sink),
                Turns::Eight(t) => step::<8, true, Radix8, _, _>(m, s, t, source, sink),
            }
            std::mem::swap(&mut here, &mut there);
        }
        for (index, value) in here.iter().enumerate() {
            sink.put(index, value);
        }
    }
}
