//! Units: a small table of what measures what, and the dB references.
//!
//! Every unit is an affine map to the *shown* unit of its quantity, the
//! SI-based unit all samples are calibrated to: `shown = value * factor + offset`.

use std::f64::consts::PI;
use std::fmt;

use crate::Error;

/// Standard gravity in m/s², exact by definition (3rd CGPM, 1901).
pub const STANDARD_GRAVITY: f64 = 9.80665;

/// What a channel measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
#[non_exhaustive]
pub enum Quantity {
    /// Shown in m/s².
    Acceleration,
    /// Velocity of vibration, shown in mm/s.
    Velocity,
    /// Displacement of vibration, shown in µm.
    Displacement,
    /// Shown in Pa.
    Pressure,
    /// Shown in N.
    Force,
    /// Shown in N·m.
    Torque,
    /// Shown in V.
    Voltage,
    /// Shown in A.
    Current,
    /// Shown in °C.
    Temperature,
    /// Rotational speed, shown in rpm.
    Speed,
    /// Anything else, shown in the unit it was given in.
    #[default]
    Other,
}

impl Quantity {
    /// All of them, in the order of the table.
    pub const ALL: [Self; 11] = [
        Self::Acceleration,
        Self::Velocity,
        Self::Displacement,
        Self::Pressure,
        Self::Force,
        Self::Torque,
        Self::Voltage,
        Self::Current,
        Self::Temperature,
        Self::Speed,
        Self::Other,
    ];

    /// The word used in run files and messages.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Acceleration => "acceleration",
            Self::Velocity => "velocity",
            Self::Displacement => "displacement",
            Self::Pressure => "pressure",
            Self::Force => "force",
            Self::Torque => "torque",
            Self::Voltage => "voltage",
            Self::Current => "current",
            Self::Temperature => "temperature",
            Self::Speed => "speed",
            Self::Other => "other",
        }
    }

    /// The quantity of that name, `None` if there is none.
    #[must_use]
    pub fn from_name(name: &str) -> Option<Self> {
        Self::ALL
            .into_iter()
            .find(|quantity| quantity.name() == name)
    }

    /// The SI-based unit its samples are calibrated to; `None` for
    /// [`Quantity::Other`].
    #[must_use]
    pub fn shown_unit(self) -> Option<&'static str> {
        UNITS
            .iter()
            .find(|unit| unit.quantity == self)
            .map(|unit| unit.name)
    }

    /// The unit shown for `--units us`: g, in/s and mil, else the SI-based one.
    #[must_use]
    pub fn us_unit(self) -> Option<&'static str> {
        match self {
            Self::Acceleration => Some("g"),
            Self::Velocity => Some("in/s"),
            Self::Displacement => Some("mil"),
            _ => self.shown_unit(),
        }
    }

    /// The reference of levels in dB, in the shown unit, and how it is
    /// written: 1 µm/s², 1 nm/s, 1 pm, 20 µPa, 1 µN.
    ///
    /// Source: ISO 1683 (values from memory).
    #[must_use]
    pub fn decibel_reference(self) -> Option<(f64, &'static str)> {
        match self {
            Self::Acceleration => Some((1e-6, "1 µm/s²")),
            Self::Velocity => Some((1e-6, "1 nm/s")),
            Self::Displacement => Some((1e-6, "1 pm")),
            Self::Pressure => Some((20e-6, "20 µPa")),
            Self::Force => Some((1e-6, "1 µN")),
            _ => None,
        }
    }

    /// `20·log10(value / reference)` of a positive value in the shown unit;
    /// `None` where the quantity has no reference.
    #[must_use]
    pub fn decibels(self, value: f64) -> Option<f64> {
        let (reference, _) = self.decibel_reference()?;
        Some(20.0 * (value / reference).log10())
    }

    /// How often displacement has been differentiated to reach this quantity.
    fn derivative(self) -> Option<i32> {
        match self {
            Self::Displacement => Some(0),
            Self::Velocity => Some(1),
            Self::Acceleration => Some(2),
            _ => None,
        }
    }

    fn unit_names(self) -> String {
        let names: Vec<_> = UNITS
            .iter()
            .filter(|unit| unit.quantity == self)
            .map(|unit| unit.name)
            .collect();
        names.join(", ")
    }
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

/// A unit of the table.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Unit {
    /// As shown.
    pub name: &'static str,
    /// What it measures.
    pub quantity: Quantity,
    /// Shown units per unit.
    pub factor: f64,
    /// Shown value at 0 of this unit; not zero for temperatures only.
    pub offset: f64,
    aliases: &'static [&'static str],
}

