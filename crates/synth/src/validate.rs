//! Reading recipes and checking their values.

use crate::motion::speed_bounds;
use crate::noise::Filter;
use crate::{
    Channel, Edge, Error, Faults, Noise, Order, Profile, PulseTrain, Recipe, ShaftRatio, Speed,
    Width,
};
use std::fmt::Display;

type Check = Result<(), Error>;

impl Recipe {
    /// Reads a recipe from JSON and validates it.
    ///
    /// ```
    /// let recipe = shaftwise_synth::Recipe::parse(r#"{
    ///     "sample_rate_hz": 5120, "seconds": 10, "seed": 7,
    ///     "speed": {
    ///         "profile": {"constant": {"rev_per_s": 24.6}},
    ///         "hunting": {"rms_rev_per_s": 0.3, "slowest_hz": 0.03, "fastest_hz": 0.5}
    ///     },
    ///     "channels": [
    ///         {
    ///             "name": "drive end", "quantity": "acceleration", "unit": "m/s²",
    ///             "orders": [{"order": 6, "amplitude": 2.4, "phase_lead_deg": 75}],
    ///             "tones": [{"frequency_hz": 100, "amplitude": 0.4}],
    ///             "noise": [{"white": {"rms": 0.2}}]
    ///         },
    ///         {
    ///             "name": "tach", "quantity": "voltage", "unit": "V",
    ///             "pulses": {
    ///                 "pulses_per_rev": 1, "width": {"degrees": 20}, "edge": {"seconds": 0.0008},
    ///                 "faults": {"missing_fraction": 0.03, "strays_per_s": 0.4}
    ///             },
    ///             "converter": {"bits": 12, "full_scale": 10}
    ///         }
    ///     ]
    /// }"#)?;
    /// assert_eq!(recipe.frames(), 51_200);
    /// # Ok::<(), shaftwise_synth::Error>(())
    /// ```
    ///
    /// # Errors
    /// [`Error::Syntax`] with line and column if the text is no JSON, has an unknown key, lacks one
    /// or has a value of the wrong type; [`Error::Value`] if a value is out of range.
    pub fn parse(json: &str) -> Result<Self, Error> {
        let recipe: Self = serde_json::from_str(json).map_err(|error| {
            let message = error.to_string();
            // the parser appends its position, which has fields of its own here
            let place = format!(" at line {} column {}", error.line(), error.column());
            Error::Syntax {
                line: error.line(),
                column: error.column(),
                message: message.strip_suffix(&place).unwrap_or(&message).to_owned(),
            }
        })?;
        recipe.validate()?;
        Ok(recipe)
    }

    /// The recipe as JSON, from which [`Recipe::parse`] makes the same recipe again.
    ///
    /// # Errors
    /// [`Error::Value`] if a value is out of range: not every number has a JSON form.
    pub fn to_json(&self) -> Result<String, Error> {
        self.validate()?;
        serde_json::to_string_pretty(self).map_err(|error| Error::Value {
            field: "recipe".to_owned(),
            found: error.to_string(),
            expected: "a recipe that can be written as JSON".to_owned(),
        })
    }

    /// Samples per channel.
    #[must_use]
    pub fn frames(&self) -> u64 {
        (self.sample_rate_hz * self.seconds).round() as u64
    }

    /// Checks every value.
    ///
    /// # Errors
    /// [`Error::Value`] with the first field that is out of range.
    pub fn validate(&self) -> Check {
        above("sample_rate_hz", self.sample_rate_hz, 0.0, 1e7, "Hz")?;
        above("seconds", self.seconds, 0.0, 1e7, "s")?;
        if self.frames() == 0 {
            return wrong("seconds", self.seconds, "at least one sample long, s");
        }
        self.speed.validate()?;
        let [slowest, fastest] = speed_bounds(self);
        if !(slowest > 0.0 && fastest <= 1e5) {
            return wrong(
                "speed",
                format!("{slowest} to {fastest}"),
                "profile minus all amplitudes above 0, profile plus all amplitudes at most 1e5 rev/s",
            );
        }
        if self.channels.len() > 256 {
            return wrong("channels", self.channels.len(), "at most 256 channels");
        }
        for (index, channel) in self.channels.iter().enumerate() {
            let path = format!("channels[{index}]");
            channel.validate(&path, self, [slowest, fastest])?;
        }
        Ok(())
    }
}

