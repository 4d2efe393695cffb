//! From data to paper: the span of an axis, and the plot two axes make.

use super::error::FigureError;
use super::scene::{Point, Rect};
use super::ticks::{self, Ticks};

/// Numbers this large overflow when their span is taken; no measurement comes near.
const LARGEST: f64 = 1e150;

/// The least and greatest of the finite numbers seen so far.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Span {
    pub lo: f64,
    pub hi: f64,
}

impl Span {
    /// A span that holds nothing yet.
    pub const NOTHING: Span = Span {
        lo: f64::INFINITY,
        hi: f64::NEG_INFINITY,
    };

    pub fn of(values: impl IntoIterator<Item = f64>) -> Self {
        let mut span = Self::NOTHING;
        for v in values {
            span.take(v);
        }
        span
    }

    /// Takes in `v` if it is finite.
    pub fn take(&mut self, v: f64) {
        if v.is_finite() {
            self.lo = self.lo.min(v);
            self.hi = self.hi.max(v);
        }
    }

    pub fn join(&mut self, other: Span) {
        self.take(other.lo);
        self.take(other.hi);
    }

    pub fn is_nothing(&self) -> bool {
        self.lo > self.hi
    }

    pub fn width(&self) -> f64 {
        self.hi - self.lo
    }

    /// The span widened where it is a single number, so that an axis can show it: by a tenth of
    /// the number, or by one about zero.
    pub fn opened(self) -> Self {
        let size = self.lo.abs().max(self.hi.abs());
        if self.width() > 1e-9 * size && size > 1.0 / LARGEST {
            return self;
        }
        let middle = 0.5 * (self.lo + self.hi);
        let half = if size > 1.0 / LARGEST {
            0.1 * size
        } else {
            1.0
        };
        Self {
            lo: middle - half,
            hi: middle + half,
        }
    }
}

/// One axis: what its ends are, and whether it counts decades.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Axis {
    pub lo: f64,
    pub hi: f64,
    pub log: bool,
}

impl Axis {
    /// The axis over `span`, or over `asked` where that is given.
    ///
    /// `name` is "x" or "y"; `room` is the share of the span left free at each end.
    pub fn new(
        name: &'static str,
        span: Span,
        asked: Option<(f64, f64)>,
        log: bool,
        room: f64,
    ) -> Result<Self, FigureError> {
        if let Some((lo, hi)) = asked {
            let size = lo.abs().max(hi.abs());
            let carried = (1.0 / LARGEST..=LARGEST).contains(&size) && hi - lo > 1e-9 * size;
            let decades = !log || lo >= 1.0 / LARGEST;
            if !(lo < hi && carried && decades) {
                // Each by the name of the option it was given in.
                let what = match name {
                    "colour" => "range".to_owned(),
                    axis => format!("{axis}_range"),
                };
                return Err(FigureError::Range { what, lo, hi });
            }
            return Ok(Self { lo, hi, log });
        }
        let size = span.lo.abs().max(span.hi.abs());
        if size > LARGEST {
            return Err(FigureError::OffScale {
                axis: name,
                value: size,
            });
        }
        if log {
            if span.is_nothing() || span.lo <= 0.0 {
                return Err(FigureError::NothingAboveZero(name));
            }
            if span.lo < 1.0 / LARGEST {
                return Err(FigureError::OffScale {
                    axis: name,
                    value: span.lo,
                });
            }
            let decades = (span.hi / span.lo).log10();
            let factor = if decades < 0.1 {
                2.0
            } else {
                10f64.powf(room * decades)
            };
            let (lo, hi) = (span.lo / factor, span.hi * factor);
            return Ok(Self { lo, hi, log });
        }
        let span = span.opened();
        let free = room * span.width();
        Ok(Self {
            lo: span.lo - free,
            hi: span.hi + free,
            log,
        })
    }

    /// How far along the axis `value` is: 0 at `lo`, 1 at `hi`. NaN where it has no place.
    pub fn fraction(&self, value: f64) -> f64 {
        if self.log {
            (value / self.lo).ln() / (self.hi / self.lo).ln()
        } else {
            (value - self.lo) / (self.hi - self.lo)
        }
    }

    /// The value a fraction along the axis.
    pub fn value(&self, fraction: f64) -> f64 {
        if self.log {
            self.lo * (self.hi / self.lo).powf(fraction)
        } else {
            self.lo + fraction * (self.hi - self.lo)
        }
    }

    pub fn holds(&self, value: f64) -> bool {
        (self.lo..=self.hi).contains(&value)
    }

    /// About `about` marks, but never fewer than two: one number alone says no scale.
    pub fn ticks(&self, about: f64) -> Ticks {
        let mut about = about;
        loop {
            let ticks = if self.log {
                ticks::logarithmic(self.lo, self.hi, about)
            } else {
                ticks::linear(self.lo, self.hi, about)
            };
            if ticks.major.len() > 1 || about > 20.0 {
                return ticks;
            }
            about *= 1.5;
        }
    }
}

/// Two axes on paper.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Plot {
    pub rect: Rect,
    pub x: Axis,
    pub y: Axis,
}

impl Plot {
    pub fn x_mm(&self, x: f64) -> f64 {
        self.rect.x + self.x.fraction(x) * self.rect.w
    }

    pub fn y_mm(&self, y: f64) -> f64 {
        self.rect.bottom() - self.y.fraction(y) * self.rect.h
    }

    /// Where the data point stands on the sheet; `None` where it has no place (NaN, or not above
    /// zero on an axis of decades).
    pub fn at(&self, x: f64, y: f64) -> Option<Point> {
        let p = [self.x_mm(x), self.y_mm(y)];
        p.iter().all(|c| c.is_finite()).then_some(p)
    }
}
