//! What explains the plot: the colour bar, the reference arrow and the key of signs, in a column
//! beside it; the legend of curves, in lines over it.

use super::arrows::{Fitted, add_arrow, draw_measured, draw_replaced};
use super::colour::{INK, MUTED};
use super::curve::{Look, SAMPLE_MM, draw_sample};
use super::font::CAPITAL;
use super::layout::{LABEL_MM, NUMBER_MM};
use super::outlines::draw_line;
use super::scene::{Anchor, Item, Path, Rect, Scene, Stroke, Style};
use super::shade::{Shading, hatched};
use super::ticks::{ten_to, with_minus};
use crate::quantity::{Unit, plain_number};

/// Width of the colour bar.
const BAR_MM: f64 = 3.4;
/// Least length of the colour bar.
const LEAST_BAR_MM: f64 = 22.0;
/// Height of one line of the key.
const LINE_MM: f64 = 4.4;
/// Width of a sign in the key, and the gap after it.
const SIGN_MM: f64 = 6.5;
const GAP_MM: f64 = 1.4;

/// The column beside the plot.
#[derive(Default)]
pub(crate) struct Key {
    /// The shading and the unit of its values.
    pub bar: Option<(Shading, Unit)>,
    /// Speed of the reference arrow and its unit.
    pub reference: Option<(f64, Unit)>,
    /// Some vectors drawn are replacements.
    pub replaced: bool,
    /// Some outlines are in doubt.
    pub doubtful: bool,
}

/// `name (unit)`, `name (×10³ unit)`, `name`.
pub(crate) fn with_unit(name: &str, unit: Unit, exponent: i32) -> String {
    let unit = unit.to_string();
    let inside = match (exponent, unit.is_empty()) {
        (0, true) => return name.to_owned(),
        (0, false) => unit,
        (e, true) => format!("×{}", ten_to(e)),
        (e, false) => format!("×{} {unit}", ten_to(e)),
    };
    if name.is_empty() {
        inside
    } else {
        format!("{name} ({inside})")
    }
}

/// `1.7×10⁻⁹`, `20`, `−0.5`: a number in running words.
fn in_words(value: f64) -> String {
    let text = plain_number(value, 3);
    match text.split_once('e') {
        Some((digits, power)) => match power.parse() {
            Ok(power) => format!("{}×{}", with_minus(digits), ten_to(power)),
            Err(_) => text.clone(),
        },
        None => with_minus(&text),
    }
}

impl Key {
    fn reference_text(&self) -> Option<String> {
        self.reference.map(|(speed, unit)| {
            let unit = unit.to_string();
            format!("{} {unit}", in_words(speed)).trim_end().to_owned()
        })
    }

