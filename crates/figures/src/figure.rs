use crate::axis::Axis;

/// Width and height of the layout in logical pixels.
///
/// Strokes and letters grow with the layout, so that a slide carries the same
/// picture as a page. The bitmap has `dpi / 150` times as many pixels each way.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct FigureSize {
    /// Width in logical pixels, 320 to 4096.
    pub width: u32,
    /// Height in logical pixels, 240 to 4096.
    pub height: u32,
}

impl FigureSize {
    /// For a page: 1200 × 800, at 300 dpi 2400 × 1600 pixels or 203 × 135 mm.
    pub const PAGE: Self = Self {
        width: 1200,
        height: 800,
    };
    /// For a slide: 1920 × 1080, to be written at 150 dpi for that many pixels.
    pub const SLIDE: Self = Self {
        width: 1920,
        height: 1080,
    };
}

impl Default for FigureSize {
    /// [`FigureSize::PAGE`].
    fn default() -> Self {
        Self::PAGE
    }
}

/// One picture: a heading, panels from top to bottom, and small print.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Figure {
    /// What the picture says, one line, set bold at the top left. Broken into
    /// two lines where it is too long for one.
    pub title: String,
    /// What was measured, under the title. May be empty.
    pub subtitle: String,
    /// From top to bottom, at least one.
    pub panels: Vec<Panel>,
    /// All panels span the same x range, and only the lowest names it.
    pub shared_x: bool,
    /// All panels span the same y range (taken over all of them where their
    /// axes leave it open).
    pub shared_y: bool,
    /// Small print under the panels: channel, unit, resolution, window,
    /// averages, source. One entry a line, long ones are wrapped.
    pub foot: Vec<String>,
    /// Default: [`FigureSize::PAGE`].
    pub size: FigureSize,
}

/// One pair of axes and all that is drawn between them.
///
/// Drawn from the ground up: spans, grid, bands, rules, series, marks, labels.
#[derive(Debug, Clone, PartialEq)]
pub struct Panel {
    /// A few words over the left end of the plot. May be empty.
    pub heading: String,
    /// The horizontal axis.
    pub x: Axis,
    /// The vertical axis.
    pub y: Axis,
    /// Areas between two curves.
    pub bands: Vec<Band>,
    /// Curves, stems and points.
    pub series: Vec<Series>,
    /// Symbols.
    pub marks: Vec<Marks>,
    /// Text at points, most important first.
    pub labels: Vec<PeakLabel>,
    /// Stretches of the x axis with a meaning of their own.
    pub spans: Vec<Span>,
    /// Straight lines across the plot.
    pub rules: Vec<Rule>,
    /// Default: [`LegendPlace::Above`].
    pub legend: LegendPlace,
    /// Height relative to the other panels' shares. Default: 1.
    pub height_share: f64,
    /// A magnified detail.
    pub inset: Option<Inset>,
}

impl Panel {
    /// An empty panel between two axes.
    pub fn new(x: Axis, y: Axis) -> Self {
        Self {
            heading: String::new(),
            x,
            y,
            bands: Vec::new(),
            series: Vec::new(),
            marks: Vec::new(),
            labels: Vec::new(),
            spans: Vec::new(),
            rules: Vec::new(),
            legend: LegendPlace::Above,
            height_share: 1.0,
            inset: None,
        }
    }
}

/// What a line, band or symbol stands for; it decides colour, weight and dash
/// together, so that no two roles differ by hue alone.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum Role {
    /// The result itself (tracked, measured, order 1): dark, solid, strong.
    #[default]
    Primary,
    /// What the result is set against (smeared, before): light, warm, dashed.
    Secondary,
    /// A third curve: mid-toned, long dashes.
    Third,
    /// A fourth curve: mid-toned, dash and dot.
    Fourth,
    /// A law or an expectation: grey, thin, dashed.
    Reference,
    /// A limit supplied by somebody: dark red, long dashes.
    Limit,
    /// Something doubtful: dark red, thin.
    Warning,
    /// Something there for orientation only: light grey, thin.
    Muted,
}

/// How the points of a [`Series`] are joined.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum SeriesStyle {
    /// A line through the points, with the role's dash (solid where it turns
    /// too densely for dashes to show).
    #[default]
    Line,
    /// A line through the points, always solid, over a light area down to the
    /// axis. For spectra, where dashes would break up narrow peaks.
    Area,
    /// A stem from zero (or the axis, if zero is not on it) to each point.
    Stem,
    /// A dot at each point.
    Points,
    /// Dots joined by a line, for few points.
    LinePoints,
}

/// A curve. A NaN in x or y is a gap.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Series {
    /// Its name in the legend; empty: not listed.
    pub name: String,
    /// Abscissae, in the unit of the x axis. For long lines in ascending
    /// order, so that they can be reduced to one pixel column's extremes.
    pub x: Vec<f64>,
    /// Ordinates, as many as abscissae.
    pub y: Vec<f64>,
    /// What it stands for.
    pub role: Role,
    /// How the points are joined.
    pub style: SeriesStyle,
}