impl Speed {
    fn validate(&self) -> Check {
        between(
            "speed.start_angle_rev",
            self.start_angle_rev,
            -1e9,
            1e9,
            "rev",
        )?;
        match &self.profile {
            Profile::Constant { rev_per_s } => {
                above("speed.profile.rev_per_s", *rev_per_s, 0.0, 1e5, "rev/s")?;
            }
            Profile::Ramp {
                start_rev_per_s,
                slope_rev_per_s2,
            } => {
                let path = "speed.profile.start_rev_per_s";
                above(path, *start_rev_per_s, 0.0, 1e5, "rev/s")?;
                let path = "speed.profile.slope_rev_per_s2";
                between(path, *slope_rev_per_s2, -1e6, 1e6, "rev/s²")?;
            }
            Profile::Glide { knots } => {
                if knots.len() < 2 {
                    return wrong("speed.profile.knots", knots.len(), "2 or more knots");
                }
                for (index, knot) in knots.iter().enumerate() {
                    let path = format!("speed.profile.knots[{index}]");
                    above(
                        &format!("{path}.rev_per_s"),
                        knot.rev_per_s,
                        0.0,
                        1e5,
                        "rev/s",
                    )?;
                    between(&format!("{path}.at_s"), knot.at_s, -1e7, 1e7, "s")?;
                    if index > 0 && knot.at_s <= knots[index - 1].at_s {
                        return wrong(
                            &format!("{path}.at_s"),
                            knot.at_s,
                            "later than the knot before, s",
                        );
                    }
                }
            }
            Profile::Tanh {
                from_rev_per_s,
                to_rev_per_s,
                mid_s,
                width_s,
            } => {
                let path = "speed.profile.from_rev_per_s";
                above(path, *from_rev_per_s, 0.0, 1e5, "rev/s")?;
                above(
                    "speed.profile.to_rev_per_s",
                    *to_rev_per_s,
                    0.0,
                    1e5,
                    "rev/s",
                )?;
                between("speed.profile.mid_s", *mid_s, -1e7, 1e7, "s")?;
                above("speed.profile.width_s", *width_s, 0.0, 1e7, "s")?;
            }
        }
        for (index, wobble) in self.wobbles.iter().enumerate() {
            let path = format!("speed.wobbles[{index}]");
            let field = format!("{path}.amplitude_rev_per_s");
            between(&field, wobble.amplitude_rev_per_s, -1e5, 1e5, "rev/s")?;
            above(
                &format!("{path}.frequency_hz"),
                wobble.frequency_hz,
                0.0,
                1e6,
                "Hz",
            )?;
            finite(&format!("{path}.phase_deg"), wobble.phase_deg, "degrees")?;
        }
        if let Some(hunting) = &self.hunting {
            let path = "speed.hunting.rms_rev_per_s";
            between(path, hunting.rms_rev_per_s, 0.0, 1e5, "rev/s")?;
            above(
                "speed.hunting.slowest_hz",
                hunting.slowest_hz,
                0.0,
                1e6,
                "Hz",
            )?;
            above(
                "speed.hunting.fastest_hz",
                hunting.fastest_hz,
                hunting.slowest_hz,
                1e6,
                "Hz",
            )?;
            count("speed.hunting.sines", hunting.sines as u64, 1, 200)?;
        }
        Ok(())
    }
}

impl Channel {
    fn validate(&self, path: &str, recipe: &Recipe, speeds: [f64; 2]) -> Check {
        if self.name.is_empty() {
            return wrong(&format!("{path}.name"), "\"\"", "a name");
        }
        for (index, order) in self.orders.iter().enumerate() {
            order.validate(&format!("{path}.orders[{index}]"))?;
        }
        for (index, tone) in self.tones.iter().enumerate() {
            let path = format!("{path}.tones[{index}]");
            above(
                &format!("{path}.frequency_hz"),
                tone.frequency_hz,
                0.0,
                1e7,
                "Hz",
            )?;
            size(&format!("{path}.amplitude"), tone.amplitude)?;
            finite(
                &format!("{path}.phase_lead_deg"),
                tone.phase_lead_deg,
                "degrees",
            )?;
        }
        for (index, noise) in self.noise.iter().enumerate() {
            noise.validate(&format!("{path}.noise[{index}]"), recipe.sample_rate_hz)?;
        }
        if let Some(pulses) = &self.pulses {
            pulses.validate(&format!("{path}.pulses"), recipe, speeds)?;
        }
        finite(&format!("{path}.bias"), self.bias, &self.unit)?;
        finite(
            &format!("{path}.drift_per_s"),
            self.drift_per_s,
            "unit per s",
        )?;
        for (index, spike) in self.spikes.iter().enumerate() {
            let path = format!("{path}.spikes[{index}]");
            between(&format!("{path}.at_s"), spike.at_s, 0.0, 1e7, "s")?;
            finite(&format!("{path}.value"), spike.value, &self.unit)?;
            count(&format!("{path}.samples"), spike.samples, 1, 1 << 40)?;
        }
        if let Some(limit) = self.clip_at {
            above(&format!("{path}.clip_at"), limit, 0.0, f64::MAX, &self.unit)?;
        }
        if let Some(converter) = &self.converter {
            let path = format!("{path}.converter");
            count(&format!("{path}.bits"), converter.bits.into(), 1, 32)?;
            let full_scale = converter.full_scale;
            above(
                &format!("{path}.full_scale"),
                full_scale,
                0.0,
                f64::MAX,
                &self.unit,
            )?;
        }
        Ok(())
    }
}

