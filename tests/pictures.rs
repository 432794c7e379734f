//! Pictures are read back from their SVG: what is drawn where.

use roxmltree::{Document, Node};
use wellwright::models::{Band, BandOperator};
use wellwright::report::svg::{
    BandDiagram, FINENESS, Gaussian, SensitivityBar, SensitivityBars, Width, Window,
    YieldHistogram, palette, text_width_pt,
};
use wellwright::structure::{self, Stack, Structure};
use wellwright::subbands::{Accuracy, Bands, Curves, Place, Solution, coupled_curves, curves};

const SHIPPED: [&str; 6] = [
    include_str!("../structures/coupled-well-emitter.yaml"),
    include_str!("../structures/graded-parabolic-well.yaml"),
    include_str!("../structures/methane-cascade-7p7um.yaml"),
    include_str!("../structures/short-wave-emitter.yaml"),
    include_str!("../structures/terahertz-module.yaml"),
    include_str!("../structures/thermal-camera-8p6um.yaml"),
];
/// Those with holes.
const WITH_HOLES: [&str; 2] = [
    include_str!("../structures/field-modulator-well.yaml"),
    include_str!("../structures/strained-980nm-well.yaml"),
];
const WIDTHS: [Width; 2] = [Width::Page, Width::Column];
/// A figure that two columns of a journal or a page can take: A4 less its margins, in points.
const TALLEST_PT: f64 = 740.0;

struct Solved {
    structure: Structure,
    stack: Stack,
    bands: Bands,
    shown: Vec<usize>,
    curves: Vec<Curves>,
}

fn solved(text: &str) -> Solved {
    let (file, problems) = structure::read(text);
    let structure = file.unwrap_or_else(|| panic!("{problems:?}\n{text}"));
    let stack = structure
        .stack()
        .unwrap_or_else(|problems| panic!("{problems:?}\n{text}"));
    let bands = Bands::solve(&stack, &Band::of(&structure), Accuracy::default()).unwrap();
    let shown = bands.asked_for(&structure);
    let curves = (0..bands.count()).map(|band| match bands.solution(band) {
        Solution::Alone(solved) => {
            let operator = BandOperator::new(&stack, solved.band).unwrap();
            curves(&operator, solved, shown[band], FINENESS)
        }
        Solution::Coupled(coupled, side) => coupled_curves(coupled, side, shown[band], FINENESS),
    });
    Solved {
        curves: curves.collect(),
        bands,
        shown,
        structure,
        stack,
    }
}

fn diagram(solved: &Solved) -> BandDiagram {
    let Solved {
        structure,
        stack,
        bands,
        shown,
        curves,
    } = solved;
    BandDiagram::new(structure, stack, bands, curves.clone(), shown)
}

fn attribute(node: Node, name: &str) -> f64 {
    node.attribute(name)
        .and_then(|value| value.parse().ok())
        .unwrap_or_else(|| panic!("no number {name} in {node:?}"))
}

fn group<'a>(document: &'a Document, class: &str) -> Node<'a, 'a> {
    document
        .descendants()
        .find(|node| node.attribute("class") == Some(class))
        .unwrap_or_else(|| panic!("no group {class}"))
}

fn children<'a>(node: Node<'a, 'a>, tag: &'static str) -> impl Iterator<Item = Node<'a, 'a>> {
    node.descendants().filter(move |n| n.has_tag_name(tag))
}

fn words(node: Node) -> String {
    node.descendants()
        .filter(|n| n.is_text())
        .filter_map(|n| n.text())
        .collect()
}

/// Left, top, right and bottom of a text, from its estimated width; letters reach a little below their line.
fn text_box(node: Node) -> [f64; 4] {
    let size = attribute(node, "font-size");
    let pieces: f64 = node
        .descendants()
        .filter(|n| n.is_text())
        .map(|n| {
            let own = n.parent().filter(|p| p.has_tag_name("tspan"));
            let size = own.map_or(size, |p| attribute(p, "font-size"));
            text_width_pt(n.text().unwrap_or(""), size)
        })
        .sum();
    let (x, y) = (attribute(node, "x"), attribute(node, "y"));
    let start = match node.attribute("text-anchor") {
        Some("middle") => -0.5 * pieces,
        Some("end") => -pieces,
        _ => 0.0,
    };
    let (above, below) = (0.72 * size, 0.2 * size);
    if node.attribute("transform").is_some() {
        [x - above, y - start - pieces, x + below, y - start]
    } else {
        [x + start, y - above, x + start + pieces, y + below]
    }
}

