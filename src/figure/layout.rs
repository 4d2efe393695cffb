//! Where everything stands: margins measured, plot and sheet sized, in mm.

use super::axis::{Axis, Plot};
use super::caption;
use super::error::FigureError;
use super::figure::Figure;
use super::scene::{Rect, Scene, Style};
use super::settle::Settled;
use super::ticks::Ticks;

/// Width of a figure nobody gave one.
pub(crate) const WIDTH_MM: f64 = 120.0;
/// Margin around everything.
pub(crate) const PAD: f64 = 2.5;
/// Size of titles, of labels and of numbers: 9.6, 7.9 and 7.1 points.
const TITLE_MM: f64 = 3.4;
pub(crate) const LABEL_MM: f64 = 2.8;
pub(crate) const NUMBER_MM: f64 = 2.5;
const TITLE_LINE: f64 = 4.6;
/// Room for a label over or under the plot, and for the numbers along x.
pub(crate) const LABEL_LINE: f64 = 4.4;
pub(crate) const NUMBER_LINE: f64 = 4.0;
/// Gap between the plot and its key.
pub(crate) const KEY_GAP: f64 = 4.0;
/// Half of a long and of a short mark, which straddle the axis.
pub(crate) const LONG: f64 = 0.8;
pub(crate) const SHORT: f64 = 0.4;
/// Least width and height of the plot.
pub(crate) const LEAST_PLOT: f64 = 12.0;
/// Room under the plot.
pub(crate) const FOOT: f64 = NUMBER_LINE + LABEL_LINE + PAD;
/// A map more slender than this is not drawn to one scale: it would be a thread.
const MOST_SLENDER: f64 = 8.0;

/// Longest side of a sheet.
const MOST_MM: f64 = 3000.0;

/// A figure laid out.
pub(crate) struct Layout {
    pub plot: Plot,
    pub x_ticks: Ticks,
    pub y_ticks: Ticks,
    /// Width and height of the sheet.
    pub size: (f64, f64),
}

/// Room around the plot.
#[derive(Clone, Copy)]
struct Margins {
    left: f64,
    right: f64,
    top: f64,
    bottom: f64,
}

/// The title broken into lines that fit a sheet `width` wide.
pub(crate) fn title_lines(figure: &Figure, width: f64) -> Vec<String> {
    let words = figure.title.as_deref().unwrap_or("");
    broken(words, Style::plain(TITLE_MM).medium(), width)
}

/// Words broken into lines that fit a sheet `width` wide.
pub(crate) fn broken(words: &str, style: Style, width: f64) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for word in words.split_whitespace() {
        match lines.last_mut() {
            Some(line) if style.width(&format!("{line} {word}")) <= width - 2.0 * PAD => {
                line.push(' ');
                line.push_str(word);
            }
            _ => lines.push(word.to_owned()),
        }
    }
    lines
}

pub(crate) fn draw_title(scene: &mut Scene, lines: &[String]) {
    for (k, line) in lines.iter().enumerate() {
        let y = PAD + TITLE_MM * 0.8 + TITLE_LINE * k as f64;
        scene.text([PAD, y], line, Style::plain(TITLE_MM).medium());
    }
}

/// Width of the widest number.
pub(crate) fn widest(ticks: &Ticks) -> f64 {
    let style = Style::plain(NUMBER_MM);
    ticks
        .major
        .iter()
        .map(|(_, t)| style.width(t))
        .fold(0.0, f64::max)
}

/// Marks along x as many as stand clear of each other on `width` mm.
fn x_ticks(axis: &Axis, width: f64) -> Ticks {
    let mut about = width / 13.0;
    loop {
        let ticks = axis.ticks(about);
        let style = Style::plain(NUMBER_MM);
        let clear = ticks.major.windows(2).all(|pair| {
            let apart = (axis.fraction(pair[1].0) - axis.fraction(pair[0].0)) * width;
            let need = 0.5 * (style.width(&pair[0].1) + style.width(&pair[1].1)) + 1.5;
            apart >= need
        });
        if clear || about < 1.5 {
            return ticks;
        }
        about *= 0.75;
    }
}

/// Leaves out short marks that would stand closer than a millimetre.
fn thin(ticks: &mut Ticks, side: f64) {
    if ticks.minor.len() as f64 > side {
        ticks.minor.clear();
    }
}

/// How far the last number along x reaches beyond the plot.
fn overhang(axis: &Axis, ticks: &Ticks, width: f64) -> f64 {
    ticks.major.last().map_or(0.0, |(value, text)| {
        let half = 0.5 * Style::plain(NUMBER_MM).width(text);
        half - (1.0 - axis.fraction(*value)) * width
    })
}

