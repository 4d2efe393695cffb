//! Eddies: finding and measuring them.

use std::sync::Arc;

use rhai::Dynamic;

use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::super::options::Optional;
use super::field::unknown_word;
use super::interrogate::counted;
use crate::field::VectorField;
use crate::quantity::Measured;
use crate::vortex::{Eddies, Eddy, EddyOptions, Method, find_eddies};

crate::option_keys! {
    EddyOptions {
        scheme: "one of \"forward\", \"central\", \"richardson\", \"least_squares\", \"eight_neighbours\" or \"cubic_fit\"",
            "", "none", "Difference scheme of the gradient; left out, \"cubic_fit\".";
        fraction: "number", "fraction", "0.25",
            "Vorticity at the boundary as a part of the peak.";
        threshold: "number", "fraction", "0.2",
            "Least swirling strength of a core as a part of the strongest in the field.";
        saddle: "number", "fraction", "0.8",
            "Two peaks are two eddies where the saddle between them is lower than this part of the lower one.";
        least_nodes: "whole number", "count", "6",
            "Cores of fewer nodes than this are taken for noise.";
    }
}

/// One eddy together with the field it was found in.
#[derive(Clone, Debug)]
pub(super) struct Found {
    pub among: Arc<Eddies>,
    pub eddy: Eddy,
}

/// The eddies of one field.
#[derive(Clone, Debug)]
pub(super) struct FoundEddies(pub Arc<Eddies>);

impl FoundEddies {
    fn pick(&self, index: i64) -> Result<Arc<Found>, Fault> {
        let list = &self.0.list;
        Ok(Arc::new(Found {
            among: Arc::clone(&self.0),
            eddy: list[counted(list.len(), index, "eddies", "eddies")?].clone(),
        }))
    }
}

impl Kind for FoundEddies {
    const NAME: &'static str = "eddies";
    const ABOUT: &'static str = "The eddies of one vector field, the strongest circulation first, with \
        the fields they were found in; `for` goes through them, [i] picks one.";

    fn show(&self) -> String {
        let mut text = match self.0.list.len() {
            0 => "no eddies".to_owned(),
            1 => "1 eddy".to_owned(),
            n => format!("{n} eddies"),
        };
        for eddy in &self.0.list {
            text += &format!("\n  {}: {eddy}", eddy.index);
        }
        text
    }

    fn count(&self) -> usize {
        self.0.list.len()
    }

    fn item(&self, index: usize) -> Result<Dynamic, Fault> {
        Ok(Dynamic::from(self.pick(index as i64)?))
    }

    const HAS_ITEMS: bool = true;
}

impl Kind for Found {
    const NAME: &'static str = "eddy";
    const ABOUT: &'static str = "One eddy: its centre, sense, size and strength, in px and frames or \
        mm and s, and flags that say what to beware of.";

    fn show(&self) -> String {
        self.eddy.to_string()
    }
}

/// An exact field with four round eddies the examples look at.
macro_rules! with_eddies {
    ($code:literal) => {
        concat!(
            "let flow = shielded_gaussian(#{ x_px: 100, y_px: 80, core_radius_px: 20, peak_vorticity_per_frame: 0.3 }).field(#{ nx: 101, ny: 81, spacing_px: 2 });\n",
            "let found = flow.eddies();\n",
            $code
        )
    };
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<FoundEddies>();
    room.kind::<Found>();
    finding(room);
    place(room);
    size(room);
}

fn finding(room: &mut Room) {
    room.method::<VectorField>("eddies")
        .about("The eddies of the field: cores found from swirling strength, measured and flagged.")
        .words("vortex vortices find detect core circulation diameter")
        .errors("an option makes no sense or the field is smaller than 5 x 5 nodes")
        .source("Zhou, Adrian, Balachandar & Kendall 1999 (swirling strength)")
        .example(with_eddies!("found.len()"), "1")
        .does(
            |flow: &VectorField, options: Optional<EddyOptions>, call: Call| {
                let found = find_eddies(flow, &options.0, &call.task())?;
                Ok::<_, Fault>(FoundEddies(Arc::new(found)))
            },
        );
    room.method::<FoundEddies>("len")
        .about("How many eddies there are.")
        .words("count number size")
        .unit("count")
        .example(with_eddies!("found.len()"), "1")
        .does(|found: &FoundEddies| found.0.list.len());
    room.index::<FoundEddies>()
        .about("The eddy of this number; 0 has the strongest circulation.")
        .words("pick choose one")
        .input("index", "count", "which eddy, from 0; -1 is the weakest")
        .errors("there is no such eddy")
        .example(with_eddies!("found[0].sense"), "\"counter-clockwise\"")
        .does(|found: &FoundEddies, index: i64| {
            if found.0.list.is_empty() {
                return Err(Fault::new("no eddies were found in this field")
                    .hint("`found.len()` tells beforehand"));
            }
            found.pick(index)
        });
    room.property::<FoundEddies>("vorticity")
        .about("The vorticity they were found in.")
        .words("field rotation")
        .unit("1/frame or 1/s")
        .example(with_eddies!("found.vorticity.name"), "\"vorticity\"")
        .does(|found: &FoundEddies| Arc::clone(&found.0.vorticity));
    room.property::<FoundEddies>("swirl")
        .about("The swirling strength they were found in.")
        .words("field core")
        .unit("1/frame or 1/s")
        .example(with_eddies!("found.swirl.unit"), "\"1/frame\"")
        .does(|found: &FoundEddies| Arc::clone(&found.0.swirl));
    room.property::<FoundEddies>("flow")
        .about("The vector field they were found in.")
        .words("velocity")
        .unit("px/frame or mm/s")
        .example(with_eddies!("found.flow.unit"), "\"px/frame\"")
        .does(|found: &FoundEddies| Arc::clone(&found.0.field));
}

