//! What a channel is called, what it measures and how its samples become
//! values.

use crate::Error;
use crate::sample::{Encoding, SampleFormat};
use crate::unit::{Quantity, Unit};

/// What is known about a channel besides its samples; all that is left out
/// comes from the file, or stays unknown.
///
/// # Calibration
///
/// A *sample* is ±1 at full scale for integer files, and the number in the
/// file for float files and text. The value is
///
/// - with `factor`: `sample * factor`, in `unit`;
/// - with `mv_per_unit` and `range_v`: `sample * range_v * 1000 / mv_per_unit`,
///   in `unit`, where `range_v` is the voltage at sample 1;
/// - with `mv_per_unit` alone: the sample is a voltage already (text and float
///   files only; a text column in mV is one too): `volts * 1000 / mv_per_unit`;
/// - with `range_v` alone: `sample * range_v`, in V.
///
/// In text `range_v` never scales, it only states the full scale. Negative
/// sensitivities are allowed and turn the sign.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ChannelSetup {
    /// Channel, from 1 in file order; a time column is not counted.
    pub number: usize,
    /// Default: the name in the file, else `channel N`.
    pub name: Option<String>,
    /// Default: what the unit measures.
    pub quantity: Option<Quantity>,
    /// Unit of the value, before it is brought to the shown unit. Default: the
    /// file's, else the shown unit of the quantity.
    pub unit: Option<String>,
    /// Units per sample; finite, not 0.
    pub factor: Option<f64>,
    /// Sensitivity in mV per unit; finite, not 0.
    pub mv_per_unit: Option<f64>,
    /// Voltage at full scale; positive.
    pub range_v: Option<f64>,
}

/// `value = sample * factor + offset`, in the shown unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scale {
    /// Shown units per sample.
    pub factor: f64,
    /// Value of sample 0; not 0 for temperatures only.
    pub offset: f64,
}

/// A channel of a recording.
#[derive(Debug, Clone, PartialEq)]
pub struct Channel {
    /// From 1, in file order.
    pub number: usize,
    /// Its name; not necessarily unique.
    pub name: String,
    /// What it measures.
    pub quantity: Quantity,
    /// The unit its values are in, as shown: SI-based for known quantities,
    /// `FS` (fraction of full scale) for integer samples and `unit` for others
    /// of which nothing is known.
    pub unit: String,
    /// From sample to value.
    pub scale: Scale,
    /// Largest magnitude the recorder could store, in the shown unit, where it
    /// is known.
    pub full_scale: Option<f64>,
}

/// What the file itself says about a channel.
#[derive(Debug, Clone, Default)]
pub(crate) struct Origin {
    pub(crate) name: Option<String>,
    pub(crate) unit: Option<String>,
    /// Numbers in text are values already, never fractions of full scale.
    pub(crate) text: bool,
}

/// Sets up all channels.
pub(crate) fn set_up(
    origins: &[Origin],
    format: SampleFormat,
    setups: &[ChannelSetup],
    warnings: &mut Vec<String>,
) -> Result<Vec<Channel>, Error> {
    for (i, setup) in setups.iter().enumerate() {
        if !(1..=origins.len()).contains(&setup.number) {
            return Err(Error::Setting {
                what: "channel number".into(),
                found: setup.number.to_string(),
                expected: format!("1 to {}", origins.len()),
            });
        }
        if setups[..i].iter().any(|other| other.number == setup.number) {
            return Err(Error::Setting {
                what: "channel number".into(),
                found: format!("{} twice", setup.number),
                expected: "each channel once".into(),
            });
        }
    }
    let unset = ChannelSetup::default();
    origins
        .iter()
        .enumerate()
        .map(|(i, origin)| {
            let setup = setups.iter().find(|setup| setup.number == i + 1);
            set_up_one(i + 1, origin, format, setup.unwrap_or(&unset), warnings)
        })
        .collect()
}

