//! Whole figures: what is in them, and what is refused.

use ndarray::Array2;
use proptest::prelude::*;

use super::*;
use crate::field::{Grid, ScalarField, Status, Trace, VectorField};
use crate::quantity::Unit;

fn grid(nx: usize, ny: usize, length: Unit) -> Grid {
    Grid {
        nx,
        ny,
        x0: 16.0,
        y0: 16.0,
        dx: 8.0,
        dy: 8.0,
        length,
    }
}

fn vorticity(grid: Grid, f: impl Fn(f64, f64) -> f64) -> ScalarField {
    ScalarField {
        grid,
        values: grid.map(f),
        unit: Unit::ONE.per(Unit::S),
        name: "vorticity".to_owned(),
    }
}

fn waves(x: f64, y: f64) -> f64 {
    (x / 30.0).sin() * (y / 20.0).cos()
}

/// Solid rotation about the middle, with one vector of each kind.
fn rotation(grid: Grid) -> VectorField {
    let (cx, cy) = (0.5 * (grid.x0 + grid.x1()), 0.5 * (grid.y0 + grid.y1()));
    let mut u = grid.map(|_, y| -(y - cy));
    let v = grid.map(|x, _| x - cx);
    u[(0, 0)] = f64::NAN;
    let mut field = VectorField::new(grid, Unit::S, u, v, "turntable");
    if let Some(status) = field.status.get_mut((grid.ny / 2, grid.nx / 2)) {
        *status = Status::Replaced;
    }
    field
}

fn ring(flagged: bool, clockwise: bool) -> Outline {
    Outline {
        polygon: (0..40)
            .map(|k| f64::from(k) * 0.157)
            .map(|t| [80.0 + 20.0 * t.cos(), 80.0 + 20.0 * t.sin()])
            .collect(),
        centre: [80.0, 80.0],
        label: "7".to_owned(),
        clockwise,
        flagged,
    }
}

fn map() -> Figure {
    let mm = grid(20, 18, Unit::MM);
    let mut field = vorticity(mm, waves);
    field.values[(3, 4)] = f64::NAN;
    let list = vec![ring(true, true), ring(false, false)];
    Figure::new()
        .shade(field, ShadeOptions::default())
        .arrows(rotation(mm), ArrowOptions::default())
        .outlines(OutlineSet {
            length: Unit::MM,
            list,
        })
        .title("Basin & inlet <pair 3>")
}

/// The words of a figure, by a reader of XML that is not ours (roxmltree).
fn words(svg: &str) -> Vec<String> {
    let document = roxmltree::Document::parse(svg).expect("well-formed");
    document
        .descendants()
        .filter_map(|n| n.attribute("aria-label").map(str::to_owned))
        .collect()
}

fn drawn(figure: &Figure) -> String {
    sound(figure.svg().expect("a figure"))
}

/// The drawing, once it is known to hold no coordinate that is not a number.
fn sound(svg: String) -> String {
    for wrong in ["NaN", "inf", "nan"] {
        let outside_data = svg
            .split("base64,")
            .map(|part| part.split_once('"').map_or(part, |(_, rest)| rest));
        assert!(
            outside_data.into_iter().all(|part| !part.contains(wrong)),
            "{wrong}"
        );
    }
    svg
}

fn error(figure: &Figure) -> String {
    figure.svg().expect_err("no figure").to_string()
}

#[test]
fn a_map_says_in_words_what_a_reader_needs() {
    let found = words(&drawn(&map()));
    for needed in [
        "Basin & inlet <pair 3>",
        "x (mm)",
        "y (mm)",
        "vorticity (1/s)",
        "100 mm/s",
        "replaced",
        "flagged",
        "no value",
        "7",
        "−0.6",
    ] {
        assert!(found.iter().any(|w| w == needed), "{needed} in {found:?}");
    }
}

