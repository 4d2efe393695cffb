//! What a recording's images say of themselves, and the plan that fits them.

use std::sync::Arc;

use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::interrogate::given;
use crate::advice::{
    Health, Verdict, pair_health, pair_plan, recording_health, recording_plan,
};
use crate::figure::locking_figure;
use crate::frames::{Pair, Recording};
use crate::interrogate::Plan;
use crate::quantity::{Measured, Unit};
use crate::table::{health_findings, health_of_pairs};

/// Pairs that are looked at where nobody asks for another number.
const HEALTH_PAIRS: usize = 6;
const PLAN_PAIRS: usize = 3;

impl Kind for Health {
    const NAME: &'static str = "recording health";
    const ABOUT: &'static str = "What the images of a pair or a recording, and their vectors by a \
        plan, say of themselves: particle images, light, noise, pairs lost, locking. It prints what \
        is amiss first, each with what to do about it. Lengths are px of the image.";

    fn show(&self) -> String {
        self.to_string()
    }
}

/// A noisy pair the examples look at.
macro_rules! with_a_pair {
    ($code:literal) => {
        concat!(
            "let p = uniform(#{ u_px_per_frame: 3.3, v_px_per_frame: -1.2 }).pair(#{ width_px: 256, height_px: 256, noise_of_full_scale: 0.02, background_of_full_scale: 0.1, out_of_plane_loss: 0.3, sheet: \"flat\" });\n",
            "let h = p.health(plan(#{ windows_px: [32, 32], overlap: 0.5 }));\n",
            $code
        )
    };
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Health>();
    of_images(room);
    of_plans(room);
    of_particles(room);
    of_light(room);
    of_motion(room);
    of_locking(room);
    of_the_whole(room);
}

fn of_images(room: &mut Room) {
    room.method::<Pair>("health")
        .about(
            "What the images of the pair and its vectors by a plan say of themselves: how wide and \
             how many particle images are, light and noise, loss between the exposures, motion \
             against the windows, peak locking; with verdicts, and what to do about what is amiss.",
        )
        .words("quality check diagnose particle image diameter seeding density noise peak locking loss saturation background")
        .input("plan", "", "the plan to measure vectors by; left out, the default plan")
        .errors("the pair is smaller than 64 px or its first window, or a frame cannot be read")
        .source("Campbell 1909 (moments of overlapping images); Keane & Adrian 1990, 1992 (limits); from memory")
        .example(
            with_a_pair!("h.findings().select([\"verdict\", \"subject\"])"),
            "",
        )
        .does(|pair: &Pair, plan: Option<Arc<Plan>>, call: Call| {
            Ok::<_, Fault>(pair_health(pair, &*given(plan)?, &call.task())?)
        });
    room.method::<Recording>("health")
        .about("The same of some of its pairs, evenly spread over it, together.")
        .words("quality check diagnose particle image diameter seeding density noise peak locking loss saturation background")
        .input("plan", "", "the plan to measure vectors by; left out, the default plan")
        .input("pairs", "count", "how many pairs at most; 6 when left out")
        .errors("there is no pair, or as for one")
        .source("Campbell 1909 (moments of overlapping images); Keane & Adrian 1990, 1992 (limits); from memory")
        .example(
            with_a_pair!("recording([p, p, p]).health(plan(#{ windows_px: [32], overlap: 0 }), 2).table().rows()"),
            "2",
        )
        .does(
            |recording: &Recording, plan: Option<Arc<Plan>>, pairs: Option<usize>, call: Call| {
                let most = pairs.unwrap_or(HEALTH_PAIRS);
                let health = recording_health(recording, &*given(plan)?, most, &call.task());
                Ok::<_, Fault>(health?)
            },
        );
}

fn of_plans(room: &mut Room) {
    room.method::<Pair>("advise_plan")
        .about(
            "The plan that fits the pair, by a quick look at its motion and by trying windows and \
             passes on it. It prints its reasons, and what to write to have it again.",
        )
        .words("choose windows passes suggest best automatic adaptive settings")
        .errors("no particle images are seen, or the exposures have no motion in common")
        .source("Keane & Adrian 1990, 1992; Hausman 1978 (comparison of two estimates); from memory")
        .example(
            "let eddy = lamb_oseen(#{ x_px: 96, y_px: 96, core_radius_px: 20, circulation_px2_per_frame: 300 });\neddy.pair(#{ width_px: 192, height_px: 192, noise_of_full_scale: 0.02 }).advise_plan().literal",
            "",
        )
        .does(|pair: &Pair, call: Call| Ok::<_, Fault>(pair_plan(pair, &call.task())?));
    room.method::<Recording>("advise_plan")
        .about("The plan that fits the recording, by some of its pairs, evenly spread over it.")
        .words("choose windows passes suggest best automatic adaptive settings")
        .input("pairs", "count", "how many pairs at most; 3 when left out")
        .errors("there is no pair, or as for one")
        .source("Keane & Adrian 1990, 1992; Hausman 1978 (comparison of two estimates); from memory")
        .example(
            "let p = uniform(#{ u_px_per_frame: 3, v_px_per_frame: 0 }).pair(#{ width_px: 128, height_px: 128 });\nrecording([p, p]).advise_plan(1).reasons.len()",
            "5",
        )
        .does(|recording: &Recording, pairs: Option<usize>, call: Call| {
            let most = pairs.unwrap_or(PLAN_PAIRS);
            Ok::<_, Fault>(recording_plan(recording, most, &call.task())?)
        });
    room.property::<Plan>("reasons")
        .about("Why an advised plan is as it is, a sentence each; empty for a plan written by hand.")
        .words("why advice explanation")
        .example("plan().reasons", "[]")
        .does(|plan: &Plan| plan.reasons().to_vec());
    room.property::<Plan>("literal")
        .about("What to write in a script to have this very plan again.")
        .words("paste code reproduce source")
        .example(
            "plan(#{ windows_px: [64, [32, 16]], least_lit: 0.6 }).literal",
            "\"plan(#{ windows_px: [64, [32, 16]], overlap: 0.75, least_lit: 0.6 })\"",
        )
        .does(literal);
}

