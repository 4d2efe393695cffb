//! The claims the colour scales make, in numbers.
//!
//! Reference values come from two general-purpose colour libraries; the script that printed them
//! is `tests/outside/colour_reference.py`.

use super::super::colour::CURVES;
use super::*;

type Three = [f64; 3];

fn linear(c: Colour) -> Three {
    [c.r, c.g, c.b].map(|v| {
        let v = f64::from(v) / 255.0;
        if v <= 0.040_45 {
            v / 12.92
        } else {
            ((v + 0.055) / 1.055).powf(2.4)
        }
    })
}

fn times(m: &[Three; 3], v: Three) -> Three {
    std::array::from_fn(|k| m[k][0] * v[0] + m[k][1] * v[1] + m[k][2] * v[2])
}

/// CIELAB (D65) of linear sRGB: the way back, with the standard's own forward matrix (IEC
/// 61966-2-1, from memory).
fn lab(rgb: Three) -> Three {
    const M: [Three; 3] = [
        [0.412_456_4, 0.357_576_1, 0.180_437_5],
        [0.212_672_9, 0.715_152_2, 0.072_175_0],
        [0.019_333_9, 0.119_192_0, 0.950_304_1],
    ];
    let [x, y, z] = times(&M, rgb);
    let f = |t: f64| {
        if t > (6.0f64 / 29.0).powi(3) {
            t.cbrt()
        } else {
            t * (29.0f64 / 6.0).powi(2) / 3.0 + 4.0 / 29.0
        }
    };
    let (fx, fy, fz) = (f(x / 0.950_47), f(y), f(z / 1.088_83));
    [116.0 * fy - 16.0, 500.0 * (fx - fy), 200.0 * (fy - fz)]
}

/// Colour difference CIEDE2000 (CIE 142-2001, from memory; checked below against a library).
fn difference([l1, a1, b1]: Three, [l2, a2, b2]: Three) -> f64 {
    let mean_c = 0.5 * (a1.hypot(b1) + a2.hypot(b2));
    let weight = |c: f64| (c.powi(7) / (c.powi(7) + 25f64.powi(7))).sqrt();
    let g = 1.0 + 0.5 * (1.0 - weight(mean_c));
    let (a1, a2) = (a1 * g, a2 * g);
    let (c1, c2) = (a1.hypot(b1), a2.hypot(b2));
    let hue = |a: f64, b: f64| b.atan2(a).to_degrees().rem_euclid(360.0);
    let (h1, h2) = (hue(a1, b1), hue(a2, b2));
    let mut dh = h2 - h1;
    if dh > 180.0 {
        dh -= 360.0;
    } else if dh < -180.0 {
        dh += 360.0;
    }
    let mut h = 0.5 * (h1 + h2);
    if (h1 - h2).abs() > 180.0 {
        h += if h < 180.0 { 180.0 } else { -180.0 };
    }
    let (dl, dc) = (l2 - l1, c2 - c1);
    let dh = 2.0 * (c1 * c2).sqrt() * (0.5 * dh).to_radians().sin();
    let (l, c) = (0.5 * (l1 + l2), 0.5 * (c1 + c2));
    let cos = |degrees: f64| degrees.to_radians().cos();
    let t = 1.0 - 0.17 * cos(h - 30.0) + 0.24 * cos(2.0 * h) + 0.32 * cos(3.0 * h + 6.0)
        - 0.20 * cos(4.0 * h - 63.0);
    let sl = 1.0 + 0.015 * (l - 50.0).powi(2) / (20.0 + (l - 50.0).powi(2)).sqrt();
    let (sc, sh) = (1.0 + 0.045 * c, 1.0 + 0.015 * c * t);
    let turn = 60.0 * (-((h - 275.0) / 25.0).powi(2)).exp();
    let rt = -2.0 * weight(c) * turn.to_radians().sin();
    let (l, c, h) = (dl / sl, dc / sc, dh / sh);
    (l * l + c * c + h * h + rt * c * h).sqrt()
}