#[test]
fn the_same_figure_gives_the_same_bytes_and_a_changed_copy_leaves_it_alone() {
    let figure = map();
    let (svg, png) = (figure.svg().unwrap(), figure.png(60.0).unwrap());
    let other = figure.clone().title("other").width_mm(90.0);
    assert_ne!(other.svg().unwrap(), svg);
    assert_eq!(map().svg().unwrap(), svg);
    assert_eq!(figure.svg().unwrap(), svg);
    assert_eq!(figure.png(60.0).unwrap(), png);
}

#[test]
fn a_png_has_the_size_on_paper_at_the_dots_asked_for() {
    let curve = Curve::new("f", vec![0.0, 1.0], vec![1.0, 2.0]);
    let figure = Figure::new().line(curve).size_mm(101.6, 101.6);
    let bytes = figure.png(100.0).unwrap();
    // Read by the general-purpose `image` crate: 101.6 mm are 4 inches.
    let image = image::load_from_memory(&bytes).unwrap().to_rgb8();
    assert_eq!(image.dimensions(), (400, 400));
    assert_eq!(image.get_pixel(0, 0).0, [255, 255, 255]);
    assert!(svg_size(&figure).starts_with("width=\"101.6mm\" height=\"101.6mm\""));
    assert!(
        figure
            .png(1e4)
            .unwrap_err()
            .to_string()
            .contains("20 to 2400")
    );
}

#[test]
fn a_map_given_more_height_than_its_scale_allows_leaves_no_blank_below() {
    let natural = map().width_mm(90.0).scene(4.0).unwrap();
    let given = map().size_mm(90.0, 140.0).scene(4.0).unwrap();
    assert_eq!(given.width, 90.0);
    assert!((given.height - natural.height).abs() < 0.01);
}

fn svg_size(figure: &Figure) -> String {
    let svg = figure.svg().unwrap();
    svg.split_once("width")
        .map(|(_, rest)| format!("width{rest}"))
        .unwrap_or_default()
}

/// Mean colour of a small patch of the drawn plot, at a fraction of its width and height.
fn colour_at(figure: &Figure, fx: f64, fy: f64) -> [i32; 3] {
    let (settled, dots_per_mm) = (figure.scene(4.0).unwrap(), 4.0);
    let rect = settled
        .items
        .iter()
        .find_map(|i| match i {
            scene::Item::Dots { rect, .. } => Some(*rect),
            _ => None,
        })
        .unwrap();
    let bytes = raster::write(&settled, dots_per_mm).unwrap();
    let image = image::load_from_memory(&bytes).unwrap().to_rgb8();
    let x = ((rect.x + fx * rect.w) * dots_per_mm) as u32;
    let y = ((rect.y + fy * rect.h) * dots_per_mm) as u32;
    image.get_pixel(x, y).0.map(i32::from)
}

#[test]
fn shading_puts_each_value_where_it_belongs_with_row_0_below() {
    // Negative to the left and below, so a mirrored or upturned drawing would show.
    let field = vorticity(grid(24, 24, Unit::MM), |x, y| {
        (x - 108.0) + 3.0 * (y - 108.0)
    });
    let figure = Figure::new().shade(field, ShadeOptions::default());
    let expected = |value: f64| {
        let half = 4.0 * 92.0;
        let c = ColourScale::EbbFlood.at(0.5 * (value / half + 1.0));
        [c.r, c.g, c.b].map(i32::from)
    };
    for (fx, fy) in [
        (0.25, 0.25),
        (0.75, 0.25),
        (0.25, 0.75),
        (0.75, 0.75),
        (0.1, 0.55),
    ] {
        let (x, y) = ((fx - 0.5) * 192.0, (0.5 - fy) * 192.0);
        let (found, wanted) = (colour_at(&figure, fx, fy), expected(x + 3.0 * y));
        // One dot is 0.5 mm of 192, so a value 1 % of the half range off: up to 3 of 255.
        let off = found.iter().zip(wanted).map(|(a, b)| (a - b).abs()).max();
        assert!(off <= Some(8), "at {fx} {fy}: {found:?} for {wanted:?}");
    }
}