impl Series {
    /// A line.
    pub fn line(name: &str, role: Role, x: Vec<f64>, y: Vec<f64>) -> Self {
        Self {
            name: name.to_owned(),
            x,
            y,
            role,
            style: SeriesStyle::Line,
        }
    }
}

/// How dark a [`Band`] is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum BandShade {
    /// The wider of two bands, or the only one.
    #[default]
    Light,
    /// The narrower of two bands.
    Strong,
}

/// The area between two curves over the same abscissae. A NaN is a gap.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Band {
    /// Its name in the legend; empty: not listed.
    pub name: String,
    /// Abscissae in ascending order.
    pub x: Vec<f64>,
    /// Lower edge, as many as abscissae.
    pub lower: Vec<f64>,
    /// Upper edge, as many as abscissae.
    pub upper: Vec<f64>,
    /// The role of the curve it belongs to.
    pub role: Role,
    /// Light or strong.
    pub shade: BandShade,
}

/// A symbol's form. The three of the ledger have names of their own.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum Symbol {
    /// ▲, a pulse put in.
    Inserted,
    /// ×, a pulse thrown out.
    Rejected,
    /// ◆, a pulse moved.
    Moved,
    /// ●
    #[default]
    Dot,
    /// ○
    Ring,
}

/// Where a set of symbols stands.
#[derive(Debug, Clone, PartialEq)]
pub enum MarkHeight {
    /// In a lane of its own along the top of the plot, one lane a set.
    Lane,
    /// At these ordinates, as many as abscissae.
    At(Vec<f64>),
}

/// Symbols of one meaning.
#[derive(Debug, Clone, PartialEq)]
pub struct Marks {
    /// Its name in the legend; empty: not listed.
    pub name: String,
    /// The form.
    pub symbol: Symbol,
    /// The colour.
    pub role: Role,
    /// Abscissae.
    pub x: Vec<f64>,
    /// Ordinates.
    pub height: MarkHeight,
}

/// Text at a point, moved aside where it would cover other text and then tied
/// to its point by a thin line. Where the whole text finds no place, the part
/// before ` · ` is tried; where that finds none, the label is left out. The
/// first of the list get theirs first.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct PeakLabel {
    /// Abscissa of the point.
    pub x: f64,
    /// Ordinate of the point.
    pub y: f64,
    /// One line, for example `2.00 · 1.31 mm/s`.
    pub text: String,
    /// Colour of the text.
    pub role: Role,
}

/// Why a stretch of the x axis is shaded.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum SpanKind {
    /// Left out of the analysis: hatched.
    Excluded,
    /// A break between two sections: bordered by two lines.
    Break,
    /// Beyond what the sensor, the rate or the tach can show: plain grey.
    NotReachable,
}

/// A shaded stretch of the x axis.
#[derive(Debug, Clone, PartialEq)]
pub struct Span {
    /// Left end.
    pub from: f64,
    /// Right end, not left of `from`.
    pub to: f64,
    /// Why.
    pub kind: SpanKind,
    /// A word or two at its foot, drawn where there is room; may be empty.
    pub text: String,
}

/// Which way a [`Rule`] runs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum RuleWay {
    /// At one ordinate, from left to right.
    Across,
    /// At one abscissa, from bottom to top.
    Upright,
}

/// A straight line across the plot.
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// The ordinate (`Across`) or abscissa (`Upright`).
    pub at: f64,
    /// Which way it runs.
    pub way: RuleWay,
    /// A word or two beside it; may be empty.
    pub text: String,
    /// What it stands for.
    pub role: Role,
}

/// Where the names of a panel's series stand. Never over the data.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum LegendPlace {
    /// In a row over the plot.
    #[default]
    Above,
    /// Nowhere.
    Hidden,
}

/// Where an [`Inset`] stands in its panel.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum InsetPlace {
    /// The upper place that covers least of the data.
    #[default]
    Auto,
    /// Upper left.
    Left,
    /// Upper middle.
    Middle,
    /// Upper right.
    Right,
}

/// A magnified detail of its panel, with axes of its own, tied by two thin
/// lines to a frame that shows where it comes from.
#[derive(Debug, Clone, PartialEq)]
pub struct Inset {
    /// The stretch of the panel's x axis that is magnified.
    pub x: (f64, f64),
    /// The stretch of its y axis; `None`: what the data there needs.
    pub y: Option<(f64, f64)>,
    /// Where it stands.
    pub place: InsetPlace,
    /// Width and height relative to the plot, 0.15 to 0.8. Default: 0.32, 0.6.
    pub share: (f64, f64),
}

impl Inset {
    /// A detail of the given stretch, placed where it covers least.
    pub fn new(from: f64, to: f64) -> Self {
        Self {
            x: (from, to),
            y: None,
            place: InsetPlace::Auto,
            share: (0.32, 0.6),
        }
    }
}
