use crate::axis::{Scale, Ticks};
use crate::number::{decimals, fixed, raised};

/// A grid line with its number.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Tick {
    pub(crate) value: f64,
    pub(crate) label: String,
}

/// Where an axis is divided.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct Division {
    /// With numbers.
    pub(crate) major: Vec<Tick>,
    /// Without.
    pub(crate) minor: Vec<f64>,
}

/// More divisions than any axis can show; a guard against endless loops.
const MOST: f64 = 400.0;

/// Divides an axis of `length` pixels from `lower` to `upper`.
///
/// `extent` measures a number along the axis, `gap` is the least distance
/// between two of them; the finest division that keeps it is taken.
pub(crate) fn divide(
    (lower, upper): (f64, f64),
    scale: Scale,
    ticks: Ticks,
    length: f64,
    gap: f64,
    extent: &dyn Fn(&str) -> f64,
) -> Division {
    match (scale, ticks) {
        (Scale::Log, _) => decades(lower, upper, length, gap, extent),
        (Scale::Linear, Ticks::Auto) => evenly(lower, upper, length, gap, extent),
        (Scale::Linear, Ticks::Every(step)) => {
            let span = upper - lower;
            let fits = |step: f64| {
                fit(
                    &multiples(lower, upper, step),
                    step / span * length,
                    gap,
                    extent,
                )
            };
            let kept = (1..=1000)
                .map(|k| step * f64::from(k))
                .find(|&s| span / s < MOST && fits(s));
            kept.map_or_else(
                || evenly(lower, upper, length, gap, extent),
                |step| Division {
                    major: multiples(lower, upper, step),
                    minor: Vec::new(),
                },
            )
        }
    }
}

fn fit(ticks: &[Tick], pitch: f64, gap: f64, extent: &dyn Fn(&str) -> f64) -> bool {
    ticks.iter().map(|t| extent(&t.label)).fold(0.0, f64::max) + gap <= pitch
}

fn evenly(lower: f64, upper: f64, length: f64, gap: f64, extent: &dyn Fn(&str) -> f64) -> Division {
    let span = upper - lower;
    let finest = span / (length / gap.max(8.0)).clamp(2.0, 40.0);
    let mut exponent = finest.log10().floor() as i32;
    let mut steps = [1.0, 2.0, 5.0].into_iter().cycle();
    // Five decades of steps from the finest up: the last leaves one number.
    for _ in 0..15 {
        let mantissa = steps.next().unwrap_or(1.0);
        let step = mantissa * 10f64.powi(exponent);
        if mantissa == 5.0 {
            exponent += 1;
        }
        if step < finest {
            continue;
        }
        let major = multiples(lower, upper, step);
        if fit(&major, step / span * length, gap, extent) {
            let parts = if mantissa == 2.0 { 4.0 } else { 5.0 };
            let minor = if step / span * length / parts >= 7.0 {
                indices(lower, upper, step / parts)
                    .filter(|i| i.rem_euclid(parts) != 0.0)
                    .map(|i| i * (step / parts))
                    .collect()
            } else {
                Vec::new()
            };
            return Division { major, minor };
        }
    }
    Division::default()
}

fn indices(lower: f64, upper: f64, step: f64) -> impl Iterator<Item = f64> {
    // A hair of slack, so that a range of 0 to 0.3 has its tick at 0.3.
    let first = (lower / step - 1e-9).ceil();
    let last = (upper / step + 1e-9).floor();
    let count = (last - first + 1.0).clamp(0.0, MOST) as u32;
    (0..count).map(move |i| first + f64::from(i))
}

fn multiples(lower: f64, upper: f64, step: f64) -> Vec<Tick> {
    let largest = lower.abs().max(upper.abs());
    // Powers of ten only where plain digits would be a row of noughts.
    let power = if !(1e-3..1e7).contains(&largest) {
        largest.log10().floor() as i32
    } else {
        0
    };
    let unit = 10f64.powi(power);
    let places = decimals(step / unit);
    indices(lower, upper, step)
        .map(|i| {
            let value = if i == 0.0 { 0.0 } else { i * step };
            let mut label = fixed(value / unit, places);
            if power != 0 && value != 0.0 {
                label.push_str("·10");
                label.push_str(&raised(power));
            }
            Tick {
                value,
                label: if value == 0.0 { "0".to_owned() } else { label },
            }
        })
        .collect()
}

