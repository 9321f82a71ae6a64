use plotters::coord::cartesian::Cartesian2d;
use plotters::coord::ranged1d::{BoldPoints, KeyPointHint, KeyPointWeight};
use plotters::prelude::{DrawingBackend, RGBColor};
use plotters::style::Color;

use crate::Error;
use crate::canvas::{Canvas, HPos, Lettering, VPos, drawing};
use crate::figure::{
    Band, BandShade, InsetPlace, MarkHeight, Marks, Panel, Role, RuleWay, Series, SeriesStyle,
    SpanKind, Symbol,
};
use crate::font::{Fonts, cap_height};
use crate::layout::{
    AXIS_LABEL, AXIS_PITCH, HEADING, LABEL, LANE, LEGEND_PITCH, LegendRows, NUMBER_GAP, detail,
};
use crate::palette::{self, AXIS, Colour, FINE_GRID, GRID, HATCH, INK, SHADE, SOFT_INK, WHITE};
use crate::placer::Placer;
use crate::polyline::{Box2, Point, clip, clip_polygon, clip_segment, dashes, length, runs, thin};
use crate::range::AxisMap;

/// Width of the columns long curves are reduced to: a pixel at 300 dpi.
const COLUMN: f64 = 0.5;
const AREA_ALPHA: f64 = 0.22;

/// A panel in its place, or a magnified part of one.
pub(crate) struct Plot<'f> {
    pub(crate) panel: &'f Panel,
    /// Where the data goes.
    pub(crate) frame: Box2,
    pub(crate) x: AxisMap,
    pub(crate) y: AxisMap,
    /// Whether the x axis carries numbers.
    pub(crate) numbered: bool,
    pub(crate) number_size: f64,
    pub(crate) x_label: Vec<String>,
    pub(crate) y_label: Vec<String>,
    pub(crate) legend: LegendRows<'f>,
    /// Rows of heading and legend above the frame.
    pub(crate) head_rows: usize,
    /// The stretch of the y axis its inset shows.
    pub(crate) inset_y: (f64, f64),
}

/// What a legend entry stands for.
#[derive(Clone, Copy)]
pub(crate) enum Key<'f> {
    Series(&'f Series),
    Band(&'f Band),
    Marks(&'f Marks),
}

impl Key<'_> {
    const SAMPLE: f64 = 30.0;
    const GAP: f64 = 8.0;
    const MOST: f64 = 440.0;
    /// Between two entries.
    pub(crate) const AIR: f64 = 26.0;

    fn name(&self) -> &str {
        match self {
            Self::Series(s) => &s.name,
            Self::Band(b) => &b.name,
            Self::Marks(m) => &m.name,
        }
    }

    /// The name, cut where it would take the row to itself.
    fn shown(&self, fonts: &Fonts) -> String {
        fonts
            .wrap(self.name(), LABEL, false, Self::MOST, 1)
            .concat()
    }

    fn sample(&self) -> f64 {
        if matches!(self, Self::Marks(_)) {
            12.0
        } else {
            Self::SAMPLE
        }
    }

    pub(crate) fn width(&self, fonts: &Fonts) -> f64 {
        self.sample() + Self::GAP + fonts.width(&self.shown(fonts), LABEL, false) + Self::AIR
    }
}

/// The named contents of a panel: curves, then bands, then symbols.
pub(crate) fn keys(panel: &Panel) -> Vec<Key<'_>> {
    let series = panel.series.iter().map(Key::Series);
    let bands = panel.bands.iter().map(Key::Band);
    let marks = panel.marks.iter().map(Key::Marks);
    series
        .chain(bands)
        .chain(marks)
        .filter(|k| !k.name().is_empty())
        .collect()
}

