//! A number with its unit and its doubt.

use std::collections::BTreeMap;
use std::fmt;
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use super::Unit;

/// Two units that cannot be added, compared or converted.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("{left} and {right} do not go together: {hint}", left = name(*left), right = name(*right), hint = hint(*left, *right))]
pub struct UnitMismatch {
    /// Unit of the left-hand value.
    pub left: Unit,
    /// Unit of the right-hand value.
    pub right: Unit,
}

fn name(unit: Unit) -> String {
    if unit.is_one() {
        "a plain number".to_owned()
    } else {
        unit.to_string()
    }
}

fn hint(left: Unit, right: Unit) -> &'static str {
    let (left, right) = (left.to_string(), right.to_string());
    // One side counts in what a camera knows, the other in what a ruler or clock does.
    let apart = |camera: &str, outside: &str| {
        let one =
            |a: &str, b: &str| a.contains(camera) && !b.contains(camera) && b.contains(outside);
        one(&left, &right) || one(&right, &left)
    };
    if left.is_empty() || right.is_empty() {
        "a plain number carries no unit; write it with one, such as exact(3, \"mm\")"
    } else if apart("frame", "s") {
        "frames become seconds only through a calibration (give the recording dt_s and mm_per_px)"
    } else if apart("px", "m") {
        "px become mm only through a calibration (give the recording mm_per_px)"
    } else {
        "they measure different things"
    }
}

/// Where doubt comes from: each independent source with what it contributes, in the value's unit
/// and with its sign, at one standard uncertainty.
type Sources = Arc<BTreeMap<u64, f64>>;

static NEXT_SOURCE: AtomicU64 = AtomicU64::new(0);

/// A number, its unit and its standard uncertainty.
///
/// The uncertainty is *known* (possibly zero, for an exact number) or *missing* (nothing has yet
/// said how good the number is); a missing one stays missing through arithmetic and is never
/// taken for zero. Known ones propagate to first order with their correlations, because each
/// value remembers the independent sources of its doubt (JCGM 100:2008, equation 13 written as a
/// sum over sources).
#[derive(Clone, Debug)]
pub struct Measured {
    value: f64,
    unit: Unit,
    sources: Option<Sources>,
}

impl Measured {
    /// An exact number.
    pub fn exact(value: f64, unit: Unit) -> Self {
        Self {
            value,
            unit,
            sources: Some(Arc::default()),
        }
    }

    /// A number nothing has given an uncertainty yet.
    pub fn without_uncertainty(value: f64, unit: Unit) -> Self {
        Self {
            value,
            unit,
            sources: None,
        }
    }

    /// A number with the standard uncertainty `unc` (same unit), from a source of its own.
    /// A `unc` that is negative or not finite counts as missing.
    pub fn new(value: f64, unc: f64, unit: Unit) -> Self {
        if !unc.is_finite() || unc < 0.0 {
            return Self::without_uncertainty(value, unit);
        }
        let id = NEXT_SOURCE.fetch_add(1, Ordering::Relaxed);
        let sources = if unc == 0.0 {
            BTreeMap::new()
        } else {
            BTreeMap::from([(id, unc)])
        };
        Self {
            value,
            unit,
            sources: Some(Arc::new(sources)),
        }
    }

    /// The number.
    pub fn value(&self) -> f64 {
        self.value
    }

    /// Its unit.
    pub fn unit(&self) -> Unit {
        self.unit
    }

    /// Its standard uncertainty in the same unit; `None` when missing.
    pub fn unc(&self) -> Option<f64> {
        // Summed from 0.0: an empty sum of floats is -0.0, which would show.
        self.sources
            .as_ref()
            .map(|s| s.values().fold(0.0, |sum: f64, c| sum + c * c).sqrt())
    }

    /// True when value and uncertainty are exact.
    pub fn is_exact(&self) -> bool {
        self.sources.as_ref().is_some_and(|s| s.is_empty())
    }

    /// The 95 % interval of a normal error: value ± 1.96 standard uncertainties.
    pub fn interval95(&self) -> Option<(f64, f64)> {
        // 1.959964: 97.5 % point of the normal distribution.
        self.unc()
            .map(|u| (self.value - 1.959_964 * u, self.value + 1.959_964 * u))
    }

    /// A value computed from this one by a function with the given result and slope.
    fn through(&self, value: f64, slope: f64, unit: Unit) -> Self {
        let sources = self
            .sources
            .as_ref()
            .map(|s| Arc::new(s.iter().map(|(&id, c)| (id, c * slope)).collect()));
        Self {
            value,
            unit,
            sources,
        }
    }