fn place(room: &mut Room) {
    room.property::<Found>("index")
        .about("Its number among the eddies of its field; 0 has the strongest circulation.")
        .words("number rank")
        .unit("count")
        .example(with_eddies!("found[0].index"), "0")
        .does(|e: &Found| e.eddy.index);
    room.property::<Found>("x")
        .about("x of the centre: where the vorticity is strongest.")
        .words("position centre core")
        .unit("px or mm")
        .example(with_eddies!("found[0].x"), "100 ± ? px")
        .does(|e: &Found| e.eddy.x.clone());
    room.property::<Found>("y")
        .about("y of the centre, upwards.")
        .words("position centre core")
        .unit("px or mm")
        .example(with_eddies!("found[0].y"), "80 ± ? px")
        .does(|e: &Found| e.eddy.y.clone());
    room.property::<Found>("sense")
        .about("Sense of rotation: \"counter-clockwise\" or \"clockwise\".")
        .words("direction rotation sign")
        .example(with_eddies!("found[0].sense"), "\"counter-clockwise\"")
        .does(|e: &Found| e.eddy.sense.text());
    room.property::<Found>("flags")
        .about("What to beware of, as a list of texts; empty when there is nothing.")
        .words("warning doubt quality cut edge resolved")
        .example(with_eddies!("found[0].flags"), "[]")
        .does(|e: &Found| {
            e.eddy
                .flags
                .iter()
                .map(|flag| flag.text())
                .collect::<Vec<_>>()
        });
    room.method::<Found>("flags_by")
        .about("What to beware of in the size and circulation by one method, as a list of texts.")
        .words("warning doubt quality cut edge resolved")
        .input(
            "method",
            "",
            "\"vorticity_fraction\" or \"largest_circulation\"",
        )
        .errors("there is no such method")
        .example(
            with_eddies!("found[0].flags_by(\"vorticity_fraction\")"),
            "[]",
        )
        .does(|e: &Found, name: String| {
            let flags = e.eddy.flags_of(method(&name)?);
            Ok::<_, Fault>(flags.map(|flag| flag.text()).collect::<Vec<_>>())
        });
    room.property::<Found>("outline")
        .about("The boundary by vorticity fraction, as a list of corners [x, y].")
        .words("boundary contour polygon shape")
        .unit("px or mm")
        .example(with_eddies!("found[0].outline.len() > 20"), "true")
        .does(|e: &Found| {
            let corners = e.eddy.outline.iter();
            corners.map(|corner| corner.to_vec()).collect::<Vec<_>>()
        });
}

fn size(room: &mut Room) {
    room.property::<Found>("peak_vorticity")
        .about("Vorticity at the centre, with its sign.")
        .words("strength maximum rotation")
        .unit("1/frame or 1/s")
        .example(with_eddies!("found[0].peak_vorticity"), "0.301 ± ? 1/frame")
        .does(|e: &Found| e.eddy.peak_vorticity.clone());
    room.property::<Found>("circulation")
        .about("Circulation inside the boundary by vorticity fraction, with its sign.")
        .words("strength gamma integral")
        .unit("px²/frame or mm²/s")
        .example(with_eddies!("found[0].circulation.unit"), "\"px²/frame\"")
        .does(|e: &Found| e.eddy.circulation.clone());
    room.property::<Found>("diameter")
        .about(
            "Diameter of the circle with the area of the region whose vorticity is above a \
             fraction (0.25 unless asked otherwise) of the peak.",
        )
        .words("size width extent")
        .unit("px or mm")
        .example(with_eddies!("found[0].diameter.unit"), "\"px\"")
        .does(|e: &Found| e.eddy.diameter.clone());
    room.method::<Found>("diameter_by")
        .about("The diameter by a method: \"vorticity_fraction\" or \"largest_circulation\".")
        .words("size width extent boundary")
        .input("method", "", "one of these two words")
        .unit("px or mm")
        .errors("the method has no answer for this eddy, and then it says why")
        .example(
            with_eddies!("decimals(found[0].diameter_by(\"largest_circulation\").value, 0)"),
            "\"40\"",
        )
        .does(|e: &Found, name: String| Ok::<Measured, Fault>(e.eddy.diameter_by(method(&name)?)?));
    room.method::<Found>("circulation_by")
        .about("The circulation inside the boundary of a method: \"vorticity_fraction\" or \"largest_circulation\".")
        .words("strength gamma integral boundary")
        .input("method", "", "one of these two words")
        .unit("px²/frame or mm²/s")
        .errors("the method has no answer for this eddy, and then it says why")
        .example(with_eddies!("found[0].circulation_by(\"largest_circulation\").unit"), "\"px²/frame\"")
        .does(|e: &Found, name: String| {
            Ok::<Measured, Fault>(e.eddy.circulation_by(method(&name)?)?)
        });
}

fn method(name: &str) -> Result<Method, Fault> {
    let known = Method::ALL.map(Method::text);
    Method::parse(name).ok_or_else(|| unknown_word("method", name, &known))
}
