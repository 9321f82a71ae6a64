/// How values are spread along an axis.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum Scale {
    /// Evenly.
    #[default]
    Linear,
    /// By their logarithm; values of 0 and below are gaps.
    Log,
}

/// Where an axis has its numbers.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum Ticks {
    /// Steps of 1, 2 or 5 times a power of ten, decades on a log axis.
    #[default]
    Auto,
    /// At every multiple of this step, > 0, in the axis' unit (45 for angles
    /// in degrees). Thinned out to every second, third … where they would
    /// touch. On a log axis the same as `Auto`.
    Every(f64),
}

/// One axis of a panel.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Axis {
    /// Quantity and unit, for example `velocity, mm/s rms`.
    pub label: String,
    /// From where to where; `None`: what the data needs.
    pub range: Option<(f64, f64)>,
    /// Linear or logarithmic.
    pub scale: Scale,
    /// Where the numbers stand.
    pub ticks: Ticks,
    /// An open range is drawn out to zero (linear axes only).
    pub from_zero: bool,
}

impl Axis {
    /// An evenly spread axis over what the data needs.
    pub fn linear(label: &str) -> Self {
        Self {
            label: label.to_owned(),
            ..Self::default()
        }
    }

    /// A logarithmic axis over what the data needs.
    pub fn log(label: &str) -> Self {
        Self {
            label: label.to_owned(),
            scale: Scale::Log,
            ..Self::default()
        }
    }

    /// The same axis from `lower` to `upper`.
    pub fn over(mut self, lower: f64, upper: f64) -> Self {
        self.range = Some((lower, upper));
        self
    }

    /// The same axis, an open range drawn out to zero.
    pub fn from_zero(mut self) -> Self {
        self.from_zero = true;
        self
    }

    /// The same axis with numbers at every multiple of `step`.
    pub fn every(mut self, step: f64) -> Self {
        self.ticks = Ticks::Every(step);
        self
    }
}
