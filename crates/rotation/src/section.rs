//! A stretch of motion without a break: position in the recording as a function of angle.
//!
//! t(θ) is a uniform quintic spline over angle. Its coefficients are whole numbers of
//! 2^−bits samples from the section's origin, with as many bits as the section's length
//! leaves room for: differences between neighbours are exact, so a position is as good after
//! a day as at the start (rounding below 2^−30 sample up to a day at 51.2 kHz; −120 dB at the
//! highest frequency needs 3e-7 sample).

use shaftwise_signal::{SamplePosition, quintic_polynomial};

/// The polynomial that holds an angle.
///
/// position = `origin` + Σ `coefficients[k]`·u^k samples, u = (angle − first)/`width_rev`
/// in [0, 1), where first = `first_rev` + `first_fraction`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Piece {
    /// Whole revolutions of the angle where the piece starts.
    pub first_rev: i64,
    /// The rest of that angle, in revolutions, in [0, 1).
    pub first_fraction: f64,
    /// Width in revolutions.
    pub width_rev: f64,
    /// Sample the coefficients count from.
    pub origin: u64,
    /// Samples per power of u.
    pub coefficients: [f64; 6],
}

impl Piece {
    /// u of an angle; outside [0, 1) where the piece does not hold it.
    #[must_use]
    pub fn local(&self, rev: i64, fraction: f64) -> f64 {
        ((rev - self.first_rev) as f64 + (fraction - self.first_fraction)) / self.width_rev
    }

    /// Samples after `origin` at u.
    #[must_use]
    pub fn offset(&self, u: f64) -> f64 {
        self.coefficients
            .iter()
            .rev()
            .fold(0.0, |sum, c| sum * u + c)
    }

    /// d offset / du at u, in samples.
    #[must_use]
    pub fn slope(&self, u: f64) -> f64 {
        (1..6)
            .rev()
            .fold(0.0, |sum, k| sum * u + k as f64 * self.coefficients[k])
    }
}

/// The instant at which the shaft stands at an angle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AngleInstant {
    /// Where in the recording.
    pub position: SamplePosition,
    /// d position / d angle, in samples per revolution.
    pub samples_per_rev: f64,
}

/// A stretch of motion without a break, from its first pulse to its last.
///
/// Angles count in revolutions of the tach shaft from the rotation's first pulse. Asked
/// outside its span, a section goes on with its first or last piece: callers stay between
/// [`Section::start_rev`] and [`Section::end_rev`].
#[derive(Debug, Clone, PartialEq)]
pub struct Section {
    pub(crate) first_rev: i64,
    pub(crate) first_fraction: f64,
    /// Span in knot intervals; the last may be used in part.
    pub(crate) span_knots: f64,
    pub(crate) knots_per_rev: u32,
    pub(crate) sample_rate_hz: f64,
    pub(crate) motion: Motion,
}

#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Motion {
    Spline {
        origin: u64,
        bits: u32,
        /// Five more than there are intervals.
        coefficients: Vec<i64>,
        /// One standard deviation at each knot: angle in rev, speed in rev/s.
        sigma: Vec<[f32; 2]>,
    },
    Steady {
        start: SamplePosition,
        /// Samples per revolution: a whole number and the rest.
        whole: u64,
        rest: f64,
    },
}

impl Section {
    /// Number of pieces.
    #[must_use]
    pub fn pieces(&self) -> u64 {
        (self.span_knots.ceil() as u64).max(1)
    }

    /// Angle of the first pulse, in revolutions.
    #[must_use]
    pub fn start_rev(&self) -> f64 {
        self.first_rev as f64 + self.first_fraction
    }

    /// Angle of the last pulse, in revolutions.
    #[must_use]
    pub fn end_rev(&self) -> f64 {
        self.start_rev() + self.span_rev()
    }

    /// Revolutions from the first pulse to the last.
    #[must_use]
    pub fn span_rev(&self) -> f64 {
        self.span_knots / f64::from(self.knots_per_rev)
    }

    /// Where the section starts.
    #[must_use]
    pub fn start(&self) -> SamplePosition {
        let piece = self.piece(0);
        SamplePosition::new(piece.origin, piece.coefficients[0])
    }

    /// Where the section ends.
    #[must_use]
    pub fn end(&self) -> SamplePosition {
        let last = self.pieces() - 1;
        let piece = self.piece(last);
        SamplePosition::new(piece.origin, piece.offset(self.span_knots - last as f64))
    }

    /// The piece with this number, from 0; beyond the last, the last.
    #[must_use]
    pub fn piece(&self, number: u64) -> Piece {
        let number = number.min(self.pieces() - 1);
        let per_rev = u64::from(self.knots_per_rev);
        let width_rev = 1.0 / f64::from(self.knots_per_rev);
        let mut first_rev = self.first_rev + (number / per_rev) as i64;
        let mut first_fraction =
            self.first_fraction + (number % per_rev) as f64 / f64::from(self.knots_per_rev);
        if first_fraction >= 1.0 {
            first_fraction -= 1.0;
            first_rev += 1;
        }
        let (origin, coefficients) = match &self.motion {
            Motion::Spline {
                origin,
                bits,
                coefficients,
                ..
            } => {
                let six = &coefficients[number as usize..number as usize + 6];
                let base = six[2] >> bits;
                let unit = (-f64::from(*bits)).exp2();
                let local = std::array::from_fn(|k| (six[k] - (base << bits)) as f64 * unit);
                whole_origin(*origin, base, quintic_polynomial(local))
            }
            Motion::Steady { start, whole, rest } => {
                let offset = start.fraction + number as f64 * rest;
                let base = (number * whole) as i64;
                let line = [offset, *whole as f64 + rest, 0.0, 0.0, 0.0, 0.0];
                whole_origin(start.index, base, line)
            }
        };
        Piece {
            first_rev,
            first_fraction,
            width_rev,
            origin,
            coefficients,
        }
    }

