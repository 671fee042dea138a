//! What the jet meets: temperature, and the factor p.u/E of the flow, along its path.

use super::svg::{Anchor, Svg, label, path, ticks};
use super::{GAP, GRID, ORIGIN, PANEL, PROFILE_GAP, PROFILE_HEIGHT, Scene};

/// Points of the curves.
const POINTS: usize = 400;

pub(super) fn draw(svg: &mut Svg, scene: &Scene) {
    let left = ORIGIN[0];
    let top = ORIGIN[1] + GRID[1] as f64 * PANEL + (GRID[1] - 1) as f64 * GAP[1] + PROFILE_GAP;
    let width = GRID[0] as f64 * PANEL + (GRID[0] - 1) as f64 * GAP[0];
    let bottom = top + PROFILE_HEIGHT;
    let last_fm = (1.04 * last_hot(scene)).max(scene.times_fm[0]);
    let highest = 1.08 * scene.range_gev[1];
    let along = |l: f64| left + width * l / last_fm;
    let up = |temperature: f64| bottom - PROFILE_HEIGHT * temperature / highest;
    let sample = |place: usize| {
        let l = last_fm * place as f64 / POINTS as f64;
        (l, scene.slices.at(l, scene.jet.at(l)))
    };
    let samples: Vec<_> = (0..=POINTS)
        .map(sample)
        .filter(|(_, point)| point.temperature_gev > 0.0)
        .collect();
    let ink = format!("fill=\"{}\"", scene.colours.ink);
    let jet = &scene.colours.jet;
    let axis = format!("stroke=\"{}\" stroke-width=\"1.2\"", scene.colours.ink);
    for tick in ticks([0.0, highest], 4.0) {
        svg.line(
            [left, up(tick)],
            [left + width, up(tick)],
            "stroke=\"#000000\" stroke-opacity=\"0.07\"",
        );
        svg.text(
            [left - 9.0, up(tick) + 4.5],
            Anchor::End,
            13.0,
            &ink,
            &label(tick),
        );
    }
    for tick in ticks([0.0, last_fm], 10.0) {
        svg.line([along(tick), bottom], [along(tick), bottom + 5.0], &axis);
        svg.text(
            [along(tick), bottom + 20.0],
            Anchor::Middle,
            13.0,
            &ink,
            &label(tick),
        );
    }
    if let (Some((first, _)), Some((last, _))) = (samples.first(), samples.last()) {
        let curve = samples
            .iter()
            .map(|(l, point)| [along(*l), up(point.temperature_gev)]);
        let ends = [[along(*last), bottom], [along(*first), bottom]];
        let area = path(curve.clone().chain(ends), true);
        svg.push(&format!(
            "<path fill=\"{jet}\" fill-opacity=\"0.16\" d=\"{area}\"/>"
        ));
        svg.push(&format!("<path fill=\"none\" stroke=\"{jet}\" stroke-width=\"2.4\" stroke-linejoin=\"round\" d=\"{}\"/>", path(curve, false)));
    }
    let end = up(scene.end_temperature_gev);
    svg.line(
        [left, end],
        [left + width, end],
        &format!(
            "stroke=\"{}\" stroke-width=\"1.4\" stroke-dasharray=\"6 3.5\"",
            scene.colours.faint
        ),
    );
    for time in &scene.times_fm {
        let point = scene.slices.at(*time, scene.jet.at(*time));
        if point.temperature_gev == 0.0 {
            continue;
        }
        svg.push(&format!(
            "<circle cx=\"{:.1}\" cy=\"{:.1}\" r=\"5\" fill=\"{jet}\" stroke=\"{}\" stroke-width=\"1.6\"/>",
            along(*time),
            up(point.temperature_gev),
            scene.colours.paper
        ));
    }
    svg.line([left, bottom], [left + width, bottom], &axis);
    svg.line([left, top], [left, bottom], &axis);
    if scene.largest_speed > 0.0 {
        flow_factor(
            svg,
            scene,
            &samples
                .iter()
                .map(|(l, point)| (along(*l), point.flow))
                .collect::<Vec<_>>(),
            [left + width, top],
        );
    }
    let faint = format!("fill=\"{}\"", scene.colours.faint);
    let [nx, ny] = scene.jet.direction;
    let towards = if scene.is_round {
        "along x".to_owned()
    } else {
        let angle = label(ny.atan2(nx).to_degrees().round());
        format!("along the second-order event plane ({angle}\u{b0} from x)")
    };
    let words = format!(
        "What a jet meets that starts from the centre at t = 0 {towards}; dots: the slices above"
    );
    svg.text([left, top - 14.0], Anchor::Start, 14.0, &faint, &words);
    svg.text(
        [left + 0.5 * width, bottom + 40.0],
        Anchor::Middle,
        15.0,
        &ink,
        "path (fm)",
    );
    let (x, y) = (left - 42.0, 0.5 * (top + bottom));
    svg.text(
        [x, y],
        Anchor::Middle,
        15.0,
        &format!("fill=\"{jet}\" font-weight=\"bold\" transform=\"rotate(-90 {x:.1} {y:.1})\""),
        "T (GeV)",
    );
}

/// Where the jet meets the end temperature for the last time.
fn last_hot(scene: &Scene) -> f64 {
    let farthest = scene.slices.data.tau_fm[scene.slices.data.tau_fm.len() - 1];
    let hot = |place: &usize| {
        let l = farthest * *place as f64 / POINTS as f64;
        scene.slices.at(l, scene.jet.at(l)).temperature_gev >= scene.end_temperature_gev
    };
    let last = (0..=POINTS).rev().find(hot).unwrap_or(POINTS);
    // To the last slice shown at least, so that every dot has its place.
    let shown = scene.times_fm[scene.times_fm.len() - 1];
    (farthest * last as f64 / POINTS as f64).max(shown)
}

/// The curve of p.u/E = u^tau - n.u at mid-rapidity, on an axis of its own at the right.
fn flow_factor(svg: &mut Svg, scene: &Scene, points: &[(f64, [f64; 2])], [right, top]: [f64; 2]) {
    const HIGHEST: f64 = 1.25;
    let bottom = top + PROFILE_HEIGHT;
    let [nx, ny] = scene.jet.direction;
    let factor = |[ux, uy]: [f64; 2]| (1.0 + ux * ux + uy * uy).sqrt() - nx * ux - ny * uy;
    let up = |value: f64| bottom - PROFILE_HEIGHT * value / HIGHEST;
    let curve = points
        .iter()
        .map(|(x, flow)| [*x, up(factor(*flow).min(HIGHEST))]);
    let ink = &scene.colours.ink;
    svg.push(&format!("<path fill=\"none\" stroke=\"{ink}\" stroke-width=\"1.6\" stroke-linejoin=\"round\" d=\"{}\"/>", path(curve, false)));
    let axis = format!("stroke=\"{ink}\" stroke-width=\"1.2\"");
    svg.line([right, top], [right, bottom], &axis);
    for tick in ticks([0.0, HIGHEST], 3.0) {
        svg.line([right, up(tick)], [right + 5.0, up(tick)], &axis);
        svg.text(
            [right + 9.0, up(tick) + 4.5],
            Anchor::Start,
            13.0,
            &format!("fill=\"{ink}\""),
            &label(tick),
        );
    }
    let (x, y) = (right + 50.0, 0.5 * (top + bottom));
    svg.text(
        [x, y],
        Anchor::Middle,
        15.0,
        &format!("fill=\"{ink}\" transform=\"rotate(-90 {x:.1} {y:.1})\""),
        "flow factor p\u{b7}u/E",
    );
}