/// Draws a panel with all that belongs to it.
pub(crate) fn draw<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    label_x: f64,
) -> Result<(), Error> {
    let mut placer = Placer::new(plot.frame);
    contents(canvas, plot, &mut placer)?;
    axes(canvas, plot)?;
    words(canvas, plot, label_x)?;
    if let Some(inset) = &plot.panel.inset {
        let place = inset_place(plot, inset.place, inset.share, &placer);
        if let Some(part) = detail(plot, inset.x, place, canvas.fonts) {
            magnified(canvas, plot, &part, place, &mut placer)?;
        }
    }
    notes(canvas, plot, &mut placer)?;
    labels(canvas, plot, &mut placer)
}

/// Everything between the axes that is not text.
fn contents<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    placer: &mut Placer,
) -> Result<(), Error> {
    mesh(canvas, plot)?;
    spans(canvas, plot)?;
    for band in &plot.panel.bands {
        draw_band(canvas, plot, band, placer)?;
    }
    for rule in &plot.panel.rules {
        let ends = match rule.way {
            RuleWay::Across => {
                let y = plot.y.place(rule.at);
                [(plot.frame.left, y), (plot.frame.right, y)]
            }
            RuleWay::Upright => {
                let x = plot.x.place(rule.at);
                [(x, plot.frame.bottom), (x, plot.frame.top)]
            }
        };
        if plot.frame.contains(ends[0]) {
            placer.ink(&ends);
            dashed(canvas, &ends, rule.role)?;
        }
    }
    for series in &plot.panel.series {
        draw_series(canvas, plot, series, placer)?;
    }
    let mut lane = plot.frame.top + 0.6 * LANE;
    for marks in &plot.panel.marks {
        let lane_here = lane;
        if marks.height == MarkHeight::Lane {
            lane += LANE;
        }
        for (i, &x) in marks.x.iter().enumerate() {
            let y = match &marks.height {
                MarkHeight::Lane => lane_here,
                MarkHeight::At(y) => plot.y.place(y[i]),
            };
            let at = (plot.x.place(x), y);
            if plot.frame.contains(at) {
                symbol(canvas, marks.symbol, at, palette::stroke(marks.role).colour)?;
                placer.take(Box2::new(at.0, at.1, at.0, at.1).grown(5.0));
            }
        }
    }
    Ok(())
}

fn spans<DB: DrawingBackend>(canvas: &Canvas<'_, DB>, plot: &Plot<'_>) -> Result<(), Error> {
    for span in &plot.panel.spans {
        let Some(place) = span_box(plot, span.from, span.to) else {
            continue;
        };
        canvas.rectangle(place, SHADE, 1.0)?;
        match span.kind {
            SpanKind::NotReachable => {}
            SpanKind::Break => {
                for x in [place.left, place.right] {
                    canvas.line(&[(x, place.top), (x, place.bottom)], AXIS, 1.0)?;
                }
            }
            SpanKind::Excluded => {
                let rise = place.height();
                let pitch = 9.0;
                // Hatching hangs on the page, so that neighbours join up.
                let mut foot = ((place.left - rise) / pitch).floor() * pitch;
                while foot < place.right {
                    let (a, b) = ((foot, place.bottom), (foot + rise, place.top));
                    if let Some((a, b)) = clip_segment(a, b, &place) {
                        canvas.line(&[a, b], HATCH, 0.8)?;
                    }
                    foot += pitch;
                }
            }
        }
    }
    Ok(())
}

fn span_box(plot: &Plot<'_>, from: f64, to: f64) -> Option<Box2> {
    let frame = plot.frame;
    let edge = |v: f64| plot.x.place(v).clamp(frame.left, frame.right);
    let apart = to >= plot.x.lower && from <= plot.x.upper && to >= from;
    apart.then(|| Box2::new(edge(from), frame.top, edge(to), frame.bottom))
}

/// Asks an axis for the lines between its numbers.
struct FinePoints;

impl KeyPointHint for FinePoints {
    fn max_num_points(&self) -> usize {
        usize::MAX
    }
    fn weight(&self) -> KeyPointWeight {
        KeyPointWeight::Any
    }
}

