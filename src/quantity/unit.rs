//! A unit as a product of powers of symbols, with exact conversion where the dimension agrees.

use std::fmt;

/// A symbol a unit is made of.
///
/// `px` and `frame` are dimensions of their own: only a calibration turns them into lengths and
/// times, never a conversion.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[allow(missing_docs)]
pub enum Symbol {
    Px,
    Um,
    Mm,
    Cm,
    M,
    Frame,
    Us,
    Ms,
    S,
    Deg,
}

const COUNT: usize = 10;
const ALL: [Symbol; COUNT] = [
    Symbol::Px,
    Symbol::Um,
    Symbol::Mm,
    Symbol::Cm,
    Symbol::M,
    Symbol::Frame,
    Symbol::Us,
    Symbol::Ms,
    Symbol::S,
    Symbol::Deg,
];

impl Symbol {
    /// How the symbol is written in a header and in the language.
    pub fn text(self) -> &'static str {
        match self {
            Symbol::Px => "px",
            Symbol::Um => "um",
            Symbol::Mm => "mm",
            Symbol::Cm => "cm",
            Symbol::M => "m",
            Symbol::Frame => "frame",
            Symbol::Us => "us",
            Symbol::Ms => "ms",
            Symbol::S => "s",
            Symbol::Deg => "deg",
        }
    }

    /// The dimension as a small number, and the power of ten of this symbol in it.
    fn dimension(self) -> (usize, i32) {
        match self {
            Symbol::Px => (0, 0),
            Symbol::Um => (1, -6),
            Symbol::Mm => (1, -3),
            Symbol::Cm => (1, -2),
            Symbol::M => (1, 0),
            Symbol::Frame => (2, 0),
            Symbol::Us => (3, -6),
            Symbol::Ms => (3, -3),
            Symbol::S => (3, 0),
            Symbol::Deg => (4, 0),
        }
    }
}

/// A product of integer powers of [`Symbol`]s; `Unit::ONE` is the unit of a plain number.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Unit {
    powers: [i8; COUNT],
}

impl Unit {
    /// The unit of a plain number.
    pub const ONE: Unit = Unit { powers: [0; COUNT] };
    /// Pixel.
    pub const PX: Unit = Unit::of(Symbol::Px);
    /// Millimetre.
    pub const MM: Unit = Unit::of(Symbol::Mm);
    /// Frame interval: the time between the two exposures of a pair.
    pub const FRAME: Unit = Unit::of(Symbol::Frame);
    /// Second.
    pub const S: Unit = Unit::of(Symbol::S);

    /// The unit made of one symbol.
    pub const fn of(symbol: Symbol) -> Unit {
        let mut powers = [0; COUNT];
        powers[symbol as usize] = 1;
        Unit { powers }
    }

    /// The product of two units.
    pub fn times(self, other: Unit) -> Unit {
        let mut powers = self.powers;
        for (p, q) in powers.iter_mut().zip(other.powers) {
            *p = p.saturating_add(q);
        }
        Unit { powers }
    }

    /// The quotient of two units.
    pub fn per(self, other: Unit) -> Unit {
        self.times(other.power(-1))
    }

    /// The unit to an integer power.
    pub fn power(self, n: i8) -> Unit {
        Unit {
            powers: self.powers.map(|p| p.saturating_mul(n)),
        }
    }

    /// The unit whose `n`-th power this is, if every exponent allows it.
    pub fn root(self, n: i8) -> Option<Unit> {
        (n != 0 && self.powers.iter().all(|p| p % n == 0)).then(|| Unit {
            powers: self.powers.map(|p| p / n),
        })
    }

    /// True for a plain number.
    pub fn is_one(self) -> bool {
        self == Unit::ONE
    }

    /// Exponents of the dimensions and the power of ten in front.
    fn dimensions(self) -> ([i32; 5], i32) {
        let mut exponents = [0; 5];
        let mut tens = 0;
        for (symbol, p) in ALL.iter().zip(self.powers) {
            let (dimension, ten) = symbol.dimension();
            exponents[dimension] += i32::from(p);
            tens += ten * i32::from(p);
        }
        (exponents, tens)
    }

    /// The factor a number in this unit is multiplied by to be in `other`; `None` when the
    /// dimensions differ (px is never mm).
    pub fn factor_to(self, other: Unit) -> Option<f64> {
        let (mine, my_tens) = self.dimensions();
        let (theirs, their_tens) = other.dimensions();
        (mine == theirs).then(|| 10f64.powi(my_tens - their_tens))
    }

