//! Masks, and what they hide of pairs and recordings.

use std::sync::Arc;

use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::Kind;
use super::super::number::number_text;
use super::super::options::Needed;
use crate::frames::{BrightOptions, Frame, Mask, MaskUnit, Pair, Recording, Scale};
use crate::store::write_tiff;

crate::option_keys! {
    BrightOptions {
        above: "number", "grey level", "needed",
            "Grey level that a bright pixel passes, 0 to 65535.";
        grow_px: "number", "px", "3.0",
            "How far past the bright pixels is hidden, 0 to 100.";
        least_area_px2: "number", "px²", "100.0",
            "Area of the smallest patch of bright pixels that is hidden; smaller ones are particle images.";
    }
}

impl Kind for Mask {
    const NAME: &'static str = "mask";
    const ABOUT: &'static str = "Which pixels of an exposure are hidden: polygons, circles, \
        rectangles, images, bright patches, several of these, or all but these. Coordinates are in \
        mm where the recording has a calibration and in px where it has none, x right, y up, from \
        the centre of the bottom-left pixel; \"px\" as the last value of a shape makes them px \
        whatever the calibration.";

    fn show(&self) -> String {
        format!("mask: {self}")
    }
}

fn unit(text: Option<String>) -> Result<MaskUnit, Fault> {
    let Some(text) = text else {
        return Ok(MaskUnit::default());
    };
    MaskUnit::parse(&text).ok_or_else(|| {
        Fault::new(format!(
            "the unit of a mask is \"px\" or \"mm\", not \"{text}\""
        ))
        .hint("left out, it is mm for a recording with a calibration and px for one without")
    })
}

/// The unit a mask may be given in, as the last parameter.
const UNIT: &str = "\"px\" or \"mm\"; left out, the recording's: mm with a calibration, else px";

macro_rules! with_a_pair {
    ($code:literal) => {
        concat!(
            "let p = uniform(#{ u_px_per_frame: 1, v_px_per_frame: 0 }).pair(#{ width_px: 80, height_px: 50 });\n",
            $code
        )
    };
}

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Mask>();
    shapes(room);
    images(room);
    together(room);
    hiding(room);
    looking(room);
}

fn shapes(room: &mut Room) {
    room.function("mask_polygon")
        .about("The mask that hides the inside of a polygon, and its sides.")
        .words("hide exclude region area outline body wall")
        .input(
            "corners",
            "the recording's length unit",
            "corners in their order round it",
        )
        .input("unit", "", UNIT)
        .errors("there are fewer than 3 corners or more than 10000, sides cross, or it has no area")
        .example(
            "mask_polygon([[0, 0], [40, 0], [0, 30]])",
            "mask: polygon of 3 corners, x 0 to 40, y 0 to 30",
        )
        .does(|corners: Vec<(f64, f64)>, given: Option<String>| {
            let corners = corners.into_iter().map(|(x, y)| [x, y]).collect();
            Ok::<_, Fault>(Mask::polygon(corners, unit(given)?)?)
        });
    room.function("mask_circle")
        .about("The mask that hides the inside of a circle, and the circle.")
        .words("hide exclude region disc round cylinder")
        .input(
            "x",
            "the recording's length unit",
            "its centre, to the right",
        )
        .input("y", "the recording's length unit", "its centre, upwards")
        .input("radius", "the recording's length unit", "its radius")
        .input("unit", "", UNIT)
        .errors("the centre is not finite, or the radius not above 0")
        .example(
            "mask_circle(30, 20, 8, \"px\")",
            "mask: circle about (30, 20) of radius 8 px",
        )
        .does(|x: f64, y: f64, radius: f64, given: Option<String>| {
            Ok::<_, Fault>(Mask::circle([x, y], radius, unit(given)?)?)
        });
    room.function("mask_rectangle")
        .about("The mask that hides a rectangle with sides along x and y, the sides included.")
        .words("hide exclude region box crop wall")
        .input("from", "the recording's length unit", "one corner")
        .input("to", "the recording's length unit", "the corner opposite")
        .input("unit", "", UNIT)
        .errors("a corner is not finite, or the rectangle has no area")
        .example(
            "mask_rectangle([0, 0], [79, 9])",
            "mask: rectangle, x 0 to 79, y 0 to 9",
        )
        .does(|from: (f64, f64), to: (f64, f64), given: Option<String>| {
            let (from, to) = ([from.0, from.1], [to.0, to.1]);
            Ok::<_, Fault>(Mask::rectangle(from, to, unit(given)?)?)
        });
}

