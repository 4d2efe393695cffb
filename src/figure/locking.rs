//! How displacements lie between whole px, drawn: what shows peak locking.

use super::curve::{Bars, Curve};
use super::figure::Figure;
use super::ticks::with_minus;
use crate::advice::Locking;
use crate::quantity::{Measured, Unit, plain_number};

/// Two panels over the fraction of a px that displacements have: how often each fraction comes,
/// beside what would be even; and how far vectors of that fraction stand off the smooth field
/// about them. Locked vectors crowd at 0 and 1, and stand below the field before 1/2 and above
/// it after.
pub fn locking_figure(locking: &Locking) -> Figure {
    let n = locking.shares.len();
    let edge = |k: usize| k as f64 / n as f64;
    let bars = Bars {
        name: "share of vectors".to_owned(),
        edges: (0..=n).map(edge).collect(),
        heights: locking.shares.map(|share| 100.0 * share).to_vec(),
        x_name: "fraction".to_owned(),
        x_unit: Unit::PX,
        y_unit: Unit::ONE,
    };
    let shares = Figure::new()
        .bars(bars)
        .level(100.0 / n as f64, "even")
        .x_range(0.0, 1.0)
        .x_label("fraction of displacement")
        .y_label("share of vectors (%)");
    let middles = (0..n).map(|k| edge(k) + 0.5 / n as f64).collect();
    let departures = Curve::new("departure", middles, locking.departures.to_vec());
    let departures = Figure::new()
        .points(departures.units(Unit::PX, Unit::PX))
        .level(0.0, "")
        .x_range(0.0, 1.0)
        .x_label("fraction of displacement")
        .y_label("departure from the smooth field");
    let panels = if locking.departures.iter().any(|d| d.is_finite()) {
        vec![shares, departures]
    } else {
        vec![shares]
    };
    Figure::panels(panels, 2)
        .title("Displacements between whole px")
        .caption(&caption(locking))
}

fn caption(locking: &Locking) -> String {
    let span = plain_number(locking.span_px, 3);
    let Some(pulls) = locking.pulls else {
        return format!(
            "Displacements span {span} px: too little, or too steeply, to show a pull to whole px."
        );
    };
    let [whole, even] = pulls.map(|pull| {
        let amplitude = Measured::new(pull.amplitude_px, pull.unc_px, Unit::PX);
        let cosine = Measured::new(pull.cosine, pull.cosine_unc, Unit::ONE);
        [amplitude, cosine].map(|value| with_minus(&value.number_text()))
    });
    format!(
        "Pull to whole px {} px, to even px {} px (largest error of a vector); mean of cos 2πd {}, of cos πd {}, d in px. Displacements span {span} px.",
        whole[0], even[0], whole[1], even[1]
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::advice::Pull;

    #[test]
    fn a_locked_field_is_drawn_with_its_numbers() {
        let pull = |period_px, amplitude_px| Pull {
            period_px,
            amplitude_px,
            unc_px: 0.004,
            cosine: 0.21,
            cosine_unc: 0.03,
        };
        let locking = Locking {
            pulls: Some([pull(1.0, 0.041), pull(2.0, -0.002)]),
            span_px: 7.4,
            shares: std::array::from_fn(|k| if k < 2 || k > 17 { 0.1 } else { 0.0375 }),
            departures: std::array::from_fn(|k| -0.01 * (k as f64 / 20.0 * 6.28).sin()),
        };
        let svg = locking_figure(&locking).svg().unwrap();
        for words in [
            "share of vectors (%)",
            "fraction of displacement (px)",
            "departure from the smooth field (px)",
            "Pull to whole px 0.041 ± 0.004 px",
        ] {
            assert!(svg.contains(words), "{words}");
        }
        let nothing = Locking {
            pulls: None,
            span_px: 0.2,
            shares: [0.05; 20],
            departures: [f64::NAN; 20],
        };
        assert!(locking_figure(&nothing).svg().unwrap().contains("span 0.2 px"));
    }
}
