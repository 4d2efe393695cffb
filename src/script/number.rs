//! How a plain number prints.

/// The number with up to 15 significant digits, without the tail that binary fractions leave:
/// `0.1 + 0.2` prints `0.3`, `4 / 2` prints `2`, a million million prints `1e12`.
///
/// Fifteen digits are those every 64-bit number keeps (IEEE 754-2019, binary64: 53 bits of
/// significand hold 15 decimal digits in full).
///
/// ```
/// use kolk::script::number_text;
/// assert_eq!(number_text(0.1 + 0.2), "0.3");
/// assert_eq!(number_text(2.0), "2");
/// assert_eq!(number_text(1.5e-7), "1.5e-7");
/// assert_eq!(number_text(f64::NAN), "NaN");
/// ```
pub fn number_text(x: f64) -> String {
    if !x.is_finite() {
        return x.to_string();
    }
    if x == 0.0 {
        return "0".to_owned();
    }
    let scientific = format!("{x:.14e}");
    let Some((digits, exponent)) = scientific.split_once('e') else {
        return scientific;
    };
    let exponent: i32 = exponent.parse().unwrap_or(0);
    if (-5..12).contains(&exponent) {
        let decimals = usize::try_from(14 - exponent).unwrap_or(0);
        without_tail(&format!("{x:.decimals$}")).to_owned()
    } else {
        format!("{}e{exponent}", without_tail(digits))
    }
}

fn without_tail(text: &str) -> &str {
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.')
    } else {
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_number_prints_without_the_tail_of_binary_fractions() {
        for (x, text) in [
            (0.1 + 0.2, "0.3"),
            (1.0 / 3.0, "0.333333333333333"),
            (2.0, "2"),
            (-0.0, "0"),
            (100.0, "100"),
            (123456.789, "123456.789"),
            (1e12, "1e12"),
            (999_999_999_999.0, "999999999999"),
            (0.00001, "0.00001"),
            (1.25e-6, "1.25e-6"),
            (-6.02214076e23, "-6.02214076e23"),
            (f64::INFINITY, "inf"),
        ] {
            assert_eq!(number_text(x), text);
        }
    }
}
