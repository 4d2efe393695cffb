//! The health of a recording as rows.

use super::{Column, Table, TableError};
use crate::advice::{Health, PairHealth};
use crate::quantity::{Measured, Unit};

/// What was measured of each pair: one row a pair.
///
/// Columns: pair (its number); particle_diameter in px and seeding in 1/px², each with its
/// uncertainty beside it; diameter_spread; noise, background and peak in grey levels; shares from
/// 0 to 1: saturated, lit, lost (with its uncertainty) and measured; displacement in px/frame and
/// gradient in 1/frame, the largest of the pair.
///
/// # Errors
/// [`TableError`] never in practice: all columns have as many rows.
pub fn health_of_pairs(health: &Health) -> Result<Table, TableError> {
    let pairs = &health.pairs;
    let measured = |read: fn(&PairHealth) -> Option<Measured>| -> Vec<Option<Measured>> {
        pairs.iter().map(read).collect()
    };
    let plain = |name: &str, unit: Unit, read: fn(&PairHealth) -> Option<f64>| {
        Column::new(name, unit, pairs.iter().map(read))
    };
    let mut table = Table::of([plain("pair", Unit::ONE, |p| Some(p.index as f64))])?;
    let diameters = measured(|p| p.diameter.clone());
    table.push_measured_in("particle_diameter", Unit::PX, &diameters)?;
    table.push(plain("diameter_spread", Unit::PX, |p| p.diameter_spread))?;
    let seeding = measured(|p| p.seeding.clone());
    table.push_measured_in("seeding", Unit::PX.power(-2), &seeding)?;
    table.push(plain("noise", Unit::ONE, |p| p.noise))?;
    table.push(plain("background", Unit::ONE, |p| p.background))?;
    table.push(plain("peak", Unit::ONE, |p| p.peak))?;
    table.push(plain("saturated", Unit::ONE, |p| Some(p.saturated)))?;
    table.push(plain("lit", Unit::ONE, |p| Some(p.lit)))?;
    table.push_measured_in("lost", Unit::ONE, &measured(PairHealth::lost))?;
    let speed = Unit::PX.per(Unit::FRAME);
    table.push(plain("displacement", speed, |p| Some(p.displacement)))?;
    let rate = Unit::ONE.per(Unit::FRAME);
    table.push(plain("gradient", rate, |p| Some(p.gradient)))?;
    table.push(plain("measured", Unit::ONE, |p| Some(p.measured)))?;
    Ok(table)
}

/// What follows from it: one row a finding, warnings first.
///
/// Columns of words: verdict, subject, finding and remedy.
///
/// # Errors
/// [`TableError`] never in practice.
pub fn health_findings(health: &Health) -> Result<Table, TableError> {
    let findings = || health.findings.iter();
    let words = |name: &str, cells: Vec<&str>| Column::new(name, Unit::ONE, cells);
    Table::of([
        words("verdict", findings().map(|f| f.verdict.text()).collect()),
        words("subject", findings().map(|f| f.subject).collect()),
        words("finding", findings().map(|f| f.text.as_str()).collect()),
        words("remedy", findings().map(|f| f.remedy.as_str()).collect()),
    ])
}