#[test]
fn cells_without_value_are_hatched_grey_and_never_coloured() {
    let mut field = vorticity(grid(24, 24, Unit::MM), |_, _| 1.0);
    field
        .values
        .slice_mut(ndarray::s![0..12, ..])
        .fill(f64::NAN);
    field.values[(20, 20)] = f64::INFINITY;
    let figure = Figure::new().shade(field, ShadeOptions::default());
    for fx in [0.2, 0.41, 0.63, 0.8] {
        let [r, g, b] = colour_at(&figure, fx, 0.8);
        assert!(
            (r - b).abs() < 8 && (r - g).abs() < 8 && r > 180,
            "{r} {g} {b}"
        );
    }
    let [r, _, b] = colour_at(&figure, 0.3, 0.2);
    assert!((r - b).abs() > 8, "a value is coloured: {r} {b}");
}

#[test]
fn one_cell_one_row_constants_and_extremes_are_drawn() {
    let one = |nx, ny, value: f64| {
        let field = vorticity(grid(nx, ny, Unit::PX), |_, _| value);
        Figure::new().shade(field, ShadeOptions::default())
    };
    for value in [0.0, -0.0, 3.5, -4.2e-9, 1e120, -1e-200, f64::MIN_POSITIVE] {
        for (nx, ny) in [(1, 1), (40, 1), (1, 40), (7, 7)] {
            let svg = drawn(&one(nx, ny, value));
            assert!(words(&svg).len() > 4, "{value} on {nx} x {ny}");
        }
    }
    let still = VectorField::new(
        grid(5, 5, Unit::PX),
        Unit::FRAME,
        Array2::zeros((5, 5)),
        Array2::zeros((5, 5)),
        "still",
    );
    drawn(&Figure::new().arrows(still, ArrowOptions::default()));
    assert!(error(&one(3, 3, 1e200)).contains("cannot be drawn"));
    assert!(error(&one(3, 3, f64::NAN)).contains("vorticity holds no finite value"));
}

#[test]
fn a_curve_breaks_where_it_has_no_value() {
    let curve = |y: Vec<f64>| {
        let x = (0..y.len()).map(|k| k as f64).collect();
        Figure::new().line(Curve::new("f", x, y))
    };
    let pieces = |figure: &Figure| {
        let svg = drawn(figure);
        let document = roxmltree::Document::parse(&svg).unwrap();
        document
            .descendants()
            .filter(|n| n.attribute("stroke") == Some("#0e5560"))
            .filter_map(|n| n.attribute("d"))
            .filter(|d| d.contains('L'))
            .count()
    };
    assert_eq!(pieces(&curve(vec![1.0, 2.0, 3.0, 4.0, 5.0])), 1);
    assert_eq!(pieces(&curve(vec![1.0, 2.0, f64::NAN, 4.0, 5.0])), 2);
    assert_eq!(pieces(&curve(vec![1.0, 2.0, f64::INFINITY, 4.0, 5.0])), 2);
    // On an axis of decades there is no place for zero and less.
    assert_eq!(
        pieces(&curve(vec![1.0, 2.0, -3.0, 0.0, 4.0, 5.0]).log_y()),
        2
    );
}

#[test]
fn a_close_look_at_a_long_curve_keeps_its_slopes() {
    // From (0, 0) to (1e6, 1e6): through the middle of a plot from 0 to 1 at any size.
    let curve = Curve::new("f", vec![0.0, 1e6], vec![0.0, 1e6]);
    let svg = drawn(
        &Figure::new()
            .line(curve)
            .x_range(0.0, 1.0)
            .y_range(0.0, 1.0),
    );
    let document = roxmltree::Document::parse(&svg).unwrap();
    let line = document
        .descendants()
        .find(|n| n.attribute("stroke") == Some("#0e5560"))
        .unwrap();
    let numbers: Vec<f64> = line
        .attribute("d")
        .unwrap()
        .split(['M', 'L', ' '])
        .filter_map(|w| w.parse().ok())
        .collect();
    let clip = document
        .descendants()
        .find(|n| n.has_tag_name("clipPath"))
        .unwrap();
    let rect = clip.first_child().unwrap();
    let side = |name: &str| rect.attribute(name).unwrap().parse::<f64>().unwrap();
    let slope = (numbers[3] - numbers[1]) / (numbers[2] - numbers[0]);
    assert!(
        (slope + side("height") / side("width")).abs() < 1e-3,
        "{slope}"
    );
    assert!(
        numbers[2] < side("x") + side("width") + 6.0,
        "cut off near the plot"
    );
}