    fn joined(&self, other: &Self, value: f64, slopes: (f64, f64), unit: Unit) -> Self {
        let sources = match (&self.sources, &other.sources) {
            (Some(a), Some(b)) => {
                let mut sum: BTreeMap<u64, f64> =
                    a.iter().map(|(&id, c)| (id, c * slopes.0)).collect();
                for (&id, c) in b.iter() {
                    *sum.entry(id).or_insert(0.0) += c * slopes.1;
                }
                sum.retain(|_, c| *c != 0.0);
                Some(Arc::new(sum))
            }
            _ => None,
        };
        Self {
            value,
            unit,
            sources,
        }
    }

    /// The same quantity in another unit.
    ///
    /// # Errors
    /// [`UnitMismatch`] when the dimensions differ.
    pub fn to(&self, unit: Unit) -> Result<Self, UnitMismatch> {
        let factor = self.unit.factor_to(unit).ok_or(UnitMismatch {
            left: self.unit,
            right: unit,
        })?;
        Ok(self.through(self.value * factor, factor, unit))
    }

    /// Sum, in this value's unit.
    ///
    /// # Errors
    /// [`UnitMismatch`] when the dimensions differ.
    pub fn plus(&self, other: &Self) -> Result<Self, UnitMismatch> {
        let other = other.to(self.unit).map_err(|e| e.swapped())?;
        Ok(self.joined(&other, self.value + other.value, (1.0, 1.0), self.unit))
    }

    /// Difference, in this value's unit; `x.minus(&x)` is exactly zero.
    ///
    /// # Errors
    /// [`UnitMismatch`] when the dimensions differ.
    pub fn minus(&self, other: &Self) -> Result<Self, UnitMismatch> {
        self.plus(&other.through(-other.value, -1.0, other.unit))
    }

    /// Product.
    pub fn times(&self, other: &Self) -> Self {
        self.joined(
            other,
            self.value * other.value,
            (other.value, self.value),
            self.unit.times(other.unit),
        )
    }

    /// Quotient; units of one dimension cancel (mm/cm is a plain number).
    pub fn over(&self, other: &Self) -> Self {
        let same = other.to(self.unit);
        let (other, unit) = match &same {
            Ok(converted) => (converted, Unit::ONE),
            Err(_) => (other, self.unit.per(other.unit)),
        };
        let ratio = self.value / other.value;
        self.joined(
            other,
            ratio,
            (1.0 / other.value, -ratio / other.value),
            unit,
        )
    }

    /// Integer power.
    pub fn power(&self, n: i8) -> Self {
        let value = self.value.powi(i32::from(n));
        let slope = f64::from(n) * self.value.powi(i32::from(n) - 1);
        self.through(value, slope, self.unit.power(n))
    }

    /// Square root; `None` where the unit has none.
    pub fn sqrt(&self) -> Option<Self> {
        let unit = self.unit.root(2)?;
        let value = self.value.sqrt();
        Some(self.through(value, 0.5 / value, unit))
    }

    /// Absolute value.
    pub fn abs(&self) -> Self {
        self.through(self.value.abs(), self.value.signum(), self.unit)
    }

    /// The negative.
    pub fn negated(&self) -> Self {
        self.through(-self.value, -1.0, self.unit)
    }

    /// Exact comparison of the numbers, after conversion to one unit.
    ///
    /// # Errors
    /// [`UnitMismatch`] when the dimensions differ.
    pub fn compare(&self, other: &Self) -> Result<Option<std::cmp::Ordering>, UnitMismatch> {
        let other = other.to(self.unit).map_err(|e| e.swapped())?;
        Ok(self.value.partial_cmp(&other.value))
    }

    /// The number rounded to its uncertainty, without unit: `11.8 ± 0.4`, `11.82 ± ?`, `12`.
    pub fn number_text(&self) -> String {
        match self.unc() {
            None => format!("{} ± ?", plain_number(self.value, 4)),
            Some(u) if u > 0.0 && self.value.is_finite() => {
                let (rounded, decimals) = round_uncertainty(u);
                format!(
                    "{} ± {}",
                    fixed(self.value, decimals),
                    fixed(rounded, decimals)
                )
            }
            Some(_) => plain_number(self.value, 6),
        }
    }

    /// The short form with the uncertainty of the last digits in brackets: `11.8(4) mm`.
    /// Falls back to the long form where the uncertainty is missing or reaches above the units.
    pub fn brief(&self) -> String {
        if let Some(u) = self.unc()
            && u > 0.0
        {
            let (rounded, decimals) = round_uncertainty(u);
            if decimals >= 0 {
                let last = (rounded * 10f64.powi(decimals)).round();
                let number = format!("{}({last})", fixed(self.value, decimals));
                return with_unit(number, self.unit);
            }
        }
        self.to_string()
    }
}

