//! Whole-field arithmetic and comparison, with units.
//!
//! Results are fields on the same grid; a cell masked in either operand is masked in the result.

use ndarray::{Array2, Zip};

use super::{FieldError, Grid, ScalarField, Status, VectorField};
use crate::quantity::{Measured, Unit, UnitMismatch, plain_number};

/// The right-hand side of an operation on a field: another field or one number with its unit.
#[derive(Clone, Copy, Debug)]
pub enum Operand<'a> {
    /// A field on the same grid.
    Field(&'a ScalarField),
    /// One number for every node.
    Number(f64, Unit),
}

impl<'a> From<&'a ScalarField> for Operand<'a> {
    fn from(field: &'a ScalarField) -> Self {
        Operand::Field(field)
    }
}

impl From<f64> for Operand<'_> {
    /// A plain number.
    fn from(number: f64) -> Self {
        Operand::Number(number, Unit::ONE)
    }
}

impl From<&Measured> for Operand<'_> {
    /// The number with its unit; scalar fields carry no uncertainty, so it is dropped.
    fn from(measured: &Measured) -> Self {
        Operand::Number(measured.value(), measured.unit())
    }
}

impl Operand<'_> {
    fn unit(&self) -> Unit {
        match self {
            Operand::Field(field) => field.unit,
            Operand::Number(_, unit) => *unit,
        }
    }

    fn describe(&self) -> String {
        match self {
            Operand::Field(field) => bracketed(&field.name),
            Operand::Number(number, unit) => format!("{} {unit}", plain_number(*number, 6))
                .trim_end()
                .to_owned(),
        }
    }

    /// The factor that brings this operand to the unit of a field it is added to or compared
    /// with. Zero is zero in every unit.
    fn factor_to(&self, unit: Unit) -> Result<f64, FieldError> {
        if matches!(self, Operand::Number(0.0, Unit::ONE)) {
            return Ok(1.0);
        }
        let mismatch = UnitMismatch {
            left: unit,
            right: self.unit(),
        };
        Ok(self.unit().factor_to(unit).ok_or(mismatch)?)
    }
}

fn bracketed(name: &str) -> String {
    if name.contains(' ') && !name.chars().all(|c| c.is_alphanumeric() || c == ' ') {
        format!("({name})")
    } else {
        name.to_owned()
    }
}

/// Fields meet only node by node.
pub(super) fn same_grid(left: &Grid, right: &Grid) -> Result<(), FieldError> {
    if left.coincides_with(right) {
        Ok(())
    } else {
        Err(FieldError::GridsDiffer(left.describe(), right.describe()))
    }
}

impl ScalarField {
    /// The field made of `formula(value)` at every node.
    pub fn map(&self, name: &str, unit: Unit, formula: impl Fn(f64) -> f64) -> ScalarField {
        ScalarField {
            grid: self.grid,
            values: self.values.mapv(formula),
            unit,
            name: name.to_owned(),
        }
    }

    /// The field made of `formula(left, right)` at every node of two fields on one grid.
    ///
    /// # Errors
    /// [`FieldError::GridsDiffer`] naming both grids.
    pub fn zip_with(
        &self,
        other: &ScalarField,
        name: &str,
        unit: Unit,
        formula: impl Fn(f64, f64) -> f64,
    ) -> Result<ScalarField, FieldError> {
        same_grid(&self.grid, &other.grid)?;
        let values = Zip::from(&self.values)
            .and(&other.values)
            .map_collect(|&a, &b| formula(a, b));
        Ok(ScalarField {
            grid: self.grid,
            values,
            unit,
            name: name.to_owned(),
        })
    }

    fn combined(
        &self,
        sign: &str,
        other: Operand<'_>,
        unit: Unit,
        formula: impl Fn(f64, f64) -> f64,
    ) -> Result<ScalarField, FieldError> {
        let name = format!("{} {sign} {}", bracketed(&self.name), other.describe());
        match other {
            Operand::Field(field) => self.zip_with(field, &name, unit, formula),
            Operand::Number(number, _) => Ok(self.map(&name, unit, |value| formula(value, number))),
        }
    }

