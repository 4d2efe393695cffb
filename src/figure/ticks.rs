//! Where the marks along an axis stand, and what is written beside them.

/// The marks of one axis.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Ticks {
    /// Values with a number beside them, rising, and the number.
    pub major: Vec<(f64, String)>,
    /// Values with a short mark only, rising.
    pub minor: Vec<f64>,
    /// The numbers are to be multiplied by ten to this power (0 where they are plain).
    pub exponent: i32,
}

/// Steps of 1, 2 or 5 times a power of ten from `lo` to `hi`, about `about` of them.
///
/// `lo` < `hi`, both finite and below 1e150 in size. Every mark is the double nearest to its
/// decimal number, zero is never written as −0, and marks lie within the range.
pub(crate) fn linear(lo: f64, hi: f64, about: f64) -> Ticks {
    let (mantissa, power) = step_near((hi - lo) / about.max(1.0));
    let step = decimal(mantissa, power);
    let slack = 1e-9 * (hi - lo) / step;
    let first = (lo / step - slack).ceil() as i64;
    let last = (hi / step + slack).floor() as i64;
    let largest = lo.abs().max(hi.abs()).log10().floor() as i32;
    let exponent = if (-3..5).contains(&largest) {
        0
    } else {
        3 * largest.div_euclid(3)
    };
    let decimals = (exponent - power).max(0) as usize;
    let text = |k: i64| {
        let number = decimal(k * mantissa, power - exponent);
        with_minus(&format!("{number:.decimals$}"))
    };
    let parts = if mantissa == 2 { 4 } else { 5 };
    Ticks {
        major: (first..=last)
            .map(|k| (decimal(k * mantissa, power).clamp(lo, hi), text(k)))
            .collect(),
        minor: ((first - 1) * parts..=(last + 1) * parts)
            .filter(|n| n % parts != 0)
            .map(|n| n as f64 / parts as f64 * step)
            .filter(|v| (lo..=hi).contains(v))
            .collect(),
        exponent,
    }
}

/// Decades from `lo` to `hi`, both above zero, thinned to about `about`; on a range of less than
/// two decades also their 2 and 5 fold, on less than half a decade evenly spaced numbers.
pub(crate) fn logarithmic(lo: f64, hi: f64, about: f64) -> Ticks {
    let decades = (hi / lo).log10();
    if decades < 0.5 {
        return linear(lo, hi, about);
    }
    let (from, to) = (lo.log10().floor() as i32, hi.log10().ceil() as i32);
    let inside = |v: &f64| (lo * (1.0 - 1e-9)..=hi * (1.0 + 1e-9)).contains(v);
    let folds: &[i64] = if decades < 2.0 { &[1, 2, 5] } else { &[1] };
    let every = (decades / about.max(1.0)).ceil().max(1.0) as i32;
    let plain = lo >= 0.999e-3 && hi <= 1.001e4;
    let mut ticks = Ticks {
        major: Vec::new(),
        minor: Vec::new(),
        exponent: 0,
    };
    for power in from..=to {
        for fold in 1..10 {
            let value = decimal(fold, power);
            if !inside(&value) {
                continue;
            }
            if folds.contains(&fold) && power.rem_euclid(every) == 0 {
                ticks
                    .major
                    .push((value.clamp(lo, hi), power_text(fold, power, plain)));
            } else if every == 1 || fold == 1 {
                ticks.minor.push(value);
            }
        }
    }
    ticks
}

fn power_text(fold: i64, power: i32, plain: bool) -> String {
    match (plain, fold) {
        (true, _) => format!("{:.*}", (-power).max(0) as usize, decimal(fold, power)),
        (false, 1) if power == 0 => "1".to_owned(),
        (false, 1) => ten_to(power),
        (false, fold) => format!("{fold}·{}", ten_to(power)),
    }
}

/// `10⁻³`
pub(crate) fn ten_to(power: i32) -> String {
    let raised: String = power
        .to_string()
        .chars()
        .map(|c| match c.to_digit(10) {
            Some(d) => ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'][d as usize],
            None => '⁻',
        })
        .collect();
    format!("10{raised}")
}

/// The number with a true minus sign, and no minus before zero.
pub(crate) fn with_minus(number: &str) -> String {
    match number.strip_prefix('-') {
        Some(digits) if digits.bytes().all(|b| matches!(b, b'0' | b'.')) => digits.to_owned(),
        Some(digits) => format!("−{}", digits.replace('-', "−")),
        None => number.replace('-', "−"),
    }
}

