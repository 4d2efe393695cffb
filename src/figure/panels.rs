//! Several figures on one sheet.

use super::caption;
use super::error::FigureError;
use super::figure::Figure;
use super::layout::{PAD, WIDTH_MM, draw_title, title_lines};
use super::scene::Scene;
use super::sheet::{Stand, stand};

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
    let below = caption::height(figure, width);
    let each = (width - GAP * (columns - 1) as f64) / columns as f64;
    let height = figure
        .height_mm
        .map(|h| (h - top - below - GAP * (rows - 1) as f64) / rows as f64);
    let mut scene = Scene::new(width, top);
    let mut y = top;
    for row in figure.panels.chunks(columns) {
        let mut row = row.to_vec();
        for panel in &mut row {
            (panel.width_mm, panel.height_mm) = (Some(each), height);
        }
        let mut tallest: f64 = 0.0;
        for (column, (panel, down)) in aligned(row)?.into_iter().enumerate() {
            let part = panel.scene(dots_per_mm)?;
            tallest = tallest.max(down + part.height);
            scene.place(part, column as f64 * (each + GAP), y + down);
        }
        y += tallest + GAP;
    }
    scene.height = y - GAP + below;
    draw_title(&mut scene, &lines);
    caption::draw(&mut scene, figure);
    Ok(scene)
}

/// The panels of one row with their plots equally high and level with each other, each with the
/// distance it is moved down for that. Panels within panels stay as they are.
///
/// The lowest map sets the height, as it keeps its proportions; without maps the lowest plot does.
/// No plot becomes lower than its own key asks.
fn aligned(row: Vec<Figure>) -> Result<Vec<(Figure, f64)>, FigureError> {
    let stands = |row: &[Figure]| -> Result<Vec<Option<Stand>>, FigureError> {
        let single = |f: &Figure| f.panels.is_empty().then(|| stand(f)).transpose();
        row.iter().map(single).collect()
    };
    let before = stands(&row)?;
    let lowest = |maps: bool| {
        before
            .iter()
            .flatten()
            .filter(|s| s.is_map || !maps)
            .map(|s| s.height)
            .reduce(f64::min)
    };
    let Some(height) = lowest(true).or(lowest(false)) else {
        return Ok(row.into_iter().map(|panel| (panel, 0.0)).collect());
    };
    let mut row = row;
    for (panel, stand) in row.iter_mut().zip(&before) {
        if let Some(stand) = stand {
            panel.height_mm = Some(stand.top + height.max(stand.least) + stand.foot);
        }
    }
    let after = stands(&row)?;
    let top = after.iter().flatten().map(|s| s.top).fold(0.0, f64::max);
    let down = after
        .iter()
        .map(|s| s.as_ref().map_or(0.0, |s| top - s.top));
    Ok(row.into_iter().zip(down.collect::<Vec<_>>()).collect())
}
