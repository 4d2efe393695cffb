//! Where the windows of a pass lie.

use ndarray::Array2;
use rayon::prelude::*;

use super::plan::WindowSize;

/// A regular arrangement of windows, each wholly inside the image.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Layout {
    /// Size of every window.
    pub window: WindowSize,
    /// Windows along a row.
    pub columns: usize,
    /// Rows of windows.
    pub rows: usize,
    /// Columns between neighbours, px.
    pub step_x: usize,
    /// Rows between neighbours, px.
    pub step_y: usize,
    /// Column of the first window's left side.
    pub left: usize,
    /// Row of the first window's top side.
    pub top: usize,
}

impl Layout {
    /// The windows that fit an image of `width` x `height` px, centred in it; `None` when not
    /// even one fits.
    pub fn new(window: WindowSize, overlap: f64, width: usize, height: usize) -> Option<Self> {
        let along = |side: usize, image: usize| {
            let room = image.checked_sub(side)?;
            let step = ((side as f64 * (1.0 - overlap)).round() as usize).max(1);
            Some((room / step + 1, step, room % step / 2))
        };
        let (columns, step_x, left) = along(window.width, width)?;
        let (rows, step_y, top) = along(window.height, height)?;
        Some(Self {
            window,
            columns,
            rows,
            step_x,
            step_y,
            left,
            top,
        })
    }

    /// Top-left pixel (row, column) of the window in row `j`, column `i`.
    pub fn corner(&self, j: usize, i: usize) -> (usize, usize) {
        (self.top + j * self.step_y, self.left + i * self.step_x)
    }

    /// Column of the centre of the first window; half a pixel where the side is even.
    pub fn first_x(&self) -> f64 {
        self.left as f64 + (self.window.width as f64 - 1.0) / 2.0
    }

    /// Row of the centre of the first window.
    pub fn first_y(&self) -> f64 {
        self.top as f64 + (self.window.height as f64 - 1.0) / 2.0
    }

    /// One value for each window (row, column); over all cores.
    pub fn cells<T: Send>(&self, of: impl Fn((usize, usize)) -> T + Sync) -> Array2<T> {
        let (rows, columns) = self.shape();
        let values: Vec<T> = (0..rows * columns)
            .into_par_iter()
            .with_min_len(columns)
            .map(|k| of((k / columns, k % columns)))
            .collect();
        let shaped = Array2::from_shape_vec((rows, columns), values);
        shaped.unwrap_or_else(|_| unreachable!("one value a window"))
    }

    /// Shape of the arrays that hold one value a window.
    pub fn shape(&self) -> (usize, usize) {
        (self.rows, self.columns)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn windows_stay_inside_and_are_centred() {
        let window = WindowSize {
            width: 32,
            height: 16,
        };
        let layout = Layout::new(window, 0.5, 101, 64).unwrap();
        assert_eq!((layout.columns, layout.rows), (5, 7));
        let (row, column) = layout.corner(layout.rows - 1, layout.columns - 1);
        assert!(row + 16 <= 64 && column + 32 <= 101);
        assert_eq!(layout.left, 2);
        assert_eq!(layout.first_x(), 2.0 + 15.5);
        assert_eq!(Layout::new(window, 0.5, 31, 64), None);
    }
}
