//! Numbers as a person likes to read them.

/// Powers of ten between which a number is written out.
const PLAIN_DECADES: std::ops::Range<i32> = -3..6;

/// A number with so many significant digits, in powers of ten where it is very small or large.
pub(super) fn significant(value: f64, digits: i32) -> String {
    if value == 0.0 || !value.is_finite() {
        return value.to_string();
    }
    let decade = value.abs().log10().floor() as i32;
    if PLAIN_DECADES.contains(&decade) {
        let decimals = (digits - 1 - decade).max(0) as usize;
        format!("{value:.decimals$}")
    } else {
        let decimals = (digits - 1).max(0) as usize;
        format!("{value:.decimals$e}")
    }
}

#[cfg(test)]
mod tests {
    use super::significant;

    #[test]
    fn digits_follow_the_size() {
        assert_eq!(significant(123.456, 4), "123.5");
        assert_eq!(significant(0.0123456, 3), "0.0123");
        assert_eq!(significant(1.5e-7, 3), "1.50e-7");
        assert_eq!(significant(0.0, 3), "0");
        assert_eq!(significant(12345.6, 3), "12346");
    }
}