const fn unit(
    quantity: Quantity,
    name: &'static str,
    factor: f64,
    aliases: &'static [&'static str],
) -> Unit {
    Unit {
        name,
        quantity,
        factor,
        offset: 0.0,
        aliases,
    }
}

const RPM_PER_RAD_S: f64 = 60.0 / (2.0 * PI);

/// Pound-force in N, exact: 0.45359237 kg × standard gravity.
const POUND_FORCE: f64 = 0.453_592_37 * STANDARD_GRAVITY;

/// The shown unit of each quantity stands first in its group. Aliases are
/// compared after [`plain`].
static UNITS: &[Unit] = &[
    unit(
        Quantity::Acceleration,
        "m/s²",
        1.0,
        &["m/s^2", "m/s**2", "m/s/s", "ms-2", "m/sec2"],
    ),
    unit(Quantity::Acceleration, "mm/s²", 1e-3, &["mm/s^2"]),
    unit(
        Quantity::Acceleration,
        "g",
        STANDARD_GRAVITY,
        &["gn", "g_n"],
    ),
    unit(Quantity::Acceleration, "mg", STANDARD_GRAVITY * 1e-3, &[]),
    unit(Quantity::Acceleration, "in/s²", 0.0254, &["in/s^2"]),
    unit(Quantity::Velocity, "mm/s", 1.0, &["mm/sec"]),
    unit(Quantity::Velocity, "m/s", 1e3, &["m/sec"]),
    unit(Quantity::Velocity, "µm/s", 1e-3, &[]),
    unit(
        Quantity::Velocity,
        "in/s",
        25.4,
        &["ips", "inch/s", "in/sec"],
    ),
    unit(Quantity::Displacement, "µm", 1.0, &["micron", "microns"]),
    unit(Quantity::Displacement, "nm", 1e-3, &[]),
    unit(Quantity::Displacement, "mm", 1e3, &[]),
    unit(Quantity::Displacement, "m", 1e6, &[]),
    unit(Quantity::Displacement, "mil", 25.4, &["mils"]),
    unit(Quantity::Displacement, "in", 25_400.0, &["inch"]),
    unit(Quantity::Pressure, "Pa", 1.0, &[]),
    unit(Quantity::Pressure, "hPa", 1e2, &[]),
    unit(Quantity::Pressure, "kPa", 1e3, &[]),
    unit(Quantity::Pressure, "MPa", 1e6, &[]),
    unit(Quantity::Pressure, "mbar", 1e2, &[]),
    unit(Quantity::Pressure, "bar", 1e5, &[]),
    // pound-force on a square inch
    unit(
        Quantity::Pressure,
        "psi",
        POUND_FORCE / (0.0254 * 0.0254),
        &[],
    ),
    unit(Quantity::Force, "N", 1.0, &[]),
    unit(Quantity::Force, "mN", 1e-3, &[]),
    unit(Quantity::Force, "kN", 1e3, &[]),
    unit(Quantity::Force, "lbf", POUND_FORCE, &[]),
    unit(Quantity::Torque, "N·m", 1.0, &["Nm", "N*m", "N.m"]),
    unit(Quantity::Torque, "kN·m", 1e3, &["kNm", "kN*m", "kN.m"]),
    unit(Quantity::Voltage, "V", 1.0, &["volt", "volts"]),
    unit(Quantity::Voltage, "mV", 1e-3, &[]),
    unit(Quantity::Voltage, "µV", 1e-6, &[]),
    unit(Quantity::Current, "A", 1.0, &["ampere"]),
    unit(Quantity::Current, "mA", 1e-3, &[]),
    unit(Quantity::Temperature, "°C", 1.0, &["degC", "C"]),
    Unit {
        offset: -273.15,
        ..unit(Quantity::Temperature, "K", 1.0, &[])
    },
    Unit {
        offset: -160.0 / 9.0,
        ..unit(Quantity::Temperature, "°F", 5.0 / 9.0, &["degF"])
    },
    unit(
        Quantity::Speed,
        "rpm",
        1.0,
        &[
            "r/min", "1/min", "min-1", "min^-1", "rev/min", "RPM", "U/min",
        ],
    ),
    unit(Quantity::Speed, "rev/s", 60.0, &["r/s", "rps"]),
    unit(Quantity::Speed, "rad/s", RPM_PER_RAD_S, &[]),
];