/// The picture parses, stays inside its page, and no two of its texts overlap.
fn assert_tidy(name: &str, svg: &str) {
    let document = Document::parse(svg).unwrap_or_else(|error| panic!("{name}: {error}"));
    let root = document.root_element();
    let page: Vec<f64> = root
        .attribute("viewBox")
        .unwrap()
        .split(' ')
        .map(|v| v.parse().unwrap())
        .collect();
    assert!(page[3] <= TALLEST_PT, "{name} is {} pt high", page[3]);
    let texts: Vec<(String, [f64; 4])> = children(root, "text")
        .map(|node| (words(node), text_box(node)))
        .collect();
    assert!(texts.len() > 5, "{name} has texts");
    for (index, (text, own)) in texts.iter().enumerate() {
        assert!(
            own[0] >= 0.0 && own[1] >= 0.0 && own[2] <= page[2] && own[3] <= page[3],
            "{name}: `{text}` at {own:?} leaves the page {page:?}"
        );
        for (other_text, other) in &texts[..index] {
            let apart = own[2] <= other[0] + 0.01
                || other[2] <= own[0] + 0.01
                || own[3] <= other[1] + 0.01
                || other[3] <= own[1] + 0.01;
            assert!(
                apart,
                "{name}: `{text}` at {own:?} covers `{other_text}` at {other:?}"
            );
        }
    }
    for tag in ["line", "rect"] {
        for node in children(root, tag) {
            for (key, limit) in [
                ("x1", page[2]),
                ("x2", page[2]),
                ("y1", page[3]),
                ("y2", page[3]),
            ] {
                if node.attribute(key).is_some() {
                    let value = attribute(node, key);
                    assert!(
                        (0.0..=limit).contains(&value),
                        "{name}: {node:?} leaves the page"
                    );
                }
            }
        }
    }
}

fn number(text: &str) -> f64 {
    text.replace('−', "-")
        .parse()
        .unwrap_or_else(|_| panic!("{text} is no number"))
}

/// Value against place on an axis: slope and offset from its lowest and its highest tick.
fn axis(document: &Document, class: &str, place: &str) -> impl Fn(f64) -> f64 + use<> {
    axis_of(group(document, class), class, place)
}

fn axis_of(group: Node, class: &str, place: &str) -> impl Fn(f64) -> f64 + use<> {
    let values: Vec<f64> = children(group, "text")
        .map(words)
        .filter_map(|text| text.replace('−', "-").parse().ok())
        .collect();
    // The first line is the axis itself.
    let places: Vec<f64> = children(group, "line")
        .skip(1)
        .map(|line| attribute(line, place))
        .collect();
    assert_eq!(values.len(), places.len());
    assert!(values.len() >= 2, "{class} has {values:?}");
    let last = values.len() - 1;
    let slope = (values[last] - values[0]) / (places[last] - places[0]);
    let (value, origin) = (values[0], places[0]);
    move |place: f64| value + slope * (place - origin)
}

/// Levels stand where the axis says, to half a hundredth of a point at both ends of the scale and at the level itself.
fn assert_levels_in_place(name: &str, solved: &Solved, svg: &str) {
    let document = Document::parse(svg).unwrap();
    let energy = axis(&document, "axis-y", "y1");
    let per_point = (energy(0.0) - energy(1.0)).abs();
    let unit = if svg.contains(">Energy (eV)<") {
        1.0
    } else {
        1e3
    };
    let levels: Vec<f64> = children(group(&document, "levels"), "line")
        .map(|line| attribute(line, "y1"))
        .collect();
    let states = solved.bands.conduction().unwrap().states();
    assert_eq!(levels.len(), states.len(), "{name}");
    for (y, state) in levels.iter().zip(&states) {
        let (drawn, solved) = (energy(*y), unit * state.from_edge_ev);
        assert!(
            (drawn - solved).abs() <= 0.02 * per_point,
            "{name}: {drawn} drawn for {solved}; one point is {per_point}"
        );
    }
    let printed: Vec<f64> = children(group(&document, "energies"), "text")
        .map(words)
        .filter(|text| text.contains('.'))
        .map(|text| number(&text))
        .collect();
    for (printed, state) in printed.iter().rev().zip(&states) {
        assert!(
            (printed - unit * state.from_edge_ev).abs() <= 0.0501,
            "{name}: {printed} printed"
        );
    }
}

fn check_all(name: &str, text: &str) {
    let solved = solved(text);
    for width in WIDTHS {
        let name = format!("{name} ({width:?})");
        let svg = diagram(&solved).svg(width);
        assert_tidy(&name, &svg);
        assert_levels_in_place(&name, &solved, &svg);
    }
}