fn through(name: &str, length: Unit, f: impl Fn(f64) -> f64) -> Trace {
    let distance: Vec<f64> = (0..101).map(|k| f64::from(k) * 0.1).collect();
    Trace {
        x: distance.clone(),
        y: vec![5.0; 101],
        values: distance.iter().map(|d| f(*d)).collect(),
        distance,
        length,
        unit: Unit::ONE.per(Unit::S),
        name: name.to_owned(),
    }
}

#[test]
fn a_transect_counts_from_the_core_and_names_its_marks() {
    let traces = [
        through("vorticity", Unit::MM, |d| {
            8.0 * (-(d - 5.0) * (d - 5.0)).exp()
        }),
        through("swirl", Unit::MM, |d| {
            (4.0 - (d - 5.0) * (d - 5.0)).max(0.0)
        }),
    ];
    let marks = Transect {
        core: Some(5.0),
        level: Some((2.0, "25 % of the peak".to_owned())),
        boundaries: vec![
            (3.82, "left edge".to_owned()),
            (6.18, "right edge".to_owned()),
        ],
    };
    let found = words(&drawn(&transect(&traces, &marks)));
    for needed in [
        "distance from core (mm)",
        "1/s",
        "vorticity",
        "swirl",
        "25 % of the peak",
        "left edge",
        "right edge",
        "−4",
    ] {
        assert!(found.iter().any(|w| w == needed), "{needed} in {found:?}");
    }
}

#[test]
fn layers_in_px_and_mm_do_not_share_axes() {
    let (px, mm) = (grid(6, 6, Unit::PX), grid(6, 6, Unit::MM));
    let shaded = Figure::new().shade(vorticity(px, waves), ShadeOptions::default());
    let both = shaded.clone().arrows(rotation(mm), ArrowOptions::default());
    assert_eq!(
        error(&both),
        "the layers do not share the x axis: vorticity is in px, the vector field in mm"
    );
    let curve = Figure::new()
        .trace(&through("vorticity", Unit::MM, |d| d))
        .line(Curve::new("peak", vec![1.0], vec![2.0]).units(Unit::MM, Unit::MM));
    assert!(error(&curve).contains("y axis: vorticity is in 1/s, peak in mm"));
    let twice = shaded.shade(vorticity(px, waves), ShadeOptions::default());
    assert!(error(&twice).contains("a figure shades one field"));
}

