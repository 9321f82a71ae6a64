use crate::Error;
use crate::axis::{Axis, Scale, Ticks};
use crate::figure::{Figure, LegendPlace, MarkHeight, Panel, SeriesStyle};
use crate::font::{Fonts, cap_height};
use crate::plot::{Key, Plot, keys};
use crate::polyline::Box2;
use crate::range::{AxisMap, Extent};
use crate::ticks::divide;

/// Sizes in pixels per em on a page 1200 pixels or 203 mm wide: 14.5 pixels
/// are 7 points.
pub(crate) const TITLE: f64 = 25.0;
pub(crate) const SUBTITLE: f64 = 16.5;
pub(crate) const HEADING: f64 = 15.5;
pub(crate) const AXIS_LABEL: f64 = 15.5;
pub(crate) const NUMBER: f64 = 14.5;
pub(crate) const INSET_NUMBER: f64 = 12.5;
pub(crate) const LABEL: f64 = 14.5;
pub(crate) const FOOT: f64 = 12.5;

pub(crate) const EDGE: f64 = 28.0;
pub(crate) const TITLE_PITCH: f64 = 32.0;
pub(crate) const SUBTITLE_PITCH: f64 = 23.0;
pub(crate) const FOOT_PITCH: f64 = 18.0;
pub(crate) const AXIS_PITCH: f64 = 20.0;
pub(crate) const LEGEND_PITCH: f64 = 23.0;
/// From an axis to its numbers: the tick and some air.
pub(crate) const NUMBER_GAP: f64 = 10.0;
pub(crate) const LANE: f64 = 17.0;
/// Between two panels.
const BETWEEN: f64 = 14.0;
const LEAST_PLOT: f64 = 40.0;

/// A figure with everything put in its place, in design pixels.
pub(crate) struct Sheet<'f> {
    pub(crate) width: f64,
    pub(crate) height: f64,
    pub(crate) title: Vec<String>,
    pub(crate) subtitle: Vec<String>,
    pub(crate) foot: Vec<String>,
    pub(crate) plots: Vec<Plot<'f>>,
    /// Middle of the upright axis labels.
    pub(crate) label_x: f64,
}

/// Legend entries by rows, each with its left end.
pub(crate) type LegendRows<'f> = Vec<Vec<(f64, Key<'f>)>>;

/// A panel with its height and all that decides it; the width comes later,
/// when the numbers of every y axis are known.
struct Draft<'f> {
    panel: &'f Panel,
    x_range: (f64, f64),
    /// Whether the x axis carries numbers and its label.
    numbered: bool,
    y_label: Vec<String>,
    x_label: Vec<String>,
    legend: Vec<Vec<Key<'f>>>,
    rows: usize,
    top: f64,
    height: f64,
}

/// Puts a figure in its place.
pub(crate) fn lay_out<'f>(
    figure: &'f Figure,
    fonts: &Fonts,
    width: f64,
    height: f64,
) -> Result<Sheet<'f>, Error> {
    check(figure)?;
    let text_width = width - 2.0 * EDGE;
    let title = fonts.wrap(&figure.title, TITLE, true, text_width - 14.0, 2);
    let subtitle = fonts.wrap(&figure.subtitle, SUBTITLE, false, text_width - 14.0, 2);
    let foot: Vec<String> = figure
        .foot
        .iter()
        .flat_map(|line| fonts.wrap(line, FOOT, false, text_width, 2))
        .collect();
    let mut top = EDGE;
    if !title.is_empty() {
        top += title.len() as f64 * TITLE_PITCH;
    }
    if !subtitle.is_empty() {
        top += subtitle.len() as f64 * SUBTITLE_PITCH + 8.0;
    }
    let foot_height = if foot.is_empty() {
        0.0
    } else {
        foot.len() as f64 * FOOT_PITCH + 16.0
    };
    let bottom = height - 0.6 * EDGE - foot_height;

    let drafts = draft(figure, fonts, text_width, top, bottom)?;
    let y_ranges = y_ranges(figure, &drafts)?;
    let y_maps: Vec<AxisMap> = drafts
        .iter()
        .zip(&y_ranges)
        .map(|(d, &range)| y_map(&d.panel.y, range, d.top, d.top + d.height, NUMBER))
        .collect();
    let number_width = y_maps
        .iter()
        .flat_map(|m| &m.division.major)
        .map(|t| fonts.width(&t.label, NUMBER, false))
        .fold(0.0, f64::max);
    let label_lines = drafts.iter().map(|d| d.y_label.len()).max().unwrap_or(0);
    let label_width = label_lines as f64 * AXIS_PITCH;
    let left = EDGE + label_width + 6.0 + number_width + NUMBER_GAP;
    let x_fonts = |text: &str| fonts.width(text, NUMBER, false);
    let mut right = width - EDGE;
    for draft in &drafts {
        let map = x_map(&draft.panel.x, draft.x_range, left, right, NUMBER, &x_fonts);
        if let Some(tick) = map.division.major.last() {
            right = right.min(width - 12.0 - 0.5 * x_fonts(&tick.label));
        }
    }
    if right - left < LEAST_PLOT {
        return Err(Error::Room {
            panel: 1,
            width: right - left,
            height: drafts[0].height,
        });
    }

    let mut plots = Vec::new();
    for ((draft, y), inset_y) in drafts.into_iter().zip(y_maps).zip(inset_ranges(figure)?) {
        let frame = Box2::new(left, draft.top, right, draft.top + draft.height);
        let x = x_map(&draft.panel.x, draft.x_range, left, right, NUMBER, &x_fonts);
        plots.push(Plot {
            panel: draft.panel,
            frame,
            x,
            y,
            numbered: draft.numbered,
            number_size: NUMBER,
            x_label: draft.x_label,
            y_label: draft.y_label,
            legend: place_legend(draft.legend, fonts, right),
            head_rows: draft.rows,
            inset_y,
        });
    }
    Ok(Sheet {
        width,
        height,
        title,
        subtitle,
        foot,
        plots,
        label_x: EDGE + 0.5 * label_width - 4.0,
    })
}