#[test]
fn shipped_structures() {
    for text in SHIPPED {
        let title = text.lines().find(|line| line.starts_with("title")).unwrap();
        check_all(title, text);
        let svg = diagram(&solved(text)).svg(Width::Page);
        assert!(svg.len() < 150_000, "{title}: {} bytes", svg.len());
    }
}

const MATERIALS: &str = "materials:\n  W: {conduction_edge: 0 eV, electron_mass: 0.067}\n  B: {conduction_edge: 0.25 eV, electron_mass: 0.09}\n";

#[test]
fn a_single_layer() {
    check_all(
        "one layer",
        &(MATERIALS.to_owned() + "layers: [{material: W, width: 10 nm}]\n"),
    );
}

#[test]
fn sixty_layers() {
    let mut text = MATERIALS.to_owned()
        + "field: 8 kV/cm\nbands: {conduction: {model: parabolic, states: 8}}\nlayers:\n";
    for k in 0..30 {
        text += &format!(
            "  - {{name: barrier number {k}, material: B, width: {} nm}}\n",
            3 + k % 4
        );
        text += &format!("  - {{material: W, width: {} nm}}\n", 4 + k % 3);
    }
    check_all("sixty layers", &text);
}

/// Forty periods of four wells and a barrier at each end: 322 layers.
fn cascade() -> String {
    let mut text = MATERIALS.to_owned()
        + "title: Forty periods\nfield: -20 kV/cm\nbands: {conduction: {model: parabolic, states: 12}}\nlayers:\n  \
           - {material: B, width: 20 nm}\n  - repeat: 40\n    layers:\n";
    for (barrier, well) in [(3.0, 6.0), (1.5, 5.0), (1.2, 4.0), (2.0, 3.0)] {
        text += &format!(
            "      - {{material: B, width: {barrier} nm}}\n      - {{material: W, width: {well} nm}}\n"
        );
    }
    text + "  - {material: B, width: 20 nm}\n"
}

#[test]
fn forty_periods() {
    check_all("forty periods", &cascade());
    let svg = diagram(&solved(&cascade())).svg(Width::Page);
    assert!(svg.len() < 500_000, "{} bytes", svg.len());
    assert!(svg.contains("Layers 2 to 9 stand 40 times."));
}

#[test]
fn many_levels_nearly_in_one_place() {
    let text = MATERIALS.to_owned()
        + "bands: {conduction: {model: parabolic, states: 12}}\nlayers:\n  - {material: B, width: 12 nm}\n  - repeat: 12\n    \
           layers:\n      - {name: a well, material: W, width: 6 nm}\n      - {name: a barrier, material: B, width: 9 nm}\n  \
           - {material: B, width: 6 nm}\n";
    let solved = solved(&text);
    let pairs = &solved.bands.conduction().unwrap().pairs;
    assert!(pairs[11].value - pairs[0].value < 1e-3);
    check_all("twelve levels", &text);
}

/// What has no room is thinned out or cut, and said so.
#[test]
fn more_than_a_page_can_hold() {
    let levels = MATERIALS.to_owned()
        + "bands: {conduction: {model: parabolic, states: 80}}\nlayers: [{material: W, width: 100 nm}]\n";
    let mut layers =
        MATERIALS.to_owned() + "bands: {conduction: {model: parabolic, states: 2}}\nlayers:\n";
    for k in 0..400 {
        let material = if k % 2 == 0 { "B" } else { "W" };
        layers += &format!("  - {{material: {material}, width: {} nm}}\n", 2 + k % 5);
    }
    for width in WIDTHS {
        assert_tidy("80 levels", &diagram(&solved(&levels)).svg(width));
    }
    let svg = diagram(&solved(&layers)).svg(Width::Page);
    assert_tidy("400 layers", &svg);
    assert!(svg.contains("and 328 more layers"), "72 of 400 are listed");
}

#[test]
fn text_of_the_file_is_only_text() {
    let title = "<svg onload=\"x\"> & 'well' 🔬 ".repeat(11);
    assert!(title.chars().count() > 300);
    let text = format!(
        "title: '{}'\n{MATERIALS}layers:\n  - {{name: '</text><script>', material: B, width: 20 nm}}\n  - {{name: '&<>\"', material: W, width: 2 nm}}\n  \
         - {{name: '{}', material: B, width: 20 nm}}\n",
        title.trim().replace('\'', "''"),
        "a very long name ".repeat(12).trim(),
    );
    check_all("odd title", &text);
    let svg = diagram(&solved(&text)).svg(Width::Column);
    let document = Document::parse(&svg).unwrap();
    assert!(
        document
            .descendants()
            .all(|node| !node.has_tag_name("script"))
    );
    assert!(
        children(document.root_element(), "text")
            .any(|node| words(node).starts_with("<svg onload"))
    );
}