/// One spelling of what people write in several: no blanks, one micro sign,
/// powers as digits.
fn plain(name: &str) -> String {
    let mut text: String = name.chars().filter(|c| !c.is_whitespace()).collect();
    text = text.replace(['\u{3bc}', '\u{b5}'], "u").replace('²', "2");
    text.replace('⋅', "·")
}

impl Unit {
    /// Finds a unit by its name in any usual spelling: `m/s2`, `m/s^2`, `um`,
    /// `ips`, `mils`.
    #[must_use]
    pub fn find(name: &str) -> Option<&'static Self> {
        let wanted = plain(name);
        UNITS.iter().find(|unit| {
            plain(unit.name) == wanted || unit.aliases.iter().any(|alias| *alias == wanted)
        })
    }

    /// Every unit of the table, those of one quantity together, its shown
    /// unit first.
    #[must_use]
    pub fn all() -> &'static [Self] {
        UNITS
    }

    /// Finds a unit and checks that it measures `quantity`.
    ///
    /// # Errors
    ///
    /// [`Error::UnitMismatch`] if it does not or is unknown.
    pub fn of(quantity: Quantity, name: &str) -> Result<&'static Self, Error> {
        Self::find(name)
            .filter(|unit| unit.quantity == quantity)
            .ok_or_else(|| Error::UnitMismatch {
                unit: name.to_owned(),
                quantity: quantity.to_string(),
                expected: quantity.unit_names(),
            })
    }

    /// A value of this unit in the shown unit.
    #[must_use]
    pub fn to_shown(&self, value: f64) -> f64 {
        value * self.factor + self.offset
    }

    /// A value of the shown unit in this unit.
    #[must_use]
    pub fn from_shown(&self, value: f64) -> f64 {
        (value - self.offset) / self.factor
    }
}

fn known(name: &str) -> Result<&'static Unit, Error> {
    Unit::find(name).ok_or_else(|| Error::UnknownUnit {
        unit: name.to_owned(),
    })
}

/// Converts between two units of the same quantity.
///
/// # Errors
///
/// [`Error::UnknownUnit`], or [`Error::UnitMismatch`] if the two measure
/// different quantities.
pub fn convert(value: f64, from: &str, to: &str) -> Result<f64, Error> {
    let from = known(from)?;
    let to = Unit::of(from.quantity, known(to)?.name)?;
    Ok(to.from_shown(from.to_shown(value)))
}

/// Converts the amplitude of a sine of `frequency_hz` between acceleration,
/// velocity and displacement: each step of differentiation multiplies by
/// `2π·f` (in base units, m and s). The detector (peak, rms) is kept.
///
/// # Errors
///
/// [`Error::UnknownUnit`]; [`Error::UnitMismatch`] if one of the units does
/// not measure vibration; [`Error::Setting`] unless the frequency is positive
/// and finite.
pub fn convert_at_frequency(
    value: f64,
    from: &str,
    to: &str,
    frequency_hz: f64,
) -> Result<f64, Error> {
    if !(frequency_hz > 0.0 && frequency_hz.is_finite()) {
        return Err(Error::Setting {
            what: "frequency".into(),
            found: format!("{frequency_hz} Hz"),
            expected: "a positive number of Hz".into(),
        });
    }
    let (from, to) = (known(from)?, known(to)?);
    let derivative = |unit: &Unit| {
        unit.quantity
            .derivative()
            .ok_or_else(|| Error::UnitMismatch {
                unit: unit.name.to_owned(),
                quantity: "vibration".into(),
                expected: "units of acceleration, velocity or displacement".into(),
            })
    };
    let steps = derivative(to)? - derivative(from)?;
    let omega = 2.0 * PI * frequency_hz;
    let base = from.to_shown(value) * per_shown(from.quantity);
    Ok(to.from_shown(base * omega.powi(steps) / per_shown(to.quantity)))
}