/// The call that makes the plan: windows and overlap, and what differs from its default.
pub(super) fn literal(plan: &Plan) -> String {
    let options = plan.options();
    let sides = options.windows_px.iter().map(|window| {
        if window.width == window.height {
            window.width.to_string()
        } else {
            format!("[{}, {}]", window.width, window.height)
        }
    });
    let windows = sides.collect::<Vec<_>>().join(", ");
    let mut text = format!("plan(#{{ windows_px: [{windows}]");
    let written = |options: &crate::interrogate::PlanOptions| serde_json::to_value(options).ok();
    let (own, default) = (written(options), written(&Default::default()));
    for (key, value) in own.iter().filter_map(|own| own.as_object()).flatten() {
        let usual = default.as_ref().and_then(|default| default.get(key));
        if key == "overlap" || (key != "windows_px" && usual != Some(value)) {
            text += &format!(", {key}: {value}");
        }
    }
    text + " })"
}

/// A measured value of a recording, or why there is none.
fn known(value: Option<Measured>, what: &str) -> Result<Measured, Fault> {
    value.ok_or_else(|| {
        Fault::new(format!(
            "no particle images are seen in these exposures: there is no {what}"
        ))
    })
}

fn of_particles(room: &mut Room) {
    room.property::<Health>("particle_diameter")
        .about(
            "Diameter at which the light of a particle image has fallen to e⁻², the averaging over \
             pixels taken out.",
        )
        .words("size width particle image")
        .unit("px")
        .errors("no particle images are seen")
        .example(with_a_pair!("h.particle_diameter.unit"), "\"px\"")
        .does(|health: &Health| known(health.diameter(), "diameter"));
    room.property::<Health>("seeding")
        .about("Particle images a px², overlapping or not: those brighter than e⁻² of the brightest.")
        .words("density concentration number particles")
        .unit("1/px²")
        .errors("no particle images are seen")
        .example(with_a_pair!("decimals(h.seeding.value, 2)"), "\"0.06\"")
        .does(|health: &Health| known(health.seeding(), "seeding"));
    room.property::<Health>("images_in_window")
        .about("Particle images in a window of the plan's last pass.")
        .words("number particles window seeding")
        .unit("count")
        .errors("no particle images are seen")
        .example(with_a_pair!("h.images_in_window.value > 50"), "true")
        .does(|health: &Health| known(health.images_in_window(), "seeding"));
    room.property::<Health>("lost")
        .about(
            "Share of the particle pattern, weighed by brightness, that is not in both exposures of \
             a pair: what left the sheet, or entered it. Motion within the image is no loss.",
        )
        .words("loss pairs out of plane sheet missing")
        .unit("fraction")
        .errors("no particle images are seen")
        .example(with_a_pair!("decimals(h.lost.value, 1)"), "\"0.3\"")
        .does(|health: &Health| known(health.lost(), "loss"));
}

fn of_light(room: &mut Room) {
    room.property::<Health>("noise")
        .about("Standard deviation of what differs from pixel to pixel: read-out, photons, the camera's own pattern.")
        .words("camera rms scatter")
        .unit("grey levels")
        .errors("no particle images are seen")
        .example(with_a_pair!("h.noise.value > 40"), "true")
        .does(|health: &Health| known(health.noise(), "noise"));
    room.property::<Health>("background")
        .about("Grey level between the particle images, averaged over the image.")
        .words("dark haze offset level")
        .unit("grey levels")
        .errors("no particle images are seen")
        .example(with_a_pair!("decimals(h.background.value / 4095, 2)"), "\"0.10\"")
        .does(|health: &Health| known(health.background(), "background"));
    room.property::<Health>("saturated")
        .about("Share of the pixels at full scale, or at a lower level at which they pile up.")
        .words("saturation overexposed clipped bright")
        .unit("fraction")
        .example(with_a_pair!("h.saturated < 0.01"), "true")
        .does(Health::saturated);
    room.property::<Health>("lit")
        .about("Share of the image round whose pixels the pattern has at least a quarter of the contrast that it has in the best tenth.")
        .words("light sheet illumination dark")
        .unit("fraction")
        .example(with_a_pair!("h.lit"), "1.0")
        .does(Health::lit);
}