#[test]
fn every_bad_input_is_one_clear_message() {
    let curve = |x: &[f64], y: &[f64]| Curve::new("decay", x.to_vec(), y.to_vec());
    let good = Figure::new().line(curve(&[0.0, 1.0], &[1.0, 2.0]));
    let vectors = |options| Figure::new().arrows(rotation(grid(6, 6, Unit::PX)), options);
    let cases: Vec<(Figure, &str)> = vec![
        (Figure::new(), "the figure is empty"),
        (Figure::new().marker(1.0, "here"), "the figure is empty"),
        (Figure::panels(vec![], 2), "the figure is empty"),
        (
            Figure::new().line(curve(&[], &[])),
            "decay holds no finite value",
        ),
        (
            Figure::new().line(curve(&[f64::NAN], &[1.0])),
            "decay holds no finite value",
        ),
        (
            Figure::new().line(curve(&[1.0], &[])),
            "needs one number for each of the 1 points",
        ),
        (
            Figure::new().line(curve(&[1.0], &[1.0]).band(vec![])),
            "decay: band needs one number for each",
        ),
        (good.clone().x_range(2.0, 1.0), "x_range 2 to 1 is no range"),
        (good.clone().y_range(f64::NAN, 1.0), "is no range"),
        (good.clone().y_range(0.0, f64::INFINITY), "is no range"),
        (good.clone().x_range(-1.0, 1.0).log_x(), "x_range -1 to 1"),
        (
            Figure::new().line(curve(&[1.0], &[-1.0])).log_y(),
            "the y axis is logarithmic, and no value along it is above zero",
        ),
        (good.clone().marker(f64::NAN, "core"), "\"core\""),
        (map().size_mm(120.0, 45.0), "leaves no room for the plot"),
        (
            good.clone().size_mm(10.0, 10.0),
            "leaves no room for the plot",
        ),
        (good.clone().size_mm(f64::NAN, 10.0), "cannot be drawn"),
        (good.clone().width_mm(1e9), "cannot be drawn"),
        (
            vectors(ArrowOptions {
                every: Some(0),
                ..Default::default()
            }),
            "every is 0; it should be 1 or more",
        ),
        (
            vectors(ArrowOptions {
                reference: Some(-2.0),
                ..Default::default()
            }),
            "reference is -2; it should be a speed above zero",
        ),
        (
            Figure::new().bars(Bars::histogram(&[f64::NAN], "error", Unit::PX, None)),
            "count holds no finite value",
        ),
    ];
    for (figure, expected) in cases {
        let found = error(&figure);
        assert!(
            found.contains(expected),
            "{found:?} should say {expected:?}"
        );
        assert!(!found.contains('\n'));
    }
}

#[test]
fn the_extension_decides_the_format_and_an_unknown_one_writes_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let figure = Figure::new().line(Curve::new("f", vec![0.0, 1.0], vec![1.0, 2.0]));
    let path = |name: &str| folder.path().join(name);
    figure.save(&path("a.svg")).unwrap();
    figure.save(&path("a.PNG")).unwrap();
    assert_eq!(
        std::fs::read_to_string(path("a.svg")).unwrap(),
        figure.svg().unwrap()
    );
    assert_eq!(&std::fs::read(path("a.PNG")).unwrap()[1..4], b"PNG");
    for name in ["a.jpg", "a"] {
        let error = figure.save(&path(name)).unwrap_err().to_string();
        assert!(error.ends_with("end the name in .svg or .png"), "{error}");
        assert!(!path(name).exists());
    }
    let error = Figure::new().save(&path("b.svg")).unwrap_err().to_string();
    assert!(error.contains("empty") && !path("b.svg").exists());
}

/// The least x or y and the greatest among the points of a path.
fn extent(path: &scene::Path, axis: usize) -> (f64, f64) {
    let mut all = (f64::INFINITY, f64::NEG_INFINITY);
    for step in &path.steps {
        if let scene::Step::Move(p) | scene::Step::Line(p) = step {
            all = (all.0.min(p[axis]), all.1.max(p[axis]));
        }
    }
    all
}

