//! Series, labels and marks to PNG and SVG bytes.
//!
//! A [`Figure`] is plain data: it can be built, printed, compared and tested
//! without drawing anything. [`render`] turns it into a PNG, [`render_svg`]
//! into an SVG; both run the same drawing code over plotters, and the same
//! figure always gives the same bytes. There is no analysis in here, no file
//! and no clock.
//!
//! ```
//! use shaftwise_figures::{Axis, Figure, Panel, RenderOptions, Role, Series, render};
//!
//! let orders: Vec<f64> = (0..=160).map(|i| f64::from(i) / 16.0).collect();
//! let rms = orders.iter().map(|k| 1.3 / (1.0 + (40.0 * (k - 2.0)).powi(2))).collect();
//! let mut panel = Panel::new(Axis::linear("order"), Axis::linear("velocity, mm/s rms").from_zero());
//! panel.series.push(Series::line("tracked", Role::Primary, orders, rms));
//! let figure = Figure {
//!     title: "Pump P-3, drive end: order 2 stands alone".to_owned(),
//!     panels: vec![panel],
//!     ..Figure::default()
//! };
//! let png = render(&figure, &RenderOptions { dpi: 150.0 })?;
//! assert_eq!(&png[1..4], b"PNG");
//! # Ok::<(), shaftwise_figures::Error>(())
//! ```

mod axis;
mod bitmap;
mod canvas;
mod error;
mod figure;
mod font;
mod layout;
mod number;
mod palette;
mod placer;
mod plot;
mod polyline;
mod range;
mod raster;
mod sheet;
mod ticks;
mod vector;

pub use axis::{Axis, Scale, Ticks};
pub use bitmap::{RenderOptions, render};
pub use error::Error;
pub use figure::{
    Band, BandShade, Figure, FigureSize, Inset, InsetPlace, LegendPlace, MarkHeight, Marks, Panel,
    PeakLabel, Role, Rule, RuleWay, Series, SeriesStyle, Span, SpanKind, Symbol,
};
pub use vector::render_svg;