fn mesh<DB: DrawingBackend>(canvas: &Canvas<'_, DB>, plot: &Plot<'_>) -> Result<(), Error> {
    let (left, bottom) = canvas.virtual_point((plot.frame.left, plot.frame.bottom));
    let (right, top) = canvas.virtual_point((plot.frame.right, plot.frame.top));
    let grid = Cartesian2d::<AxisMap, AxisMap>::new(
        plot.x.clone(),
        plot.y.clone(),
        (left..right, bottom..top),
    );
    let area = canvas.area.apply_coord_spec(grid);
    let style =
        |(r, g, b): Colour| RGBColor(r, g, b).stroke_width((0.9 * canvas.grid).round() as u32);
    let (fine, bold) = (style(FINE_GRID), style(GRID));
    area.draw_mesh(
        |backend, line| line.draw(backend, &fine),
        FinePoints,
        FinePoints,
    )
    .map_err(drawing)?;
    let most = usize::MAX;
    area.draw_mesh(
        |backend, line| line.draw(backend, &bold),
        BoldPoints(most),
        BoldPoints(most),
    )
    .map_err(drawing)
}

fn draw_band<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    band: &Band,
    placer: &mut Placer,
) -> Result<(), Error> {
    let colour = palette::stroke(band.role).colour;
    let alpha = band_alpha(band);
    // A gap in either edge is a gap of the band: both run over the same points.
    let edge = |ys: &[f64]| {
        let finite = (0..band.x.len()).map(|i| {
            let sound =
                plot.y.place(band.lower[i]).is_finite() && plot.y.place(band.upper[i]).is_finite();
            (
                plot.x.place(band.x[i]),
                if sound { plot.y.place(ys[i]) } else { f64::NAN },
            )
        });
        runs(finite)
    };
    for (lower, upper) in edge(&band.lower).iter().zip(&edge(&band.upper)) {
        let (mut outline, lower) = (thin(upper, COLUMN), thin(lower, COLUMN));
        for edge in [&outline, &lower] {
            clip(edge, &plot.frame)
                .iter()
                .for_each(|part| placer.ink(part));
        }
        outline.extend(lower.into_iter().rev());
        canvas.polygon(&clip_polygon(outline, &plot.frame), colour, alpha)?;
    }
    Ok(())
}

fn band_alpha(band: &Band) -> f64 {
    match band.shade {
        BandShade::Light => 0.18,
        BandShade::Strong => 0.42,
    }
}

fn draw_series<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    series: &Series,
    placer: &mut Placer,
) -> Result<(), Error> {
    let stroke = palette::stroke(series.role);
    let points = series
        .x
        .iter()
        .zip(&series.y)
        .map(|(&x, &y)| (plot.x.place(x), plot.y.place(y)));
    if matches!(
        series.style,
        SeriesStyle::Points | SeriesStyle::LinePoints | SeriesStyle::Stem
    ) {
        for run in runs(points.clone()) {
            // More dots than columns would only cover one another.
            let run = if run.len() > 4000 {
                thin(&run, COLUMN)
            } else {
                run
            };
            for at in run {
                if series.style == SeriesStyle::Stem {
                    let foot = plot
                        .y
                        .place(if plot.y.holds(0.0) { 0.0 } else { plot.y.lower });
                    let foot = if foot.is_finite() {
                        foot
                    } else {
                        plot.frame.bottom
                    };
                    if let Some((a, b)) = clip_segment((at.0, foot), at, &plot.frame) {
                        placer.ink(&[a, b]);
                        canvas.line(&[a, b], stroke.colour, stroke.width)?;
                    }
                }
                if plot.frame.contains(at) {
                    placer.ink(&[at]);
                    canvas.disc(at, 3.2, stroke.colour)?;
                }
            }
        }
    }
    if matches!(series.style, SeriesStyle::Points | SeriesStyle::Stem) {
        return Ok(());
    }
    for run in runs(points) {
        let run = thin(&run, COLUMN);
        if series.style == SeriesStyle::Area {
            let floor = plot.y.place(0.0);
            let floor = if floor.is_finite() {
                floor
            } else {
                plot.frame.bottom
            };
            let mut outline = run.clone();
            outline.push((run[run.len() - 1].0, floor));
            outline.push((run[0].0, floor));
            canvas.polygon(
                &clip_polygon(outline, &plot.frame),
                stroke.colour,
                AREA_ALPHA,
            )?;
        }
        for part in clip(&run, &plot.frame) {
            placer.ink(&part);
            match series.style {
                _ if part.len() == 1 => canvas.disc(part[0], 0.8 * stroke.width, stroke.colour)?,
                SeriesStyle::Area => canvas.line(&part, stroke.colour, 0.85 * stroke.width)?,
                _ => dashed(canvas, &part, series.role)?,
            }
        }
    }
    Ok(())
}