#[test]
fn the_same_input_gives_the_same_bytes() {
    let one = diagram(&solved(SHIPPED[2])).svg(Width::Page);
    assert_eq!(one, diagram(&solved(SHIPPED[2])).svg(Width::Page));
}

/// ∫ y dz of a line, by the trapezoidal rule that is exact for it.
fn area(line: &[[f64; 2]]) -> f64 {
    line.windows(2)
        .map(|p| 0.5 * (p[0][1] + p[1][1]) * (p[1][0] - p[0][0]))
        .sum()
}

/// The lines may be off by `FINENESS` of the peak at each place, so that the area is within that of the peak times the width.
#[test]
fn squared_envelopes_have_an_area_of_one() {
    for text in SHIPPED.iter().map(|t| t.to_string()).chain([cascade()]) {
        let solved = solved(&text);
        for state in &solved.curves[0].states {
            let whole = state.whole();
            let peak = whole.iter().fold(0.0, |a: f64, p| a.max(p[1]));
            let bound = FINENESS * peak * solved.stack.total_width_nm();
            let found = area(whole);
            assert!((found - 1.0).abs() < bound, "{found} within {bound}");
            assert!(area(&state.envelope) < 1.0 + bound);
        }
    }
}

/// Between hard walls ψ² = (2/L) sin²(nπz/L) (any textbook of quantum mechanics).
#[test]
fn a_well_between_hard_walls() {
    let text = "materials: {W: {conduction_edge: 0 eV, electron_mass: 0.067}}\nlayers: [{material: W, width: 10 nm}]\n";
    let solved = solved(text);
    let length = 10.0;
    for (index, state) in solved.curves[0].states.iter().enumerate() {
        let n = (index + 1) as f64;
        for [z, value] in state.whole() {
            let expected = 2.0 / length * (n * std::f64::consts::PI * z / length).sin().powi(2);
            assert!(
                (value - expected).abs() < 1e-6 * 2.0 / length,
                "n = {n}, z = {z} nm: {value} for {expected}"
            );
        }
        assert!(state.whole().len() > 20);
    }
}

/// The edge is the file's: flat layers tilted by the field, with both values at each interface.
#[test]
fn the_edge_jumps_at_interfaces_only() {
    let text = MATERIALS.to_owned()
        + "field: 10 kV/cm\nlayers:\n  - {material: B, width: 20 nm}\n  - {material: W, width: 8 nm}\n  - {material: B, width: 20 nm}\n";
    let edge = solved(&text).curves[0].edges[0].clone();
    // 10 kV/cm is 1 meV/nm.
    let expected = [
        [0.0, 0.250],
        [20.0, 0.270],
        [20.0, 0.020],
        [28.0, 0.028],
        [28.0, 0.278],
        [48.0, 0.298],
    ];
    assert_eq!(edge.len(), expected.len(), "{edge:?}");
    for (point, [z, value]) in edge.iter().zip(expected) {
        assert!(
            (point[0] - z).abs() < 1e-9 && (point[1] - value).abs() < 1e-9,
            "{point:?}"
        );
    }
}

fn channels(colour: &str) -> [f64; 3] {
    [1, 3, 5].map(|k| {
        let c = f64::from(u8::from_str_radix(&colour[k..k + 2], 16).unwrap()) / 255.0;
        // IEC 61966-2-1 (sRGB).
        if c <= 0.04045 {
            c / 12.92
        } else {
            ((c + 0.055) / 1.055).powf(2.4)
        }
    })
}

/// CIE 1976 L*a*b* of linear sRGB channels, white point D65.
fn lab([r, g, b]: [f64; 3]) -> [f64; 3] {
    let f = |t: f64| {
        if t > 216.0 / 24389.0 {
            t.cbrt()
        } else {
            (24389.0 / 27.0 * t + 16.0) / 116.0
        }
    };
    let x = f((0.4124564 * r + 0.3575761 * g + 0.1804375 * b) / 0.95047);
    let y = f(0.2126729 * r + 0.7151522 * g + 0.0721750 * b);
    let z = f((0.0193339 * r + 0.1191920 * g + 0.9503041 * b) / 1.08883);
    [116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z)]
}