/// Shares the height between `top` and `bottom` out among the panels.
fn draft<'f>(
    figure: &'f Figure,
    fonts: &Fonts,
    text_width: f64,
    top: f64,
    bottom: f64,
) -> Result<Vec<Draft<'f>>, Error> {
    let last = figure.panels.len() - 1;
    let mut drafts = Vec::new();
    let mut fixed = BETWEEN * last as f64;
    for (i, (panel, x_range)) in figure.panels.iter().zip(x_ranges(figure)?).enumerate() {
        let numbered = !figure.shared_x || i == last;
        let x_label = if numbered {
            fonts.wrap(&panel.x.label, AXIS_LABEL, false, text_width - 110.0, 2)
        } else {
            Vec::new()
        };
        // The width is not known yet; text is flowed into a little less.
        let (legend, rows) = flow_legend(panel, fonts, text_width - 120.0);
        fixed += head_height(rows) + foot_height_of(numbered, x_label.len());
        drafts.push(Draft {
            panel,
            x_range,
            numbered,
            y_label: Vec::new(),
            x_label,
            legend,
            rows,
            top: 0.0,
            height: 0.0,
        });
    }
    let shares: f64 = figure.panels.iter().map(|p| p.height_share).sum();
    let mut at = top;
    for (i, draft) in drafts.iter_mut().enumerate() {
        draft.height = (bottom - top - fixed) * draft.panel.height_share / shares;
        draft.top = at + head_height(draft.rows);
        at = draft.top
            + draft.height
            + foot_height_of(draft.numbered, draft.x_label.len())
            + BETWEEN;
        if draft.height < LEAST_PLOT {
            return Err(Error::Room {
                panel: i + 1,
                width: text_width,
                height: draft.height,
            });
        }
        let room = draft.height + 20.0;
        draft.y_label = fonts.wrap(&draft.panel.y.label, AXIS_LABEL, false, room, 2);
    }
    Ok(drafts)
}

/// The panel's axes for a magnified detail, if its place has room for them.
pub(crate) fn detail<'f>(
    plot: &Plot<'f>,
    x: (f64, f64),
    place: Box2,
    fonts: &Fonts,
) -> Option<Plot<'f>> {
    let panel = plot.panel;
    let extent = |text: &str| fonts.width(text, INSET_NUMBER, false);
    let top = place.top + 12.0;
    let bottom = place.bottom - 27.0;
    if bottom - top < 0.5 * LEAST_PLOT {
        return None;
    }
    let y = y_map(&panel.y, plot.inset_y, top, bottom, INSET_NUMBER);
    let number_width = y
        .division
        .major
        .iter()
        .map(|t| extent(&t.label))
        .fold(0.0, f64::max);
    let left = place.left + 8.0 + number_width + 8.0;
    let right = place.right - 22.0;
    (right - left >= LEAST_PLOT).then(|| Plot {
        panel,
        frame: Box2::new(left, top, right, bottom),
        x: x_map(&panel.x, x, left, right, INSET_NUMBER, &extent),
        y,
        numbered: true,
        number_size: INSET_NUMBER,
        x_label: Vec::new(),
        y_label: Vec::new(),
        legend: Vec::new(),
        head_rows: 0,
        inset_y: plot.inset_y,
    })
}