/// Draws a line with its role's dash; solid where it turns so densely that
/// dashes would show as noise.
fn dashed<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    run: &[Point],
    role: Role,
) -> Result<(), Error> {
    let stroke = palette::stroke(role);
    let across = run[run.len() - 1].0 - run[0].0;
    if stroke.dash.is_empty() || (length(run) > 6.0 * across.abs() && run.len() > 100) {
        return canvas.line(run, stroke.colour, stroke.width);
    }
    dashes(run, stroke.dash)
        .iter()
        .try_for_each(|dash| canvas.line(dash, stroke.colour, stroke.width))
}

fn symbol<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    symbol: Symbol,
    (x, y): Point,
    colour: Colour,
) -> Result<(), Error> {
    let r = 5.0;
    match symbol {
        Symbol::Inserted => canvas.polygon(
            &[(x, y - r), (x + r, y + 0.8 * r), (x - r, y + 0.8 * r)],
            colour,
            1.0,
        ),
        Symbol::Moved => canvas.polygon(
            &[(x, y - r), (x + r, y), (x, y + r), (x - r, y)],
            colour,
            1.0,
        ),
        Symbol::Rejected => {
            let d = 0.8 * r;
            canvas.line(&[(x - d, y - d), (x + d, y + d)], colour, 2.0)?;
            canvas.line(&[(x - d, y + d), (x + d, y - d)], colour, 2.0)
        }
        Symbol::Dot => canvas.disc((x, y), 0.8 * r, colour),
        Symbol::Ring => {
            canvas.disc((x, y), 0.9 * r, colour)?;
            canvas.disc((x, y), 0.9 * r - 1.6, WHITE)
        }
    }
}

/// Axis lines, ticks and numbers.
fn axes<DB: DrawingBackend>(canvas: &Canvas<'_, DB>, plot: &Plot<'_>) -> Result<(), Error> {
    let Box2 {
        left,
        top,
        right,
        bottom,
    } = plot.frame;
    canvas.line(&[(left, top), (left, bottom), (right, bottom)], AXIS, 1.2)?;
    let short = 0.45 * plot.number_size / 14.5;
    let gap = NUMBER_GAP * plot.number_size / 14.5;
    let tick = 0.5 * gap;
    for division in &plot.x.division.minor {
        let x = plot.x.place(*division);
        canvas.line(&[(x, bottom), (x, bottom + short * tick)], AXIS, 0.9)?;
    }
    for division in &plot.x.division.major {
        let x = plot.x.place(division.value);
        canvas.line(&[(x, bottom), (x, bottom + tick)], AXIS, 1.1)?;
        if plot.numbered {
            let lettering = Lettering::new(plot.number_size, INK, HPos::Center, VPos::Top);
            canvas.text(&division.label, (x, bottom + gap), lettering)?;
        }
    }
    for division in &plot.y.division.minor {
        let y = plot.y.place(*division);
        canvas.line(&[(left - short * tick, y), (left, y)], AXIS, 0.9)?;
    }
    for division in &plot.y.division.major {
        let y = plot.y.place(division.value);
        canvas.line(&[(left - tick, y), (left, y)], AXIS, 1.1)?;
        let lettering = Lettering::new(plot.number_size, INK, HPos::Right, VPos::Center);
        canvas.text(&division.label, (left - gap, y), lettering)?;
    }
    Ok(())
}