/// In grey the lightness alone must tell states apart; a difference of 10 in L*a*b* is seen at a glance. Full loss of one
/// cone: Machado, Oliveira and Fernandes, IEEE Trans. Vis. Comput. Graph. 15, 1291 (2009), severity 1. Contrast 3 : 1 for
/// graphics: WCAG 2.1, 1.4.11.
#[test]
fn colours_differ_in_grey_and_for_the_colour_blind() {
    let views = [
        [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
        [
            [0.152286, 1.052583, -0.204868],
            [0.114503, 0.786281, 0.099216],
            [-0.003882, -0.048116, 1.051998],
        ],
        [
            [0.367322, 0.860646, -0.227968],
            [0.280085, 0.672501, 0.047413],
            [-0.011820, 0.042940, 0.968881],
        ],
        [
            [1.255528, -0.076749, -0.178779],
            [-0.078411, 0.930809, 0.147602],
            [0.004733, 0.691367, 0.303900],
        ],
    ];
    let colours = palette::STATES.map(channels);
    for (i, a) in colours.iter().enumerate() {
        let luminance = 0.2126 * a[0] + 0.7152 * a[1] + 0.0722 * a[2];
        assert!(1.05 / (luminance + 0.05) >= 3.0);
        for b in &colours[..i] {
            assert!((lab(*a)[0] - lab(*b)[0]).abs() > 12.0);
            for view in views {
                let seen = |colour: &[f64; 3]| {
                    lab(view.map(|row: [f64; 3]| {
                        let mixed: f64 = row.iter().zip(colour).map(|(m, c)| m * c).sum();
                        mixed.clamp(0.0, 1.0)
                    }))
                };
                let distance: f64 = seen(a)
                    .iter()
                    .zip(seen(b))
                    .map(|(p, q)| (p - q).powi(2))
                    .sum();
                assert!(distance.sqrt() > 15.0);
            }
        }
    }
}

fn bars() -> SensitivityBars {
    let bar = |name: &str, unit: &str, change_mev: f64| SensitivityBar {
        name: name.to_owned(),
        unit: unit.to_owned(),
        change_mev,
    };
    SensitivityBars {
        title: "What moves the line of the 8.6 µm detector".to_owned(),
        quantity: "conduction 1 to 2".to_owned(),
        caption: "First derivatives at the design.".to_owned(),
        bars: vec![
            bar("width of upper barrier", "1 ML", 0.002),
            bar("width of well", "1 ML", -4.37),
            bar("growth rate", "1 %", -0.883),
            bar("flux of the Al cell", "1 %", 0.461),
            bar("Al fraction of lower barrier", "0.01", 1.92),
            bar("field", "1 kV/cm", 0.0113),
            bar("temperature", "1 K", -0.0071),
        ],
    }
}

fn histogram() -> YieldHistogram {
    // Counts of a normal distribution of mean 8.61 and deviation 0.055, times 10 000, by hand from the density.
    let borders: Vec<f64> = (0..=30).map(|k| 8.41 + 0.4 * f64::from(k) / 30.0).collect();
    let counts = borders
        .windows(2)
        .enumerate()
        .map(|(k, pair)| {
            let x = (0.5 * (pair[0] + pair[1]) - 8.61) / 0.055;
            let ripple = 1.0 + 0.06 * ((k * k) as f64).sin();
            (10_000.0 * 0.4 / 30.0 * (-0.5 * x * x).exp() / (0.055 * std::f64::consts::TAU.sqrt())
                * ripple) as u64
        })
        .collect();
    YieldHistogram {
        title: "Detector well for 8.6 µm: wafers to expect".to_owned(),
        quantity: "Wavelength".to_owned(),
        unit: "µm".to_owned(),
        caption: "10 000 sampled wafers, seed 1.".to_owned(),
        borders,
        counts,
        linear: Some(Gaussian {
            mean: 8.61,
            standard_deviation: 0.0553,
        }),
        window: Some(Window {
            between: [8.5, 8.7],
            share: 0.9271,
            share_interval: [0.9218, 0.9321],
        }),
    }
}

#[test]
fn bars_reach_their_values() {
    for width in WIDTHS {
        let svg = bars().svg(width);
        assert_tidy("bars", &svg);
        let document = Document::parse(&svg).unwrap();
        let value = axis(&document, "axis-x", "x1");
        let group = group(&document, "bars");
        let areas: Vec<&str> = children(group, "path")
            .filter(|path| path.attribute("stroke").is_none())
            .map(|path| path.attribute("d").unwrap())
            .collect();
        let mut expected: Vec<f64> = bars().bars.iter().map(|bar| bar.change_mev).collect();
        expected.sort_by(|a, b| b.abs().total_cmp(&a.abs()));
        assert_eq!(areas.len(), expected.len());
        let per_point = (value(1.0) - value(0.0)).abs();
        for (path, expected) in areas.iter().zip(expected) {
            // M x y l dx dy ...: from zero to the value, then down; a bar of no width begins downwards.
            let (start, steps) = path[1..].split_once('l').unwrap();
            let start: f64 = start.split(' ').next().unwrap().parse().unwrap();
            let steps = steps.replace('-', " -");
            let mut step = steps.split_whitespace().map(|v| v.parse::<f64>().unwrap());
            let (dx, dy) = (step.next().unwrap(), step.next().unwrap());
            assert!(value(start).abs() <= 0.02 * per_point, "starts at zero");
            let drawn = if dy == 0.0 { dx * per_point } else { 0.0 };
            assert!(
                (drawn - expected).abs() <= 0.03 * per_point,
                "{drawn} drawn for {expected}"
            );
        }
    }
    let one_sided = SensitivityBars {
        bars: bars()
            .bars
            .into_iter()
            .filter(|b| b.change_mev > 0.0)
            .collect(),
        ..bars()
    };
    assert_tidy("one side", &one_sided.svg(Width::Page));
    let none = SensitivityBars {
        bars: Vec::new(),
        ..bars()
    };
    assert_tidy("no bars", &none.svg(Width::Page));
    let mut many = bars();
    many.bars = (0..100)
        .map(|k| SensitivityBar {
            name: format!("a name that is rather too long for its place, of layer {k} & <more>"),
            unit: "0.01 of the composition".to_owned(),
            change_mev: f64::from(k - 50),
        })
        .collect();
    assert_tidy("many bars", &many.svg(Width::Column));
}

#[test]
fn a_histogram_shows_what_it_was_given() {
    for width in WIDTHS {
        let svg = histogram().svg(width);
        assert_tidy("histogram", &svg);
        let document = Document::parse(&svg).unwrap();
        let value = axis(&document, "axis-x", "x1");
        let per_point = (value(1.0) - value(0.0)).abs();
        let limits: Vec<f64> = children(group(&document, "window"), "line")
            .filter(|line| line.attribute("stroke-dasharray").is_some())
            .map(|line| value(attribute(line, "x1")))
            .collect();
        assert_eq!(limits.len(), 2);
        for (drawn, wanted) in limits.iter().zip([8.5, 8.7]) {
            assert!((drawn - wanted).abs() <= 0.02 * per_point);
        }
        assert!(svg.contains("92.7 % inside (92.2 to 93.2 %)"));
    }
    let far = YieldHistogram {
        window: Some(Window {
            between: [20.0, 30.0],
            share: 0.0,
            share_interval: [0.0, 0.0004],
        }),
        ..histogram()
    };
    assert_tidy("window out of sight", &far.svg(Width::Page));
    let empty = YieldHistogram {
        borders: Vec::new(),
        counts: Vec::new(),
        linear: None,
        window: None,
        ..histogram()
    };
    assert_tidy("empty", &empty.svg(Width::Page));
}
/// In a column there is room for one row of arrows; what crosses it is told in the caption.
#[test]
fn every_aim_is_told() {
    let solved = solved(SHIPPED[4]);
    let energy = |k: usize| solved.bands.conduction().unwrap().pairs[k].value;
    for width in WIDTHS {
        let svg = diagram(&solved).svg(width);
        let document = Document::parse(&svg).unwrap();
        let told: String = children(document.root_element(), "text")
            .map(words)
            .collect();
        // hc = 1.239841984 eV µm (CODATA 2022). The aims are 5 to 4, 4 to 3 and 4 to 2.
        for (upper, lower) in [(4, 3), (3, 2), (3, 1)] {
            let wavelength_um = 1.239_841_984 / (energy(upper) - energy(lower));
            let decimals = if wavelength_um < 100.0 { 2 } else { 1 };
            let text = format!("{wavelength_um:.decimals$} µm");
            assert!(told.contains(&text), "{text} in {width:?}");
        }
    }
}

fn run(arguments: &[&std::ffi::OsStr]) -> std::process::Output {
    let mut command = assert_cmd::Command::cargo_bin("wellwright").unwrap();
    command.arg("plot").args(arguments).output().unwrap()
}

#[test]
fn the_command_prints_or_writes_the_picture() {
    let folder = tempfile::tempdir().unwrap();
    let (input, output) = (folder.path().join("in.yaml"), folder.path().join("out.svg"));
    std::fs::write(&input, SHIPPED[2]).unwrap();
    let expected = diagram(&solved(SHIPPED[2]));
    let printed = run(&[input.as_ref()]);
    assert_eq!(printed.status.code(), Some(0));
    assert_eq!(
        String::from_utf8(printed.stdout).unwrap(),
        expected.svg(Width::Page)
    );
    let written = run(&[
        input.as_ref(),
        "--width".as_ref(),
        "column".as_ref(),
        "-o".as_ref(),
        output.as_ref(),
    ]);
    assert_eq!(written.status.code(), Some(0));
    assert_eq!(
        std::fs::read_to_string(&output).unwrap(),
        expected.svg(Width::Column)
    );
    let refused = run(&[input.as_ref(), "-o".as_ref(), input.as_ref()]);
    assert_eq!(refused.status.code(), Some(2));
    assert_eq!(std::fs::read_to_string(&input).unwrap(), SHIPPED[2]);
}

/// Of two panels on one z axis the upper one has the electrons and the lower one the holes, each on its own scale, with arrows from one to
/// the other that carry the wavelength of the aim.
#[test]
fn holes_hang_below_the_electrons() {
    for text in WITH_HOLES {
        let solved = solved(text);
        let bands = &solved.bands;
        let edges = bands.alone().skip(1).map(|band| -band.pencil.floor());
        let zeros = [
            bands.conduction().unwrap().pencil.floor(),
            edges.fold(f64::NEG_INFINITY, f64::max),
        ];
        let holes: Vec<f64> = bands
            .holes()
            .into_iter()
            .filter(|place| place.state < solved.shown[place.band])
            .map(|place| bands.energy_ev(place))
            .collect();
        for width in WIDTHS {
            let svg = diagram(&solved).svg(width);
            let name = format!("{:?} ({width:?})", solved.structure.title);
            assert_tidy(&name, &svg);
            assert_levels_in_place(&name, &solved, &svg);
            let document = Document::parse(&svg).unwrap();
            let all = |class: &'static str| -> Vec<Node> {
                document
                    .descendants()
                    .filter(move |node| node.attribute("class") == Some(class))
                    .collect()
            };
            let (axes, levels, edges) = (all("axis-y"), all("levels"), all("edge"));
            assert_eq!((axes.len(), levels.len(), edges.len()), (2, 2, 2), "{name}");
            let energy = axis_of(axes[1], "axis-y", "y1");
            let per_point = (energy(0.0) - energy(1.0)).abs();
            let drawn: Vec<f64> = children(levels[1], "line")
                .map(|line| attribute(line, "y1"))
                .collect();
            assert_eq!(drawn.len(), holes.len());
            for (y, hole_ev) in drawn.iter().zip(&holes) {
                let expected = 1e3 * (hole_ev - zeros[1]);
                assert!((energy(*y) - expected).abs() <= 0.02 * per_point, "{name}");
            }
            let electrons: Vec<f64> = children(levels[0], "line")
                .map(|line| attribute(line, "y1"))
                .collect();
            let lowest = electrons.iter().fold(0.0, |a: f64, y| a.max(*y));
            assert!(drawn.iter().all(|y| *y > lowest), "{name}: holes below");
            let wavelength_um =
                1.239_841_984 / (bands.conduction().unwrap().energy_ev(0) - holes[0]);
            let told: String = children(document.root_element(), "text")
                .map(words)
                .collect();
            assert!(
                told.contains(&format!("{wavelength_um:.4} µm")),
                "{name}: {told}"
            );
        }
    }
}