impl UnitMismatch {
    fn swapped(self) -> Self {
        Self {
            left: self.right,
            right: self.left,
        }
    }
}

/// The uncertainty rounded to one or two digits, and the decimals that takes (negative: tens).
///
/// Two digits where the leading ones are below 35.5, one where they are above, so that rounding
/// never changes an uncertainty by more than about 14 % (common practice, no source).
fn round_uncertainty(u: f64) -> (f64, i32) {
    let exponent = u.log10().floor() as i32;
    let leading = u / 10f64.powi(exponent);
    let digits = if leading < 3.55 { 2 } else { 1 };
    let decimals = digits - 1 - exponent;
    let step = 10f64.powi(decimals);
    let rounded = (u * step).round() / step;
    (rounded, decimals)
}

fn fixed(value: f64, decimals: i32) -> String {
    if decimals >= 0 {
        format!("{value:.*}", decimals as usize)
    } else {
        let step = 10f64.powi(-decimals);
        format!("{:.0}", (value / step).round() * step)
    }
}

/// A number to `digits` significant digits, in plain notation where that is readable.
pub(crate) fn plain_number(value: f64, digits: usize) -> String {
    if value == 0.0 || !value.is_finite() {
        return if value == 0.0 {
            "0".to_owned()
        } else {
            value.to_string()
        };
    }
    let exponent = value.abs().log10().floor() as i32;
    if (-4..7).contains(&exponent) {
        let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
        let text = format!("{value:.decimals$}");
        if text.contains('.') {
            text.trim_end_matches('0').trim_end_matches('.').to_owned()
        } else {
            text
        }
    } else {
        format!("{value:.*e}", digits - 1)
    }
}

fn with_unit(number: String, unit: Unit) -> String {
    if unit.is_one() {
        number
    } else {
        format!("{number} {unit}")
    }
}

impl fmt::Display for Measured {
    /// `11.8 ± 0.4 mm`; `11.82 ± ? mm` when the uncertainty is missing; `12 mm` when exact.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&with_unit(self.number_text(), self.unit))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn printing_follows_the_uncertainty() {
        let show = |v, u| Measured::new(v, u, Unit::MM).to_string();
        assert_eq!(show(11.8123, 0.41), "11.8 ± 0.4 mm");
        assert_eq!(show(11.8123, 0.123), "11.81 ± 0.12 mm");
        assert_eq!(show(11812.3, 41.0), "11810 ± 40 mm");
        assert_eq!(show(5.0, 0.097), "5.00 ± 0.10 mm");
        assert_eq!(Measured::new(11.8123, 0.41, Unit::MM).brief(), "11.8(4) mm");
        assert_eq!(
            Measured::without_uncertainty(11.8123, Unit::MM).to_string(),
            "11.81 ± ? mm"
        );
        let exact = Measured::exact(12.0, Unit::MM);
        assert_eq!(exact.to_string(), "12 mm");
        assert!(exact.unc().is_some_and(f64::is_sign_positive));
    }

    #[test]
    fn shared_sources_cancel_and_independent_ones_add_in_quadrature() {
        let a = Measured::new(3.0, 0.3, Unit::MM);
        let b = Measured::new(4.0, 0.4, Unit::MM);
        let zero = a.minus(&a).unwrap();
        assert_eq!((zero.value(), zero.unc()), (0.0, Some(0.0)));
        let back = a.plus(&b).unwrap().minus(&a).unwrap();
        assert!((back.unc().unwrap() - 0.4).abs() < 1e-15);
        assert!((a.plus(&b).unwrap().unc().unwrap() - 0.5).abs() < 1e-15);
        // The square of a value is fully correlated with itself: u(x²) = 2 x u(x).
        assert!((a.times(&a).unc().unwrap() - 1.8).abs() < 1e-12);
        assert!((a.power(2).unc().unwrap() - 1.8).abs() < 1e-12);
    }

    #[test]
    fn a_missing_uncertainty_stays_missing() {
        let known = Measured::new(3.0, 0.3, Unit::MM);
        let missing = Measured::without_uncertainty(4.0, Unit::MM);
        assert_eq!(known.plus(&missing).unwrap().unc(), None);
        assert_eq!(known.times(&missing).unc(), None);
    }

    #[test]
    fn px_and_mm_do_not_add() {
        let error = Measured::exact(1.0, Unit::PX)
            .plus(&Measured::exact(1.0, Unit::MM))
            .unwrap_err();
        assert_eq!((error.left, error.right), (Unit::PX, Unit::MM));
        assert!(error.to_string().contains("mm_per_px"));
    }
}