/// Axis labels, heading and legend.
fn words<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    label_x: f64,
) -> Result<(), Error> {
    let Box2 {
        left,
        top,
        right,
        bottom,
    } = plot.frame;
    let middle = Lettering::new(AXIS_LABEL, INK, HPos::Center, VPos::Center);
    let below = bottom + NUMBER_GAP + cap_height(plot.number_size) + 14.0;
    for (i, line) in plot.x_label.iter().enumerate() {
        let y = below + 0.5 * cap_height(AXIS_LABEL) + i as f64 * AXIS_PITCH;
        canvas.text(line, (0.5 * (left + right), y), middle)?;
    }
    let lines = plot.y_label.len() as f64;
    for (i, line) in plot.y_label.iter().enumerate() {
        let x = label_x + (i as f64 - 0.5 * (lines - 1.0)) * AXIS_PITCH;
        canvas.text(
            line,
            (x, 0.5 * (top + bottom)),
            Lettering {
                upright: true,
                ..middle
            },
        )?;
    }
    let row =
        |i: usize| top - 10.0 - (plot.head_rows - i) as f64 * LEGEND_PITCH + 0.5 * LEGEND_PITCH;
    if !plot.panel.heading.is_empty() {
        let lettering = Lettering {
            bold: true,
            ..Lettering::new(HEADING, INK, HPos::Left, VPos::Center)
        };
        let heading = canvas
            .fonts
            .wrap(&plot.panel.heading, HEADING, true, right - left, 1)
            .concat();
        canvas.text(&heading, (left, row(0)), lettering)?;
    }
    for (i, entries) in plot.legend.iter().enumerate() {
        for (x, key) in entries {
            legend_entry(canvas, key, (*x, row(i)))?;
        }
    }
    Ok(())
}

fn legend_entry<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    key: &Key<'_>,
    (x, y): Point,
) -> Result<(), Error> {
    let end = x + key.sample();
    let swatch = Box2::new(x, y - 6.0, end, y + 6.0);
    match key {
        Key::Series(series) => {
            let stroke = palette::stroke(series.role);
            match series.style {
                SeriesStyle::Line => dashed(canvas, &[(x, y), (end, y)], series.role)?,
                SeriesStyle::Area => {
                    canvas.rectangle(
                        Box2 {
                            top: y - 4.0,
                            ..swatch
                        },
                        stroke.colour,
                        AREA_ALPHA,
                    )?;
                    canvas.line(&[(x, y - 4.0), (end, y - 4.0)], stroke.colour, stroke.width)?;
                }
                SeriesStyle::LinePoints => {
                    dashed(canvas, &[(x, y), (end, y)], series.role)?;
                    canvas.disc((0.5 * (x + end), y), 3.2, stroke.colour)?;
                }
                SeriesStyle::Points | SeriesStyle::Stem => {
                    canvas.disc((0.5 * (x + end), y), 3.2, stroke.colour)?;
                }
            }
        }
        Key::Band(band) => {
            let colour = palette::stroke(band.role).colour;
            canvas.rectangle(swatch, colour, band_alpha(band))?;
        }
        Key::Marks(marks) => {
            symbol(
                canvas,
                marks.symbol,
                (0.5 * (x + end), y),
                palette::stroke(marks.role).colour,
            )?;
        }
    }
    let lettering = Lettering::new(LABEL, INK, HPos::Left, VPos::Center);
    canvas.text(&key.shown(canvas.fonts), (end + Key::GAP, y), lettering)
}

