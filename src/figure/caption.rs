//! Words under a figure.

use super::figure::Figure;
use super::layout::{NUMBER_MM, PAD, broken};
use super::scene::{Scene, Style};

/// From one line to the next.
const LINE_MM: f64 = 3.8;
/// Room between the figure and the first line, beside the margin of the figure.
const GAP_MM: f64 = 0.6;

fn lines(figure: &Figure, width: f64) -> Vec<String> {
    let words = figure.caption.as_deref().unwrap_or("");
    broken(words, Style::plain(NUMBER_MM), width)
}

/// Height of the caption on a sheet `width` wide; 0 where there is none.
pub(crate) fn height(figure: &Figure, width: f64) -> f64 {
    match lines(figure, width).len() {
        0 => 0.0,
        n => GAP_MM + LINE_MM * n as f64,
    }
}

/// Sets the caption at the foot of the sheet.
pub(crate) fn draw(scene: &mut Scene, figure: &Figure) {
    let lines = lines(figure, scene.width);
    let count = lines.len();
    for (k, line) in lines.iter().enumerate() {
        let up = LINE_MM * (count - 1 - k) as f64;
        let at = [PAD, scene.height - PAD - up];
        scene.text(at, line, Style::plain(NUMBER_MM));
    }
}

#[cfg(test)]
mod tests {
    use crate::figure::{Curve, Figure};

    fn figure() -> Figure {
        Figure::new().line(Curve::new("decay", vec![0.0, 1.0], vec![1.0, 0.5]))
    }

    #[test]
    fn a_caption_stands_below_and_takes_its_room_from_a_size_that_was_given() {
        let plain = figure().scene(10.0).unwrap();
        let one = figure().caption("One line.").scene(10.0).unwrap();
        let long = "words ".repeat(60);
        let more = figure().caption(&long).scene(10.0).unwrap();
        assert!(plain.height < one.height && one.height < more.height);
        let given = figure().caption(&long).size_mm(80.0, 70.0);
        assert_eq!(given.scene(10.0).unwrap().height, 70.0);
        let row = |caption| {
            Figure::panels(vec![figure(), figure().caption("Below.")], 2)
                .caption(caption)
                .scene(10.0)
                .unwrap()
        };
        assert!(row("All of it.").height > row("").height);
        let svg = figure().caption("One line.").svg().unwrap();
        assert!(svg.contains("aria-label=\"One line.\""));
    }
}
