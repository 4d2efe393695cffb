//! A correlation plane drawn: what a careful person looks at to see why a vector is as it is.

use super::curve::Curve;
use super::figure::Figure;
use super::marks::{Bounds, Mark, MarkSet};
use super::scale::ColourScale;
use super::shade::ShadeOptions;
use super::ticks::with_minus;
use crate::interrogate::{CorrelationPlane, PlanePeak};
use crate::quantity::{Unit, plain_number};

/// How many of the highest peaks are marked.
const MARKED: usize = 5;

/// How far from the peak the cuts reach, in its widths, and at least, in samples.
const CUT_WIDTHS: f64 = 2.5;
const CUT_SAMPLES: f64 = 8.0;

/// Points of a Gaussian.
const POINTS: usize = 161;

/// The plane as a map over displacement, its highest peaks numbered, a dot in the one that the
/// vector was read from, and the limit of the search dashed; beside it the cuts along x and y
/// through the highest sample with the Gaussian through the three samples about it. A plane
/// without a peak is a map alone.
pub fn plane_figure(plane: &CorrelationPlane) -> Figure {
    // Zero is the middle of a coefficient's range, even where the whole plane is zero.
    let shading = ShadeOptions {
        scale: Some(ColourScale::EbbFlood),
        ..ShadeOptions::default()
    };
    let map = Figure::new()
        .shade(plane.field.clone(), shading)
        .marks(marks(plane))
        .x_label("u")
        .y_label("v");
    let (x, y) = plane.centre;
    let (length, window) = (plane.length, plane.window);
    let title = format!(
        "Correlation of the window of {} × {} px about ({}, {}) {length}",
        window.width,
        window.height,
        number(x, 6),
        number(y, 6),
    );
    let figure = match plane.peaks().first() {
        Some(peak) => Figure::panels(vec![map, cuts(plane, peak)], 2),
        None => map,
    };
    figure.title(&title).caption(&caption(plane))
}

/// A number in running words.
fn number(value: f64, digits: usize) -> String {
    with_minus(&plain_number(value, digits))
}

/// The highest peaks, and the search limit.
fn marks(plane: &CorrelationPlane) -> MarkSet {
    let read = plane.vector().map(|peak| peak.sample);
    let mut marks: Vec<Mark> = plane
        .peaks()
        .iter()
        .take(MARKED)
        .enumerate()
        .map(|(k, peak)| Mark {
            at: peak.displacement.into(),
            label: (k + 1).to_string(),
            chosen: read == Some(peak.sample),
        })
        .collect();
    if let Some(vector) = plane.vector().filter(|_| !marks.iter().any(|m| m.chosen)) {
        // No peak, or not among the highest.
        marks.push(Mark {
            at: vector.displacement.into(),
            label: "read".to_owned(),
            chosen: true,
        });
    }
    MarkSet {
        unit: plane.field.grid.length,
        marks,
        bounds: vec![Bounds {
            ends: plane.searched(),
            label: "search limit".to_owned(),
        }],
    }
}

fn caption(plane: &CorrelationPlane) -> String {
    let Some(peak) = plane.peaks().first() else {
        return "No contrast in the window: no peak.".to_owned();
    };
    let mut parts = vec![format!("Highest peak {}", number(peak.height, 3))];
    if let Some(ratio) = peak.ratio {
        parts.push(format!("{} times the second", number(ratio, 3)));
    }
    if let Some(noise) = plane.noise() {
        parts.push(format!("noise {} (rms)", number(noise, 2)));
    }
    let mut caption = parts.join(", ");
    if let Some(vector) = plane.vector() {
        let (u, v) = vector.displacement;
        let (u, v, unit) = (number(u, 4), number(v, 4), plane.field.grid.length);
        caption += &format!("; vector ({u}, {v}) {unit}");
    }
    caption + "."
}

/// The samples along x and along y through the highest one against the distance from the maximum
/// fitted to them.
fn cuts(plane: &CorrelationPlane, peak: &PlanePeak) -> Figure {
    let grid = &plane.field.grid;
    let (column, row) = peak.sample;
    let values = &plane.field.values;
    let cuts = [
        (
            "along x",
            Cut::about(column, &values.row(row).to_vec()),
            grid.dx,
        ),
        (
            "along y",
            Cut::about(row, &values.column(column).to_vec()),
            grid.dy,
        ),
    ];
    let widest = |width: Option<f64>| width.unwrap_or(0.0) * CUT_WIDTHS;
    let reach = widest(peak.width_px.0).max(widest(peak.width_px.1));
    let reach = reach.max(CUT_SAMPLES);
    let mut figure = Figure::new();
    for (name, cut, step) in cuts {
        let curve = |(x, y): (Vec<f64>, Vec<f64>)| {
            let x = x.iter().map(|x| x * step).collect();
            Curve::new(name, x, y).units(grid.length, Unit::ONE)
        };
        let points = curve(cut.samples(reach));
        figure = match &cut.gaussian {
            Some(gaussian) => figure.fitted(points, curve(gaussian.line(reach))),
            None => figure.points(points),
        };
    }
    figure
        .x_label("displacement from the highest peak")
        .y_label("correlation")
}