/// Words beside rules and in spans, and a word where there is no data.
fn notes<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    placer: &mut Placer,
) -> Result<(), Error> {
    let Box2 {
        left,
        top,
        right,
        bottom,
    } = plot.frame;
    let high = cap_height(LABEL);
    for rule in plot.panel.rules.iter().filter(|r| !r.text.is_empty()) {
        let wide = canvas.fonts.width(&rule.text, LABEL, false);
        let place = |x: f64, y: f64| Box2::new(x, y, x + wide, y + high);
        let mut places = Vec::new();
        match rule.way {
            RuleWay::Across => {
                let y = plot.y.place(rule.at);
                for share in [1.0, 0.0, 0.75, 0.5, 0.25] {
                    let x = left + 8.0 + share * (right - left - wide - 14.0);
                    places.push(place(x, y - high - 9.0));
                    places.push(place(x, y + 9.0));
                }
            }
            RuleWay::Upright => {
                let x = plot.x.place(rule.at);
                for share in [0.0, 0.15, 0.3, 0.5, 0.7, 0.9] {
                    let y = top + 8.0 + share * (bottom - top - high - 16.0);
                    places.push(place(x + 7.0, y));
                    places.push(place(x - 7.0 - wide, y));
                }
            }
        }
        if let Some(place) = placer.note(&places, 0.3) {
            covered_text(canvas, &rule.text, place, palette::text(rule.role), placer)?;
        }
    }
    for span in plot.panel.spans.iter().filter(|s| !s.text.is_empty()) {
        let Some(area) = span_box(plot, span.from, span.to) else {
            continue;
        };
        let wide = canvas.fonts.width(&span.text, LABEL, false);
        let middle = 0.5 * (area.left + area.right);
        let shares = [0.97, 0.8, 0.6, 0.4, 0.2, 0.03];
        if area.width() >= wide + 12.0 {
            let places = shares.map(|share| {
                let y = top + share * (bottom - top - high);
                Box2::new(middle - 0.5 * wide, y, middle + 0.5 * wide, y + high)
            });
            if let Some(place) = placer.note(&places, 0.3) {
                canvas.rectangle(place.grown(3.0), SHADE, 1.0)?;
                covered_text(canvas, &span.text, place, SOFT_INK, placer)?;
            }
        } else if area.width() >= high + 8.0 {
            let places = shares.map(|share| {
                let y = top + 3.0 + share * (bottom - top - wide - 6.0);
                Box2::new(middle - 0.5 * high, y, middle + 0.5 * high, y + wide)
            });
            if let Some(place) = placer.note(&places, 0.3) {
                canvas.rectangle(place.grown(3.0), SHADE, 1.0)?;
                let lettering = Lettering {
                    upright: true,
                    ..Lettering::new(LABEL, SOFT_INK, HPos::Center, VPos::Center)
                };
                canvas.text(
                    &span.text,
                    (middle, 0.5 * (place.top + place.bottom)),
                    lettering,
                )?;
            }
        }
    }
    let bare = |s: &Series| runs(s.x.iter().copied().zip(s.y.iter().copied())).is_empty();
    if plot.panel.series.iter().all(bare)
        && plot.panel.bands.is_empty()
        && plot.panel.marks.is_empty()
    {
        let centre = (0.5 * (left + right), 0.5 * (top + bottom));
        canvas.text(
            "no data",
            centre,
            Lettering::new(AXIS_LABEL, SOFT_INK, HPos::Center, VPos::Center),
        )?;
    }
    Ok(())
}

/// Text on a veil of the ground where it lies over a curve.
fn covered_text<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    text: &str,
    place: Box2,
    colour: Colour,
    placer: &Placer,
) -> Result<(), Error> {
    if placer.covered(&place) > 0.0 {
        canvas.rectangle(place.grown(3.0), WHITE, 0.85)?;
    }
    let lettering = Lettering::new(LABEL, colour, HPos::Left, VPos::Bottom);
    canvas.text(text, (place.left, place.bottom), lettering)
}

