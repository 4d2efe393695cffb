//! Lists of plain numbers or of measured values, for what takes either.

use std::cmp::Ordering;
use std::sync::Arc;

use rhai::{Array, Dynamic};

use super::super::argument::{Argument, NumberOr, Shape};
use super::super::call::Call;
use super::super::fault::Fault;
use super::super::kind::{kind_name, number, with_article};
use super::quantity::unit;
use crate::quantity::{Measured, Unit, UnitMismatch};
use crate::table::Column;

/// The items of a list that are all of one of two kinds.
#[derive(Clone, Debug)]
pub(super) enum Values {
    /// Plain numbers; also a list without items.
    Numbers(Vec<f64>),
    /// Measured values.
    Measured(Vec<Arc<Measured>>),
}

fn measured(item: &Dynamic) -> Option<Arc<Measured>> {
    item.read_lock::<Arc<Measured>>().map(|m| Arc::clone(&m))
}

fn misfit(index: usize, item: &Dynamic) -> Fault {
    let fault = Fault::new(format!(
        "item {index} of the list is {}, not a number",
        with_article(kind_name(item))
    ));
    if item.is_unit() {
        fault.hint("`.filter(|v| v != ())` leaves the missing ones out")
    } else {
        fault
    }
}

fn mixed(index: usize) -> Fault {
    Fault::new(format!(
        "the list mixes measured values and plain numbers: item {index} has no unit"
    ))
    .hint("write it with one, such as exact(3, \"mm\"), or take `.value` of the others")
}

impl Values {
    /// The items of `list`.
    pub fn of(list: &Array) -> Result<Self, Fault> {
        Self::of_items(&list.iter().enumerate().collect::<Vec<_>>())
    }

    fn of_items(items: &[(usize, &Dynamic)]) -> Result<Self, Fault> {
        if items.iter().any(|(_, item)| measured(item).is_some()) {
            let values = items.iter().map(|(i, item)| {
                measured(item).ok_or_else(|| match number(item) {
                    Some(_) => mixed(*i),
                    None => misfit(*i, item),
                })
            });
            return values.collect::<Result<_, _>>().map(Values::Measured);
        }
        let numbers = items
            .iter()
            .map(|(i, item)| number(item).ok_or_else(|| misfit(*i, item)));
        numbers.collect::<Result<_, _>>().map(Values::Numbers)
    }

    /// The same, of a list that has items.
    pub fn some_of(list: &Array) -> Result<Self, Fault> {
        if list.is_empty() {
            return Err(Fault::new("the list is empty"));
        }
        Self::of(list)
    }

    /// Their sum.
    pub fn sum(self) -> Result<NumberOr<Measured>, Fault> {
        Ok(match self {
            Values::Numbers(x) => NumberOr::Number(x.iter().sum()),
            Values::Measured(m) => NumberOr::Other(Arc::new(total(&m)?)),
        })
    }

    /// Their mean; the list has items.
    pub fn mean(self) -> Result<NumberOr<Measured>, Fault> {
        Ok(match self {
            Values::Numbers(x) => NumberOr::Number(x.iter().sum::<f64>() / x.len() as f64),
            Values::Measured(m) => {
                let count = Measured::exact(m.len() as f64, Unit::ONE);
                NumberOr::Other(Arc::new(total(&m)?.over(&count)))
            }
        })
    }

    /// The least (`Less`) or greatest (`Greater`) of them; the list has items.
    pub fn extreme(self, wanted: Ordering) -> Result<NumberOr<Measured>, Fault> {
        match self {
            Values::Numbers(x) => {
                let fold = |(start, choose): (f64, fn(f64, f64) -> f64)| {
                    x.iter().copied().fold(start, choose)
                };
                Ok(NumberOr::Number(fold(if wanted.is_lt() {
                    (f64::INFINITY, f64::min)
                } else {
                    (f64::NEG_INFINITY, f64::max)
                })))
            }
            Values::Measured(m) => {
                let mut items = m.into_iter();
                let first = items
                    .next()
                    .ok_or_else(|| Fault::new("the list is empty"))?;
                let chosen = items.try_fold(first, |best, item| {
                    let better = item.compare(&best)? == Some(wanted);
                    Ok::<_, UnitMismatch>(if better { item } else { best })
                })?;
                Ok(NumberOr::Other(chosen))
            }
        }
    }