/// Numbers at 1, 2, 5 of each decade where there is room, at the decades, or
/// at every second, third … of them.
fn decades(
    lower: f64,
    upper: f64,
    length: f64,
    gap: f64,
    extent: &dyn Fn(&str) -> f64,
) -> Division {
    let (first, last) = (lower.log10().floor() as i32, upper.log10().ceil() as i32);
    let span = upper.log10() - lower.log10();
    if span < 0.4 {
        return evenly(lower, upper, length, gap, extent);
    }
    let per_decade = length / span;
    let plain = lower > 0.9e-3 && upper < 1.1e5;
    let inside = |v: f64| v >= lower * (1.0 - 1e-9) && v <= upper * (1.0 + 1e-9);
    let label = |mantissa: f64, exponent: i32| {
        if plain {
            fixed(
                mantissa * 10f64.powi(exponent),
                usize::try_from(-exponent).unwrap_or(0),
            )
        } else if mantissa == 1.0 {
            format!("10{}", raised(exponent))
        } else {
            format!("{mantissa}·10{}", raised(exponent))
        }
    };
    let numbers = |mantissas: &[f64], every: i32| -> Vec<Tick> {
        (first..=last)
            .filter(|e| e.rem_euclid(every) == 0)
            .flat_map(|e| mantissas.iter().map(move |&m| (m, e)).collect::<Vec<_>>())
            .map(|(m, e)| Tick {
                value: m * 10f64.powi(e),
                label: label(m, e),
            })
            .filter(|t| inside(t.value))
            .collect()
    };
    // 1, 2 and 5 are 0.30, 0.40 and 0.30 of a decade apart.
    let dense = numbers(&[1.0, 2.0, 5.0], 1);
    let (major, every) = if fit(&dense, 0.30 * per_decade, gap, extent) {
        (dense, 1)
    } else {
        let kept =
            (1..=300).find(|&n| fit(&numbers(&[1.0], n), f64::from(n) * per_decade, gap, extent));
        let every = kept.unwrap_or(300);
        (numbers(&[1.0], every), every)
    };
    let minor = if every > 1 {
        numbers(&[1.0], 1).into_iter().map(|t| t.value).collect()
    } else if per_decade > 36.0 {
        let all: Vec<f64> = (2..=9).map(f64::from).collect();
        numbers(&all, 1).into_iter().map(|t| t.value).collect()
    } else {
        Vec::new()
    };
    let taken: Vec<f64> = major.iter().map(|t| t.value).collect();
    let minor = minor.into_iter().filter(|v| !taken.contains(v)).collect();
    Division { major, minor }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(range: (f64, f64), scale: Scale, ticks: Ticks, length: f64) -> Vec<String> {
        let extent = |text: &str| 9.0 * text.chars().count() as f64;
        let division = divide(range, scale, ticks, length, 20.0, &extent);
        assert!(
            division
                .major
                .iter()
                .all(|t| t.value >= range.0 - 1e-9 && t.value <= range.1 * (1.0 + 1e-8) + 1e-9)
        );
        division.major.into_iter().map(|t| t.label).collect()
    }

    #[test]
    fn angles_stand_at_every_45_degrees_and_are_thinned_where_they_would_touch() {
        let wide = labels((0.0, 360.0), Scale::Linear, Ticks::Every(45.0), 1000.0);
        assert_eq!(
            wide,
            ["0", "45", "90", "135", "180", "225", "270", "315", "360"]
        );
        let narrow = labels((0.0, 360.0), Scale::Linear, Ticks::Every(45.0), 250.0);
        assert_eq!(narrow, ["0", "90", "180", "270", "360"]);
    }

    #[test]
    fn steps_are_1_2_5_and_numbers_as_short_as_they_can_be() {
        assert_eq!(
            labels((0.0, 6000.0), Scale::Linear, Ticks::Auto, 260.0),
            ["0", "2000", "4000", "6000"]
        );
        assert_eq!(
            labels((-0.3, 0.3), Scale::Linear, Ticks::Auto, 300.0),
            ["−0.2", "0", "0.2"]
        );
        assert_eq!(
            labels((0.0, 3e-5), Scale::Linear, Ticks::Auto, 400.0),
            ["0", "1·10⁻⁵", "2·10⁻⁵", "3·10⁻⁵"]
        );
    }

    #[test]
    fn decades_are_plain_in_the_middle_and_powers_beyond() {
        assert_eq!(
            labels((1.0, 1000.0), Scale::Log, Ticks::Auto, 400.0),
            ["1", "10", "100", "1000"]
        );
        assert_eq!(
            labels((0.01, 1.0), Scale::Log, Ticks::Auto, 200.0),
            ["0.01", "0.10", "1"].map(|s| if s == "0.10" { "0.1" } else { s })
        );
        assert_eq!(
            labels((1e-6, 1e-3), Scale::Log, Ticks::Auto, 400.0),
            ["10⁻⁶", "10⁻⁵", "10⁻⁴", "10⁻³"]
        );
        assert_eq!(
            labels((1.0, 12.0), Scale::Log, Ticks::Auto, 600.0),
            ["1", "2", "5", "10"]
        );
        assert!(labels((1e-300, 1e300), Scale::Log, Ticks::Auto, 600.0).len() > 3);
    }
}
