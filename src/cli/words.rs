//! Words on stderr, and numbers as they read well.

use std::fmt;
use std::io::{Write, stderr, stdout};
use std::time::Duration;

use anyhow::Context;

const SECONDS_A_MINUTE: u64 = 60;
const SECONDS_AN_HOUR: u64 = 3600;
/// Below this many seconds, hundredths are shown.
const SECONDS_WITH_HUNDREDTHS: f64 = 10.0;
/// The shortest time that is told.
const SHORTEST_SECONDS: f64 = 0.01;
/// Decimals of a number without an error.
const USUAL_DECIMALS: i32 = 4;
/// Most decimals of a number with an error.
const MOST_DECIMALS: i32 = 9;

/// Prints lines on stderr. That nobody listens is no reason to stop a run, so failures are ignored.
pub fn say(lines: &str) {
    let _ = writeln!(stderr(), "{lines}");
}

/// Prints data on stdout; the text brings its own line ends.
///
/// # Errors
/// What the operating system says, such as a full disk.
pub(super) fn print_data(text: &str) -> anyhow::Result<()> {
    let mut stdout = stdout().lock();
    let printed = stdout
        .write_all(text.as_bytes())
        .and_then(|()| stdout.flush());
    printed.context("cannot write to standard output")
}

/// A count with its digits in groups of three: `1,234,567`.
pub(super) fn grouped(count: u64) -> String {
    let digits = count.to_string();
    let mut text = String::new();
    for (place, digit) in digits.char_indices() {
        if place > 0 && (digits.len() - place).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

/// A size in powers of 1000, to three digits.
pub(super) fn bytes(size: f64) -> String {
    const UNITS: [&str; 6] = ["bytes", "kB", "MB", "GB", "TB", "PB"];
    const STEP: f64 = 1000.0;
    let (mut value, mut unit) = (size, 0);
    while value >= STEP && unit + 1 < UNITS.len() {
        value /= STEP;
        unit += 1;
    }
    let decimals = match value {
        _ if unit == 0 => 0,
        small if small < 10.0 => 2,
        middle if middle < 100.0 => 1,
        _ => 0,
    };
    format!("{value:.decimals$} {}", UNITS[unit])
}

/// A time as a person says it: `0.42 s`, `37 s`, `12 min 05 s`, `3 h 07 min`.
pub(super) fn time(seconds: f64) -> String {
    if seconds < SECONDS_WITH_HUNDREDTHS {
        return format!("{:.2} s", seconds.max(SHORTEST_SECONDS));
    }
    let whole = Duration::try_from_secs_f64(seconds).map_or(u64::MAX, |time| time.as_secs());
    if whole < SECONDS_A_MINUTE {
        format!("{whole} s")
    } else if whole < SECONDS_AN_HOUR {
        format!(
            "{} min {:02} s",
            whole / SECONDS_A_MINUTE,
            whole % SECONDS_A_MINUTE
        )
    } else {
        let minutes = whole % SECONDS_AN_HOUR / SECONDS_A_MINUTE;
        format!("{} h {minutes:02} min", whole / SECONDS_AN_HOUR)
    }
}

/// A share in per cent, to three digits where it is small.
pub(super) fn percent(share: f64) -> String {
    let percent = 100.0 * share;
    let decimals = match percent {
        small if small != 0.0 && small < 1.0 => 3,
        middle if middle < 10.0 => 2,
        _ => 1,
    };
    format!("{percent:.decimals$} %")
}

/// A mean with its standard error, to two digits of the error: `7.749 +- 0.026`.
pub(super) fn with_error(mean: Option<f64>, error: Option<f64>) -> String {
    let decimals = match error {
        Some(error) if error > 0.0 => (1 - error.log10().floor() as i32).clamp(0, MOST_DECIMALS),
        _ => USUAL_DECIMALS,
    } as usize;
    let text = |value: f64| format!("{value:.decimals$}");
    format!(
        "{} +- {}",
        or_dash(mean.map(text)),
        or_dash(error.map(text))
    )
}

/// Something that may not exist, such as a mean of nothing.
pub(super) fn or_dash(value: Option<impl fmt::Display>) -> String {
    value.map_or_else(|| "-".to_owned(), |value| value.to_string())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn counts_are_grouped() {
        for (count, text) in [
            (0, "0"),
            (999, "999"),
            (1000, "1,000"),
            (12_345_678, "12,345,678"),
        ] {
            assert_eq!(grouped(count), text);
        }
    }

    #[test]
    fn sizes_have_three_digits() {
        for (size, text) in [
            (0.0, "0 bytes"),
            (999.0, "999 bytes"),
            (1.5e3, "1.50 kB"),
            (2.34e10, "23.4 GB"),
            (3e20, "300000 PB"),
        ] {
            assert_eq!(bytes(size), text);
        }
    }

    #[test]
    fn times_have_two_parts_at_most() {
        for (seconds, text) in [
            (0.0, "0.01 s"),
            (4.25, "4.25 s"),
            (59.9, "59 s"),
            (725.0, "12 min 05 s"),
            (11_263.0, "3 h 07 min"),
        ] {
            assert_eq!(time(seconds), text);
        }
        assert!(time(f64::INFINITY).ends_with("min"));
    }

    #[test]
    fn errors_have_two_digits() {
        for (mean, error, text) in [
            (7.74870, 0.02564, "7.749 +- 0.026"),
            (1234.5, 21.0, "1234 +- 21"),
            (1.0, 0.0, "1.0000 +- 0.0000"),
        ] {
            assert_eq!(with_error(Some(mean), Some(error)), text);
        }
        assert_eq!(with_error(None, None), "- +- -");
    }

    #[test]
    fn small_shares_keep_their_digits() {
        for (share, text) in [
            (0.0, "0.00 %"),
            (0.00123, "0.123 %"),
            (0.0456, "4.56 %"),
            (1.0, "100.0 %"),
        ] {
            assert_eq!(percent(share), text);
        }
    }
}