#[test]
fn arrows_point_inside_the_frame_and_keep_off_marks_and_labels() {
    let mm = grid(20, 18, Unit::MM);
    let even = |u: f64, v: f64| {
        let fill = |w| Array2::from_elem((18, 20), w);
        VectorField::new(mm, Unit::S, fill(u), fill(v), "even")
    };
    let plot = axis::Plot {
        rect: scene::Rect {
            x: 10.0,
            y: 10.0,
            w: 50.0,
            h: 45.0,
        },
        x: axis::Axis::new(
            "x",
            axis::Span {
                lo: 12.0,
                hi: 172.0,
            },
            None,
            false,
            0.0,
        )
        .unwrap(),
        y: axis::Axis::new(
            "y",
            axis::Span {
                lo: 12.0,
                hi: 156.0,
            },
            None,
            false,
            0.0,
        )
        .unwrap(),
    };
    let set = OutlineSet {
        length: Unit::MM,
        list: vec![ring(false, true)],
    };
    let boxes: Vec<scene::Rect> = outlines::place(&set, &plot).boxes().collect();
    assert_eq!(boxes.len(), 2, "a mark and a label");
    for (u, v) in [(3.0, 0.0), (-3.0, 0.0), (0.0, 3.0), (2.0, -2.0)] {
        let field = even(u, v);
        let fit = arrows::Arrows::new(&field, &ArrowOptions::default())
            .unwrap()
            .fit(&field, &plot);
        let tips = |clear: &[scene::Rect]| -> Vec<scene::Point> {
            let mut sheet = scene::Scene::new(70.0, 70.0);
            fit.draw(&mut sheet, &field, &plot, clear);
            let [scene::Item::Clip { rect, items }] = &sheet.items[..] else {
                panic!("cut off at the frame");
            };
            assert_eq!(*rect, plot.rect);
            let Some(scene::Item::Shape { path, .. }) = items.last() else {
                panic!("arrows");
            };
            // An arrow is a polygon of seven corners and its closing; the fourth is the tip.
            let tips = path.steps.chunks(8).map(|arrow| match arrow[3] {
                scene::Step::Line(p) => p,
                _ => panic!("a corner"),
            });
            tips.collect()
        };
        let (all, kept) = (tips(&[]), tips(&boxes));
        assert!(kept.len() < all.len() && kept.len() > all.len() / 2);
        assert!(all.iter().all(|p| plot.rect.grown(0.02).holds(*p)));
        let covered = |p: &scene::Point| boxes.iter().any(|b| b.holds(*p));
        assert!(!kept.iter().any(covered));
    }
}

#[test]
fn an_outline_in_doubt_has_no_unbroken_rim() {
    let mut sheet = scene::Scene::new(50.0, 50.0);
    outlines::draw_line(
        &mut sheet,
        scene::Path::segment([0.0, 0.0], [9.0, 0.0]),
        true,
    );
    assert_eq!(sheet.items.len(), 2);
    for item in &sheet.items {
        let scene::Item::Shape { stroke, .. } = item else {
            panic!("a line");
        };
        let stroke = stroke.as_ref().unwrap();
        assert!(!stroke.dash.is_empty() && !stroke.round);
    }
}

#[test]
fn a_curve_ends_short_of_the_frame() {
    let curve = Curve::new("f", vec![0.0, 1.0, 2.0], vec![1.0, 2.0, 1.5]);
    let sheet = Figure::new().line(curve).scene(4.0).unwrap();
    let (rect, items) = sheet
        .items
        .iter()
        .find_map(|item| match item {
            scene::Item::Clip { rect, items } => Some((rect, items)),
            _ => None,
        })
        .unwrap();
    let Some(scene::Item::Shape { path, .. }) = items.first() else {
        panic!("a line");
    };
    let (left, right) = extent(path, 0);
    assert!(left > rect.x + 1.0 && right < rect.right() - 1.0);
}

#[test]
fn plots_in_one_row_stand_level_and_are_equally_high() {
    let line = |name: &str| Figure::new().line(Curve::new(name, vec![0.0, 1.0], vec![1.0, 2.0]));
    let shaded = Figure::new().shade(
        vorticity(grid(20, 18, Unit::MM), waves),
        ShadeOptions::default(),
    );
    let row = vec![
        map(),
        shaded,
        line("second").title("Over it"),
        line("third"),
    ];
    let sheet = Figure::panels(row, 4).width_mm(480.0).scene(4.0).unwrap();
    // Shading fills the plot of a map; lines are cut off at the plot.
    let plots: Vec<scene::Rect> = sheet
        .items
        .iter()
        .filter_map(|item| match item {
            scene::Item::Dots { rect, .. } | scene::Item::Clip { rect, .. } => Some(*rect),
            _ => None,
        })
        .filter(|rect| rect.h > 10.0)
        .collect();
    assert!(plots.len() >= 4);
    for plot in &plots {
        assert!((plot.y - plots[0].y).abs() < 0.01, "{plots:?}");
        assert!((plot.h - plots[0].h).abs() < 0.01, "{plots:?}");
    }
}