/// How protanopes and deuteranopes see linear sRGB: Machado, Oliveira & Fernandes 2009, severity
/// 1.0 (matrices from memory; checked below against a library).
const DICHROMATS: [[Three; 3]; 2] = [
    [
        [0.152_286, 1.052_583, -0.204_868],
        [0.114_503, 0.786_281, 0.099_216],
        [-0.003_882, -0.048_116, 1.051_998],
    ],
    [
        [0.367_322, 0.860_646, -0.227_968],
        [0.280_085, 0.672_501, 0.047_413],
        [-0.011_820, 0.042_940, 0.968_881],
    ],
];

fn seen(c: Colour, eye: &[Three; 3]) -> Three {
    lab(times(eye, linear(c)).map(|v| v.clamp(0.0, 1.0)))
}

/// Every way of seeing the tests ask about, the common one among them.
fn eyes() -> [[Three; 3]; 3] {
    let plain = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]];
    [plain, DICHROMATS[0], DICHROMATS[1]]
}

const BOTH: [ColourScale; 2] = [ColourScale::Silt, ColourScale::EbbFlood];

/// 33 colours: 32 steps, coarse enough that rounding to 8 bits does not decide the outcome.
fn colours(scale: ColourScale) -> Vec<Colour> {
    (0..=32).map(|k| scale.at(f64::from(k) / 32.0)).collect()
}

#[test]
fn the_yardsticks_agree_with_a_colour_library() {
    let colour = |hex: u32| Colour::solid((hex >> 16) as u8, (hex >> 8) as u8, hex as u8);
    let at = |hex: u32| lab(linear(colour(hex)));
    // CIELAB under D65 from colorspacious 1.1; 0.1 covers its six-digit white point.
    for (hex, expected) in [
        (0x0e5560, [32.777, -16.373, -12.346]),
        (0xc8582f, [51.225, 42.225, 44.382]),
        (0xf4f3ef, [95.815, -0.359, 2.03]),
        (0x78222e, [27.666, 38.072, 13.89]),
        (0x8cc4dd, [76.237, -11.945, -18.235]),
    ] {
        for (ours, theirs) in at(hex).into_iter().zip(expected) {
            assert!((ours - theirs).abs() < 0.1, "{hex:06x}: {ours} {theirs}");
        }
        assert_eq!(Colour::from_lab(at(hex)), colour(hex), "there and back");
    }
    // CIEDE2000 from scikit-image 0.26.
    for (left, right, expected) in [
        (0x0e5560, 0xc8582f, 45.228),
        (0xc8582f, 0x78222e, 25.832),
        (0xf4f3ef, 0x8cc4dd, 21.738),
        (0x0e5560, 0x8cc4dd, 41.815),
    ] {
        let found = difference(at(left), at(right));
        assert!((found - expected).abs() < 0.1, "{found} {expected}");
    }
    // Dichromacy from colorspacious 1.1, as sRGB fractions.
    let library = [
        (0, 0x0e5560, [0.2981, 0.32, 0.3791]),
        (0, 0xc8582f, [0.4671, 0.4178, 0.164]),
        (1, 0x0e5560, [0.2556, 0.2889, 0.3768]),
        (1, 0xc8582f, [0.5746, 0.5156, 0.1715]),
    ];
    for (eye, hex, expected) in library {
        let bytes = expected.map(|v| (v * 255.0f64).round() as u8);
        let theirs = lab(linear(Colour::solid(bytes[0], bytes[1], bytes[2])));
        let ours = seen(colour(hex), &DICHROMATS[eye]);
        assert!(
            difference(ours, theirs) < 0.5,
            "{hex:06x}: {ours:?} {theirs:?}"
        );
    }
}