fn y_map(axis: &Axis, range: (f64, f64), top: f64, bottom: f64, size: f64) -> AxisMap {
    // Decades cannot be halved, so they may stand closer.
    let gap = if axis.scale == Scale::Log { 1.6 } else { 2.4 } * size;
    let division = divide(range, axis.scale, axis.ticks, bottom - top, gap, &|_| {
        cap_height(size)
    });
    AxisMap {
        lower: range.0,
        upper: range.1,
        scale: axis.scale,
        from: bottom,
        to: top,
        division,
    }
}

fn x_map(
    axis: &Axis,
    range: (f64, f64),
    left: f64,
    right: f64,
    size: f64,
    extent: &dyn Fn(&str) -> f64,
) -> AxisMap {
    let division = divide(
        range,
        axis.scale,
        axis.ticks,
        right - left,
        2.4 * size,
        extent,
    );
    AxisMap {
        lower: range.0,
        upper: range.1,
        scale: axis.scale,
        from: left,
        to: right,
        division,
    }
}

fn head_height(rows: usize) -> f64 {
    if rows == 0 {
        10.0
    } else {
        rows as f64 * LEGEND_PITCH + 10.0
    }
}

fn foot_height_of(numbered: bool, label_lines: usize) -> f64 {
    if !numbered {
        return 6.0;
    }
    let numbers = NUMBER_GAP + cap_height(NUMBER) + 4.0;
    if label_lines == 0 {
        numbers
    } else {
        numbers + 10.0 + label_lines as f64 * AXIS_PITCH
    }
}

/// Legend entries by rows, and the rows needed above the plot with the heading.
fn flow_legend<'f>(panel: &'f Panel, fonts: &Fonts, width: f64) -> (Vec<Vec<Key<'f>>>, usize) {
    let heading = if panel.heading.is_empty() {
        0.0
    } else {
        fonts.width(&panel.heading, HEADING, true) + 30.0
    };
    let mut rows: Vec<Vec<Key<'f>>> = Vec::new();
    if panel.legend == LegendPlace::Above {
        let mut used = f64::INFINITY;
        for key in keys(panel) {
            let own = key.width(fonts);
            if used + own > width {
                // The heading keeps the left of the first row to itself.
                used = if rows.is_empty() { heading } else { 0.0 };
                rows.push(Vec::new());
                if used + own > width {
                    used = 0.0;
                    rows.push(Vec::new());
                }
            }
            used += own;
            if let Some(row) = rows.last_mut() {
                row.push(key);
            }
        }
    }
    let count = rows.len().max(usize::from(!panel.heading.is_empty()));
    (rows, count)
}

fn place_legend<'f>(rows: Vec<Vec<Key<'f>>>, fonts: &Fonts, right: f64) -> LegendRows<'f> {
    rows.into_iter()
        .map(|row| {
            let mut at = right - row.iter().map(|k| k.width(fonts)).sum::<f64>() + Key::AIR;
            row.into_iter()
                .map(|key| {
                    let here = at;
                    at += key.width(fonts);
                    (here, key)
                })
                .collect()
        })
        .collect()
}

fn x_ranges(figure: &Figure) -> Result<Vec<(f64, f64)>, Error> {
    let range = |panel: &Panel, extent: Extent| {
        let dots = panel
            .series
            .iter()
            .any(|s| !matches!(s.style, SeriesStyle::Line | SeriesStyle::Area));
        let pad = if dots { 0.02 } else { 0.0 };
        extent.range(&panel.x, (pad, pad))
    };
    if figure.shared_x {
        let all = figure
            .panels
            .iter()
            .map(Extent::of_x)
            .fold(Extent::NONE, Extent::with);
        let given = figure
            .panels
            .iter()
            .find(|p| p.x.range.is_some())
            .unwrap_or(&figure.panels[0]);
        let shared = range(given, all)?;
        return Ok(vec![shared; figure.panels.len()]);
    }
    figure
        .panels
        .iter()
        .map(|p| range(p, Extent::of_x(p)))
        .collect()
}