/// The number among 1, 2 and 5 times a power of ten nearest to `raw` by ratio.
pub(crate) fn step_near(raw: f64) -> (i64, i32) {
    let power = raw.log10().floor() as i32;
    let leading = raw / 10f64.powi(power);
    // Bounds are the geometric means of neighbouring steps: √2, √10, √50.
    match leading {
        l if l < 1.414 => (1, power),
        l if l < 3.162 => (2, power),
        l if l < 7.071 => (5, power),
        _ => (1, power + 1),
    }
}

/// `number` times ten to `power`, rounded once so that 3 · 10⁻¹ is the double 0.3.
pub(crate) fn decimal(number: i64, power: i32) -> f64 {
    if power < 0 {
        number as f64 / 10f64.powi(-power)
    } else {
        number as f64 * 10f64.powi(power)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn read(text: &str) -> f64 {
        text.replace('−', "-").parse().unwrap()
    }

    proptest! {
        // The properties are the definition of a readable axis: common practice, no source.
        #[test]
        fn marks_are_round_even_inside_and_written_as_they_are(
            middle in -1e6f64..1e6, decade in -4i32..7, about in 3.0f64..12.0,
        ) {
            let half = 10f64.powi(decade);
            let (lo, hi) = (middle - half, middle + half);
            let ticks = linear(lo, hi, about);
            let n = ticks.major.len() as f64;
            // Steps 1-2-5 differ from the wanted one by at most a factor √2.5 = 1.58.
            prop_assert!(n >= about / 1.6 - 1.0 && n <= about * 1.6 + 1.0, "{n} of {about}");
            let factor = 10f64.powi(ticks.exponent);
            for (value, text) in &ticks.major {
                prop_assert!((lo..=hi).contains(value));
                prop_assert!((read(text) * factor - value).abs() <= 1e-9 * (hi - lo) + 1e-15 * value.abs(), "{text} for {value}");
                prop_assert!(!text.contains('-'));
            }
            let step = ticks.major[1].0 - ticks.major[0].0;
            for pair in ticks.major.windows(2) {
                // Neighbours are doubles nearest to decimal numbers, so their distance is rounded.
                let rounding = 1e-9 * (hi - lo) + 1e-15 * middle.abs();
                prop_assert!((pair[1].0 - pair[0].0 - step).abs() < rounding);
                prop_assert_ne!(&pair[0].1, &pair[1].1);
            }
            let leading = step / 10f64.powi((step * (1.0 + 1e-6)).log10().floor() as i32);
            prop_assert!([1.0, 2.0, 5.0].iter().any(|m| (leading / m - 1.0).abs() < 1e-5), "{leading}");
            prop_assert!(ticks.minor.iter().all(|v| (lo..=hi).contains(v)));
        }

        #[test]
        fn decades_rise_and_stay_inside(low in -12i32..6, span in 0.3f64..12.0, about in 3.0f64..9.0) {
            let lo = 10f64.powi(low) * 1.3;
            let hi = lo * 10f64.powf(span);
            let ticks = logarithmic(lo, hi, about);
            prop_assert!(ticks.major.windows(2).all(|p| p[0].0 < p[1].0));
            prop_assert!(ticks.major.iter().all(|(v, _)| (lo..=hi).contains(v)));
        }
    }

    #[test]
    fn numbers_are_written_as_a_person_would() {
        let texts = |t: Ticks| t.major.into_iter().map(|m| m.1).collect::<Vec<_>>();
        assert_eq!(
            texts(linear(-1.0, 1.0, 4.0)),
            ["−1.0", "−0.5", "0.0", "0.5", "1.0"]
        );
        assert_eq!(
            texts(linear(0.0, 100.0, 5.0)),
            ["0", "20", "40", "60", "80", "100"]
        );
        let large = linear(0.0, 4e6, 4.0);
        assert_eq!(large.exponent, 6);
        assert_eq!(texts(large), ["0", "1", "2", "3", "4"]);
        assert_eq!(linear(0.0, 2e-7, 4.0).exponent, -9);
        assert_eq!(
            texts(logarithmic(0.01, 100.0, 5.0)),
            ["0.01", "0.1", "1", "10", "100"]
        );
        assert_eq!(
            texts(logarithmic(1e-6, 1e-4, 5.0)),
            ["10⁻⁶", "10⁻⁵", "10⁻⁴"]
        );
        assert_eq!(linear(0.0, 0.4, 4.0).major[3].0, 0.3);
    }
}
