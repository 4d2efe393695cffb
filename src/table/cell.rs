//! One cell of a table.

/// What stands in one place of a table.
#[derive(Clone, Debug, PartialEq)]
pub enum Cell {
    /// A number in the column's unit; never NaN when made by [`Cell::from`].
    Number(f64),
    /// Words.
    Text(String),
    /// Nothing is known: neither zero nor an empty word.
    Missing,
}

impl Cell {
    /// The number, if it is one.
    pub fn number(&self) -> Option<f64> {
        match self {
            Cell::Number(v) => Some(*v),
            _ => None,
        }
    }

    /// The cell as a file has it: a number with the fewest digits that give it back exactly, an
    /// empty field where it is missing or NaN.
    pub fn written(&self) -> String {
        match self {
            Cell::Text(words) => words.clone(),
            Cell::Missing => String::new(),
            Cell::Number(v) if v.is_nan() => String::new(),
            Cell::Number(v) => shortest(*v),
        }
    }
}

/// The shortest decimal number that reads back as `value`, with an exponent where that is shorter
/// to read.
fn shortest(value: f64) -> String {
    let size = value.abs();
    if size == 0.0 || !size.is_finite() || (1e-5..1e15).contains(&size) {
        value.to_string()
    } else {
        format!("{value:e}")
    }
}

impl From<f64> for Cell {
    /// NaN becomes [`Cell::Missing`].
    fn from(value: f64) -> Self {
        if value.is_nan() {
            Cell::Missing
        } else {
            Cell::Number(value)
        }
    }
}

impl From<Option<f64>> for Cell {
    fn from(value: Option<f64>) -> Self {
        value.map_or(Cell::Missing, Cell::from)
    }
}

impl From<&str> for Cell {
    /// An empty word becomes [`Cell::Missing`].
    fn from(words: &str) -> Self {
        if words.is_empty() {
            Cell::Missing
        } else {
            Cell::Text(words.to_owned())
        }
    }
}

impl From<String> for Cell {
    /// An empty word becomes [`Cell::Missing`].
    fn from(words: String) -> Self {
        Cell::from(words.as_str())
    }
}
