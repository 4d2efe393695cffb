//! A table in plain text cut into cells: what separates them, what is comment, what is heading.

/// What is wrong in a file, and in which line if one is to blame.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Problem {
    pub line: Option<usize>,
    pub what: String,
}

impl Problem {
    pub(super) fn at(line: usize, what: String) -> Self {
        let line = Some(line);
        Self { line, what }
    }

    pub(super) fn whole(what: String) -> Self {
        Self { line: None, what }
    }
}

/// One line of cells, with its number counted from 1.
pub(super) struct Row<'a> {
    pub line: usize,
    pub cells: Vec<&'a str>,
}

/// The heading, if there is one, and the rows below it.
pub(super) struct Cells<'a> {
    pub heading: Option<Vec<&'a str>>,
    pub rows: Vec<Row<'a>>,
}

/// What stands between two cells.
#[derive(Clone, Copy, PartialEq)]
enum Separator {
    Semicolon,
    Tab,
    Comma,
    Blanks,
}

impl Separator {
    fn of(line: &str) -> Separator {
        let order = [
            (';', Separator::Semicolon),
            ('\t', Separator::Tab),
            (',', Separator::Comma),
        ];
        let found = order.into_iter().find(|(c, _)| line.contains(*c));
        found.map_or(Separator::Blanks, |(_, separator)| separator)
    }

    /// The cells of a line; `expected` is how many there ought to be, where that is known.
    fn cut(self, line: &str, expected: Option<usize>) -> Vec<&str> {
        let strip = |cell| str::trim_matches(str::trim(cell), ['"', '\'']);
        let mut cells: Vec<&str> = match self {
            Separator::Semicolon => line.split(';').map(strip).collect(),
            Separator::Tab => line.split('\t').map(strip).collect(),
            Separator::Comma => line.split(',').map(strip).collect(),
            Separator::Blanks => line.split_whitespace().map(strip).collect(),
        };
        // A separator after the last cell is common and means nothing.
        let expected = expected.unwrap_or(usize::MAX);
        if cells.len() == expected.saturating_add(1) && cells.last() == Some(&"") {
            cells.pop();
        }
        cells
    }
}

/// A cell as a number: a decimal point, or a decimal comma where commas do not separate. `None`
/// for text.
pub(super) fn number(cell: &str) -> Option<f64> {
    if let Ok(number) = cell.parse() {
        return Some(number);
    }
    let (whole, part) = cell.split_once(',')?;
    format!("{whole}.{part}").parse().ok()
}

/// True for a cell that says there is no value.
pub(super) fn is_gap(cell: &str) -> bool {
    ["", "nan", "na", "n/a", "-", "--", "null", "none", "masked"]
        .iter()
        .any(|word| cell.eq_ignore_ascii_case(word))
}

/// Cuts a text into rows of cells. Empty lines and lines that begin with # or % are left out;
/// a first line without any number is the heading, and failing that the last comment before the
/// first row, where it has one name a cell.
pub(super) fn cut(text: &str) -> Result<Cells<'_>, Problem> {
    let text = text.trim_start_matches('\u{feff}');
    let mut comment = None;
    let mut heading = None;
    let mut separator = None;
    let mut rows: Vec<Row> = Vec::new();
    for (index, line) in text.lines().enumerate() {
        let bare = line.trim_start();
        if bare.trim_end().is_empty() {
            continue;
        }
        if bare.starts_with(['#', '%']) {
            if rows.is_empty() {
                comment = Some(bare.trim_start_matches(['#', '%', ' ']));
            }
            continue;
        }
        let separator = *separator.get_or_insert_with(|| Separator::of(line));
        let expected = heading
            .as_ref()
            .or(rows.first().map(|row| &row.cells))
            .map(Vec::len);
        let cells = separator.cut(line, expected);
        if rows.is_empty() && heading.is_none() && !cells.iter().any(|c| number(c).is_some()) {
            heading = Some(cells);
            continue;
        }
        let expected = expected.unwrap_or(cells.len());
        if cells.len() != expected {
            let what = format!("has {} cells where {expected} are expected", cells.len());
            return Err(Problem::at(index + 1, what));
        }
        rows.push(Row {
            line: index + 1,
            cells,
        });
    }
    if let (None, Some(comment), Some(first)) = (&heading, comment, rows.first()) {
        let cut = |by: Separator| by.cut(comment, Some(first.cells.len()));
        heading = [Separator::of(comment), Separator::Blanks]
            .into_iter()
            .map(cut)
            .find(|names| names.len() == first.cells.len());
    }
    Ok(Cells { heading, rows })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn shape(text: &str) -> (Option<usize>, Vec<usize>) {
        let cells = cut(text).unwrap();
        let rows = cells.rows.iter().map(|row| row.cells.len()).collect();
        (cells.heading.map(|names| names.len()), rows)
    }

    #[test]
    fn every_common_separator_is_found() {
        assert_eq!(shape("1,2,3,4\n5,6,7,8\n"), (None, vec![4, 4]));
        assert_eq!(shape("1 2  3 4\n 5 6 7 8"), (None, vec![4, 4]));
        assert_eq!(shape("x;y;u;v\n1,5;2;3;4;\n"), (Some(4), vec![4]));
        assert_eq!(shape("x\ty\tu\tv\r\n1\t2\t\t\r\n"), (Some(4), vec![4]));
        assert_eq!(shape("# x y u v\n1,2,3,4"), (Some(4), vec![4]));
        assert_eq!(shape("% made today\n\n1,2,3,4"), (None, vec![4]));
    }

    #[test]
    fn decimal_commas_and_gaps_are_read() {
        assert_eq!(number("1,5"), Some(1.5));
        assert_eq!(number("-1e-3"), Some(-1e-3));
        assert_eq!(number("1,5,2"), None);
        assert!(is_gap("NaN") && is_gap("") && !is_gap("0"));
    }

    #[test]
    fn a_short_line_is_named() {
        let problem = cut("1,2,3,4\n5,6,7\n").err().unwrap();
        assert_eq!(problem.line, Some(2));
        assert_eq!(problem.what, "has 3 cells where 4 are expected");
    }
}
