//! A rotation and the part of it that counts.

use crate::{Error, Selection, SpeedRange};
use shaftwise_rotation::Rotation;
use shaftwise_signal::SamplePosition;
use std::sync::Arc;

/// A part of a section that counts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Window {
    pub(crate) section: usize,
    pub(crate) from: SamplePosition,
    pub(crate) to: SamplePosition,
}

/// The tach shaft's rotation with the selection laid over it.
#[derive(Debug)]
pub(crate) struct Spinning {
    pub(crate) rotation: Arc<Rotation>,
    pub(crate) windows: Vec<Window>,
    /// Lowest, mean and highest speed over the windows, rev/s.
    pub(crate) min: f64,
    pub(crate) mean: f64,
    pub(crate) max: f64,
}

impl Spinning {
    /// Cuts the selection out of the rotation.
    pub(crate) fn new(rotation: Arc<Rotation>, select: &Selection) -> Result<Self, Error> {
        let windows = windows(&rotation, select);
        if windows.is_empty() {
            let spans: Vec<String> = rotation
                .sections
                .iter()
                .map(|s| {
                    format!(
                        "{:.2} to {:.2} s",
                        s.start().seconds(rotation.sample_rate_hz),
                        s.end().seconds(rotation.sample_rate_hz)
                    )
                })
                .collect();
            return Err(Error::Setting {
                what: format!(
                    "the selection leaves nothing; the pulses cover {}",
                    spans.join(", ")
                ),
                hint: "check --from, --to and --exclude".to_owned(),
            });
        }
        let (mut min, mut max) = (f64::INFINITY, 0.0f64);
        let (mut revs, mut samples) = (0.0, 0.0);
        for window in &windows {
            let section = &rotation.sections[window.section];
            let (first, last) = (section.angle_at(window.from), section.angle_at(window.to));
            revs += (last.0 - first.0) as f64 + (last.1 - first.1);
            samples += window.to.since(window.from);
            // Four looks a revolution see whatever pulses once a revolution can show.
            for quarter in first.0 * 4..=last.0 * 4 + 3 {
                let (rev, fraction) = (quarter.div_euclid(4), 0.25 * quarter.rem_euclid(4) as f64);
                let instant = section.at(rev, fraction);
                if instant.position >= window.from && instant.position <= window.to {
                    let speed = rotation.sample_rate_hz / instant.samples_per_rev;
                    min = min.min(speed);
                    max = max.max(speed);
                }
            }
        }
        let mean = revs * rotation.sample_rate_hz / samples;
        Ok(Self {
            min: min.min(mean),
            mean,
            max: max.max(mean),
            rotation,
            windows,
        })
    }

    /// Speed range in rpm of a shaft that turns `ratio` times as fast.
    pub(crate) fn range_rpm(&self, ratio: f64) -> SpeedRange {
        SpeedRange {
            min: 60.0 * ratio * self.min,
            mean: 60.0 * ratio * self.mean,
            max: 60.0 * ratio * self.max,
        }
    }
}

fn windows(rotation: &Rotation, select: &Selection) -> Vec<Window> {
    let rate = rotation.sample_rate_hz;
    let at = |seconds: f64| SamplePosition::from_seconds(seconds, rate);
    let mut found = Vec::new();
    for (section, span) in rotation.sections.iter().enumerate() {
        let mut from = span.start();
        if let Some(s) = select.from_s
            && at(s) > from
        {
            from = at(s);
        }
        let mut to = span.end();
        if let Some(s) = select.to_s
            && at(s) < to
        {
            to = at(s);
        }
        let mut gaps: Vec<_> = select
            .exclude
            .iter()
            .map(|e| (at(e.from_s), at(e.to_s)))
            .collect();
        gaps.sort_by(|a, b| a.partial_cmp(b).unwrap_or(std::cmp::Ordering::Equal));
        for (start, end) in gaps {
            if start > from && start < to {
                found.push(Window {
                    section,
                    from,
                    to: start,
                });
            }
            if end > from {
                from = end;
            }
        }
        if from < to {
            found.push(Window { section, from, to });
        }
    }
    found.retain(|w| w.to > w.from);
    found
}
