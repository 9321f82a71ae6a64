//! Numbers for people: few digits, aligned by their points.

use std::fmt::Display;

/// A value with that many digits that count; what could not be worked out is a hyphen.
pub(crate) fn significant(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return "-".to_owned();
    }
    if value == 0.0 {
        return "0".to_owned();
    }
    let size = value.abs();
    if !(1e-4..1e6).contains(&size) {
        return format!("{value:.*e}", digits.saturating_sub(1));
    }
    fixed(value, decimals(size, digits))
}

/// The same without zeros that say nothing: `50`, not `50.0`.
pub(crate) fn short(value: f64, digits: usize) -> String {
    let text = significant(value, digits);
    if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// A value with that many decimals; a hyphen where it could not be worked out, never "-0".
pub(crate) fn fixed(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return "-".to_owned();
    }
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(zero) if zero.bytes().all(|b| matches!(b, b'0' | b'.')) => zero.to_owned(),
        _ => text,
    }
}

/// Decimals that give a size in 1e-4…1e6 so many digits that count.
fn decimals(size: f64, digits: usize) -> usize {
    let lead = size.log10().floor() as i32;
    usize::try_from(digits as i32 - 1 - lead).unwrap_or(0)
}

/// A column of levels, their points under one another: three digits for the smallest of them.
/// Where they differ too much for that, each gets three digits of its own.
pub(crate) fn column(values: &[f64]) -> Vec<String> {
    let sizes = || {
        values
            .iter()
            .map(|v| v.abs())
            .filter(|v| v.is_finite() && *v > 0.0)
    };
    let (least, most) = sizes().fold((f64::INFINITY, 0.0), |(a, b), v| {
        (f64::min(a, v), f64::max(b, v))
    });
    let whole = |v: &f64| significant(*v, 3);
    if !(least >= 1e-4 && most < 1e6) {
        return values.iter().map(whole).collect();
    }
    let decimals = decimals(least, 3);
    values.iter().map(|v| fixed(*v, decimals)).collect()
}

/// A place along an axis whose lines are `step` apart: a tenth of the step and a little, at least
/// `least` decimals.
pub(crate) fn place(value: f64, step: f64, least: usize) -> String {
    let decimals = if step > 0.0 && step.is_finite() {
        usize::try_from((-step.log10()).ceil() as i32).unwrap_or(0)
    } else {
        0
    };
    fixed(value, decimals.clamp(least, 6))
}

/// A whole number of rpm, or one decimal for slow shafts.
pub(crate) fn rpm(value: f64) -> String {
    fixed(value, usize::from(value.abs() < 100.0))
}

/// "1 peak", "2 peaks".
pub(crate) fn count(number: impl Display, noun: &str) -> String {
    let number = number.to_string();
    let plural = if number == "1" { "" } else { "s" };
    format!("{number} {noun}{plural}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_are_those_that_count() {
        assert_eq!(significant(1.31234, 3), "1.31");
        assert_eq!(significant(0.001_234_5, 3), "0.00123");
        assert_eq!(significant(12_345.6, 3), "12346");
        assert_eq!(significant(-3.2e-9, 3), "-3.20e-9");
        assert_eq!(significant(f64::NAN, 3), "-");
        assert_eq!(significant(f64::INFINITY, 3), "-");
        assert_eq!(significant(0.0, 3), "0");
        assert_eq!(fixed(-0.001, 1), "0.0");
        assert_eq!(short(50.0, 3), "50");
        assert_eq!(short(0.02, 3), "0.02");
        assert_eq!(short(2827.0, 4), "2827");
    }

    #[test]
    fn a_column_keeps_its_points_in_line() {
        assert_eq!(column(&[1.3, 0.0123, f64::NAN]), ["1.3000", "0.0123", "-"]);
        assert_eq!(column(&[1.3, 1e-7]), ["1.30", "1.00e-7"]);
        assert_eq!(column(&[]), Vec::<String>::new());
    }

    #[test]
    fn a_place_is_as_fine_as_its_axis() {
        assert_eq!(place(2.0, 1.0 / 16.0, 2), "2.00");
        assert_eq!(place(2.000_4, 1.0 / 1024.0, 2), "2.0004");
        assert_eq!(place(49.37, 1.54, 1), "49.4");
    }
}
