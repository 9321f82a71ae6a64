//! From tach pulses to the angle of a shaft at every instant, with its uncertainty and its ledger.
//!
//! Three steps, each with its own result:
//!
//! 1. [`TachScanner`] finds and times the edges of a tach channel as it streams by.
//! 2. [`rotation_from_scan`] and [`rotation_from_times`] count the teeth: which pulse belongs to
//!    which tooth, which are strays, which teeth gave none.
//! 3. The same two lay a smooth motion through the pulses that count: a [`Rotation`].
//!
//! Angle is in revolutions of the tach shaft, speed in rev/s, positions in samples of the
//! recording. Nothing is known outside the pulses and nothing is made up there.

mod edge;
mod error;
mod ledger;
mod numbering;
mod rotation;
mod sampling;
mod section;
mod smoother;
mod swing;
mod tach;

pub use error::Error;
pub use ledger::{LedgerAction, LedgerEntry};
pub use rotation::{
    LEAST_PULSES, PhaseReference, PulseCount, Rotation, RotationConfig, SpeedCurve,
    rotation_from_scan, rotation_from_times,
};
pub use section::{AngleInstant, Piece, Section};
pub use tach::{Edge, TachConfig, TachScan, TachScanner, TimedEdge};
