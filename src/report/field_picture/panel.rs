//! One slice: bands of temperature, the line of the end temperature, arrows of flow, the jet.

use super::contour::Raster;
use super::palette::{colour, hex, lightness};
use super::slices::Point;
use super::svg::{Anchor, Svg, label, path, ticks};
use super::{GRID, PANEL, Scene};

/// Points of the raster along each side.
const POINTS: usize = 101;
/// Bands of temperature.
const BANDS: usize = 64;
/// Arrows along each side.
const ARROWS: usize = 15;
/// The fastest flow's arrow, in distances between arrows.
const LONGEST_ARROW: f64 = 1.15;
/// Part of a side on which numbers stand.
const CORNER_FREE: f64 = 0.94;
/// Slower flow has no arrow.
const SLOWEST: f64 = 0.02;
/// Above this lightness arrows are dark.
const LIGHT: f64 = 0.66;

/// A slice's coordinates.
struct Frame {
    corner: [f64; 2],
    reach_fm: f64,
}

impl Frame {
    /// A place in fm on the picture.
    fn place(&self, [x, y]: [f64; 2]) -> [f64; 2] {
        let scale = 0.5 * PANEL / self.reach_fm;
        [
            self.corner[0] + 0.5 * PANEL + scale * x,
            self.corner[1] + 0.5 * PANEL - scale * y,
        ]
    }

    /// A place of the raster in fm.
    fn of_raster(&self, place: f64) -> f64 {
        self.reach_fm * (2.0 * place / (POINTS - 1) as f64 - 1.0)
    }
}

pub(super) fn draw(svg: &mut Svg, scene: &Scene, number: usize, corner: [f64; 2]) {
    let frame = Frame {
        corner,
        reach_fm: scene.reach_fm,
    };
    let tau_fm = scene.times_fm[number];
    let [x, y] = corner;
    svg.push(&format!(
        "<clipPath id=\"slice{number}\"><rect x=\"{x:.1}\" y=\"{y:.1}\" width=\"{PANEL}\" height=\"{PANEL}\" rx=\"3\"/></clipPath>\n<g clip-path=\"url(#slice{number})\">\n<rect x=\"{x:.1}\" y=\"{y:.1}\" width=\"{PANEL}\" height=\"{PANEL}\" fill=\"{}\"/>",
        hex(colour(0.0))
    ));
    bands(svg, scene, &frame, tau_fm);
    arrows(svg, scene, &frame, tau_fm);
    jet(svg, scene, &frame, tau_fm);
    svg.push("</g>");
    let time = format!("\u{3c4} = {tau_fm:.2} fm");
    svg.push(&format!(
        "<rect x=\"{:.1}\" y=\"{:.1}\" width=\"122\" height=\"25\" rx=\"4\" fill=\"{}\" fill-opacity=\"0.55\"/>",
        x + 6.0,
        y + 6.0,
        hex(colour(0.0))
    ));
    svg.text(
        [x + 67.0, y + 24.0],
        Anchor::Middle,
        16.0,
        "fill=\"#ffffff\" font-weight=\"bold\"",
        &time,
    );
    axes(svg, scene, &frame, number);
}

fn bands(svg: &mut Svg, scene: &Scene, frame: &Frame, tau_fm: f64) {
    let value = |place: usize| {
        let at = [place / POINTS, place % POINTS].map(|index| frame.of_raster(index as f64));
        scene.slices.at(tau_fm, at).temperature_gev
    };
    let raster = Raster {
        columns: POINTS,
        rows: POINTS,
        values: (0..POINTS * POINTS).map(value).collect(),
    };
    let outline = |level: f64| -> String {
        let loops = raster.loops(level);
        let points = loops.iter().map(|points| {
            let place = |[column, row]: &[f64; 2]| {
                frame.place([frame.of_raster(*column), frame.of_raster(*row)])
            };
            path(points.iter().map(place), true)
        });
        points.collect()
    };
    for band in 1..BANDS {
        let [low, high] = scene.range_gev;
        let data = outline(low + (high - low) * band as f64 / BANDS as f64);
        if !data.is_empty() {
            // The middle of the band that begins here.
            let fill = hex(colour((band as f64 + 0.5) / BANDS as f64));
            svg.push(&format!("<path fill=\"{fill}\" d=\"{data}\"/>"));
        }
    }
    let end = end_line(&raster, scene, frame);
    if !end.is_empty() {
        svg.push(&format!(
            "<path fill=\"none\" stroke=\"#ffffff\" stroke-width=\"1.8\" stroke-dasharray=\"6 3.5\" stroke-linejoin=\"round\" d=\"{end}\"/>"
        ));
    }
}

/// Where the field has the end temperature; not where it only leaves the slice.
fn end_line(raster: &Raster, scene: &Scene, frame: &Frame) -> String {
    let last = (POINTS - 1) as f64;
    let edge = |point: &[f64; 2]| point.iter().any(|place| *place <= 0.0 || *place >= last);
    let mut data = String::new();
    for mut points in raster.loops(scene.end_temperature_gev) {
        points.push(points[0]);
        for piece in points.split_inclusive(edge) {
            let place = |[column, row]: &[f64; 2]| {
                frame.place([frame.of_raster(*column), frame.of_raster(*row)])
            };
            if piece.len() > 2 {
                data.push_str(&path(piece.iter().map(place), false));
            }
        }
    }
    data
}