/// Places the plot of `settled` on its sheet.
pub(crate) fn lay_out(settled: &Settled) -> Result<Layout, FigureError> {
    let width = settled.figure.width_mm.unwrap_or(WIDTH_MM);
    let given = settled.figure.height_mm;
    for side in [Some(width), given].into_iter().flatten() {
        if !(side > 0.0 && side <= MOST_MM) {
            return Err(FigureError::Size(format!(
                "a figure {side} mm large cannot be drawn; give 30 to {MOST_MM} mm"
            )));
        }
    }
    // The left margin depends on the numbers along y, those on the height, that on the width and
    // so on the left margin: a few rounds settle it.
    let mut layout = place(settled, width, 8.0, 0.0)?;
    for _ in 0..3 {
        let left = PAD + widest(&layout.y_ticks) + LONG + 1.2;
        let over = overhang(&settled.x, &layout.x_ticks, layout.plot.rect.w);
        layout = place(settled, width, left, over)?;
    }
    Ok(layout)
}

/// One round: the layout with the left margin and the overhang to the right as given.
fn place(settled: &Settled, width: f64, left: f64, over: f64) -> Result<Layout, FigureError> {
    let key = settled.key.width();
    let right = PAD
        + if key > 0.0 {
            key + KEY_GAP.max(over)
        } else {
            over.max(1.5)
        };
    let room = width - left - right;
    let titles = title_lines(settled.figure, width).len() as f64;
    let legend = settled.legend().height(room.max(1.0));
    let margins = Margins {
        left,
        right,
        top: PAD + titles * TITLE_LINE + legend + LABEL_LINE,
        bottom: FOOT + caption::height(settled.figure, width),
    };
    let (w, h) = plot_size(settled, room, &margins)?;
    let upright = margins.top + margins.bottom;
    let natural = upright + h.max(least_height(settled));
    let height = match settled.figure.height_mm {
        // One scale along both axes may leave a map lower than asked: no blank strip below it.
        Some(height) if settled.is_map => height.min(natural),
        Some(height) => height,
        None => natural,
    };
    let rect = Rect {
        x: left + 0.5 * (room - w),
        y: margins.top,
        w,
        h,
    };
    let mut x_ticks = x_ticks(&settled.x, w);
    let apart = if settled.is_map { 13.0 } else { 10.0 };
    let mut y_ticks = settled.y.ticks(h / apart);
    thin(&mut x_ticks, w);
    thin(&mut y_ticks, h);
    Ok(Layout {
        plot: Plot {
            rect,
            x: settled.x,
            y: settled.y,
        },
        x_ticks,
        y_ticks,
        size: (width, height),
    })
}

/// Least height of the plot for its key: a longer column reaches down beside the numbers
/// and the label of x.
pub(crate) fn least_height(settled: &Settled) -> f64 {
    settled.key.least_height() - NUMBER_LINE - LABEL_LINE
}

/// Width and height of the plot where `room` is left between its margins.
fn plot_size(settled: &Settled, room: f64, margins: &Margins) -> Result<(f64, f64), FigureError> {
    let ratio = (settled.y.hi - settled.y.lo) / (settled.x.hi - settled.x.lo);
    let slender = !(1.0 / MOST_SLENDER..=MOST_SLENDER).contains(&ratio);
    let even = settled.is_map && !settled.x.log && !settled.y.log && !slender;
    let upright = margins.top + margins.bottom;
    let high = match settled.figure.height_mm {
        Some(height) => height - upright,
        None => {
            let wanted = match (even, settled.is_map) {
                (true, _) => room * ratio,
                (false, true) if ratio < 1.0 => room / MOST_SLENDER,
                (false, true) => room,
                (false, false) => 0.55 * room,
            };
            wanted.clamp(
                LEAST_PLOT,
                1.5 * (room + margins.left + margins.right).max(LEAST_PLOT),
            )
        }
    };
    let column = least_height(settled);
    let crowded = settled.figure.height_mm.is_some() && high < column - 1e-6;
    if room < LEAST_PLOT || high < LEAST_PLOT - 1e-6 || crowded {
        return Err(FigureError::Size(format!(
            "{:.0} x {:.0} mm leaves no room for the plot; give at least {:.0} x {:.0} mm",
            room + margins.left + margins.right,
            high + upright,
            (margins.left + margins.right + 2.0 * LEAST_PLOT).ceil(),
            (upright + column.max(2.0 * LEAST_PLOT)).ceil(),
        )));
    }
    Ok(match even {
        false => (room, high),
        true if high / room > ratio => (room, room * ratio),
        true => (high / ratio, high),
    })
}
