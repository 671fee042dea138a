//! The colour scale, and what lines and arrows mean.

use super::palette::{colour, hex};
use super::panel::arrow_of_light;
use super::svg::{Anchor, Svg, label, ticks};
use super::{GAP, GRID, ORIGIN, PANEL, Scene};

const WIDTH: f64 = 20.0;
/// Pieces of the scale.
const PIECES: usize = 88;

pub(super) fn draw(svg: &mut Svg, scene: &Scene) {
    let x = ORIGIN[0] + GRID[0] as f64 * (PANEL + GAP[0]) + 14.0;
    let (top, height) = (ORIGIN[1] + 24.0, 330.0);
    let bottom = top + height;
    let ink = format!("fill=\"{}\"", scene.colours.ink);
    let line = format!("stroke=\"{}\" stroke-width=\"1.2\"", scene.colours.ink);
    svg.text([x, ORIGIN[1] + 8.0], Anchor::Start, 15.0, &ink, "T (GeV)");
    for piece in 0..PIECES {
        let share = (piece as f64 + 0.5) / PIECES as f64;
        let step = height / PIECES as f64;
        // A little higher than a step, so that no seam shows.
        let upper = bottom - (piece + 1) as f64 * step;
        let tall = if piece == 0 { step } else { step + 0.6 };
        svg.push(&format!(
            "<rect x=\"{x:.1}\" y=\"{upper:.2}\" width=\"{WIDTH}\" height=\"{tall:.2}\" fill=\"{}\"/>",
            hex(colour(share))
        ));
    }
    let level = |temperature: f64| bottom - height * scene.share(temperature);
    for tick in ticks(scene.range_gev, 5.0) {
        let y = level(tick);
        svg.line([x + WIDTH, y], [x + WIDTH + 5.0, y], &line);
        svg.text(
            [x + WIDTH + 9.0, y + 4.5],
            Anchor::Start,
            13.0,
            &ink,
            &label(tick),
        );
    }
    let end = level(scene.end_temperature_gev);
    svg.line(
        [x, end],
        [x + WIDTH, end],
        "stroke=\"#ffffff\" stroke-width=\"1.8\" stroke-dasharray=\"6 3.5\"",
    );
    svg.text(
        [x + WIDTH + 9.0, bottom + 4.5],
        Anchor::Start,
        13.0,
        &ink,
        &format!("\u{2264} {}", label(scene.range_gev[0])),
    );
    legend(svg, scene, [x, bottom + 44.0]);
}

/// The largest round speed whose arrow is no longer than the longest drawn.
fn round_speed(largest: f64) -> f64 {
    const SPEEDS: [f64; 6] = [0.8, 0.6, 0.4, 0.2, 0.1, 0.05];
    let fits = |speed: &f64| *speed <= largest;
    SPEEDS.into_iter().find(fits).unwrap_or(largest)
}

fn legend(svg: &mut Svg, scene: &Scene, [x, y]: [f64; 2]) {
    let ink = format!("fill=\"{}\"", scene.colours.ink);
    let dark = hex(colour(0.12));
    let chip = |svg: &mut Svg, y: f64| {
        svg.push(&format!(
            "<rect x=\"{x:.1}\" y=\"{:.1}\" width=\"34\" height=\"22\" rx=\"3\" fill=\"{dark}\"/>",
            y - 15.0
        ));
    };
    let mut y = y;
    chip(svg, y);
    svg.line(
        [x + 4.0, y - 4.0],
        [x + 30.0, y - 4.0],
        "stroke=\"#ffffff\" stroke-width=\"1.8\" stroke-dasharray=\"6 3.5\"",
    );
    let end = format!("{} GeV", label(scene.end_temperature_gev));
    svg.text([x + 42.0, y], Anchor::Start, 13.0, &ink, &end);
    y += 34.0;
    if scene.largest_speed > 0.0 {
        chip(svg, y);
        let speed = round_speed(scene.largest_speed);
        let length = speed * arrow_of_light(scene);
        let (back, across) = (0.32 * length, 0.19 * length);
        svg.push(&format!(
            "<path d=\"M{:.1} {:.1}h{length:.1}m{:.1} {:.1}l{back:.1} {across:.1}l{:.1} {across:.1}\" fill=\"none\" stroke=\"#ffffff\" stroke-width=\"1.2\" stroke-linecap=\"round\" stroke-linejoin=\"round\"/>",
            x + 17.0 - 0.5 * length,
            y - 4.0,
            -back,
            -across,
            -back,
        ));
        let words = format!("flow, {} c", label(speed));
        svg.text([x + 42.0, y], Anchor::Start, 13.0, &ink, &words);
        y += 34.0;
    }
    chip(svg, y);
    let jet = &scene.colours.jet;
    svg.line(
        [x + 5.0, y - 4.0],
        [x + 27.0, y - 4.0],
        &format!("stroke=\"{jet}\" stroke-width=\"3\" stroke-linecap=\"round\""),
    );
    svg.push(&format!("<circle cx=\"{:.1}\" cy=\"{:.1}\" r=\"4.4\" fill=\"{jet}\" stroke=\"#ffffff\" stroke-width=\"1.4\"/>", x + 26.0, y - 4.0));
    svg.text([x + 42.0, y], Anchor::Start, 13.0, &ink, "a jet");
}