fn of_motion(room: &mut Room) {
    room.property::<Health>("displacement")
        .about("Largest displacement along an axis in the pairs looked at: of all but one in 200 vectors.")
        .words("motion fast maximum window quarter")
        .unit("px/frame")
        .example(with_a_pair!("decimals(h.displacement.value, 0)"), "\"3\"")
        .does(|health: &Health| {
            Measured::without_uncertainty(health.displacement(), Unit::PX.per(Unit::FRAME))
        });
    room.property::<Health>("gradient")
        .about("Largest difference of displacement for a px of distance, in any direction: of all but one in 100 vectors.")
        .words("shear strain rotation slope window")
        .unit("1/frame")
        .example(with_a_pair!("h.gradient.value < 0.02"), "true")
        .does(|health: &Health| {
            Measured::without_uncertainty(health.gradient(), Unit::ONE.per(Unit::FRAME))
        });
    room.property::<Health>("measured")
        .about("Share of the vectors that are measured, of those not masked.")
        .words("valid vectors yield")
        .unit("fraction")
        .example(with_a_pair!("h.measured"), "1.0")
        .does(Health::measured);
}

fn of_locking(room: &mut Room) {
    room.property::<Health>("pull")
        .about(
            "How strongly the vectors are pulled to whole px: the largest error that makes, as they \
             themselves show it by how they stand off the smooth field. The uncertainty counts what \
             the flow alone can feign.",
        )
        .words("peak locking bias whole pixel integer")
        .unit("px")
        .errors("the displacements span less than 1 px or change too steeply to tell")
        .example(
            "let p = shear(#{ y_px: 128, rate_per_frame: 0.02 }).pair(#{ width_px: 256, height_px: 256 });\np.health().pull.value < 0.01",
            "true",
        )
        .does(|health: &Health| match &health.locking.pulls {
            Some([whole, _]) => Ok(Measured::new(whole.amplitude_px, whole.unc_px, Unit::PX)),
            None => Err(Fault::new(
                "these displacements span less than 1 px, or change too steeply, to show a pull to whole px",
            )
            .hint("expected_pull is what the plan shows on synthetic images like these")),
        });
    room.property::<Health>("expected_pull")
        .about(
            "The same as the plan shows it on synthetic images of a known shear with the diameter, \
             seeding, noise and loss of these.",
        )
        .words("peak locking bias rehearsal synthetic")
        .unit("px")
        .errors("no particle images are seen")
        .example(with_a_pair!("h.expected_pull.value.abs() < 0.02"), "true")
        .does(|health: &Health| {
            let pull = health.rehearsal.map(|rehearsal| rehearsal.pulls_px[0]);
            known(
                pull.map(|pull| Measured::without_uncertainty(pull, Unit::PX)),
                "synthetic image like them",
            )
        });
    room.property::<Health>("expected_error")
        .about("Root mean square error of a component of a vector on those synthetic images.")
        .words("accuracy random noise rehearsal synthetic")
        .unit("px")
        .errors("no particle images are seen")
        .example(with_a_pair!("h.expected_error.value < 0.1"), "true")
        .does(|health: &Health| {
            let error = health.rehearsal.map(|rehearsal| rehearsal.error_px);
            known(
                error.map(|error| Measured::without_uncertainty(error, Unit::PX)),
                "synthetic image like them",
            )
        });
    room.method::<Health>("figure")
        .about(
            "The figure that shows peak locking: how often each fraction of a px comes among the \
             displacements, and how far vectors of that fraction stand off the smooth field.",
        )
        .words("draw plot histogram fraction peak locking")
        .example(with_a_pair!("h.figure().save(\"locking.png\")"), "")
        .does(|health: &Health| locking_figure(&health.locking));
}

fn of_the_whole(room: &mut Room) {
    room.property::<Health>("warnings")
        .about("What is amiss, a sentence each; empty where nothing is.")
        .words("problems bad verdict")
        .example(with_a_pair!("h.warnings"), "[]")
        .does(|health: &Health| {
            let warnings = health
                .findings
                .iter()
                .filter(|finding| finding.verdict == Verdict::Warning);
            warnings
                .map(|finding| format!("{}: {}", finding.subject, finding.text))
                .collect::<Vec<_>>()
        });
    room.method::<Health>("findings")
        .about("Everything that is said, warnings first, as a table of words.")
        .words("verdicts remedies report list")
        .example(
            with_a_pair!("h.findings().headings"),
            "[\"verdict\", \"subject\", \"finding\", \"remedy\"]",
        )
        .does(health_findings);
    room.method::<Health>("table")
        .about("What was measured of each pair, one row a pair.")
        .words("numbers pairs list save")
        .example(
            with_a_pair!("h.table().select([\"pair\", \"lit\", \"measured\"])"),
            "pair  lit  measured\n   0    1         1",
        )
        .does(health_of_pairs);
}