#[test]
fn panels_share_one_sheet() {
    let line = Figure::new().line(Curve::new("f", vec![0.0, 1.0], vec![1.0, 2.0]));
    let parts = vec![map(), line.clone().title("second"), line.title("third")];
    let svg = drawn(&Figure::panels(parts, 2).title("All"));
    let found = words(&svg);
    for needed in ["All", "Basin & inlet <pair 3>", "second", "third"] {
        assert!(found.iter().any(|w| w == needed), "{needed} in {found:?}");
    }
    assert!(svg.contains("width=\"180mm\""));
}

#[test]
fn a_histogram_counts_every_finite_value_once() {
    let values: Vec<f64> = (0..1000).map(|k| (f64::from(k) * 0.731).sin()).collect();
    let bars = Bars::histogram(&values, "error", Unit::PX, None);
    assert_eq!(bars.heights.iter().sum::<f64>(), 1000.0);
    assert_eq!(bars.edges.len(), bars.heights.len() + 1);
    // Ten values between 0.13 and 0.83: five intervals would be 0.14 wide; 0.1 is the round
    // number nearest by ratio, and a value on an edge counts above it.
    let few = [0.13, 0.2, 0.25, 0.31, 0.33, 0.4, 0.47, 0.52, 0.7, 0.83];
    let bars = Bars::histogram(&few, "error", Unit::PX, None);
    assert_eq!(bars.edges, [0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9]);
    assert_eq!(bars.heights, [1.0, 2.0, 2.0, 2.0, 1.0, 0.0, 1.0, 1.0]);
    let bars = Bars::histogram(
        &[1.0, 1.0, f64::NAN, f64::INFINITY],
        "error",
        Unit::PX,
        Some(3),
    );
    assert_eq!(bars.heights, [0.0, 2.0, 0.0]);
    drawn(&Figure::new().bars(bars));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(40))]

    #[test]
    fn any_numbers_give_a_well_formed_drawing_or_one_error(
        y in proptest::collection::vec(proptest::num::f64::ANY, 0..30),
        band in proptest::num::f64::ANY,
        range in proptest::option::of((proptest::num::f64::ANY, proptest::num::f64::ANY)),
        log in proptest::bool::ANY,
        title in ".{0,60}",
    ) {
        let x = (0..y.len()).map(|k| k as f64).collect();
        let width = vec![band; y.len()];
        let mut figure = Figure::new().line(Curve::new("f", x, y).band(width)).title(&title);
        if let Some((lo, hi)) = range {
            figure = figure.y_range(lo, hi);
        }
        if log {
            figure = figure.log_y();
        }
        if let Ok(svg) = figure.svg() {
            words(&sound(svg));
            prop_assert!(figure.png(30.0).is_ok());
        }
    }

    #[test]
    fn any_field_gives_a_well_formed_drawing_or_one_error(
        nx in 1usize..6, ny in 1usize..6,
        values in proptest::collection::vec(proptest::num::f64::ANY, 25),
        cells in proptest::bool::ANY,
    ) {
        let g = grid(nx, ny, Unit::PX);
        let values = Array2::from_shape_fn((ny, nx), |(j, i)| values[j * 5 + i]);
        let field = ScalarField { values: values.clone(), ..vorticity(g, waves) };
        let flow = VectorField::new(g, Unit::FRAME, values.clone(), values, "any");
        let options = ShadeOptions { cells, ..Default::default() };
        let figure = Figure::new().shade(field, options);
        for figure in [figure.clone(), figure.arrows(flow, ArrowOptions::default())] {
            let figure = figure.width_mm(70.0);
            if let Ok(svg) = figure.svg() {
                words(&sound(svg));
                prop_assert!(figure.png(30.0).is_ok());
            }
        }
    }
}
