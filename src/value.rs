//! Values of flags, from their text. What a value may be is checked with the settings.

use shaftwise_run::{ChannelPick, Exclusion};

/// A finite number, also as a fraction such as `1/16`.
pub(crate) fn number(text: &str) -> Result<f64, String> {
    let plain = |text: &str| text.trim().parse::<f64>().ok();
    let value = match text.split_once('/') {
        Some((above, below)) => plain(above).zip(plain(below)).map(|(a, b)| a / b),
        None => plain(text),
    };
    match value {
        Some(value) if value.is_finite() => Ok(value),
        _ => Err("expected a finite number, such as 0.5 or 1/16".to_owned()),
    }
}

/// A reader of whole numbers; `range` says in words which.
pub(crate) fn whole<T: std::str::FromStr>(
    range: &'static str,
) -> impl Fn(&str) -> Result<T, String> + Clone {
    move |text| {
        let value = text.trim().parse();
        value.map_err(|_| format!("expected a whole number, {range}"))
    }
}

/// A channel's number from 1, or its name.
pub(crate) fn channel(text: &str) -> Result<ChannelPick, String> {
    match text.trim() {
        "" => Err("expected a channel's number or name".to_owned()),
        text if text.bytes().all(|byte| byte.is_ascii_digit()) => text
            .parse()
            .map(ChannelPick::Number)
            .map_err(|_| "expected a channel's number, at most 4294967295".to_owned()),
        text => Ok(ChannelPick::Name(text.to_owned())),
    }
}

/// `S:S` or `S:S=REASON`.
pub(crate) fn exclusion(text: &str) -> Result<Exclusion, String> {
    let (stretch, reason) = match text.split_once('=') {
        Some((stretch, reason)) => (stretch, Some(reason.trim().to_owned())),
        None => (text, None),
    };
    let (from, to) = stretch
        .split_once(':')
        .ok_or("expected START:END in seconds, such as 12:14.5=\"valve moved\"")?;
    Ok(Exclusion {
        from_s: number(from)?,
        to_s: number(to)?,
        reason,
    })
}

/// `CH=FACTOR` or `CH=FACTOR UNIT`.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Calibration {
    pub(crate) channel: u32,
    pub(crate) factor: f64,
    pub(crate) unit: Option<String>,
}

/// Reads a [`Calibration`].
pub(crate) fn calibration(text: &str) -> Result<Calibration, String> {
    let expected = "expected CHANNEL=FACTOR, such as 1=98.1 or \"1=98.1 m/s2\"";
    let (channel, rest) = text.split_once('=').ok_or(expected)?;
    let (factor, unit) = match rest.trim().split_once(char::is_whitespace) {
        Some((factor, unit)) => (factor, Some(unit.trim().to_owned())),
        None => (rest, None),
    };
    Ok(Calibration {
        channel: channel.trim().parse().map_err(|_| expected)?,
        factor: number(factor)?,
        unit,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_may_be_fractions_but_not_endless() {
        assert_eq!(number("1/16"), Ok(0.0625));
        assert_eq!(number("-2e-3"), Ok(-0.002));
        for wrong in [
            "NaN", "inf", "1/0", "0/0", "1e999", "", "1/2/3", "0x10", "1,5",
        ] {
            assert!(number(wrong).is_err(), "{wrong}");
        }
    }

    #[test]
    fn a_channel_is_a_number_or_a_name() {
        assert_eq!(channel("4"), Ok(ChannelPick::Number(4)));
        assert_eq!(
            channel("drive end"),
            Ok(ChannelPick::Name("drive end".to_owned()))
        );
        assert!(channel("").is_err());
        assert!(channel("99999999999").is_err());
    }

    #[test]
    fn a_stretch_may_have_a_reason() {
        let exclusion = exclusion("12:14.5=valve a=b").expect("read");
        assert_eq!((exclusion.from_s, exclusion.to_s), (12.0, 14.5));
        assert_eq!(exclusion.reason.as_deref(), Some("valve a=b"));
        assert!(super::exclusion("12").is_err());
    }

    #[test]
    fn a_calibration_may_have_a_unit() {
        let read = calibration("2=-0.5 mm/s").expect("read");
        assert_eq!((read.channel, read.factor), (2, -0.5));
        assert_eq!(read.unit.as_deref(), Some("mm/s"));
        assert!(calibration("a=1").is_err());
        assert!(calibration("1").is_err());
    }
}
