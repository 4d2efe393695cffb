//! A scene as SVG 1.1 (W3C): sized in mm, every coordinate in mm to a thousandth.

use std::fmt::Write;

use super::colour::Colour;
use super::error::FigureError;
use super::raster::indexed_png;
use super::scene::{Item, Path, Rect, Scene, Step, Stroke};

/// The scene as one SVG document titled `title`.
pub(crate) fn write(scene: &Scene, title: &str) -> Result<String, FigureError> {
    let (w, h) = (number(scene.width), number(scene.height));
    let mut out = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" xmlns:xlink=\"http://www.w3.org/1999/xlink\" \
         version=\"1.1\" width=\"{w}mm\" height=\"{h}mm\" viewBox=\"0 0 {w} {h}\" role=\"img\">\n\
         <title>{}</title>\n<rect width=\"{w}\" height=\"{h}\" fill=\"#ffffff\"/>\n",
        escaped(title)
    );
    let mut clips = 0;
    write_items(&mut out, &scene.items, &mut clips)?;
    out.push_str("</svg>\n");
    Ok(out)
}

fn write_items(out: &mut String, items: &[Item], clips: &mut usize) -> Result<(), FigureError> {
    for item in items {
        match item {
            Item::Shape {
                path,
                fill,
                stroke,
                label,
            } => {
                out.push_str("<path");
                if let Some(label) = label {
                    push(out, "aria-label", &escaped(label));
                }
                write_fill(out, *fill);
                if let Some(stroke) = stroke {
                    write_stroke(out, stroke);
                }
                push(out, "d", &path_data(path));
                out.push_str("/>\n");
            }
            Item::Dots { rect, dots } => {
                out.push_str("<image preserveAspectRatio=\"none\"");
                write_rect(out, *rect);
                let data = base64(&indexed_png(dots)?);
                push(out, "xlink:href", &format!("data:image/png;base64,{data}"));
                out.push_str("/>\n");
            }
            Item::Clip { rect, items } => {
                *clips += 1;
                let id = format!("cut{clips}");
                out.push_str("<clipPath");
                push(out, "id", &id);
                out.push_str("><rect");
                write_rect(out, *rect);
                out.push_str("/></clipPath>\n<g");
                push(out, "clip-path", &format!("url(#{id})"));
                out.push_str(">\n");
                write_items(out, items, clips)?;
                out.push_str("</g>\n");
            }
        }
    }
    Ok(())
}

fn push(out: &mut String, name: &str, value: &str) {
    // Writing to a String cannot fail.
    let _ = write!(out, " {name}=\"{value}\"");
}

fn write_rect(out: &mut String, rect: Rect) {
    push(out, "x", &number(rect.x));
    push(out, "y", &number(rect.y));
    push(out, "width", &number(rect.w));
    push(out, "height", &number(rect.h));
}

fn opacity(out: &mut String, name: &str, colour: Colour) {
    if colour.a < 255 {
        push(out, name, &number(f64::from(colour.a) / 255.0));
    }
}

fn write_fill(out: &mut String, fill: Option<Colour>) {
    match fill {
        None => push(out, "fill", "none"),
        Some(colour) => {
            push(out, "fill", &colour.hex());
            opacity(out, "fill-opacity", colour);
        }
    }
}

fn write_stroke(out: &mut String, stroke: &Stroke) {
    push(out, "stroke", &stroke.colour.hex());
    opacity(out, "stroke-opacity", stroke.colour);
    push(out, "stroke-width", &number(stroke.width));
    if stroke.round {
        push(out, "stroke-linejoin", "round");
        push(out, "stroke-linecap", "round");
    }
    if !stroke.dash.is_empty() {
        let dash: Vec<String> = stroke.dash.iter().map(|d| number(*d)).collect();
        push(out, "stroke-dasharray", &dash.join(" "));
    }
}

fn path_data(path: &Path) -> String {
    let mut out = String::new();
    for step in &path.steps {
        let (letter, points): (char, &[[f64; 2]]) = match step {
            Step::Move(p) => ('M', &[*p]),
            Step::Line(p) => ('L', &[*p]),
            Step::Quad(a, p) => ('Q', &[*a, *p]),
            Step::Cubic(a, b, p) => ('C', &[*a, *b, *p]),
            Step::Close => ('Z', &[]),
        };
        out.push(letter);
        for (k, p) in points.iter().enumerate() {
            if k > 0 {
                out.push(' ');
            }
            out.push_str(&number(p[0]));
            out.push(' ');
            out.push_str(&number(p[1]));
        }
    }
    out
}

/// To a thousandth, without trailing zeros and without −0.
fn number(value: f64) -> String {
    let text = format!("{value:.3}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0" } else { text }.to_owned()
}

/// Text fit for XML 1.0: markup escaped, characters XML forbids left out.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            '"' => out.push_str("&quot;"),
            '\n' | '\t' | '\r' => out.push(' '),
            c if c < ' ' || matches!(c, '\u{fffe}' | '\u{ffff}') => {}
            c => out.push(c),
        }
    }
    out
}

/// RFC 4648, section 4.
fn base64(bytes: &[u8]) -> String {
    const DIGITS: &[u8; 64] = b"ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    let mut out = String::with_capacity(bytes.len().div_ceil(3) * 4);
    for chunk in bytes.chunks(3) {
        let byte = |k: usize| u32::from(chunk.get(k).copied().unwrap_or(0));
        let word = byte(0) << 16 | byte(1) << 8 | byte(2);
        for k in 0..4 {
            if k <= chunk.len() {
                out.push(char::from(DIGITS[(word >> (18 - 6 * k) & 63) as usize]));
            } else {
                out.push('=');
            }
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn base64_follows_the_standard_s_own_examples() {
        // RFC 4648, section 10 (from memory).
        for (text, code) in [
            ("", ""),
            ("f", "Zg=="),
            ("fo", "Zm8="),
            ("foo", "Zm9v"),
            ("foob", "Zm9vYg=="),
            ("foobar", "Zm9vYmFy"),
        ] {
            assert_eq!(base64(text.as_bytes()), code);
        }
    }

    #[test]
    fn numbers_are_short_and_never_minus_zero() {
        assert_eq!(number(-0.0001), "0");
        assert_eq!(number(1.5), "1.5");
        assert_eq!(number(100.0), "100");
        assert_eq!(number(-0.0126), "-0.013");
    }
}