    fn signs(&self) -> Vec<&'static str> {
        let gaps = self.bar.as_ref().is_some_and(|(s, _)| s.gaps);
        [
            (self.replaced, "replaced"),
            (self.doubtful, "flagged"),
            (gaps, "no value"),
        ]
        .into_iter()
        .filter_map(|(there, words)| there.then_some(words))
        .collect()
    }

    fn numbers(&self, bar_mm: f64) -> (Vec<(f64, String)>, i32) {
        let Some((shading, _)) = &self.bar else {
            return (Vec::new(), 0);
        };
        let ticks = shading.bar.ticks((bar_mm / 8.0).max(3.0));
        let (lo, hi) = (shading.bar.lo, shading.bar.hi);
        let near = 3.2 / bar_mm * (hi - lo);
        let mut major = ticks.major;
        let scale = 10f64.powi(ticks.exponent);
        let end = |sign: &str, v: f64| (v, format!("{sign} {}", in_words(v / scale)));
        if shading.beyond.0 {
            major.retain(|(v, _)| v - lo > near);
            major.insert(0, end("≤", lo));
        }
        if shading.beyond.1 {
            major.retain(|(v, _)| hi - v > near);
            major.push(end("≥", hi));
        }
        (major, ticks.exponent)
    }

    fn bar_label(&self, exponent: i32) -> String {
        self.bar.as_ref().map_or(String::new(), |(s, unit)| {
            with_unit(&s.label, *unit, exponent)
        })
    }

    /// Width of the column; 0 when there is nothing to explain.
    pub fn width(&self) -> f64 {
        let (label, number) = (Style::plain(LABEL_MM), Style::plain(NUMBER_MM));
        let (numbers, exponent) = self.numbers(60.0);
        let widest = numbers
            .iter()
            .map(|(_, t)| number.width(t))
            .fold(0.0, f64::max);
        let mut width: f64 = 0.0;
        if self.bar.is_some() {
            width = label
                .width(&self.bar_label(exponent))
                .max(BAR_MM + 1.8 + widest);
        }
        if let Some(text) = self.reference_text() {
            width = width.max(number.width(&text)).max(SIGN_MM);
        }
        for words in self.signs() {
            width = width.max(SIGN_MM + GAP_MM + number.width(words));
        }
        width
    }

    fn height_below_bar(&self) -> f64 {
        let reference = if self.reference.is_some() {
            2.0 * LINE_MM
        } else {
            0.0
        };
        let signs = self.signs().len() as f64 * LINE_MM;
        if reference + signs > 0.0 {
            2.0 + reference + signs
        } else {
            0.0
        }
    }

    /// Least height of the column.
    pub fn least_height(&self) -> f64 {
        let bar = if self.bar.is_some() {
            LEAST_BAR_MM
        } else {
            0.0
        };
        bar + self.height_below_bar()
    }

    /// Draws the column from (`x`, `y`) down, `height` high; the bar's label stands over `y`.
    pub fn draw(
        &self,
        scene: &mut Scene,
        [x, y]: [f64; 2],
        height: f64,
        arrows: Option<Fitted>,
        dots_per_mm: f64,
    ) {
        let mut y = y;
        if let Some((shading, _)) = &self.bar {
            let length = (height - self.height_below_bar()).clamp(LEAST_BAR_MM, 90.0);
            let rect = Rect {
                x,
                y,
                w: BAR_MM,
                h: length,
            };
            self.draw_bar(scene, shading, rect);
            y = rect.bottom() + 2.0;
        }
        let number = Style::plain(NUMBER_MM);
        let middle = |y: f64| y + 0.5 * LINE_MM;
        let base = |y: f64| middle(y) + 0.5 * CAPITAL * NUMBER_MM;
        if let (Some((speed, _)), Some(text), Some(fit)) =
            (self.reference, self.reference_text(), arrows)
        {
            let length = fit.length(speed);
            let mut path = Path::new();
            add_arrow(&mut path, [x + 0.5 * length, middle(y)], [length, 0.0]);
            draw_measured(scene, path);
            scene.text([x, base(y + LINE_MM) - 0.6], &text, number);
            y += 2.0 * LINE_MM;
        }
        for words in self.signs() {
            self.draw_sign(scene, words, [x, middle(y)], dots_per_mm);
            scene.text([x + SIGN_MM + GAP_MM, base(y)], words, number);
            y += LINE_MM;
        }
    }

    fn draw_bar(&self, scene: &mut Scene, shading: &Shading, rect: Rect) {
        const STEPS: usize = 160;
        for k in 0..STEPS {
            // Each strip reaches to the foot, under the ones that follow, so no seam shows.
            let y = rect.y + rect.h * k as f64 / STEPS as f64;
            let strip = Rect {
                y,
                h: rect.bottom() - y,
                ..rect
            };
            let t = 1.0 - (k as f64 + 0.5) / STEPS as f64;
            scene.fill(Path::rect(strip), shading.scale.at(t));
        }
        scene.stroke(Path::rect(rect), Stroke::new(INK, 0.18));
        let (numbers, exponent) = self.numbers(rect.h);
        let style = Style::plain(NUMBER_MM);
        let mut marks = Path::new();
        for (value, text) in numbers {
            let y = rect.bottom() - shading.bar.fraction(value) * rect.h;
            marks.add(
                &Path::segment([rect.right() - 0.6, y], [rect.right() + 0.8, y]),
                |p| p,
            );
            let base = y + 0.5 * CAPITAL * NUMBER_MM;
            scene.text([rect.right() + 1.7, base], &text, style);
        }
        scene.stroke(marks, Stroke::new(INK, 0.18));
        let label = self.bar_label(exponent);
        scene.text([rect.x, rect.y - 2.0], &label, Style::plain(LABEL_MM));
    }

    fn draw_sign(&self, scene: &mut Scene, words: &str, [x, y]: [f64; 2], dots_per_mm: f64) {
        let line = Path::segment([x, y], [x + SIGN_MM, y]);
        match (words, &self.bar) {
            ("replaced", _) => {
                let mut path = Path::new();
                add_arrow(&mut path, [x + 0.5 * SIGN_MM, y], [SIGN_MM - 1.0, 0.0]);
                draw_replaced(scene, path);
            }
            ("flagged", _) => draw_line(scene, line, true),
            (_, Some((shading, _))) => {
                let rect = Rect {
                    x,
                    y: y - 1.4,
                    w: SIGN_MM,
                    h: 2.8,
                };
                let dots = hatched(&rect, shading, dots_per_mm);
                scene.items.push(Item::Dots { rect, dots });
                scene.stroke(Path::rect(rect), Stroke::new(MUTED, 0.13));
            }
            _ => {}
        }
    }
}

/// The legend: samples and names in lines no wider than `width`, the first one's middle `LINE_MM`
/// / 2 below the origin. Gives each entry's place and the number of lines.
pub(crate) struct Legend<'a> {
    pub entries: Vec<(Look, &'a str)>,
}

impl Legend<'_> {
    fn places(&self, width: f64) -> (Vec<[f64; 2]>, usize) {
        let style = Style::plain(NUMBER_MM);
        let (mut x, mut line) = (0.0, 0);
        let mut places = Vec::new();
        for (_, name) in &self.entries {
            let entry = SAMPLE_MM + GAP_MM + style.width(name);
            if x > 0.0 && x + entry > width {
                (x, line) = (0.0, line + 1);
            }
            places.push([x, line as f64 * LINE_MM]);
            x += entry + 5.0;
        }
        (places, if self.entries.is_empty() { 0 } else { line + 1 })
    }

    /// Height of all lines.
    pub fn height(&self, width: f64) -> f64 {
        self.places(width).1 as f64 * LINE_MM
    }

    pub fn draw(&self, scene: &mut Scene, [x, y]: [f64; 2], width: f64) {
        let (places, _) = self.places(width);
        for (index, ((look, name), place)) in self.entries.iter().zip(places).enumerate() {
            let at = [x + place[0], y + place[1] + 0.5 * LINE_MM];
            draw_sample(scene, at, index, *look);
            let base = [
                at[0] + SAMPLE_MM + GAP_MM,
                at[1] + 0.5 * CAPITAL * NUMBER_MM,
            ];
            scene.text(base, name, Style::plain(NUMBER_MM).anchored(Anchor::Start));
        }
    }
}
