//! Several figures on one sheet.

use super::error::FigureError;
use super::figure::Figure;
use super::layout::{PAD, WIDTH_MM, draw_title, title_lines};
use super::scene::Scene;

/// Gap between panels in mm, beside the margin each has of its own.
const GAP: f64 = 1.0;

pub(crate) fn scene(figure: &Figure, dots_per_mm: f64) -> Result<Scene, FigureError> {
    let columns = figure.columns.clamp(1, figure.panels.len());
    let rows = figure.panels.len().div_ceil(columns);
    let width = figure
        .width_mm
        .unwrap_or(if columns == 1 { WIDTH_MM } else { 180.0 });
    let lines = title_lines(figure, width);
    let top = if lines.is_empty() {
        0.0
    } else {
        PAD + 4.6 * lines.len() as f64
    };
    let each = (width - GAP * (columns - 1) as f64) / columns as f64;
    let height = figure
        .height_mm
        .map(|h| (h - top - GAP * (rows - 1) as f64) / rows as f64);
    let mut scene = Scene::new(width, top);
    let mut y = top;
    for row in figure.panels.chunks(columns) {
        let mut tallest: f64 = 0.0;
        for (column, panel) in row.iter().enumerate() {
            let mut panel = panel.clone();
            (panel.width_mm, panel.height_mm) = (Some(each), height);
            let part = panel.scene(dots_per_mm)?;
            tallest = tallest.max(part.height);
            scene.place(part, column as f64 * (each + GAP), y);
        }
        y += tallest + GAP;
    }
    scene.height = y - GAP;
    draw_title(&mut scene, &lines);
    Ok(scene)
}