/// Electrons and holes of a broken gap, eight bands coupled.
const BROKEN: &str = include_str!("../structures/carbon-dioxide-w-well-4p26um.yaml");

/// Six-band holes below one band of electrons.
fn six_band() -> String {
    include_str!("../structures/strained-980nm-well.yaml")
        .replace("decoupled", "six-band")
        .replace("from: heavy-hole 1", "from: valence 1")
}

/// A state's norm is 1, whatever the number of its functions, and none of them holds more than all.
#[test]
fn sums_over_coupled_components_have_an_area_of_one() {
    for text in [BROKEN, &six_band()] {
        let solved = solved(text);
        let states = solved.curves.iter().flat_map(|curves| &curves.states);
        let mut coupled = 0;
        for state in states {
            let Some(sum) = &state.sum else { continue };
            coupled += 1;
            // Trapezes over lines that are off by 4e-4 of the peak.
            assert!((area(sum) - 1.0).abs() < 3e-3, "{}", area(sum));
            assert!(area(&state.envelope) <= area(sum) + 3e-3);
        }
        assert!(coupled >= 3);
    }
}

/// Where the conduction edge of one layer lies below the valence edge of another, one axis has both bands: levels and edges
/// stand where their energies are, and the ladder has the aim between them.
#[test]
fn a_broken_gap_is_one_panel() {
    let solved = solved(BROKEN);
    let bands = &solved.bands;
    let edges = bands.coupled().unwrap().layer_edges_ev();
    let zero_ev = edges.iter().fold(f64::INFINITY, |a, edge| a.min(edge[0]));
    let mut expected: Vec<f64> = (0..2)
        .flat_map(|band| (0..solved.shown[band]).map(move |state| Place { band, state }))
        .map(|place| bands.energy_ev(place) - zero_ev)
        .collect();
    expected.sort_by(f64::total_cmp);
    for width in WIDTHS {
        let svg = diagram(&solved).svg(width);
        assert_tidy(&format!("broken gap ({width:?})"), &svg);
        let document = Document::parse(&svg).unwrap();
        let count = |class: &str| {
            let all = document.descendants();
            all.filter(|node| node.attribute("class") == Some(class))
                .count()
        };
        assert_eq!((count("axis-y"), count("edge"), count("body")), (1, 1, 1));
        assert_eq!(children(group(&document, "edge"), "path").count(), 3);
        assert!(svg.contains(">Energy (eV)<"));
        let energy = axis(&document, "axis-y", "y1");
        let per_point = (energy(0.0) - energy(1.0)).abs();
        let drawn: Vec<f64> = children(group(&document, "levels"), "line")
            .map(|line| energy(attribute(line, "y1")))
            .collect();
        assert_eq!(drawn.len(), 5);
        for (drawn, expected) in drawn.iter().zip(&expected) {
            assert!((drawn - expected).abs() <= 0.02 * per_point);
        }
        // Lines of the conduction, heavy-hole and light-hole edge, with every layer's value.
        for (which, line) in children(group(&document, "edge"), "path").enumerate() {
            // M x y l dx dy ...
            let (start, steps) = line.attribute("d").unwrap()[1..].split_once('l').unwrap();
            let mut y: f64 = start.split(' ').nth(1).unwrap().parse().unwrap();
            let mut ys = vec![energy(y)];
            let steps = steps.replace('-', " -");
            for step in steps.split_whitespace().skip(1).step_by(2) {
                y += step.parse::<f64>().unwrap();
                ys.push(energy(y));
            }
            for edge in &edges {
                let expected = edge[which] - zero_ev;
                let near = |y: &f64| (y - expected).abs() <= 0.02 * per_point;
                assert!(
                    ys.iter().any(near),
                    "edge {which}: {expected} not in {ys:?}"
                );
            }
        }
        let told: String = children(document.root_element(), "text")
            .map(words)
            .chain(children(group(&document, "energies"), "text").map(words))
            .collect();
        for words in ["4.463 µm", "The gap is broken", "v 1 hh", "v 2 lh", "c 2"] {
            assert!(told.contains(words), "{words}: {told}");
        }
    }
}

