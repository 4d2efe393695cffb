//! A scene as dots: PNG (ISO/IEC 15948).

use tiny_skia::{
    FillRule, FilterQuality, LineCap, LineJoin, Mask, Paint, PathBuilder, Pixmap, PixmapPaint,
    StrokeDash, Transform,
};

use super::colour::Colour;
use super::error::FigureError;
use super::scene::{Dots, Item, Path, Point, Rect, Scene, Step, Stroke};

/// More dots than this are refused: 100 million take 400 MB.
const MOST_DOTS: f64 = 1e8;

/// The scene drawn with `dots_per_mm` dots to the millimetre.
pub(crate) fn write(scene: &Scene, dots_per_mm: f64) -> Result<Vec<u8>, FigureError> {
    let width = (scene.width * dots_per_mm).round().max(1.0);
    let height = (scene.height * dots_per_mm).round().max(1.0);
    let too_large = || {
        FigureError::Size(format!(
            "{width} x {height} dots are too many for one PNG; give fewer dots per inch or a smaller size"
        ))
    };
    if width * height > MOST_DOTS || width > 65_000.0 || height > 65_000.0 {
        return Err(too_large());
    }
    let mut sheet = Pixmap::new(width as u32, height as u32).ok_or_else(too_large)?;
    sheet.fill(tiny_skia::Color::WHITE);
    let pen = Pen {
        scale: Transform::from_scale(dots_per_mm as f32, dots_per_mm as f32),
    };
    pen.draw(&mut sheet, &scene.items, None);
    rgb_png(&sheet, dots_per_mm)
}

struct Pen {
    scale: Transform,
}

impl Pen {
    fn draw(&self, sheet: &mut Pixmap, items: &[Item], mask: Option<&Mask>) {
        for item in items {
            match item {
                Item::Shape {
                    path, fill, stroke, ..
                } => {
                    let Some(path) = built(path) else { continue };
                    if let Some(colour) = fill {
                        let rule = FillRule::Winding;
                        sheet.fill_path(&path, &paint(*colour), rule, self.scale, mask);
                    }
                    if let Some(stroke) = stroke {
                        let line = line(stroke);
                        sheet.stroke_path(&path, &paint(stroke.colour), &line, self.scale, mask);
                    }
                }
                Item::Dots { rect, dots } => self.draw_dots(sheet, *rect, dots, mask),
                Item::Clip { rect, items } => {
                    let inner = self.cut(sheet, *rect, mask);
                    self.draw(sheet, items, inner.as_ref());
                }
            }
        }
    }

    fn cut(&self, sheet: &Pixmap, rect: Rect, outer: Option<&Mask>) -> Option<Mask> {
        let path = built(&Path::rect(rect))?;
        match outer {
            Some(mask) => {
                let mut mask = mask.clone();
                mask.intersect_path(&path, FillRule::Winding, true, self.scale);
                Some(mask)
            }
            None => {
                let mut mask = Mask::new(sheet.width(), sheet.height())?;
                mask.fill_path(&path, FillRule::Winding, true, self.scale);
                Some(mask)
            }
        }
    }

    fn draw_dots(&self, sheet: &mut Pixmap, rect: Rect, dots: &Dots, mask: Option<&Mask>) {
        let Some(mut image) = Pixmap::new(dots.width as u32, dots.height as u32) else {
            return;
        };
        for (pixel, index) in image.pixels_mut().iter_mut().zip(&dots.indices) {
            let c = dots.palette[usize::from(*index)];
            *pixel = tiny_skia::ColorU8::from_rgba(c.r, c.g, c.b, 255).premultiply();
        }
        let paint = PixmapPaint {
            quality: FilterQuality::Bilinear,
            ..PixmapPaint::default()
        };
        let place = self
            .scale
            .pre_translate(rect.x as f32, rect.y as f32)
            .pre_scale(
                (rect.w / dots.width as f64) as f32,
                (rect.h / dots.height as f64) as f32,
            );
        sheet.draw_pixmap(0, 0, image.as_ref(), &paint, place, mask);
    }
}

fn built(path: &Path) -> Option<tiny_skia::Path> {
    let mut builder = PathBuilder::new();
    let f = |p: Point| (p[0] as f32, p[1] as f32);
    for step in &path.steps {
        match *step {
            Step::Move(p) => builder.move_to(f(p).0, f(p).1),
            Step::Line(p) => builder.line_to(f(p).0, f(p).1),
            Step::Quad(a, p) => builder.quad_to(f(a).0, f(a).1, f(p).0, f(p).1),
            Step::Cubic(a, b, p) => {
                builder.cubic_to(f(a).0, f(a).1, f(b).0, f(b).1, f(p).0, f(p).1);
            }
            Step::Close => builder.close(),
        }
    }
    builder.finish()
}

fn paint(colour: Colour) -> Paint<'static> {
    let mut paint = Paint::default();
    paint.set_color_rgba8(colour.r, colour.g, colour.b, colour.a);
    paint.anti_alias = true;
    paint
}

fn line(stroke: &Stroke) -> tiny_skia::Stroke {
    let dash: Vec<f32> = stroke.dash.iter().map(|d| *d as f32).collect();
    tiny_skia::Stroke {
        width: stroke.width as f32,
        line_cap: if stroke.round {
            LineCap::Round
        } else {
            LineCap::Butt
        },
        line_join: if stroke.round {
            LineJoin::Round
        } else {
            LineJoin::Miter
        },
        dash: StrokeDash::new(dash, 0.0),
        ..tiny_skia::Stroke::default()
    }
}

fn encoded(e: png::EncodingError) -> FigureError {
    FigureError::Encode(e.to_string())
}

fn rgb_png(sheet: &Pixmap, dots_per_mm: f64) -> Result<Vec<u8>, FigureError> {
    // The sheet is white and solid throughout, so the stored colours are the plain ones.
    let rgb: Vec<u8> = sheet
        .pixels()
        .iter()
        .flat_map(|p| [p.red(), p.green(), p.blue()])
        .collect();
    let mut out = Vec::new();
    let mut encoder = png::Encoder::new(&mut out, sheet.width(), sheet.height());
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    let per_metre = (dots_per_mm * 1000.0).round() as u32;
    encoder.set_pixel_dims(Some(png::PixelDimensions {
        xppu: per_metre,
        yppu: per_metre,
        unit: png::Unit::Meter,
    }));
    let mut writer = encoder.write_header().map_err(encoded)?;
    writer.write_image_data(&rgb).map_err(encoded)?;
    writer.finish().map_err(encoded)?;
    Ok(out)
}

/// The dots as a PNG with their palette.
pub(crate) fn indexed_png(dots: &Dots) -> Result<Vec<u8>, FigureError> {
    let palette: Vec<u8> = dots.palette.iter().flat_map(|c| [c.r, c.g, c.b]).collect();
    let mut out = Vec::new();
    let mut encoder = png::Encoder::new(&mut out, dots.width as u32, dots.height as u32);
    encoder.set_color(png::ColorType::Indexed);
    encoder.set_depth(png::BitDepth::Eight);
    encoder.set_palette(palette);
    encoder.set_compression(png::Compression::High);
    // Neighbouring indices differ little; the up filter makes most rows nearly zero.
    encoder.set_filter(png::Filter::Adaptive);
    let mut writer = encoder.write_header().map_err(encoded)?;
    writer.write_image_data(&dots.indices).map_err(encoded)?;
    writer.finish().map_err(encoded)?;
    Ok(out)
}