fn images(room: &mut Room) {
    room.function("mask_image")
        .about(
            "The mask drawn in an image file, grey TIFF or PNG of the size of one exposure: every \
             pixel that is not black is hidden.",
        )
        .words("hide exclude file png tiff drawn painted")
        .input("file", "", "file name")
        .errors("the file cannot be read or holds several images")
        .example(
            with_a_pair!(
                "p.hide(mask_circle(40, 25, 10)).save_hidden(\"a.tif\", \"b.tif\");\nmask_image(\"out/a.tif\")"
            ),
            "mask: image of 80 x 50 px",
        )
        .does(|file: String, call: Call| {
            let path = call.existing(&file)?;
            Ok::<_, Fault>(Mask::image(&path)?)
        });
    room.function("mask_bright")
        .about(
            "The mask that hides what is too bright and too large to be particle images, in each \
             exposure by itself: reflections, walls in the light, moving bodies. Bright pixels \
             that touch side by side make a patch; patches below the least area stay, the others \
             are hidden and grown.",
        )
        .words("hide exclude threshold reflection glare saturated moving body grey level")
        .errors("an option is out of its range")
        .example(
            "mask_bright(#{ above: 3000, grow_px: 4 })",
            "mask: brighter than 3000, patches below 100 px² left out, grown by 4 px",
        )
        .does(|options: Needed<BrightOptions>| Mask::bright(options.0));
}

fn together(room: &mut Room) {
    let about = "The mask that hides what either of two masks hides.";
    let words = "both together add combine or several";
    room.operator::<Mask>("+")
        .about(about)
        .words(words)
        .input("other", "", "the other mask")
        .errors("there are more than 1000 parts in all")
        .example(
            with_a_pair!(
                "p.hide(mask_rectangle([0, 0], [79, 9]) + mask_rectangle([0, 5], [79, 14])).hidden_share()"
            ),
            "0.3",
        )
        .does(|mask: &Mask, other: Arc<Mask>| mask.union(&other));
    room.method::<Mask>("union")
        .about(about)
        .words(words)
        .input("other", "", "the other mask")
        .errors("there are more than 1000 parts in all")
        .example(
            "mask_circle(9, 9, 4).union(mask_circle(30, 9, 4))",
            "mask: circle about (9, 9) of radius 4; and circle about (30, 9) of radius 4",
        )
        .does(|mask: &Mask, other: Arc<Mask>| mask.union(&other));
    room.method::<Mask>("inverse")
        .about("The mask that hides everything this one does not: all outside a polygon, say.")
        .words("outside complement not keep only invert")
        .example(
            with_a_pair!("p.hide(mask_rectangle([0, 0], [79, 9]).inverse()).hidden_share()"),
            "0.8",
        )
        .does(|mask: &Mask| mask.inverse());
}

/// Says so where shapes lie beside the exposures: with a calibration nearly always px given as mm.
fn note_a_miss(mask: &Mask, size: (usize, usize), scale: Scale, call: &Call) {
    if mask.misses(size, &scale) {
        let (unit, factor) = scale.length();
        let side = |pixels: usize| number_text(pixels.saturating_sub(1) as f64 * factor);
        let hint = match scale.mm_per_px {
            Some(_) => "; coordinates in px need \"px\" as the last value",
            None => "",
        };
        let note = format!(
            "the mask ({mask}) hides nothing: the exposures cover x 0 to {} and y 0 to {} {unit}{hint}",
            side(size.0),
            side(size.1)
        );
        call.session().note(&note, &note);
    }
}

