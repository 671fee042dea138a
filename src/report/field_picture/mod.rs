//! A picture of a temperature field: slices at six proper times with flow and the path of a jet, the temperature that the
//! jet meets, and a colour scale.

mod contour;
mod palette;
mod panel;
mod profile;
mod scale;
mod slices;
mod svg;

use super::FieldSummary;
use super::field_summary::RELEVANT_TEMPERATURE_GEV;
use super::numbers::significant;
use crate::medium::field::FieldData;
use palette::{hex, oklch};
use slices::Slices;
use svg::{Anchor, Svg};

/// Size of the whole picture.
const SIZE: [f64; 2] = [1120.0, 1010.0];
/// Side of a slice.
const PANEL: f64 = 290.0;
/// Left and upper edge of the first slice.
const ORIGIN: [f64; 2] = [70.0, 104.0];
/// From slice to slice.
const GAP: [f64; 2] = [16.0, 16.0];
/// Slices in a row, and rows.
const GRID: [usize; 2] = [3, 2];
/// Height of the profile below the slices.
const PROFILE_HEIGHT: f64 = 150.0;
/// From the slices to the profile.
const PROFILE_GAP: f64 = 92.0;
/// The colours begin at this part of the end temperature: what is colder does not matter.
const COLDEST: f64 = 0.5;
/// A field of less ellipticity has no event plane to speak of.
const ROUND: f64 = 0.01;
/// Empty rim around what is hot, as a part of its reach.
const RIM: f64 = 0.12;

/// A jet for show: born at the centre of the first slice at t = 0, across the beam.
#[derive(Clone, Copy)]
struct Jet {
    birth_fm: [f64; 2],
    direction: [f64; 2],
}

impl Jet {
    fn at(&self, l_fm: f64) -> [f64; 2] {
        [0, 1].map(|axis| self.birth_fm[axis] + l_fm * self.direction[axis])
    }
}

/// What all parts of the picture share.
struct Scene<'a> {
    slices: Slices<'a>,
    end_temperature_gev: f64,
    /// Coldest and hottest temperature of the colours; what is colder has the coldest one's.
    range_gev: [f64; 2],
    /// The fastest flow that is drawn.
    largest_speed: f64,
    /// The slices show -`reach_fm` to `reach_fm`.
    reach_fm: f64,
    times_fm: Vec<f64>,
    jet: Jet,
    /// The field has no event plane.
    is_round: bool,
    colours: Colours,
}

impl Scene<'_> {
    /// Place of a temperature in the colours, 0 to 1.
    fn share(&self, temperature_gev: f64) -> f64 {
        let [low, high] = self.range_gev;
        ((temperature_gev - low) / (high - low)).clamp(0.0, 1.0)
    }
}

/// Colours besides the palette.
struct Colours {
    ink: String,
    faint: String,
    paper: String,
    jet: String,
}

/// Draws a field as SVG; `None` where it is nowhere hot enough to matter.
pub fn field_picture(data: &FieldData, summary: &FieldSummary, name: &str) -> Option<String> {
    let slices = Slices::new(data);
    let end_temperature_gev = RELEVANT_TEMPERATURE_GEV;
    let (hot_fm, hot_reach_fm) = slices.hot_extent(end_temperature_gev)?;
    let count = GRID[0] * GRID[1];
    let step_fm = (hot_fm[1] - hot_fm[0]) / count as f64;
    let widest = |axis: &[f64]| axis[0].abs().max(axis[axis.len() - 1].abs());
    let grid_fm = widest(&data.x_fm).max(widest(&data.y_fm));
    let is_round = summary.ellipticity < ROUND;
    let (sin, cos) = if is_round {
        0.0
    } else {
        summary.event_plane_rad
    }
    .sin_cos();
    let mut scene = Scene {
        slices,
        end_temperature_gev,
        range_gev: [
            COLDEST * end_temperature_gev,
            summary.largest_temperature_gev,
        ],
        largest_speed: 0.0,
        reach_fm: ((1.0 + RIM) * hot_reach_fm).min(grid_fm),
        times_fm: (0..count)
            .map(|place| hot_fm[0] + step_fm * place as f64)
            .collect(),
        jet: Jet {
            birth_fm: summary.centroid_fm,
            direction: [cos, sin],
        },
        is_round,
        colours: Colours {
            ink: hex(oklch(0.27, 0.03, 262.0)),
            faint: hex(oklch(0.56, 0.02, 262.0)),
            paper: hex(oklch(0.988, 0.004, 95.0)),
            jet: hex(oklch(0.72, 0.19, 40.0)),
        },
    };
    scene.largest_speed = panel::largest_speed(&scene);
    let mut svg = Svg::new(
        SIZE,
        &format!("temperature field {name}"),
        &scene.colours.paper,
    );
    heading(&mut svg, &scene, summary, name);
    for place in 0..count {
        let corner = corner(place);
        panel::draw(&mut svg, &scene, place, corner);
    }
    axis_titles(&mut svg, &scene);
    scale::draw(&mut svg, &scene);
    profile::draw(&mut svg, &scene);
    Some(svg.finish())
}

/// Upper left corner of a slice.
fn corner(place: usize) -> [f64; 2] {
    let (column, row) = (place % GRID[0], place / GRID[0]);
    [
        ORIGIN[0] + column as f64 * (PANEL + GAP[0]),
        ORIGIN[1] + row as f64 * (PANEL + GAP[1]),
    ]
}

fn heading(svg: &mut Svg, scene: &Scene, summary: &FieldSummary, name: &str) {
    let Colours { ink, faint, .. } = &scene.colours;
    svg.text(
        [ORIGIN[0], 46.0],
        Anchor::Start,
        24.0,
        &format!("fill=\"{ink}\" font-weight=\"bold\""),
        name,
    );
    let hottest = significant(summary.largest_temperature_gev, 3);
    let flow = if scene.largest_speed > 0.0 {
        let speed = significant(scene.largest_speed, 2);
        format!("transverse flow of what is hot up to {speed} c")
    } else {
        "no transverse flow".to_owned()
    };
    let eta = if scene.slices.data.eta.is_some() {
        ", at mid-rapidity"
    } else {
        ""
    };
    let words = format!("temperature across the beam{eta}; hottest {hottest} GeV, {flow}");
    svg.text(
        [ORIGIN[0], 72.0],
        Anchor::Start,
        15.0,
        &format!("fill=\"{faint}\""),
        &words,
    );
}

fn axis_titles(svg: &mut Svg, scene: &Scene) {
    let style = format!("fill=\"{}\"", scene.colours.ink);
    for column in 0..GRID[0] {
        let [x, y] = corner(column + GRID[0] * (GRID[1] - 1));
        svg.text(
            [x + 0.5 * PANEL, y + PANEL + 40.0],
            Anchor::Middle,
            15.0,
            &style,
            "x (fm)",
        );
    }
    for row in 0..GRID[1] {
        let [x, y] = corner(row * GRID[0]);
        let (x, y) = (x - 42.0, y + 0.5 * PANEL);
        let turned = format!("{style} transform=\"rotate(-90 {x:.1} {y:.1})\"");
        svg.text([x, y], Anchor::Middle, 15.0, &turned, "y (fm)");
    }
}