    /// The piece that holds an angle given as whole revolutions and a fraction of one.
    #[must_use]
    pub fn piece_at(&self, rev: i64, fraction: f64) -> Piece {
        self.piece(self.knot_below(rev, fraction))
    }

    fn knot_below(&self, rev: i64, fraction: f64) -> u64 {
        let per_rev = f64::from(self.knots_per_rev);
        let x = ((rev - self.first_rev) as f64 + (fraction - self.first_fraction)) * per_rev;
        // Angles on a knot, worked out from fractions of a revolution, may fall short by rounding.
        (x + 1e-12 * per_rev).max(0.0) as u64
    }

    /// The instant at an angle given as whole revolutions and a fraction of one.
    #[must_use]
    pub fn at(&self, rev: i64, fraction: f64) -> AngleInstant {
        let piece = self.piece_at(rev, fraction);
        let u = piece.local(rev, fraction);
        AngleInstant {
            position: SamplePosition::new(piece.origin, piece.offset(u)),
            samples_per_rev: piece.slope(u) / piece.width_rev,
        }
    }

    /// The angle at a position: whole revolutions and a fraction in [0, 1). Newton on the piece
    /// that holds it; positions outside the section give its first or last angle.
    #[must_use]
    pub fn angle_at(&self, position: SamplePosition) -> (i64, f64) {
        let (number, u) = self.knot_at(position);
        let piece = self.piece(number);
        let fraction = piece.first_fraction + u * piece.width_rev;
        let whole = fraction.floor();
        (piece.first_rev + whole as i64, fraction - whole)
    }

    /// Speed at a position, in rev/s.
    #[must_use]
    pub fn speed_at(&self, position: SamplePosition) -> f64 {
        let (number, u) = self.knot_at(position);
        let piece = self.piece(number);
        self.sample_rate_hz * piece.width_rev / piece.slope(u)
    }

    /// One standard deviation of the angle (rev) and of the speed (rev/s) at a position; zero
    /// for a shaft said to turn steadily.
    #[must_use]
    pub fn sigma_at(&self, position: SamplePosition) -> (f64, f64) {
        match &self.motion {
            Motion::Spline { sigma, .. } => {
                let (number, u) = self.knot_at(position);
                let (a, b) = (sigma[number as usize], sigma[number as usize + 1]);
                let mix = |k: usize| (1.0 - u) * f64::from(a[k]) + u * f64::from(b[k]);
                (mix(0), mix(1))
            }
            Motion::Steady { .. } => (0.0, 0.0),
        }
    }

    /// Piece number and u of a position, kept inside the section.
    fn knot_at(&self, position: SamplePosition) -> (u64, f64) {
        let (mut low, mut high) = (0, self.pieces());
        let since = |number: u64| {
            let piece = self.piece(number);
            position.since(SamplePosition::new(piece.origin, piece.coefficients[0]))
        };
        while high - low > 1 {
            let middle = low + (high - low) / 2;
            if since(middle) >= 0.0 {
                low = middle;
            } else {
                high = middle;
            }
        }
        let piece = self.piece(low);
        let most = if low + 1 == self.pieces() {
            self.span_knots - low as f64
        } else {
            1.0
        };
        let wanted = position.since(SamplePosition {
            index: piece.origin,
            fraction: 0.0,
        });
        let mut u = (wanted - piece.coefficients[0]) / (piece.offset(1.0) - piece.coefficients[0]);
        // The motion inside a piece is near a line: quadratic convergence from the chord.
        for _ in 0..8 {
            let step = (wanted - piece.offset(u)) / piece.slope(u);
            if !step.is_finite() {
                break;
            }
            u = (u + step).clamp(-1.0, 2.0);
            if step.abs() < 1e-15 {
                break;
            }
        }
        (low, u.clamp(0.0, most))
    }

    /// Speed at the start of each piece and at the end, in rev/s.
    pub(crate) fn knot_speeds(&self) -> impl Iterator<Item = f64> + '_ {
        (0..=self.pieces()).map(|number| {
            let last = self.pieces() - 1;
            let piece = self.piece(number);
            let u = if number > last {
                self.span_knots - last as f64
            } else {
                0.0
            };
            self.sample_rate_hz * piece.width_rev / piece.slope(u)
        })
    }
}

/// Moves the whole part of the constant term into the origin.
fn whole_origin(origin: u64, base: i64, mut coefficients: [f64; 6]) -> (u64, [f64; 6]) {
    let whole = coefficients[0].floor();
    let total = i128::from(origin) + i128::from(base) + whole as i128;
    match u64::try_from(total) {
        Ok(total) => {
            coefficients[0] -= whole;
            (total, coefficients)
        }
        Err(_) => {
            // Smoothing may put the very first pulse a hair before the first sample.
            coefficients[0] += base as f64 + origin as f64;
            (0, coefficients)
        }
    }
}