/// Samples along one axis through the highest one.
struct Cut {
    /// Distance from the highest, and value; the plane is circular, so that it is in the middle.
    samples: Vec<(f64, f64)>,
    gaussian: Option<Gaussian>,
}

/// The Gaussian through three samples: ln R = top - bend (x - middle)²/2.
struct Gaussian {
    middle: f64,
    top: f64,
    bend: f64,
}

impl Cut {
    fn about(highest: usize, values: &[f64]) -> Cut {
        let n = values.len();
        // Half a turn before the highest comes first.
        let sample = |k: usize| {
            let from = k as f64 - (n / 2) as f64;
            (from, values[(highest + n - n / 2 + k) % n])
        };
        let near = |back: usize| values[(highest + n - back) % n].ln();
        let (before, top, after) = (near(1), near(0), near(n - 1));
        let bend = 2.0 * top - before - after;
        let middle = (after - before) / (2.0 * bend);
        Cut {
            samples: (0..n).map(sample).collect(),
            // Logarithms of what is not above zero are not finite.
            gaussian: (bend.is_finite() && bend > 0.0).then_some(Gaussian {
                middle,
                top: top + 0.5 * bend * middle * middle,
                bend,
            }),
        }
    }

    /// Places, from the fitted maximum, and values of the samples up to `reach` samples from it.
    fn samples(&self, reach: f64) -> (Vec<f64>, Vec<f64>) {
        let middle = self.gaussian.as_ref().map_or(0.0, |g| g.middle);
        let placed = self.samples.iter().map(|(x, y)| (x - middle, *y));
        placed.filter(|(x, _)| x.abs() <= reach).unzip()
    }
}

impl Gaussian {
    /// The curve about its middle as far as it can be told from zero.
    fn line(&self, reach: f64) -> (Vec<f64>, Vec<f64>) {
        let reach = reach.min(6.0 / self.bend.sqrt());
        let x = (0..POINTS).map(|k| reach * (2.0 * k as f64 / (POINTS - 1) as f64 - 1.0));
        x.map(|x| (x, (self.top - 0.5 * self.bend * x * x).exp()))
            .unzip()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::frames::{Frame, Pair, Scale};
    use crate::interrogate::{Plan, PlanOptions, correlation_plane};
    use crate::synth::{Flow, ImageOptions, Uniform, particle_images};
    use crate::task::Task;
    use ndarray::Array2;

    fn plane(first: Frame, second: Frame) -> CorrelationPlane {
        let pair = Pair::from_frames(first, second, Scale::default(), "pair");
        let plan = Plan::new(&PlanOptions::default()).unwrap();
        correlation_plane(&pair, (60.0, 60.0), &plan, &Task::quiet()).unwrap()
    }

    #[test]
    fn a_plane_is_drawn_with_its_peaks_limit_cuts_and_numbers() {
        let options = ImageOptions {
            width_px: 128,
            height_px: 128,
            noise_of_full_scale: 0.03,
            ..ImageOptions::default()
        };
        let flow = Flow::from(Uniform { u: 4.3, v: -1.6 });
        let (first, second) = particle_images(&flow, &options).unwrap();
        let svg = plane_figure(&plane(first, second)).svg().unwrap();
        for words in [
            "search limit",
            "along x",
            "along y",
            "u (px/frame)",
            "v (px/frame)",
            "displacement from the highest peak (px/frame)",
            "Correlation of the window of 32 × 32 px about (63.5, 63.5) px",
        ] {
            assert!(svg.contains(words), "{words}");
        }
        for number in 1..=MARKED {
            assert!(svg.contains(&format!("aria-label=\"{number}\"")));
        }
    }

    #[test]
    fn the_gaussian_of_a_cut_goes_through_the_three_samples_even_across_the_rim() {
        let gauss = |x: f64| 0.7 * (-(x - 0.3f64).powi(2) / 1.8).exp();
        // Highest at index 0: the sample before it is the last.
        let values: Vec<f64> = [0.0, 1.0, 2.0, -3.0, -2.0, -1.0].map(gauss).to_vec();
        let cut = Cut::about(0, &values);
        let fit = cut.gaussian.as_ref().unwrap();
        // Exact: the logarithm of a Gaussian is a parabola.
        assert!((fit.middle - 0.3).abs() < 1e-12 && (fit.bend - 1.0 / 0.9).abs() < 1e-12);
        assert!((fit.top.exp() - 0.7).abs() < 1e-12);
        let (x, y) = cut.samples(8.0);
        assert_eq!(x.len(), 6);
        for (x, y) in x.iter().zip(&y) {
            assert!((gauss(x + 0.3) - y).abs() < 1e-12, "{x} {y}");
        }
    }

    #[test]
    fn a_plane_without_a_peak_is_drawn_and_says_so() {
        let grey = || Frame {
            pixels: Array2::from_elem((128, 128), 50.0),
            bits: 8,
        };
        let svg = plane_figure(&plane(grey(), grey())).svg().unwrap();
        assert!(svg.contains("No contrast in the window: no peak."));
        assert!(!svg.contains("along x"));
    }
}
