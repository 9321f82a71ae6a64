/// Why a figure could not be drawn.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// The figure has no panel.
    #[error("a figure needs at least one panel, found none")]
    NoPanels,
    /// The layout is too small or too large.
    #[error("figure size {width} × {height} pixels, expected 320 to 4096 by 240 to 4096")]
    Size {
        /// Width found.
        width: u32,
        /// Height found.
        height: u32,
    },
    /// The layout does not have room for its text and panels.
    #[error(
        "panel {panel} is left {height:.0} pixels high and {width:.0} wide, expected at least 40 by 40; use fewer panels or foot lines, or a larger figure"
    )]
    Room {
        /// Number of the panel, from 1.
        panel: usize,
        /// Width left for the plot, logical pixels.
        width: f64,
        /// Height left for the plot, logical pixels.
        height: f64,
    },
    /// The resolution is out of range.
    #[error("resolution {dpi} dpi, expected 50 to 1200 dpi")]
    Dpi {
        /// Resolution found.
        dpi: f64,
    },
    /// Columns of one series, band or set of marks differ in length.
    #[error("\"{name}\" has {found} values in a column, expected {expected}")]
    Length {
        /// Name of the series, band or marks.
        name: String,
        /// Length found.
        found: usize,
        /// Number of abscissae.
        expected: usize,
    },
    /// An axis range is empty, upside down, not finite, or not above zero on a
    /// logarithmic axis.
    #[error(
        "range of axis \"{axis}\" is {lower} to {upper}, expected finite and ascending, above 0 on a logarithmic axis"
    )]
    Range {
        /// Label of the axis.
        axis: String,
        /// Lower end found.
        lower: f64,
        /// Upper end found.
        upper: f64,
    },
    /// A share, step or position is out of range.
    #[error("{what} is {found}, expected {expected}")]
    Value {
        /// Which value.
        what: &'static str,
        /// Value found.
        found: f64,
        /// What is allowed.
        expected: &'static str,
    },
    /// The embedded font could not be read.
    #[error("the embedded font could not be read")]
    Font(#[source] ab_glyph::InvalidFont),
    /// The drawing layer failed.
    #[error("drawing failed: {reason}")]
    Draw {
        /// What it said.
        reason: String,
    },
    /// The bitmap could not be encoded.
    #[error("the bitmap could not be encoded")]
    Encode(#[from] png::EncodingError),
}