    /// Sum, in this field's unit.
    ///
    /// # Errors
    /// [`FieldError::Units`] when the dimensions differ (a plain 0 goes with every unit),
    /// [`FieldError::GridsDiffer`] when the grids do.
    pub fn plus<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        let other = other.into();
        let factor = other.factor_to(self.unit)?;
        self.combined("+", other, self.unit, |a, b| a + factor * b)
    }

    /// Difference, in this field's unit.
    ///
    /// # Errors
    /// As [`ScalarField::plus`].
    pub fn minus<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        let other = other.into();
        let factor = other.factor_to(self.unit)?;
        self.combined("-", other, self.unit, |a, b| a - factor * b)
    }

    /// Product; units multiply.
    ///
    /// # Errors
    /// [`FieldError::GridsDiffer`] when the grids differ.
    pub fn times<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        let other = other.into();
        let unit = self.unit.times(other.unit());
        self.combined("*", other, unit, |a, b| a * b)
    }

    /// Quotient; units divide, those of one dimension cancel. A division by zero has no value.
    ///
    /// # Errors
    /// [`FieldError::GridsDiffer`] when the grids differ.
    pub fn over<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        let other = other.into();
        let (unit, factor) = match other.unit().factor_to(self.unit) {
            Some(factor) => (Unit::ONE, factor),
            None => (self.unit.per(other.unit()), 1.0),
        };
        self.combined("/", other, unit, |a, b| finite(a / (factor * b)))
    }

    /// Integer power; a negative power of zero has no value.
    pub fn power(&self, n: i8) -> ScalarField {
        let name = format!("{} ^ {n}", bracketed(&self.name));
        self.map(&name, self.unit.power(n), |a| finite(a.powi(i32::from(n))))
    }

    /// Square root; negative values have none.
    ///
    /// # Errors
    /// [`FieldError::Option`] where the unit has no square root.
    pub fn sqrt(&self) -> Result<ScalarField, FieldError> {
        let unit = self.unit.root(2).ok_or_else(|| {
            FieldError::Option(format!(
                "{} is in {}, which has no square root",
                self.name, self.unit
            ))
        })?;
        Ok(self.map(&format!("sqrt({})", self.name), unit, f64::sqrt))
    }

    /// Absolute value.
    pub fn abs(&self) -> ScalarField {
        self.map(&format!("abs({})", self.name), self.unit, f64::abs)
    }

    /// The negative.
    pub fn negated(&self) -> ScalarField {
        self.map(&format!("-{}", bracketed(&self.name)), self.unit, |a| -a)
    }

    /// 1 where the comparison holds, 0 where it does not, nothing where a side is masked.
    fn compared<'a>(
        &self,
        sign: &str,
        other: impl Into<Operand<'a>>,
        holds: impl Fn(&f64, &f64) -> bool,
    ) -> Result<ScalarField, FieldError> {
        let other = other.into();
        let factor = other.factor_to(self.unit)?;
        self.combined(sign, other, Unit::ONE, |a, b| {
            if a.is_nan() || b.is_nan() {
                f64::NAN
            } else {
                f64::from(u8::from(holds(&a, &(factor * b))))
            }
        })
    }

    /// 1 where this field is greater, else 0.
    ///
    /// # Errors
    /// As [`ScalarField::plus`].
    pub fn greater<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        self.compared(">", other, f64::gt)
    }

    /// 1 where this field is greater or equal, else 0.
    ///
    /// # Errors
    /// As [`ScalarField::plus`].
    pub fn at_least<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        self.compared(">=", other, f64::ge)
    }

    /// 1 where this field is less, else 0.
    ///
    /// # Errors
    /// As [`ScalarField::plus`].
    pub fn less<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        self.compared("<", other, f64::lt)
    }

    /// 1 where this field is less or equal, else 0.
    ///
    /// # Errors
    /// As [`ScalarField::plus`].
    pub fn at_most<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        self.compared("<=", other, f64::le)
    }

    /// 1 where the two are exactly equal, else 0.
    ///
    /// # Errors
    /// As [`ScalarField::plus`].
    pub fn equals<'a>(&self, other: impl Into<Operand<'a>>) -> Result<ScalarField, FieldError> {
        self.compared("==", other, f64::eq)
    }

    /// 1 where the two differ, else 0.
    ///
    /// # Errors
    /// As [`ScalarField::plus`].
    pub fn differs_from<'a>(
        &self,
        other: impl Into<Operand<'a>>,
    ) -> Result<ScalarField, FieldError> {
        self.compared("!=", other, f64::ne)
    }
}