/// Coupled holes of an ordinary gap have a panel of their own below the electrons', both zeros at their edges.
#[test]
fn six_band_holes_hang_below_the_electrons() {
    let solved = solved(&six_band());
    let bands = &solved.bands;
    let edges = bands.coupled().unwrap().layer_edges_ev();
    let zero_ev = edges
        .iter()
        .fold(f64::NEG_INFINITY, |a, edge| a.max(edge[1]).max(edge[2]));
    for width in WIDTHS {
        let svg = diagram(&solved).svg(width);
        let name = format!("six bands ({width:?})");
        assert_tidy(&name, &svg);
        assert_levels_in_place(&name, &solved, &svg);
        let document = Document::parse(&svg).unwrap();
        let all = |class: &'static str| -> Vec<Node> {
            let all = document.descendants();
            all.filter(|node| node.attribute("class") == Some(class))
                .collect()
        };
        let (axes, levels, lines) = (all("axis-y"), all("levels"), all("edge"));
        assert_eq!((axes.len(), levels.len()), (2, 2), "{name}");
        assert_eq!(children(lines[1], "path").count(), 2);
        let energy = axis_of(axes[1], "axis-y", "y1");
        let per_point = (energy(0.0) - energy(1.0)).abs();
        let drawn = children(levels[1], "line").map(|line| energy(attribute(line, "y1")));
        let drawn: Vec<f64> = drawn.collect();
        assert_eq!(drawn.len(), 3);
        for (state, drawn) in drawn.iter().enumerate() {
            let level_ev = bands.energy_ev(Place { band: 1, state });
            let expected = 1e3 * (level_ev - zero_ev);
            assert!((drawn - expected).abs() <= 0.02 * per_point, "{name}");
        }
    }
}
