/// A value with a fixed number of decimals and a true minus sign, thousands
/// unbroken.
pub(crate) fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{:.decimals$}", value.abs());
    let zero = text.bytes().all(|b| b == b'0' || b == b'.');
    if value < 0.0 && !zero {
        format!("−{text}")
    } else {
        text
    }
}

/// Decimals needed to tell multiples of a step apart, at most 12.
pub(crate) fn decimals(step: f64) -> usize {
    (0..12)
        .find(|&d| {
            let scaled = step * 10f64.powi(d);
            (scaled - scaled.round()).abs() < 1e-6 * scaled.abs() && scaled.round() != 0.0
        })
        .map_or(12, |d| d as usize)
}

/// A whole number in raised signs.
pub(crate) fn raised(exponent: i32) -> String {
    exponent
        .to_string()
        .chars()
        .map(|c| match c {
            '-' => '⁻',
            '1' => '¹',
            '2' => '²',
            '3' => '³',
            other => char::from_u32(0x2070 + u32::from(other) - u32::from('0')).unwrap_or(other),
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_carry_what_the_step_needs_and_no_more() {
        assert_eq!(fixed(6000.0, decimals(2000.0)), "6000");
        assert_eq!(fixed(-0.5, decimals(0.25)), "−0.50");
        assert_eq!(fixed(-0.001, 1), "0.0");
        assert_eq!(decimals(45.0), 0);
        assert_eq!(decimals(0.1 * 3.0), 1);
        assert_eq!(raised(-10), "⁻¹⁰");
        assert_eq!(raised(234), "²³⁴");
    }
}
