//! The embedded typeface: words to outlines.
//!
//! Words are drawn as outlines, so a figure looks the same on a machine without the typeface. A
//! character the typeface lacks is drawn as its empty box.

use std::sync::LazyLock;

use ttf_parser::gpos::{PairAdjustment, PositioningSubtable};
use ttf_parser::{Face, GlyphId, OutlineBuilder};

use super::scene::Path;

/// The two cuts carried along.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Weight {
    Regular,
    Medium,
}

/// Height of a capital letter as a fraction of the size.
pub(crate) const CAPITAL: f64 = 0.689;

static REGULAR: LazyLock<Option<Face<'static>>> = LazyLock::new(|| {
    Face::parse(include_bytes!("../../assets/fonts/FiraSans-Regular.ttf"), 0).ok()
});
static MEDIUM: LazyLock<Option<Face<'static>>> =
    LazyLock::new(|| Face::parse(include_bytes!("../../assets/fonts/FiraSans-Medium.ttf"), 0).ok());

/// `None` only if the embedded bytes were damaged, which a test rules out.
fn face(weight: Weight) -> Option<&'static Face<'static>> {
    match weight {
        Weight::Regular => REGULAR.as_ref(),
        Weight::Medium => MEDIUM.as_ref(),
    }
}

/// A character as the typeface has it, and whether it is to be turned upside down.
fn glyph(face: &Face, character: char) -> (GlyphId, bool) {
    // The typeface has no nabla; its delta is one, turned over.
    let (character, upside_down) = match character {
        '∇' => ('Δ', true),
        other => (other, false),
    };
    let id = face.glyph_index(character).unwrap_or(GlyphId(0));
    (id, upside_down)
}

/// How much closer (negative) or wider two neighbours stand, in font units.
fn kerning(face: &Face, left: GlyphId, right: GlyphId) -> i32 {
    let Some(gpos) = face.tables().gpos else {
        return 0;
    };
    for lookup in gpos.lookups {
        for subtable in lookup.subtables.into_iter::<PositioningSubtable>() {
            let PositioningSubtable::Pair(pair) = subtable else {
                continue;
            };
            let Some(index) = pair.coverage().get(left) else {
                continue;
            };
            let value = match pair {
                PairAdjustment::Format1 { sets, .. } => {
                    sets.get(index).and_then(|set| set.get(right))
                }
                PairAdjustment::Format2 {
                    classes, matrix, ..
                } => matrix.get((classes.0.get(left), classes.1.get(right))),
            };
            if let Some((first, _)) = value {
                return i32::from(first.x_advance);
            }
        }
    }
    0
}

/// The glyphs of `text` with their places, and the whole width; in em.
fn set(face: &Face, text: &str) -> (Vec<(GlyphId, bool, f64)>, f64) {
    let em = f64::from(face.units_per_em());
    let mut pen = 0.0;
    let mut glyphs: Vec<(GlyphId, bool, f64)> = Vec::new();
    for character in text.chars() {
        let (id, upside_down) = glyph(face, character);
        if let Some((before, _, _)) = glyphs.last() {
            pen += f64::from(kerning(face, *before, id)) / em;
        }
        glyphs.push((id, upside_down, pen));
        pen += f64::from(face.glyph_hor_advance(id).unwrap_or(0)) / em;
    }
    (glyphs, pen)
}

/// Width of `text` in em.
pub(crate) fn width(text: &str, weight: Weight) -> f64 {
    face(weight).map_or(0.0, |face| set(face, text).1)
}

/// The outline of `text` in em from the start of its base line, y up, and its width.
pub(crate) fn outline(text: &str, weight: Weight) -> (Path, f64) {
    let mut path = Path::new();
    let Some(face) = face(weight) else {
        return (path, 0.0);
    };
    let (glyphs, width) = set(face, text);
    let em = f64::from(face.units_per_em());
    for (id, upside_down, pen) in glyphs {
        let mut pen = Pen {
            path: &mut path,
            x: pen,
            scale: 1.0 / em,
            upside_down,
        };
        face.outline_glyph(id, &mut pen);
    }
    (path, width)
}

struct Pen<'a> {
    path: &'a mut Path,
    x: f64,
    scale: f64,
    upside_down: bool,
}

impl Pen<'_> {
    fn at(&self, x: f32, y: f32) -> [f64; 2] {
        let y = f64::from(y) * self.scale;
        let y = if self.upside_down { CAPITAL - y } else { y };
        [self.x + f64::from(x) * self.scale, y]
    }
}

impl OutlineBuilder for Pen<'_> {
    fn move_to(&mut self, x: f32, y: f32) {
        self.path.move_to(self.at(x, y));
    }

    fn line_to(&mut self, x: f32, y: f32) {
        self.path.line_to(self.at(x, y));
    }

    fn quad_to(&mut self, x1: f32, y1: f32, x: f32, y: f32) {
        self.path.quad_to(self.at(x1, y1), self.at(x, y));
    }

    fn curve_to(&mut self, x1: f32, y1: f32, x2: f32, y2: f32, x: f32, y: f32) {
        self.path
            .cubic_to(self.at(x1, y1), self.at(x2, y2), self.at(x, y));
    }

    fn close(&mut self) {
        self.path.close();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_typeface_has_what_the_trade_writes() {
        let needed = "αβγδεζηθικλμνξοπρστυφχψωΓΔΘΛΞΠΣΦΨΩ∇∂⁰¹²³⁴⁵⁶⁷⁸⁹⁻±−°µ×·…√∞≈≤≥–—";
        for weight in [Weight::Regular, Weight::Medium] {
            let face = face(weight).expect("the embedded bytes are a font");
            for c in needed.chars() {
                assert_ne!(glyph(face, c).0, GlyphId(0), "{c} is missing");
            }
        }
    }

    #[test]
    fn kerning_pulls_a_slanting_pair_together() {
        let apart = width("A", Weight::Regular) + width("V", Weight::Regular);
        assert!(width("AV", Weight::Regular) < apart);
    }

    #[test]
    fn the_nabla_stands_on_its_point() {
        let (path, _) = outline("∇", Weight::Regular);
        let (mut low, mut high) = (f64::MAX, f64::MIN);
        for step in path.steps {
            if let super::super::scene::Step::Move(p) | super::super::scene::Step::Line(p) = step {
                low = low.min(p[1]);
                high = high.max(p[1]);
            }
        }
        assert!(
            low.abs() < 0.01 && (high - CAPITAL).abs() < 0.01,
            "{low} {high}"
        );
    }
}