impl Order {
    fn validate(&self, path: &str) -> Check {
        above(&format!("{path}.order"), self.order, 0.0, 1e6, "per rev")?;
        size(&format!("{path}.amplitude"), self.amplitude)?;
        finite(
            &format!("{path}.phase_lead_deg"),
            self.phase_lead_deg,
            "degrees",
        )?;
        if let Some(shaft) = &self.shaft {
            shaft.validate(&format!("{path}.shaft"))?;
        }
        if let Some(modulation) = &self.modulation {
            let path = format!("{path}.modulation");
            between(
                &format!("{path}.depth"),
                modulation.depth,
                0.0,
                1.0,
                "of the amplitude",
            )?;
            above(
                &format!("{path}.frequency_hz"),
                modulation.frequency_hz,
                0.0,
                1e7,
                "Hz",
            )?;
            finite(
                &format!("{path}.phase_deg"),
                modulation.phase_deg,
                "degrees",
            )?;
        }
        if let Some(resonance) = &self.resonance {
            let path = format!("{path}.resonance");
            above(
                &format!("{path}.natural_hz"),
                resonance.natural_hz,
                0.0,
                1e7,
                "Hz",
            )?;
            let damping = resonance.damping_ratio;
            above(
                &format!("{path}.damping_ratio"),
                damping,
                0.0,
                10.0,
                "of critical",
            )?;
            count(
                &format!("{path}.speed_power"),
                resonance.speed_power.into(),
                0,
                4,
            )?;
        }
        Ok(())
    }
}

impl ShaftRatio {
    fn validate(&self, path: &str) -> Check {
        for (name, value) in [("turns", self.turns), ("per", self.per)] {
            if !(1..=1_000_000).contains(&value) {
                return wrong(&format!("{path}.{name}"), value, "1 to 1e6 revolutions");
            }
        }
        Ok(())
    }
}

impl Noise {
    fn validate(&self, path: &str, rate_hz: f64) -> Check {
        size(&format!("{path}.rms"), self.rms())?;
        let half = 0.5 * rate_hz;
        match self {
            Self::White { .. } => return Ok(()),
            Self::OnePole { corner_hz, .. } | Self::LowPass { corner_hz, .. } => {
                below(&format!("{path}.corner_hz"), *corner_hz, half)?;
            }
            Self::BandPass {
                center_hz,
                bandwidth_hz,
                ..
            } => {
                below(&format!("{path}.center_hz"), *center_hz, half)?;
                below(&format!("{path}.bandwidth_hz"), *bandwidth_hz, half)?;
            }
        }
        if Filter::new(self, rate_hz).is_none() {
            let expected = "a corner or bandwidth of at least rate / 20 000, Hz";
            return wrong(path, format!("{self:?}"), expected);
        }
        Ok(())
    }
}

impl PulseTrain {
    fn validate(&self, path: &str, recipe: &Recipe, [slowest, fastest]: [f64; 2]) -> Check {
        let teeth = self.pulses_per_rev;
        count(&format!("{path}.pulses_per_rev"), teeth.into(), 1, 10_000)?;
        let missing = u64::from(self.missing_teeth);
        count(
            &format!("{path}.missing_teeth"),
            missing,
            0,
            u64::from(teeth) - 1,
        )?;
        let errors = self.tooth_errors_deg.len();
        if errors != 0 && errors != teeth as usize {
            let expected = format!("0 or {teeth} values, degrees");
            return wrong(&format!("{path}.tooth_errors_deg"), errors, expected);
        }
        for (index, &error) in self.tooth_errors_deg.iter().enumerate() {
            let path = format!("{path}.tooth_errors_deg[{index}]");
            between(&path, error, -180.0, 180.0, "degrees")?;
        }
        between(
            &format!("{path}.phase_deg"),
            self.phase_deg,
            -360.0,
            360.0,
            "degrees",
        )?;
        if let Some(shaft) = &self.shaft {
            shaft.validate(&format!("{path}.shaft"))?;
        }
        let [slowest, fastest] = [slowest, fastest].map(|speed| self.shaft_speed(speed));
        let ([narrowest, widest], width_path) = match self.width {
            Width::Degrees(deg) => ([deg, deg], format!("{path}.width.degrees")),
            Width::Seconds(s) => (
                [360.0 * s * slowest, 360.0 * s * fastest],
                format!("{path}.width.seconds"),
            ),
        };
        let pitch = 360.0 / f64::from(teeth);
        if !(narrowest > 0.0 && widest < pitch) {
            let expected =
                format!("a pulse above 0 and below its pitch of {pitch} degrees at all speeds");
            return wrong(
                &width_path,
                format!("{narrowest} to {widest} degrees"),
                expected,
            );
        }
        let (edge, edge_path) = match self.edge {
            Edge::Degrees(deg) => (deg, format!("{path}.edge.degrees")),
            Edge::Seconds(s) => (360.0 * s * fastest, format!("{path}.edge.seconds")),
        };
        if !(edge >= 0.0 && edge <= widest.min(pitch - widest)) {
            let expected = "no longer than the pulse and the gap beside it at the highest speed";
            return wrong(&edge_path, format!("{edge} degrees"), expected);
        }
        finite(&format!("{path}.low"), self.low, "unit")?;
        finite(&format!("{path}.high"), self.high, "unit")?;
        self.faults.validate(&format!("{path}.faults"), recipe)
    }