#[test]
fn lightness_is_straight_and_a_signed_scale_is_as_light_on_both_sides() {
    // 0.4: half a step of 8 bits in each channel moves L* by about 0.2.
    for (k, c) in colours(ColourScale::Silt).into_iter().enumerate() {
        let wanted = 96.0 - 82.0 * k as f64 / 32.0;
        assert!((lab(linear(c))[0] - wanted).abs() < 0.4, "{k}");
    }
    let signed = colours(ColourScale::EbbFlood);
    for k in 0..16 {
        let (left, right) = (lab(linear(signed[k]))[0], lab(linear(signed[32 - k]))[0]);
        assert!((left - right).abs() < 0.4, "{k}: {left} {right}");
        assert!(
            left < lab(linear(signed[k + 1]))[0] - 3.0,
            "rises to the middle"
        );
    }
    let [_, a, b] = lab(linear(signed[16]));
    assert!(a.hypot(b) < 3.0, "the middle is neutral");
}

#[test]
fn neighbouring_steps_are_nearly_equally_far_apart() {
    for scale in BOTH {
        let seen: Vec<Three> = colours(scale).into_iter().map(|c| lab(linear(c))).collect();
        let steps: Vec<f64> = seen.windows(2).map(|p| difference(p[0], p[1])).collect();
        let mean = steps.iter().sum::<f64>() / 32.0;
        let spread = (steps.iter().map(|s| (s - mean).powi(2)).sum::<f64>() / 32.0).sqrt();
        let (least, most) = steps
            .iter()
            .fold((f64::MAX, 0.0f64), |(l, m), s| (l.min(*s), m.max(*s)));
        // The knots are even to 3 % in CAM02-UCS; CIEDE2000, another yardstick, weighs light and
        // dark ends differently (measured: 15 % for silt, 9 % for ebb_flood).
        assert!(spread / mean < 0.18 && least > 0.65 * mean && most < 1.5 * mean);
    }
}

#[test]
fn colour_blind_readers_see_the_same_order_and_tell_the_ends_apart() {
    for eye in &DICHROMATS {
        let silt: Vec<Three> = colours(ColourScale::Silt)
            .iter()
            .map(|c| seen(*c, eye))
            .collect();
        assert!(
            silt.windows(2).all(|p| p[1][0] < p[0][0] - 1.0),
            "silt falls"
        );
        assert!(difference(silt[0], silt[32]) > 60.0);
        let signed: Vec<Three> = colours(ColourScale::EbbFlood)
            .iter()
            .map(|c| seen(*c, eye))
            .collect();
        assert!(
            (0..16).all(|k| signed[k][0] < signed[k + 1][0] - 1.0),
            "rises to the middle"
        );
        assert!(
            (16..32).all(|k| signed[k][0] > signed[k + 1][0] + 1.0),
            "falls after it"
        );
        // A difference of 20 is beyond mistaking; one of 2 is just seen (common practice, no
        // source). From an eighth of the way out, equal values of opposite sign stay apart.
        for k in 0..=14 {
            let apart = difference(signed[k], signed[32 - k]);
            let least = if k <= 8 { 20.0 } else { 5.0 };
            assert!(apart > least, "step {k}: {apart}");
        }
    }
}

#[test]
fn curves_stay_apart_for_every_reader() {
    for eye in &eyes() {
        for (k, a) in CURVES.iter().enumerate() {
            for b in &CURVES[..k] {
                let apart = difference(seen(*a, eye), seen(*b, eye));
                assert!(apart > 12.0, "{a:?} {b:?}: {apart}");
            }
        }
    }
}

#[test]
fn fractions_beyond_the_ends_take_the_end() {
    for scale in BOTH {
        assert_eq!(scale.at(-3.0), scale.at(0.0));
        assert_eq!(scale.at(7.0), scale.at(1.0));
        assert_eq!(scale.at(f64::NAN), scale.at(0.0));
        assert_eq!(ColourScale::parse(scale.text()), Some(scale));
    }
    assert_eq!(ColourScale::parse("sand"), None);
}
