//! The uncertainty of vectors, held against their true errors.
//!
//! Outside check: of normal errors 68.3 % are smaller than one standard deviation and 95.4 % than
//! two. A field holds some 3700 vectors of two components whose errors are shared by windows that
//! overlap four times on each axis, so about 460 independent ones: shares scatter by 2.2 % and
//! 1.0 %.
#![allow(missing_docs, clippy::unwrap_used)]

use kolk::field::{Status, VectorField};
use kolk::frames::{Pair, Scale};
use kolk::interrogate::{Plan, PlanOptions, interrogate};
use kolk::synth::{Flow, ImageOptions, LambOseen, Uniform, particle_images};
use kolk::task::Task;

/// Shares of components whose error is below one and below two uncertainties, and the ratio of
/// root-mean-square uncertainty to root-mean-square error.
fn coverage(flow: &Flow, images: &ImageOptions) -> (f64, f64, f64) {
    let (first, second) = particle_images(flow, images).unwrap();
    let pair = Pair::from_frames(first, second, Scale::default(), "synthetic");
    let plan = Plan::new(&PlanOptions::default()).unwrap();
    let field = interrogate(&pair, &plan, &Task::quiet()).unwrap();
    shares(&field, flow)
}

fn shares(field: &VectorField, flow: &Flow) -> (f64, f64, f64) {
    let (u_unc, v_unc) = field.unc.as_ref().unwrap();
    let (mut one, mut two, mut n) = (0.0, 0.0, 0.0);
    let (mut error_power, mut doubt_power) = (0.0, 0.0);
    for (at, status) in field.status.indexed_iter() {
        if *status != Status::Measured {
            continue;
        }
        let (x, y) = (field.grid.x(at.1), field.grid.y(at.0));
        let (u, v) = flow.displacement(x, y, 1.0);
        for (error, doubt) in [(field.u[at] - u, u_unc[at]), (field.v[at] - v, v_unc[at])] {
            if doubt.is_finite() {
                n += 1.0;
                one += f64::from(u8::from(error.abs() < doubt));
                two += f64::from(u8::from(error.abs() < 2.0 * doubt));
                error_power += error * error;
                doubt_power += doubt * doubt;
            }
        }
    }
    let all = 2.0 * field.count(Status::Measured) as f64;
    assert!(n > 0.95 * all, "{n} of {all} have an uncertainty");
    (one / n, two / n, (doubt_power / error_power).sqrt())
}

fn noisy(noise: f64, loss: f64) -> ImageOptions {
    ImageOptions {
        noise_of_full_scale: noise,
        background_of_full_scale: 0.05,
        out_of_plane_loss: loss,
        ..ImageOptions::default()
    }
}

#[test]
fn errors_of_noisy_images_lie_within_their_uncertainty_as_often_as_they_should() {
    let uniform = Flow::from(Uniform { u: 3.3, v: -1.2 });
    let eddy = Flow::from(LambOseen {
        x: 255.0,
        y: 255.0,
        core_radius: 45.0,
        circulation: 1500.0,
    });
    let cases = [
        (&uniform, noisy(0.02, 0.0)),
        (&uniform, noisy(0.05, 0.0)),
        (&uniform, noisy(0.02, 0.2)),
        (&eddy, noisy(0.02, 0.1)),
    ];
    for (flow, images) in cases {
        let (one, two, ratio) = coverage(flow, &images);
        println!("within 1: {one:.3}, within 2: {two:.3}, uncertainty / error {ratio:.3}");
        // Three standard deviations of a share, as worked out above.
        assert!((one - 0.683).abs() < 0.066, "{one}");
        assert!((two - 0.954).abs() < 0.030, "{two}");
        assert!((ratio - 1.0).abs() < 0.1, "{ratio}");
    }
}