/// A value, or none where it is infinite: a cell of a field holds a number or NaN.
fn finite(value: f64) -> f64 {
    if value.is_finite() { value } else { f64::NAN }
}

impl VectorField {
    /// Sum with a field on the same grid. Uncertainties add in quadrature where both are known;
    /// a vector is measured only where both are.
    ///
    /// # Errors
    /// [`FieldError::GridsDiffer`] when the grids differ, [`FieldError::Units`] when the times do.
    pub fn plus(&self, other: &VectorField) -> Result<VectorField, FieldError> {
        self.joined(other, "+", 1.0)
    }

    /// Difference from a field on the same grid; uncertainties and status as for
    /// [`VectorField::plus`].
    ///
    /// # Errors
    /// As [`VectorField::plus`].
    pub fn minus(&self, other: &VectorField) -> Result<VectorField, FieldError> {
        self.joined(other, "-", -1.0)
    }

    fn joined(
        &self,
        other: &VectorField,
        sign: &str,
        factor: f64,
    ) -> Result<VectorField, FieldError> {
        same_grid(&self.grid, &other.grid)?;
        if self.time != other.time {
            return Err(UnitMismatch {
                left: self.unit(),
                right: other.unit(),
            }
            .into());
        }
        let sum = |a: &Array2<f64>, b: &Array2<f64>| {
            Zip::from(a).and(b).map_collect(|a, b| a + factor * b)
        };
        let quadrature =
            |a: &Array2<f64>, b: &Array2<f64>| Zip::from(a).and(b).map_collect(|a, b| a.hypot(*b));
        let unc = match (&self.unc, &other.unc) {
            (Some(a), Some(b)) => Some((quadrature(&a.0, &b.0), quadrature(&a.1, &b.1))),
            _ => None,
        };
        Ok(VectorField {
            grid: self.grid,
            time: self.time,
            u: sum(&self.u, &other.u),
            v: sum(&self.v, &other.v),
            status: Zip::from(&self.status)
                .and(&other.status)
                .map_collect(|&a, &b| worse(a, b)),
            unc,
            error_correlation: self
                .error_correlation
                .clone()
                .filter(|_| self.error_correlation == other.error_correlation),
            window: self.window.filter(|_| self.window == other.window),
            label: format!("{} {sign} {}", self.label, other.label),
        })
    }

    /// The field times a plain number; its uncertainty is scaled with it.
    pub fn times(&self, number: f64) -> VectorField {
        let mut scaled = self.clone();
        scaled.u *= number;
        scaled.v *= number;
        if let Some((u, v)) = &mut scaled.unc {
            *u *= number.abs();
            *v *= number.abs();
        }
        scaled.label = format!("{} * {}", self.label, plain_number(number, 6));
        scaled
    }
}

