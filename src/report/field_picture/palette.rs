//! The picture's colours: from the deep sea to foam, computed in OKLCH (Ottosson 2020, "A perceptual color space for
//! image processing") with lightness growing evenly, so that equal steps look equal and survive grey printing.

/// Lightness of the coldest and the hottest colour.
const LIGHTNESS: [f64; 2] = [0.19, 0.975];
/// Chroma and hue (degrees) at even steps from cold to hot.
const STOPS: [[f64; 2]; 6] = [
    [0.055, 277.0],
    [0.105, 256.0],
    [0.105, 222.0],
    [0.110, 185.0],
    [0.125, 145.0],
    [0.060, 105.0],
];

/// A colour of sRGB, 0 to 255.
pub(super) type Rgb = [u8; 3];

/// The colour of a share 0 (cold) to 1 (hot).
pub(super) fn colour(share: f64) -> Rgb {
    let share = share.clamp(0.0, 1.0);
    let place = share * (STOPS.len() - 1) as f64;
    let stop = (place as usize).min(STOPS.len() - 2);
    // A smooth step, so that no stop shows as a band.
    let u = place - stop as f64;
    let u = u * u * (3.0 - 2.0 * u);
    let mix = |item: usize| STOPS[stop][item] + u * (STOPS[stop + 1][item] - STOPS[stop][item]);
    oklch(lightness(share), mix(0), mix(1))
}

/// OKLCH lightness of a share.
pub(super) fn lightness(share: f64) -> f64 {
    LIGHTNESS[0] + share.clamp(0.0, 1.0) * (LIGHTNESS[1] - LIGHTNESS[0])
}

/// A colour by lightness, chroma and hue (degrees); chroma is lowered until sRGB has it.
pub(super) fn oklch(lightness: f64, chroma: f64, hue_degrees: f64) -> Rgb {
    const LOWERING: f64 = 0.98;
    let mut chroma = chroma;
    loop {
        let linear = linear_srgb(lightness, chroma, hue_degrees);
        if linear.iter().all(|part| (0.0..=1.0).contains(part)) || chroma < 1e-3 {
            return linear.map(encode);
        }
        chroma *= LOWERING;
    }
}

/// The matrices are those of the source.
fn linear_srgb(lightness: f64, chroma: f64, hue_degrees: f64) -> [f64; 3] {
    let (sin, cos) = hue_degrees.to_radians().sin_cos();
    let (a, b) = (chroma * cos, chroma * sin);
    let l = (lightness + 0.3963377774 * a + 0.2158037573 * b).powi(3);
    let m = (lightness - 0.1055613458 * a - 0.0638541728 * b).powi(3);
    let s = (lightness - 0.0894841775 * a - 1.2914855480 * b).powi(3);
    [
        4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s,
        -1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s,
        -0.0041960863 * l - 0.7034186147 * m + 1.7076147010 * s,
    ]
}

/// The transfer function of sRGB (IEC 61966-2-1).
fn encode(linear: f64) -> u8 {
    let value = if linear <= 0.003_130_8 {
        12.92 * linear
    } else {
        1.055 * linear.powf(1.0 / 2.4) - 0.055
    };
    (value.clamp(0.0, 1.0) * 255.0).round() as u8
}

/// `#rrggbb`.
pub(super) fn hex([red, green, blue]: Rgb) -> String {
    format!("#{red:02x}{green:02x}{blue:02x}")
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Relative luminance of sRGB.
    fn luminance(colour: Rgb) -> f64 {
        let linear = colour.map(|part| {
            let value = f64::from(part) / 255.0;
            if value <= 0.04045 {
                value / 12.92
            } else {
                ((value + 0.055) / 1.055).powf(2.4)
            }
        });
        0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
    }

    #[test]
    fn hotter_is_always_lighter() {
        let steps: Vec<f64> = (0..=60)
            .map(|step| luminance(colour(f64::from(step) / 60.0)))
            .collect();
        assert!(steps.windows(2).all(|pair| pair[1] > pair[0]), "{steps:?}");
        assert!(steps[0] < 0.02 && steps[60] > 0.85);
    }

    /// White, black, and sRGB's red in OKLCH (0.62796, 0.25768, 29.234 degrees, values of the source's definition).
    #[test]
    fn known_colours() {
        assert_eq!(oklch(1.0, 0.0, 0.0), [255, 255, 255]);
        assert_eq!(oklch(0.0, 0.0, 0.0), [0, 0, 0]);
        let [red, green, blue] = oklch(0.62796, 0.2576, 29.234);
        assert!(
            red >= 254 && green <= 8 && blue <= 8,
            "{red} {green} {blue}"
        );
    }
}