fn labels<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    placer: &mut Placer,
) -> Result<(), Error> {
    for label in &plot.panel.labels {
        let at = (plot.x.place(label.x), plot.y.place(label.y));
        if !plot.frame.contains(at) || label.text.is_empty() {
            continue;
        }
        let tips = plot.panel.bands.iter().filter_map(|b| tip(b, label.x));
        let crest = tips
            .map(|tip| plot.y.place(tip))
            .filter(|y| *y > plot.frame.top)
            .fold(at.1, f64::min);
        let mut place = |text: &str| {
            let wide = canvas.fonts.width(text, LABEL, false);
            placer.label(at, crest, wide, cap_height(LABEL))
        };
        let mut text = label.text.as_str();
        let mut placed = place(text);
        if let (None, Some((head, _))) = (placed, text.split_once(" · ")) {
            text = head;
            placed = place(text);
        }
        let Some(placed) = placed else { continue };
        if let Some((from, to)) = placed.leader {
            canvas.line(&[from, to], SOFT_INK, 0.8)?;
        }
        let colour = palette::text(label.role);
        canvas.disc(at, 2.6, colour)?;
        covered_text(canvas, text, placed.place, colour, placer)?;
    }
    Ok(())
}

/// Upper edge of a band at an abscissa.
fn tip(band: &Band, x: f64) -> Option<f64> {
    let after = band.x.partition_point(|&b| b < x);
    let near = after.saturating_sub(1)..(after + 2).min(band.x.len());
    let closest = near.min_by(|&i, &j| (band.x[i] - x).abs().total_cmp(&(band.x[j] - x).abs()))?;
    Some(band.upper[closest])
}

fn inset_place(plot: &Plot<'_>, wish: InsetPlace, share: (f64, f64), placer: &Placer) -> Box2 {
    let frame = plot.frame;
    let (wide, high) = (share.0 * frame.width(), share.1 * frame.height());
    let top = frame.top + 8.0;
    let at = |share: f64| {
        let left = frame.left + 12.0 + share * (frame.width() - wide - 20.0);
        Box2::new(left, top, left + wide, top + high)
    };
    match wish {
        InsetPlace::Left => at(0.0),
        InsetPlace::Middle => at(0.5),
        InsetPlace::Right => at(1.0),
        InsetPlace::Auto => {
            let mut best = at(1.0);
            for step in 0..20 {
                let place = at(1.0 - f64::from(step + 1) / 20.0);
                if placer.covered(&place) < placer.covered(&best) - 1e-9 {
                    best = place;
                }
            }
            best
        }
    }
}

/// A detail in its box, the frame it comes from, and two lines between them.
fn magnified<DB: DrawingBackend>(
    canvas: &Canvas<'_, DB>,
    plot: &Plot<'_>,
    part: &Plot<'_>,
    place: Box2,
    placer: &mut Placer,
) -> Result<(), Error> {
    let frame = plot.frame;
    let x = |v: f64| plot.x.place(v).clamp(frame.left, frame.right);
    let y = |v: f64| plot.y.place(v).clamp(frame.top, frame.bottom);
    let source = Box2::new(
        x(part.x.lower),
        y(part.y.upper),
        x(part.x.upper),
        y(part.y.lower),
    );
    let ties = if place.bottom < source.top {
        [
            ((source.left, source.top), (place.left, place.bottom)),
            ((source.right, source.top), (place.right, place.bottom)),
        ]
    } else if place.left > source.right {
        [
            ((source.right, source.top), (place.left, place.top)),
            ((source.right, source.bottom), (place.left, place.bottom)),
        ]
    } else {
        [
            ((source.left, source.top), (place.right, place.top)),
            ((source.left, source.bottom), (place.right, place.bottom)),
        ]
    };
    for (a, b) in ties {
        canvas.line(&[a, b], HATCH, 1.0)?;
    }
    let outline = |b: &Box2| {
        let [p, q, r, s] = b.corners();
        [p, q, r, s, p]
    };
    canvas.line(&outline(&source), AXIS, 1.1)?;
    canvas.rectangle(place, WHITE, 1.0)?;
    canvas.line(&outline(&place), HATCH, 1.0)?;
    let mut own = Placer::new(part.frame);
    contents(canvas, part, &mut own)?;
    axes(canvas, part)?;
    placer.take(place);
    Ok(())
}