fn hiding(room: &mut Room) {
    room.method::<Pair>("hide")
        .about(
            "The pair with pixels hidden, beside those hidden already: interrogation does not look \
             at them. A second mask, where one is given, is for the second exposure, as for a body \
             that moves in between.",
        )
        .words("mask exclude ignore region reflection wall body")
        .input("mask", "", "what hides pixels of both exposures, or of the first")
        .input("in_second", "", "what hides pixels of the second; left out, the same")
        .errors("a mask image has another size, or a mask in mm meets a pair without calibration")
        .example(
            with_a_pair!("p.hide(mask_circle(40, 25, 10))"),
            "pair 0: synthetic pair, 80 x 50 px; in px and frames; masked",
        )
        .example(
            with_a_pair!(
                "p.hide(mask_circle(40, 25, 9), mask_circle(43, 25, 9)).interrogate(plan(#{ windows_px: [16], overlap: 0.5 })).status_count(\"masked\")"
            ),
            "3",
        )
        .does(
            |pair: &Pair, mask: Arc<Mask>, in_second: Option<Arc<Mask>>, call: Call| {
                let in_second = in_second.unwrap_or_else(|| Arc::clone(&mask));
                for mask in [&mask, &in_second] {
                    note_a_miss(mask, pair.size(), pair.scale(), &call);
                }
                Ok::<_, Fault>(pair.hide_each(&mask, &in_second)?)
            },
        );
    room.method::<Recording>("hide")
        .about("The recording with pixels hidden in every exposure, beside those hidden already.")
        .words("mask exclude ignore region reflection wall body")
        .input("mask", "", "what hides them")
        .errors(
            "a mask image has another size, or a mask in mm meets a recording without calibration",
        )
        .example(
            with_a_pair!("recording([p, p]).hide(mask_bright(#{ above: 3500 }))"),
            "recording, 2 pairs of 80 x 50 px; in px and frames; masked",
        )
        .does(|recording: &Recording, mask: Arc<Mask>, call: Call| {
            note_a_miss(
                &mask,
                recording.size().unwrap_or_default(),
                recording.scale(),
                &call,
            );
            recording.hide(&mask).map_err(Fault::from)
        });
}

fn looking(room: &mut Room) {
    room.method::<Pair>("hidden_share")
        .about("The share of the pixels that are hidden in one exposure or the other.")
        .words("masked fraction area part percent")
        .unit("fraction")
        .errors("a frame cannot be read")
        .example(
            with_a_pair!("p.hide(mask_rectangle([0, 0], [39, 49])).hidden_share()"),
            "0.5",
        )
        .does(|pair: &Pair| Ok::<_, Fault>(pair.hidden_share()?));
    room.method::<Pair>("save_hidden")
        .about(
            "Writes which pixels are hidden as two 8-bit grey TIFF files, white where hidden: to \
             look at, or for `mask_image`.",
        )
        .words("mask show look view write file tiff export image")
        .input("first", "", "file name for the first exposure")
        .input("second", "", "file name for the second")
        .errors("a frame cannot be read, or a file cannot be written")
        .example(
            with_a_pair!(
                "p.hide(mask_bright(#{ above: 900, least_area_px2: 40 })).save_hidden(\"a.tif\", \"b.tif\")"
            ),
            "",
        )
        .does(|pair: &Pair, first: String, second: String, call: Call| {
            let (a, b) = pair.load()?;
            for (hidden, name) in pair.hidden(&a, &b)?.into_iter().zip([first, second]) {
                let shape = a.pixels.dim();
                let white = |at| hidden.as_ref().is_some_and(|hidden| hidden[at]);
                let level = |at| if white(at) { 255.0 } else { 0.0 };
                let pixels = ndarray::Array2::from_shape_fn(shape, level);
                call.write(&name, |path| write_tiff(path, &Frame { pixels, bits: 8 }))?;
            }
            Ok::<_, Fault>(())
        });
}