/// Base units (m, m/s, m/s²) per shown unit.
fn per_shown(quantity: Quantity) -> f64 {
    match quantity {
        Quantity::Displacement => 1e-6,
        Quantity::Velocity => 1e-3,
        _ => 1.0,
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn one_g_peak_at_100_hz() {
        // 15.6078 mm/s, 24.8405 µm, recomputed as g/(2πf) and g/(2πf)²; printed
        // to six digits, hence 1e-5.
        let velocity = convert_at_frequency(1.0, "g", "mm/s", 100.0).unwrap();
        assert_relative_eq!(velocity, 15.6078, max_relative = 1e-5);
        assert_relative_eq!(velocity / 2f64.sqrt(), 11.0364, max_relative = 1e-5);
        let displacement = convert_at_frequency(1.0, "g", "µm", 100.0).unwrap();
        assert_relative_eq!(displacement, 24.8405, max_relative = 1e-5);
        assert_relative_eq!(2.0 * displacement, 49.6811, max_relative = 1e-5);
    }

    #[test]
    fn one_mm_s_rms_at_50_hz() {
        let acceleration = convert_at_frequency(1.0, "mm/s", "m/s2", 50.0).unwrap();
        assert_relative_eq!(acceleration, 0.314_159, max_relative = 2e-6);
        let displacement = convert_at_frequency(1.0, "mm/s", "um", 50.0).unwrap();
        assert_relative_eq!(displacement * 8f64.sqrt(), 9.0032, max_relative = 1e-5);
    }

    #[test]
    fn levels_have_the_references_of_iso_1683() {
        // References from memory; levels recomputed to 3 decimals.
        let level = |value, unit: &str| {
            let unit = Unit::find(unit).unwrap();
            unit.quantity.decibels(unit.to_shown(value)).unwrap()
        };
        assert!((level(1.0, "g") - 139.830).abs() < 1e-3);
        assert!((level(1.0, "m/s²") - 120.0).abs() < 1e-9);
        assert!((level(1.0, "mm/s") - 120.0).abs() < 1e-9);
        assert!((level(1.0, "in/s") - 148.097).abs() < 1e-3);
        assert!((level(1.0, "Pa") - 93.979).abs() < 1e-3);
        // La = Lv where ω = 1000 rad/s
        let f = 1000.0 / (2.0 * PI);
        let velocity = convert_at_frequency(3.0, "m/s2", "mm/s", f).unwrap();
        assert!((level(3.0, "m/s2") - level(velocity, "mm/s")).abs() < 1e-9);
        assert_eq!(Quantity::Voltage.decibels(1.0), None);
    }

    #[test]
    fn units_convert_there_and_back() {
        for from in Unit::all() {
            for to in Unit::all().iter().filter(|to| to.quantity == from.quantity) {
                let there = convert(-3.75, from.name, to.name).unwrap();
                let back = convert(there, to.name, from.name).unwrap();
                assert_relative_eq!(back, -3.75, max_relative = 1e-12, epsilon = 1e-12);
            }
        }
        assert_relative_eq!(convert(1.0, "in/s", "mm/s").unwrap(), 25.4);
        assert_relative_eq!(convert(1.0, "mil", "um").unwrap(), 25.4);
        assert_relative_eq!(convert(212.0, "°F", "°C").unwrap(), 100.0, epsilon = 1e-12);
        // 1 psi = 6894.757 Pa (common practice, seven digits)
        assert_relative_eq!(
            convert(1.0, "psi", "Pa").unwrap(),
            6894.757,
            max_relative = 1e-7
        );
    }

    #[test]
    fn spellings_of_one_unit_are_one() {
        for name in ["m/s²", "m/s2", "m/s^2", " m / s2 ", "m/s**2"] {
            assert_eq!(Unit::find(name).unwrap().name, "m/s²");
        }
        for name in ["µm", "μm", "um"] {
            assert_eq!(Unit::find(name).unwrap().name, "µm");
        }
        assert!(Unit::find("furlong").is_none());
    }

    #[test]
    fn names_and_aliases_are_unique() {
        let mut seen = std::collections::BTreeSet::new();
        for unit in UNITS {
            assert!(seen.insert(plain(unit.name)), "{}", unit.name);
            for alias in unit.aliases {
                assert_eq!(plain(alias), *alias, "aliases are stored plain");
                assert!(seen.insert((*alias).to_owned()), "{alias}");
            }
        }
        for quantity in Quantity::ALL {
            assert_eq!(Quantity::from_name(quantity.name()), Some(quantity));
            if let Some(shown) = quantity.shown_unit() {
                let unit = Unit::find(shown).unwrap();
                assert_eq!((unit.factor, unit.offset), (1.0, 0.0));
            }
        }
    }

    #[test]
    fn a_unit_that_does_not_fit_names_both() {
        let error = Unit::of(Quantity::Velocity, "g").unwrap_err().to_string();
        assert!(
            error.contains("unit g") && error.contains("velocity"),
            "{error}"
        );
        assert!(convert(1.0, "g", "mm/s").is_err());
        assert!(convert_at_frequency(1.0, "g", "V", 10.0).is_err());
        assert!(convert_at_frequency(1.0, "g", "mm/s", f64::NAN).is_err());
    }
}