    /// Their sample standard deviation.
    pub fn spread(self) -> Result<NumberOr<Measured>, Fault> {
        let spread = |numbers: Vec<f64>| {
            Column::new("", Unit::ONE, numbers)
                .spread()
                .ok_or_else(|| Fault::new("a spread needs two numbers or more"))
        };
        match self {
            Values::Numbers(x) => spread(x).map(NumberOr::Number),
            Values::Measured(m) => {
                let unit = m.first().map_or(Unit::ONE, |first| first.unit());
                let numbers = in_unit(&m, unit)?.iter().map(Measured::value).collect();
                let value = Measured::without_uncertainty(spread(numbers)?, unit);
                Ok(NumberOr::Other(Arc::new(value)))
            }
        }
    }
}

fn in_unit(values: &[Arc<Measured>], unit: Unit) -> Result<Vec<Measured>, UnitMismatch> {
    values.iter().map(|m| m.to(unit)).collect()
}

/// Summed by halves, so that a long list of independent values takes no square of its length.
fn total(values: &[Arc<Measured>]) -> Result<Measured, UnitMismatch> {
    match values {
        [] => Ok(Measured::exact(0.0, Unit::ONE)),
        [one] => Ok((**one).clone()),
        more => {
            let (left, right) = more.split_at(more.len() / 2);
            total(left)?.plus(&total(right)?)
        }
    }
}

/// Numbers or measured values along an axis; `()` leaves a gap.
#[derive(Clone, Debug)]
pub(super) struct AlongAxis {
    values: Values,
    is_gap: Vec<bool>,
}

/// What an axis is given: numbers with NaN for gaps, their unit, and their uncertainties where
/// every one has its own.
pub(super) struct AxisNumbers {
    pub values: Vec<f64>,
    pub unit: Unit,
    pub unc: Option<Vec<f64>>,
}

impl Argument for AlongAxis {
    fn shape() -> Shape {
        Shape::of("list of numbers or of measured values")
    }

    fn take(given: Option<&mut Dynamic>, _: &Call) -> Result<Self, Fault> {
        let given = given.map(|value| &*value);
        let wanted = "takes a list of numbers or of measured values";
        let Some(list) = given.and_then(|value| value.as_array_ref().ok()) else {
            let found = given.map_or("nothing", kind_name);
            return Err(Fault::new(format!("{wanted}, not {}", with_article(found))));
        };
        let full: Vec<_> = list
            .iter()
            .enumerate()
            .filter(|(_, item)| !item.is_unit())
            .collect();
        let values = Values::of_items(&full).map_err(|fault| {
            let named = Fault::new(format!("{wanted}: {}", fault.message()));
            match fault.hint_text() {
                Some(hint) => named.hint(hint),
                None => named,
            }
        })?;
        Ok(Self {
            values,
            is_gap: list.iter().map(Dynamic::is_unit).collect(),
        })
    }
}

impl AlongAxis {
    /// The numbers, in the unit named so or, where none is named, in that of the first value.
    pub fn in_unit_named(&self, name: &str) -> Result<AxisNumbers, Fault> {
        let named = unit(name)?;
        match &self.values {
            Values::Numbers(x) => Ok(AxisNumbers {
                values: self.with_gaps(x.iter().copied()),
                unit: named,
                unc: None,
            }),
            Values::Measured(m) => {
                let own = m.first().map_or(named, |first| first.unit());
                let unit = if name.trim().is_empty() { own } else { named };
                let m = in_unit(m, unit)?;
                let unc: Option<Vec<f64>> = m.iter().map(Measured::unc).collect();
                Ok(AxisNumbers {
                    values: self.with_gaps(m.iter().map(Measured::value)),
                    unit,
                    unc: unc
                        .filter(|unc| unc.iter().any(|u| *u > 0.0))
                        .map(|unc| self.with_gaps(unc)),
                })
            }
        }
    }

    fn with_gaps(&self, numbers: impl IntoIterator<Item = f64>) -> Vec<f64> {
        let mut numbers = numbers.into_iter();
        let mut next = |is_gap: &bool| {
            let number = if *is_gap { None } else { numbers.next() };
            number.unwrap_or(f64::NAN)
        };
        self.is_gap.iter().map(&mut next).collect()
    }
}
