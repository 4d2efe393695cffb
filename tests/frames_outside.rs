//! Image files written by general-purpose libraries outside this project, held against the
//! formula they were written from: `tests/outside/make_tiffs.py` (tifffile 2026.3.3 with
//! imagecodecs 2026.3.6, Pillow 13.0.0).

use std::path::{Path, PathBuf};

use kolk::frames::{Frame, Order, Recording, RecordingOptions, read_frames, read_page};
use ndarray::Array2;

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/images")
}

/// The formula stated in make_tiffs.py.
fn levels(bits: u8, page: usize, width: usize, height: usize) -> Frame {
    let level = |(r, c): (usize, usize)| match bits {
        8 => (r * r + 29 * c + 53 * page + 7) % 256,
        12 => (r * r + 37 * c + 977 * page + 123) % 4096,
        _ => (r * r * 251 + 4001 * c + 977 * page + 12345) % 65536,
    };
    let pixels = Array2::from_shape_fn((height, width), |at| level(at) as f32);
    Frame { pixels, bits }
}

fn assert_is(name: &str, expected: &[Frame]) {
    let found = read_frames(&folder().join(name)).unwrap_or_else(|e| panic!("{e}"));
    assert!(found == expected, "{name} differs from its formula");
}

#[test]
fn every_layout_and_compression_is_read_exactly() {
    let layouts = [
        "strips",
        "tiles",
        "packbits",
        "packbits_tiles",
        "lzw",
        "lzw_predictor_tiles",
        "deflate",
        "deflate_predictor",
        "deflate_old_number",
        "deflate_tiles",
        "white_is_zero",
        "white_is_zero_tiles",
        "big_endian",
        "big_endian_predictor",
        "bigtiff",
        "bigtiff_big_endian",
        "pillow_lzw",
    ];
    for bits in [8, 16] {
        let expected = [levels(bits, 0, 40, 24)];
        for layout in layouts {
            assert_is(&format!("{layout}_{bits}.tif"), &expected);
        }
        assert_is(&format!("grey_{bits}.png"), &expected);
        let large = format!("lzw_{bits}_large.tif");
        assert_is(&large, &[levels(bits, 0, 100, 90)]);
    }
}

#[test]
fn a_camera_depth_between_8_and_16_bits_is_kept() {
    assert_is("camera_12.tif", &[levels(12, 0, 40, 24)]);
}

#[test]
fn pages_come_in_order_and_thumbnails_are_left_out() {
    let pages: Vec<_> = (0..4).map(|page| levels(16, page, 40, 24)).collect();
    assert_is("pages_16.tif", &pages);
    let file = folder().join("pages_16.tif");
    assert!(read_page(&file, 2).unwrap() == pages[2]);
    let error = read_page(&file, 4).unwrap_err().to_string();
    assert!(error.contains("no page 4") && error.contains("has 4"));
    assert_is(
        "pages_with_thumbnail_8.tif",
        &[levels(8, 0, 40, 24), levels(8, 1, 40, 24)],
    );
}

#[test]
fn pages_of_one_file_are_successive_frames_of_a_recording() {
    let open = |name: &str, order| {
        let options = RecordingOptions {
            order,
            ..Default::default()
        };
        Recording::open(&[name.to_owned()], &folder(), &options).unwrap()
    };
    let is = |recording: &Recording, index: usize, pages: [usize; 2]| {
        let (first, second) = recording.pair(index).unwrap().load().unwrap();
        *first == levels(16, pages[0], 40, 24) && *second == levels(16, pages[1], 40, 24)
    };
    let pairs = open("pages_16.tif", Order::Pairs);
    assert_eq!((pairs.len(), pairs.size()), (2, Some((40, 24))));
    assert!(is(&pairs, 0, [0, 1]) && is(&pairs, 1, [2, 3]));
    assert_eq!(pairs.pairs()[1].label(), "pages_16.tif, pages 3 and 4");
    let series = open("pages_16.tif", Order::Series);
    assert_eq!(series.len(), 3);
    assert!(is(&series, 1, [1, 2]));
    let stacked = open("pages_16.tif", Order::Stacked);
    assert_eq!((stacked.len(), stacked.size()), (4, Some((40, 12))));
    let (upper, lower) = stacked.pair(3).unwrap().load().unwrap();
    let whole = levels(16, 3, 40, 24).pixels;
    assert_eq!(upper.pixels, whole.slice(ndarray::s![..12, ..]));
    assert_eq!(lower.pixels, whole.slice(ndarray::s![12.., ..]));
}

#[test]
fn files_that_cannot_be_read_are_named_with_what_is_wrong() {
    let cases = [
        (
            "bad_colour.tif",
            "is a colour image (red, green, blue): convert it to 8- or 16-bit grey",
        ),
        (
            "bad_colour_planes.tif",
            "is a colour image (red, green, blue)",
        ),
        ("bad_colour_table.tif", "is a colour image (a colour table)"),
        ("bad_colour.png", "is a colour image (red, green, blue)"),
        ("bad_colour_table.png", "is a colour image (a colour table)"),
        (
            "bad_float.tif",
            "is 32-bit floating-point grey; kolk reads unsigned grey of 8 or 16 bits",
        ),
        ("bad_half.tif", "is 16-bit floating-point grey"),
        ("bad_32_bit.tif", "is 32-bit grey; kolk reads"),
        ("bad_signed.tif", "is 16-bit grey with a sign"),
        ("bad_1_bit.tif", "is 1-bit grey"),
        ("bad_1_bit.png", "is grey of fewer than 8 bits"),
        ("bad_two_channels.tif", "is made of 2 channels"),
        ("bad_transparent.png", "is grey with transparency"),
        (
            "bad_jpeg_inside.tif",
            "is compressed by method 7 of the TIFF standard",
        ),
        ("bad_jpeg.jpg", "is not an image kolk reads: it is a JPEG"),
        ("bad_text.tif", "is not an image kolk reads: it is text"),
        ("bad_empty.tif", "is cut short: it is empty"),
        (
            "bad_cut_short.tif",
            "is cut short: its pixels reach to byte 2160, the file ends at byte 1296",
        ),
        (
            "bad_cut_short_lzw.tif",
            "is cut short: its pixels reach to byte 2503, the file ends at byte 1501",
        ),
        ("bad_cut_short.png", "is cut short"),
    ];
    for (name, part) in cases {
        let file = folder().join(name);
        let error = read_frames(&file).unwrap_err().to_string();
        assert!(error.starts_with(&file.display().to_string()), "{error}");
        assert!(error.contains(part), "{name}: {error}");
    }
}
