//! The few elements of SVG that the picture is made of.

use std::fmt::Write;

/// A picture under construction.
pub(super) struct Svg {
    text: String,
}

/// Where a text is anchored.
#[derive(Clone, Copy)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

impl Svg {
    /// An empty picture of a size, with its title for readers that do not see.
    pub(super) fn new([width, height]: [f64; 2], title: &str, background: &str) -> Svg {
        let mut svg = Svg {
            text: String::new(),
        };
        svg.push(&format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {width} {height}\" width=\"{width}\" height=\"{height}\" font-family=\"Helvetica, Arial, 'Liberation Sans', sans-serif\">\n<title>{}</title>\n<rect width=\"{width}\" height=\"{height}\" fill=\"{background}\"/>",
            escaped(title)
        ));
        svg
    }

    /// Any element or comment.
    pub(super) fn push(&mut self, element: &str) {
        self.text.push_str(element);
        self.text.push('\n');
    }

    /// A text; `style` holds further attributes.
    pub(super) fn text(
        &mut self,
        [x, y]: [f64; 2],
        anchor: Anchor,
        size: f64,
        style: &str,
        words: &str,
    ) {
        let anchor = match anchor {
            Anchor::Start => "start",
            Anchor::Middle => "middle",
            Anchor::End => "end",
        };
        self.push(&format!(
            "<text x=\"{x:.1}\" y=\"{y:.1}\" text-anchor=\"{anchor}\" font-size=\"{size}\" {style}>{}</text>",
            escaped(words)
        ));
    }

    /// A straight line.
    pub(super) fn line(&mut self, [x, y]: [f64; 2], [u, v]: [f64; 2], style: &str) {
        self.push(&format!(
            "<line x1=\"{x:.1}\" y1=\"{y:.1}\" x2=\"{u:.1}\" y2=\"{v:.1}\" {style}/>"
        ));
    }

    /// The finished text.
    pub(super) fn finish(mut self) -> String {
        self.push("</svg>");
        self.text
    }
}

/// The data of a path through points, closed or not, in tenths of a unit.
pub(super) fn path(points: impl IntoIterator<Item = [f64; 2]>, close: bool) -> String {
    let mut data = String::new();
    let mut last: Option<[i64; 2]> = None;
    for point in points {
        let here = point.map(|coordinate| (coordinate * 10.0).round() as i64);
        let tenths = |value: i64| value as f64 / 10.0;
        // Writing to a string cannot fail.
        let _ = match last {
            None => write!(data, "M{} {}", tenths(here[0]), tenths(here[1])),
            Some(before) if before == here => Ok(()),
            Some(before) => write!(
                data,
                "l{} {}",
                tenths(here[0] - before[0]),
                tenths(here[1] - before[1])
            ),
        };
        last = Some(here);
    }
    if close {
        data.push('z');
    }
    data
}

/// A text with what XML reserves spelt out, and without what it does not allow.
pub(super) fn escaped(text: &str) -> String {
    let mut escaped = String::new();
    for letter in text.chars() {
        match letter {
            '&' => escaped.push_str("&amp;"),
            '<' => escaped.push_str("&lt;"),
            '>' => escaped.push_str("&gt;"),
            '"' => escaped.push_str("&quot;"),
            control if control.is_control() => escaped.push(' '),
            plain => escaped.push(plain),
        }
    }
    escaped
}

/// Round numbers inside a range, about `wanted` of them.
pub(super) fn ticks([low, high]: [f64; 2], wanted: f64) -> Vec<f64> {
    let rough = (high - low) / wanted;
    let decade = 10_f64.powf(rough.log10().floor());
    let step = [1.0, 2.0, 5.0, 10.0]
        .map(|factor| factor * decade)
        .into_iter()
        .find(|step| *step >= rough * (1.0 - 1e-9))
        .unwrap_or(10.0 * decade);
    let first = (low / step - 1e-9).ceil() as i64;
    let last = (high / step + 1e-9).floor() as i64;
    (first..=last).map(|count| count as f64 * step).collect()
}

/// A tick's number as short as it can be.
pub(super) fn label(value: f64) -> String {
    let text = format!("{value:.3}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" {
        "0".into()
    } else {
        text.replace('-', "\u{2212}")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        assert_eq!(ticks([-9.3, 9.3], 4.0), [-5.0, 0.0, 5.0]);
        assert_eq!(
            ticks([0.0, 0.43], 5.0),
            [0.0, 0.1, 0.2, 0.30000000000000004, 0.4]
        );
        assert_eq!(label(0.30000000000000004), "0.3");
        assert_eq!(label(-5.0), "\u{2212}5");
    }

    #[test]
    fn names_of_files_are_no_markup() {
        assert_eq!(escaped("a<b>&\"\u{1}"), "a&lt;b&gt;&amp;&quot; ");
    }
}