fn set_up_one(
    number: usize,
    origin: &Origin,
    format: SampleFormat,
    setup: &ChannelSetup,
    warnings: &mut Vec<String>,
) -> Result<Channel, Error> {
    check(number, setup)?;
    let integer = format.encoding != Encoding::Float;
    let (quantity, unit) = quantity_and_unit(origin, setup)?;

    let volts_per_sample = match (setup.range_v, origin.text) {
        (Some(range_v), false) => Some(range_v),
        _ if integer => None,
        _ => {
            let unit = origin.unit.as_deref().and_then(Unit::find);
            let volts = unit.filter(|unit| unit.quantity == Quantity::Voltage);
            Some(volts.map_or(1.0, |unit| unit.factor))
        }
    };
    let (quantity, unit, units_per_sample) = match (setup.factor, setup.mv_per_unit) {
        (Some(factor), _) => (quantity, unit, factor),
        (None, Some(mv_per_unit)) => {
            let volts = volts_per_sample.ok_or_else(|| Error::Setting {
                what: format!("range_v of channel {number}"),
                found: "missing".into(),
                expected:
                    "the voltage at full scale, needed beside mv_per_unit for integer samples"
                        .into(),
            })?;
            (quantity, unit, volts * 1000.0 / mv_per_unit)
        }
        (None, None) => match setup.range_v {
            Some(range_v) if !origin.text => {
                let quantity = setup.quantity.unwrap_or(Quantity::Voltage);
                if quantity != Quantity::Voltage {
                    return Err(Error::Setting {
                        what: format!("mv_per_unit of channel {number}"),
                        found: "missing".into(),
                        expected: format!("the sensitivity, needed beside range_v for {quantity}"),
                    });
                }
                let unit = setup.unit.as_deref().unwrap_or("V");
                // the range is in V whatever unit is wanted
                let unit = Unit::of(Quantity::Voltage, unit)?;
                (quantity, Some(unit.name.to_owned()), range_v / unit.factor)
            }
            _ => {
                if integer && unit.is_some() {
                    warnings.push(format!(
                        "channel {number}: no calibration given, full scale taken as 1 {}",
                        unit.as_deref().unwrap_or_default()
                    ));
                }
                (quantity, unit, 1.0)
            }
        },
    };

    let known = unit
        .as_deref()
        .and_then(Unit::find)
        .filter(|unit| unit.quantity == quantity);
    let scale = Scale {
        factor: units_per_sample * known.map_or(1.0, |unit| unit.factor),
        offset: known.map_or(0.0, |unit| unit.offset),
    };
    let full_scale = match setup.range_v {
        _ if integer => Some(scale.factor.abs()),
        Some(_) if !origin.text => Some(scale.factor.abs()),
        Some(range_v) => volts_per_sample.map(|volts| (scale.factor * range_v / volts).abs()),
        None => None,
    };
    if !(scale.factor.is_finite() && scale.factor != 0.0) {
        return Err(Error::Setting {
            what: format!("calibration of channel {number}"),
            found: format!("{:e} per sample", scale.factor),
            expected: "a finite factor other than 0".into(),
        });
    }
    let unit = match (quantity.shown_unit(), unit) {
        (Some(shown), _) => shown.to_owned(),
        (None, Some(unit)) => unit,
        (None, None) if integer && setup.factor.is_none() && setup.mv_per_unit.is_none() => {
            "FS".to_owned()
        }
        (None, None) => "unit".to_owned(),
    };
    let name = setup.name.as_ref().or(origin.name.as_ref());
    Ok(Channel {
        number,
        name: name.cloned().unwrap_or_else(|| format!("channel {number}")),
        quantity,
        unit,
        scale,
        full_scale,
    })
}

/// The quantity, and the unit of the value before it is brought to the shown
/// unit.
fn quantity_and_unit(
    origin: &Origin,
    setup: &ChannelSetup,
) -> Result<(Quantity, Option<String>), Error> {
    if let Some(unit) = &setup.unit {
        return Ok(match setup.quantity {
            // `other` is the way to keep a unit as it is written
            Some(Quantity::Other) => (Quantity::Other, Some(unit.clone())),
            Some(quantity) => (quantity, Some(Unit::of(quantity, unit)?.name.to_owned())),
            None => match Unit::find(unit) {
                Some(known) => (known.quantity, Some(known.name.to_owned())),
                None => (Quantity::Other, Some(unit.clone())),
            },
        });
    }
    let known = origin.unit.as_deref().and_then(Unit::find);
    // A voltage that a sensitivity is about to turn into something else says
    // nothing about the value.
    let known =
        known.filter(|unit| setup.mv_per_unit.is_none() || unit.quantity != Quantity::Voltage);
    Ok(match (setup.quantity, known) {
        (None, Some(known)) => (known.quantity, Some(known.name.to_owned())),
        (Some(quantity), Some(known)) if known.quantity == quantity => {
            (quantity, Some(known.name.to_owned()))
        }
        (Some(quantity), _) => (quantity, quantity.shown_unit().map(str::to_owned)),
        (None, None) if setup.mv_per_unit.is_some() => (Quantity::Other, None),
        (None, None) => (Quantity::Other, origin.unit.clone()),
    })
}

fn check(number: usize, setup: &ChannelSetup) -> Result<(), Error> {
    let refuse = |field: &str, found: String, expected: &str| {
        Err(Error::Setting {
            what: format!("{field} of channel {number}"),
            found,
            expected: expected.into(),
        })
    };
    let sensitivities = [("factor", setup.factor), ("mv_per_unit", setup.mv_per_unit)];
    for (field, value) in sensitivities {
        if let Some(value) = value
            && !(value.is_finite() && value != 0.0)
        {
            return refuse(field, value.to_string(), "a finite number other than 0");
        }
    }
    if let Some(range_v) = setup.range_v
        && !(range_v > 0.0 && range_v.is_finite())
    {
        return refuse("range_v", format!("{range_v} V"), "a positive number of V");
    }
    if setup.factor.is_some() && (setup.mv_per_unit.is_some() || setup.range_v.is_some()) {
        return refuse(
            "calibration",
            "factor beside mv_per_unit or range_v".into(),
            "either factor, or mv_per_unit with range_v",
        );
    }
    Ok(())
}