    /// The unit written for a column header or an option name: `mm`, `mm2_per_s`, `per_s`;
    /// empty for a plain number.
    pub fn header(self) -> String {
        let (over, under) = self.halves(|symbol, p| {
            if p == 1 {
                symbol.text().to_owned()
            } else {
                format!("{}{p}", symbol.text())
            }
        });
        match (over.is_empty(), under.is_empty()) {
            (true, true) => String::new(),
            (false, true) => over.join("_"),
            (true, false) => format!("per_{}", under.join("_")),
            (false, false) => format!("{}_per_{}", over.join("_"), under.join("_")),
        }
    }

    fn halves(self, write: impl Fn(Symbol, i8) -> String) -> (Vec<String>, Vec<String>) {
        let mut over = Vec::new();
        let mut under = Vec::new();
        for (symbol, p) in ALL.into_iter().zip(self.powers) {
            match p {
                0 => {}
                p if p > 0 => over.push(write(symbol, p)),
                p => under.push(write(symbol, -p)),
            }
        }
        (over, under)
    }

    /// Reads what [`Unit::header`] writes, and the printed form (`mm²/s`, `mm2/s`, `1/s`).
    pub fn parse(text: &str) -> Option<Unit> {
        let plain: String = text
            .trim()
            .chars()
            .map(|c| match c {
                '²' => '2',
                '³' => '3',
                '⁴' => '4',
                c => c,
            })
            .collect();
        let plain = plain.replace("µ", "u").replace("μ", "u");
        let (over, under) = if let Some(under) = plain.strip_prefix("per_") {
            ("", under)
        } else if let Some((over, under)) = plain.split_once("_per_").or(plain.split_once('/')) {
            (over, under)
        } else {
            (plain.as_str(), "")
        };
        let product = |text: &str| -> Option<Unit> {
            text.split(['_', ' ', '·', '*'])
                .filter(|t| !t.is_empty() && *t != "1")
                .try_fold(Unit::ONE, |unit, token| {
                    let name = token.trim_end_matches(|c: char| c.is_ascii_digit());
                    let n: i8 = match &token[name.len()..] {
                        "" => 1,
                        digits => digits.parse().ok()?,
                    };
                    let symbol = ALL.into_iter().find(|s| s.text() == name)?;
                    Some(unit.times(Unit::of(symbol).power(n)))
                })
        };
        Some(product(over)?.per(product(under.trim_matches(['(', ')']))?))
    }
}

impl fmt::Display for Unit {
    /// `mm`, `mm²/s`, `1/s`; empty for a plain number.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (over, under) = self.halves(|symbol, p| {
            let name = match symbol {
                Symbol::Um => "µm",
                Symbol::Us => "µs",
                Symbol::Deg => "°",
                symbol => symbol.text(),
            };
            let power: String = match p {
                1 => String::new(),
                p => p
                    .to_string()
                    .chars()
                    .map(|c| ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'][c as usize - 48])
                    .collect(),
            };
            format!("{name}{power}")
        });
        match (over.is_empty(), under.len()) {
            (true, 0) => Ok(()),
            (false, 0) => f.write_str(&over.join("·")),
            (true, 1) => write!(f, "1/{}", under[0]),
            (true, _) => write!(f, "1/({})", under.join("·")),
            (false, 1) => write!(f, "{}/{}", over.join("·"), under[0]),
            (false, _) => write!(f, "{}/({})", over.join("·"), under.join("·")),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_unit_is_written_the_same_way_in_headers_and_read_back() {
        let circulation = Unit::MM.power(2).per(Unit::S);
        assert_eq!(circulation.header(), "mm2_per_s");
        assert_eq!(circulation.to_string(), "mm²/s");
        let rate = Unit::ONE.per(Unit::FRAME);
        assert_eq!(rate.header(), "per_frame");
        assert_eq!(rate.to_string(), "1/frame");
        for unit in [circulation, rate, Unit::MM, Unit::ONE, Unit::S.power(-2)] {
            assert_eq!(Unit::parse(&unit.header()), Some(unit));
            assert_eq!(Unit::parse(&unit.to_string()), Some(unit));
        }
        assert_eq!(Unit::parse("furlong"), None);
    }

    #[test]
    fn conversion_keeps_px_and_mm_apart() {
        let cm2 = Unit::of(Symbol::Cm).power(2);
        let factor = Unit::MM.power(2).factor_to(cm2).unwrap();
        assert!((factor - 0.01).abs() < 1e-15);
        assert_eq!(Unit::PX.factor_to(Unit::MM), None);
        assert_eq!(Unit::FRAME.factor_to(Unit::S), None);
    }
}