/// What a vector made of two is worth: the worse of both.
fn worse(a: Status, b: Status) -> Status {
    let rank = |status| match status {
        Status::Measured => 0,
        Status::Replaced => 1,
        Status::Outside => 2,
        Status::Masked => 3,
    };
    if rank(a) >= rank(b) { a } else { b }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Symbol;
    use ndarray::array;

    fn grid() -> Grid {
        Grid {
            nx: 2,
            ny: 2,
            x0: 0.0,
            y0: 0.0,
            dx: 1.0,
            dy: 1.0,
            length: Unit::MM,
        }
    }

    fn field(unit: Unit, values: [[f64; 2]; 2]) -> ScalarField {
        ScalarField {
            grid: grid(),
            values: Array2::from(values.to_vec()),
            unit,
            name: "f".to_owned(),
        }
    }

    #[test]
    fn sums_convert_units_and_products_multiply_them() {
        let mm = field(Unit::MM, [[1.0, 2.0], [3.0, f64::NAN]]);
        let cm = field(Unit::of(Symbol::Cm), [[1.0, 1.0], [1.0, 1.0]]);
        let sum = mm.plus(&cm).unwrap();
        assert_eq!(sum.unit, Unit::MM);
        assert_eq!(sum.values[(0, 1)], 12.0);
        assert!(sum.values[(1, 1)].is_nan());
        assert_eq!(mm.times(&mm).unwrap().unit, Unit::MM.power(2));
        let ratio = mm.over(&cm).unwrap();
        assert_eq!((ratio.unit, ratio.values[(1, 0)]), (Unit::ONE, 0.3));
        let rate = mm.over(&Measured::exact(2.0, Unit::S)).unwrap();
        assert_eq!(
            (rate.unit, rate.values[(0, 1)]),
            (Unit::MM.per(Unit::S), 1.0)
        );
        assert_eq!(mm.power(2).sqrt().unwrap().values[(1, 0)], 3.0);
        assert!(mm.sqrt().is_err());
        assert!(mm.over(0.0).unwrap().values.iter().all(|v| v.is_nan()));
        assert_eq!(mm.times(2.0).unwrap().unit, Unit::MM);
    }

    #[test]
    fn comparisons_give_ones_and_zeros_and_keep_the_mask() {
        let mm = field(Unit::MM, [[1.0, 2.0], [3.0, f64::NAN]]);
        let least = Measured::exact(0.2, Unit::of(Symbol::Cm));
        let more = mm.greater(&least).unwrap();
        assert_eq!(more.values.row(0), array![0.0, 0.0]);
        assert_eq!(more.values[(1, 0)], 1.0);
        assert!(more.values[(1, 1)].is_nan());
        assert_eq!(mm.at_least(&least).unwrap().mean(), Some(2.0 / 3.0));
        assert_eq!(mm.greater(0.0).unwrap().mean(), Some(1.0));
        assert_eq!(more.unit, Unit::ONE);
        assert_eq!(mm.equals(&mm).unwrap().sum_of(), 3.0);
        assert_eq!(mm.differs_from(&mm).unwrap().sum_of(), 0.0);
        assert_eq!(mm.less(&mm).unwrap().sum_of(), 0.0);
        assert_eq!(mm.at_most(&mm).unwrap().sum_of(), 3.0);
    }

    impl ScalarField {
        fn sum_of(&self) -> f64 {
            self.values.iter().filter(|v| v.is_finite()).sum()
        }
    }

    #[test]
    fn what_does_not_go_together_is_refused_with_both_named() {
        let mm = field(Unit::MM, [[1.0, 2.0], [3.0, 4.0]]);
        let message = mm.plus(1.0).unwrap_err().to_string();
        assert!(message.contains("mm and a plain number"), "{message}");
        let px = field(Unit::PX, [[1.0; 2]; 2]);
        assert!(mm.less(&px).unwrap_err().to_string().contains("mm_per_px"));
        let mut moved = mm.clone();
        moved.grid.x0 = 3.0;
        let message = mm.plus(&moved).unwrap_err().to_string();
        assert!(message.contains("from (0, 0)"), "{message}");
        assert!(message.contains("from (3, 0)"), "{message}");
    }

    #[test]
    fn vector_sums_carry_uncertainty_and_the_worse_status() {
        let one = Array2::from_elem((2, 2), 1.0);
        let mut a = VectorField::new(grid(), Unit::S, one.clone(), &one * 2.0, "a");
        a.unc = Some((&one * 0.3, &one * 0.3));
        let mut b = a.clone();
        b.unc = Some((&one * 0.4, &one * 0.4));
        b.status[(0, 0)] = Status::Replaced;
        b.status[(1, 1)] = Status::Masked;
        b.u[(1, 1)] = f64::NAN;
        b.v[(1, 1)] = f64::NAN;
        let sum = a.plus(&b).unwrap();
        assert_eq!((sum.u[(0, 1)], sum.v[(0, 1)]), (2.0, 4.0));
        assert!((sum.unc.as_ref().unwrap().0[(0, 1)] - 0.5).abs() < 1e-15);
        assert_eq!(sum.status[(0, 0)], Status::Replaced);
        assert_eq!(sum.status[(1, 1)], Status::Masked);
        assert!(sum.u[(1, 1)].is_nan());
        assert_eq!(a.minus(&a).unwrap().speed().max(), Some(0.0));
        assert_eq!(a.times(-2.0).unc.unwrap().0[(0, 0)], 0.6);
        let mut frames = a.clone();
        frames.time = Unit::FRAME;
        assert!(a.plus(&frames).unwrap_err().to_string().contains("dt_s"));
    }
}