    /// Speed of the shaft it sits on.
    pub(crate) fn shaft_speed(&self, main_rev_per_s: f64) -> f64 {
        self.shaft.map_or(main_rev_per_s, |shaft| {
            main_rev_per_s * shaft.turns as f64 / shaft.per as f64
        })
    }
}

impl Faults {
    fn validate(&self, path: &str, recipe: &Recipe) -> Check {
        let fraction = self.missing_fraction;
        between(
            &format!("{path}.missing_fraction"),
            fraction,
            0.0,
            1.0,
            "of the pulses",
        )?;
        if let Some(doubled) = &self.doubled {
            let path = format!("{path}.doubled");
            between(
                &format!("{path}.fraction"),
                doubled.fraction,
                0.0,
                1.0,
                "of the pulses",
            )?;
            let lag = doubled.lag_deg;
            if !(lag > 0.0 && lag < 360.0) {
                return wrong(
                    &format!("{path}.lag_deg"),
                    lag,
                    "above 0 and below 360 degrees",
                );
            }
        }
        // strays are listed when the recipe is built: keep the list to what memory holds
        let most = 1e6 / recipe.seconds;
        between(
            &format!("{path}.strays_per_s"),
            self.strays_per_s,
            0.0,
            most,
            "per s",
        )?;
        for (index, &time) in self.stray_times_s.iter().enumerate() {
            between(
                &format!("{path}.stray_times_s[{index}]"),
                time,
                -1e7,
                1e7,
                "s",
            )?;
        }
        for (index, burst) in self.bursts.iter().enumerate() {
            let path = format!("{path}.bursts[{index}]");
            between(&format!("{path}.at_s"), burst.at_s, -1e7, 1e7, "s")?;
            count(&format!("{path}.count"), burst.count.into(), 0, 10_000)?;
            above(&format!("{path}.spacing_s"), burst.spacing_s, 0.0, 1e3, "s")?;
        }
        above(
            &format!("{path}.stray_width_s"),
            self.stray_width_s,
            0.0,
            1.0,
            "s",
        )?;
        above(
            &format!("{path}.stray_height"),
            self.stray_height,
            0.0,
            1.0,
            "of a true pulse",
        )
    }
}

fn wrong(field: &str, found: impl Display, expected: impl Into<String>) -> Check {
    Err(Error::Value {
        field: field.to_owned(),
        found: found.to_string(),
        expected: expected.into(),
    })
}

fn between(field: &str, value: f64, low: f64, high: f64, unit: &str) -> Check {
    if value >= low && value <= high {
        return Ok(());
    }
    wrong(field, value, format!("{low} to {high} {unit}"))
}

fn above(field: &str, value: f64, low: f64, high: f64, unit: &str) -> Check {
    if value > low && value <= high {
        return Ok(());
    }
    wrong(field, value, format!("above {low}, at most {high} {unit}"))
}

fn below(field: &str, value: f64, half_rate: f64) -> Check {
    if value > 0.0 && value < half_rate {
        return Ok(());
    }
    wrong(
        field,
        value,
        format!("above 0 and below half the rate, {half_rate} Hz"),
    )
}

fn size(field: &str, value: f64) -> Check {
    if value >= 0.0 && value.is_finite() {
        return Ok(());
    }
    wrong(field, value, "0 or more, finite")
}

fn finite(field: &str, value: f64, unit: &str) -> Check {
    if value.is_finite() {
        return Ok(());
    }
    wrong(field, value, format!("a finite value, {unit}"))
}

fn count(field: &str, value: u64, low: u64, high: u64) -> Check {
    if (low..=high).contains(&value) {
        return Ok(());
    }
    wrong(field, value, format!("{low} to {high}"))
}