fn y_ranges(figure: &Figure, drafts: &[Draft<'_>]) -> Result<Vec<(f64, f64)>, Error> {
    let extents: Vec<Extent> = drafts
        .iter()
        .map(|d| Extent::of_y(d.panel, d.x_range))
        .collect();
    let pads = drafts.iter().map(|d| {
        let lanes = d
            .panel
            .marks
            .iter()
            .filter(|m| m.height == MarkHeight::Lane)
            .count();
        let mut above = 0.05 * d.height + LANE * lanes as f64;
        if !d.panel.labels.is_empty() {
            above += 42.0;
        }
        (0.05, (above / d.height).min(0.5))
    });
    let pads: Vec<(f64, f64)> = pads.collect();
    if figure.shared_y {
        let all = extents.into_iter().fold(Extent::NONE, Extent::with);
        let pad = pads
            .iter()
            .fold((0.0_f64, 0.0_f64), |a, b| (a.0.max(b.0), a.1.max(b.1)));
        let given = drafts
            .iter()
            .find(|d| d.panel.y.range.is_some())
            .unwrap_or(&drafts[0]);
        let shared = all.range(&given.panel.y, pad)?;
        return Ok(vec![shared; drafts.len()]);
    }
    drafts
        .iter()
        .zip(extents)
        .zip(pads)
        .map(|((d, e), pad)| e.range(&d.panel.y, pad))
        .collect()
}

/// What each panel's inset shows of its y axis; one stretch for all where the
/// panels share theirs, so that details can be compared as well.
fn inset_ranges(figure: &Figure) -> Result<Vec<(f64, f64)>, Error> {
    let extent = |panel: &Panel| {
        panel
            .inset
            .as_ref()
            .map_or(Extent::NONE, |i| Extent::of_y(panel, i.x))
    };
    let all = figure
        .panels
        .iter()
        .map(extent)
        .fold(Extent::NONE, Extent::with);
    let range = |panel: &Panel| {
        let axis = Axis {
            range: panel.inset.as_ref().and_then(|i| i.y),
            ..panel.y.clone()
        };
        let seen = if figure.shared_y { all } else { extent(panel) };
        seen.range(&axis, (0.06, 0.08))
    };
    figure.panels.iter().map(range).collect()
}

/// Refuses what cannot be drawn, before anything is measured.
fn check(figure: &Figure) -> Result<(), Error> {
    if figure.panels.is_empty() {
        return Err(Error::NoPanels);
    }
    let same = |name: &str, expected: usize, found: usize| {
        if found == expected {
            Ok(())
        } else {
            Err(Error::Length {
                name: name.to_owned(),
                found,
                expected,
            })
        }
    };
    let within = |what, found: f64, (lower, upper): (f64, f64), expected| {
        if found >= lower && found <= upper {
            Ok(())
        } else {
            Err(Error::Value {
                what,
                found,
                expected,
            })
        }
    };
    for panel in &figure.panels {
        within(
            "height share of a panel",
            panel.height_share,
            (0.01, 100.0),
            "0.01 to 100",
        )?;
        for axis in [&panel.x, &panel.y] {
            if let Ticks::Every(step) = axis.ticks {
                within(
                    "step of an axis",
                    step,
                    (f64::MIN_POSITIVE, 1e300),
                    "above 0",
                )?;
            }
        }
        if figure.panels[0].x.scale != panel.x.scale && figure.shared_x
            || figure.panels[0].y.scale != panel.y.scale && figure.shared_y
        {
            let found = f64::from(u8::from(panel.x.scale == Scale::Log));
            return Err(Error::Value {
                what: "scale of a shared axis",
                found,
                expected: "the same in every panel",
            });
        }
        for s in &panel.series {
            same(&s.name, s.x.len(), s.y.len())?;
        }
        for b in &panel.bands {
            same(&b.name, b.x.len(), b.lower.len())?;
            same(&b.name, b.x.len(), b.upper.len())?;
        }
        for m in &panel.marks {
            if let MarkHeight::At(y) = &m.height {
                same(&m.name, m.x.len(), y.len())?;
            }
        }
        if let Some(inset) = &panel.inset {
            within(
                "width share of an inset",
                inset.share.0,
                (0.15, 0.8),
                "0.15 to 0.8",
            )?;
            within(
                "height share of an inset",
                inset.share.1,
                (0.15, 0.8),
                "0.15 to 0.8",
            )?;
            Extent::NONE.range(
                &Axis {
                    range: Some(inset.x),
                    ..panel.x.clone()
                },
                (0.0, 0.0),
            )?;
        }
    }
    Ok(())
}
