//! One colour, and the way from CIELAB to it.

/// An sRGB colour with its opacity (255: solid).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Colour {
    /// Red.
    pub r: u8,
    /// Green.
    pub g: u8,
    /// Blue.
    pub b: u8,
    /// Opacity.
    pub a: u8,
}

/// The colour of text and lines: a blue-black.
pub(crate) const INK: Colour = Colour::solid(0x14, 0x20, 0x2c);
/// Secondary lines and words.
pub(crate) const MUTED: Colour = Colour::solid(0x5a, 0x67, 0x72);
/// Hairlines behind the data.
pub(crate) const FAINT: Colour = Colour::solid(0xde, 0xe2, 0xe4);
/// The sheet.
pub(crate) const PAPER: Colour = Colour::solid(0xff, 0xff, 0xff);

/// Colours of successive curves, each also told apart by its dash: river and shore, alternately
/// dark and middling so that they stay apart in grey and for colour-blind readers.
pub(crate) const CURVES: [Colour; 6] = [
    Colour::solid(0x0e, 0x55, 0x60), // deep water
    Colour::solid(0xc8, 0x58, 0x2f), // brick
    Colour::solid(0x6c, 0x66, 0xc9), // mussel shell
    Colour::solid(0xd8, 0xab, 0x45), // sand
    Colour::solid(0x4f, 0x10, 0x30), // kelp
    Colour::solid(0x8c, 0xc4, 0xdd), // haze
];

impl Colour {
    /// A solid colour.
    pub const fn solid(r: u8, g: u8, b: u8) -> Self {
        Self { r, g, b, a: 255 }
    }

    /// The same colour with opacity `a` (0 to 255).
    pub const fn faded(self, a: u8) -> Self {
        Self { a, ..self }
    }

    /// `#rrggbb`, opacity left out.
    pub fn hex(self) -> String {
        format!("#{:02x}{:02x}{:02x}", self.r, self.g, self.b)
    }

    /// The sRGB colour nearest to CIELAB (L*, a*, b*) under D65.
    ///
    /// CIE 1976 L*a*b* and IEC 61966-2-1 (constants from memory; a test compares them with values
    /// of a general-purpose colour library). Out-of-gamut components are clipped.
    pub fn from_lab([lightness, a, b]: [f64; 3]) -> Self {
        let fy = (lightness + 16.0) / 116.0;
        let back = |f: f64| {
            if f > 6.0 / 29.0 {
                f.powi(3)
            } else {
                3.0 * (6.0f64 / 29.0).powi(2) * (f - 4.0 / 29.0)
            }
        };
        let x = 0.950_47 * back(fy + a / 500.0);
        let y = back(fy);
        let z = 1.088_83 * back(fy - b / 200.0);
        let encode = |c: f64| {
            let c = c.clamp(0.0, 1.0);
            let c = if c <= 0.003_130_8 {
                12.92 * c
            } else {
                1.055 * c.powf(1.0 / 2.4) - 0.055
            };
            (255.0 * c).round() as u8
        };
        Self::solid(
            encode(3.240_454_2 * x - 1.537_138_5 * y - 0.498_531_4 * z),
            encode(-0.969_266_0 * x + 1.876_010_8 * y + 0.041_556_0 * z),
            encode(0.055_643_4 * x - 0.204_025_9 * y + 1.057_225_2 * z),
        )
    }
}
