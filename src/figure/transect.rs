//! The transect through an eddy: what a careful person draws to see how wide it is.

use super::figure::Figure;
use crate::field::Trace;

/// What to mark on a transect, all in the traces' units.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Transect {
    /// Where the core is, as a distance along the traces; distances are then counted from it.
    pub core: Option<f64>,
    /// A level of the traces' values and its label: the fraction that bounds the eddy.
    pub level: Option<(f64, String)>,
    /// Distances of boundaries along the traces, each with its label.
    pub boundaries: Vec<(f64, String)>,
}

/// Values along one line through an eddy, with the level and the boundaries that were read off.
///
/// The traces share one unit (vorticity and swirling strength do) or drawing fails with
/// [`FigureError::UnitsDiffer`](super::FigureError::UnitsDiffer).
pub fn transect(traces: &[Trace], marks: &Transect) -> Figure {
    let origin = marks.core.unwrap_or(0.0);
    let mut figure = Figure::new();
    for trace in traces {
        let mut trace = trace.clone();
        trace.distance.iter_mut().for_each(|d| *d -= origin);
        figure = figure.trace(&trace);
    }
    if marks.core.is_some() {
        figure = figure.x_label("distance from core");
    }
    if let Some((value, label)) = &marks.level {
        figure = figure.level(*value, label);
    }
    for (distance, label) in &marks.boundaries {
        figure = figure.marker(distance - origin, label);
    }
    figure
}