/// Places of the arrows in a slice, with temperature and flow where it is hot.
fn lattice(scene: &Scene, tau_fm: f64) -> impl Iterator<Item = ([f64; 2], Point)> {
    let spacing_fm = spacing_fm(scene);
    (0..ARROWS * ARROWS).filter_map(move |place| {
        let at = [place / ARROWS, place % ARROWS]
            .map(|index| (index as f64 + 0.5) * spacing_fm - scene.reach_fm);
        let point = scene.slices.at(tau_fm, at);
        (point.temperature_gev >= scene.end_temperature_gev).then_some((at, point))
    })
}

fn spacing_fm(scene: &Scene) -> f64 {
    2.0 * scene.reach_fm / ARROWS as f64
}

/// Length of an arrow on the picture for a flow as fast as light.
pub(super) fn arrow_of_light(scene: &Scene) -> f64 {
    LONGEST_ARROW * PANEL / ARROWS as f64 / scene.largest_speed
}

/// The fastest flow that has an arrow; 0 where there is none.
pub(super) fn largest_speed(scene: &Scene) -> f64 {
    let speed = |(_, point): ([f64; 2], Point)| point.velocity()[0].hypot(point.velocity()[1]);
    let slice = |tau_fm: &f64| lattice(scene, *tau_fm).map(speed).fold(0.0, f64::max);
    let largest = scene.times_fm.iter().map(slice).fold(0.0, f64::max);
    if largest < SLOWEST { 0.0 } else { largest }
}

/// Flow of what is hot: an arrow from each point of a lattice, as long as the flow is fast.
fn arrows(svg: &mut Svg, scene: &Scene, frame: &Frame, tau_fm: f64) {
    if scene.largest_speed == 0.0 {
        return;
    }
    let (mut dark, mut light) = (String::new(), String::new());
    for (at, point) in lattice(scene, tau_fm) {
        let velocity = point.velocity();
        if velocity[0].hypot(velocity[1]) < SLOWEST {
            continue;
        }
        let share = scene.share(point.temperature_gev);
        let data = if lightness(share) > LIGHT {
            &mut dark
        } else {
            &mut light
        };
        let length = LONGEST_ARROW * spacing_fm(scene) / scene.largest_speed;
        data.push_str(&arrow(frame, at, velocity.map(|v| v * length)));
    }
    for (data, ink) in [(dark, scene.colours.ink.as_str()), (light, "#ffffff")] {
        if !data.is_empty() {
            svg.push(&format!(
                "<path fill=\"none\" stroke=\"{ink}\" stroke-opacity=\"0.85\" stroke-width=\"1.2\" stroke-linecap=\"round\" stroke-linejoin=\"round\" d=\"{data}\"/>"
            ));
        }
    }
}

/// An arrow around a place: a shaft and two barbs.
fn arrow(frame: &Frame, [x, y]: [f64; 2], [u, v]: [f64; 2]) -> String {
    let (tail, head) = ([x - 0.5 * u, y - 0.5 * v], [x + 0.5 * u, y + 0.5 * v]);
    let barb = |side: f64| {
        let (back, across) = (0.32, 0.19 * side);
        [
            head[0] - back * u - across * v,
            head[1] - back * v + across * u,
        ]
    };
    let places = |points: &[[f64; 2]]| path(points.iter().map(|point| frame.place(*point)), false);
    places(&[tail, head]) + &places(&[barb(1.0), head, barb(-1.0)])
}

/// Where the jet has been, where it will go, where it is.
fn jet(svg: &mut Svg, scene: &Scene, frame: &Frame, tau_fm: f64) {
    let here = frame.place(scene.jet.at(tau_fm));
    let start = frame.place(scene.jet.at(0.0));
    let gone = frame.place(scene.jet.at(4.0 * frame.reach_fm));
    let colour = &scene.colours.jet;
    svg.line(here, gone, &format!("stroke=\"{colour}\" stroke-width=\"1.6\" stroke-dasharray=\"1.5 5\" stroke-linecap=\"round\""));
    svg.line(
        start,
        here,
        "stroke=\"#1b1b22\" stroke-opacity=\"0.45\" stroke-width=\"5.4\" stroke-linecap=\"round\"",
    );
    svg.line(
        start,
        here,
        &format!("stroke=\"{colour}\" stroke-width=\"3\" stroke-linecap=\"round\""),
    );
    svg.push(&format!(
        "<circle cx=\"{:.1}\" cy=\"{:.1}\" r=\"5.2\" fill=\"{colour}\" stroke=\"#ffffff\" stroke-width=\"1.6\"/>",
        here[0], here[1]
    ));
}

/// Ticks all around, numbers at the left and at the bottom of the whole.
fn axes(svg: &mut Svg, scene: &Scene, frame: &Frame, number: usize) {
    let [x, y] = frame.corner;
    let style = format!("stroke=\"{}\" stroke-width=\"1.2\"", scene.colours.ink);
    let words = format!("fill=\"{}\"", scene.colours.ink);
    // Numbers at the very corners would meet those of the next slice.
    let inner_fm = CORNER_FREE * frame.reach_fm;
    for tick in ticks([-inner_fm, inner_fm], 5.0) {
        let [along, _] = frame.place([tick, 0.0]);
        let [_, up] = frame.place([0.0, tick]);
        if number / GRID[0] == GRID[1] - 1 {
            svg.line([along, y + PANEL], [along, y + PANEL + 5.0], &style);
            svg.text(
                [along, y + PANEL + 20.0],
                Anchor::Middle,
                13.0,
                &words,
                &label(tick),
            );
        }
        if number.is_multiple_of(GRID[0]) {
            svg.line([x - 5.0, up], [x, up], &style);
            svg.text([x - 9.0, up + 4.5], Anchor::End, 13.0, &words, &label(tick));
        }
    }
}
