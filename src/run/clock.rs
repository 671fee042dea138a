//! The time of day as ISO 8601.

use std::time::{SystemTime, UNIX_EPOCH};

const SECONDS_A_DAY: u64 = 86_400;
const SECONDS_AN_HOUR: u64 = 3600;
const SECONDS_A_MINUTE: u64 = 60;
const DAYS_OUTSIDE_FEBRUARY: u64 = 337;

/// Now, in UTC, to the second: `2026-01-31T23:59:59Z`.
pub(super) fn now_utc() -> String {
    let since = SystemTime::now().duration_since(UNIX_EPOCH);
    // a clock set before 1970 says 1970
    iso_8601(since.map_or(0, |since| since.as_secs()))
}

fn iso_8601(unix_seconds: u64) -> String {
    let (year, month, day) = civil(unix_seconds / SECONDS_A_DAY);
    let second_of_day = unix_seconds % SECONDS_A_DAY;
    format!(
        "{year:04}-{month:02}-{day:02}T{:02}:{:02}:{:02}Z",
        second_of_day / SECONDS_AN_HOUR,
        second_of_day % SECONDS_AN_HOUR / SECONDS_A_MINUTE,
        second_of_day % SECONDS_A_MINUTE
    )
}

/// Year, month and day of the Gregorian calendar, given the days since 1970-01-01.
fn civil(days: u64) -> (u64, usize, u64) {
    let (mut year, mut rest) = (1970, days);
    while rest >= year_length(year) {
        rest -= year_length(year);
        year += 1;
    }
    let february = year_length(year) - DAYS_OUTSIDE_FEBRUARY;
    let months = [31, february, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];
    let mut month = 0;
    while rest >= months[month] {
        rest -= months[month];
        month += 1;
    }
    (year, month + 1, rest + 1)
}

fn year_length(year: u64) -> u64 {
    let is_leap = year.is_multiple_of(4) && (!year.is_multiple_of(100) || year.is_multiple_of(400));
    if is_leap { 366 } else { 365 }
}

#[cfg(test)]
mod tests {
    use super::iso_8601;

    // What `date -u -d @SECONDS +%FT%TZ` prints.
    #[test]
    fn known_times() {
        for (seconds, text) in [
            (0, "1970-01-01T00:00:00Z"),
            (951_782_399, "2000-02-28T23:59:59Z"),
            (951_782_400, "2000-02-29T00:00:00Z"),
            (951_868_800, "2000-03-01T00:00:00Z"),
            (1_767_225_599, "2025-12-31T23:59:59Z"),
            (1_767_225_600, "2026-01-01T00:00:00Z"),
            (4_107_542_400, "2100-03-01T00:00:00Z"),
        ] {
            assert_eq!(iso_8601(seconds), text);
        }
    }
}
