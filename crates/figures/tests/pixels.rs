//! What a reader sees, checked on decoded pixels.
#![allow(clippy::unwrap_used)]

#[allow(dead_code, unreachable_pub)]
#[path = "../examples/gallery.rs"]
mod gallery;

use std::collections::HashSet;
use std::io::Cursor;

use shaftwise_figures::{
    Axis, Band, BandShade, Error, Figure, FigureSize, Inset, MarkHeight, Marks, Panel, PeakLabel,
    RenderOptions, Role, Rule, RuleWay, Series, SeriesStyle, Span, SpanKind, Symbol, render,
    render_svg,
};

const PRIMARY: [u8; 3] = [0x10, 0x36, 0x60];
const SECONDARY: [u8; 3] = [0xe2, 0x8c, 0x1e];

struct Picture {
    width: usize,
    height: usize,
    rgb: Vec<u8>,
}

impl Picture {
    fn of(figure: &Figure, dpi: f64) -> Self {
        Self::decode(&render(figure, &RenderOptions { dpi }).unwrap()).0
    }

    fn decode(bytes: &[u8]) -> (Self, png::Info<'static>) {
        let mut reader = png::Decoder::new(Cursor::new(bytes)).read_info().unwrap();
        let mut rgb = vec![0; reader.output_buffer_size().unwrap()];
        let frame = reader.next_frame(&mut rgb).unwrap();
        assert_eq!(
            (frame.color_type, frame.bit_depth),
            (png::ColorType::Rgb, png::BitDepth::Eight)
        );
        let picture = Self {
            width: frame.width as usize,
            height: frame.height as usize,
            rgb,
        };
        (picture, reader.info().clone())
    }

    fn at(&self, x: usize, y: usize) -> [u8; 3] {
        let i = 3 * (y * self.width + x);
        [self.rgb[i], self.rgb[i + 1], self.rgb[i + 2]]
    }

    /// Columns and rows of the pixels within 40 of a colour in every channel.
    fn near(&self, colour: [u8; 3]) -> Vec<(usize, usize)> {
        let like = |p: [u8; 3]| p.iter().zip(colour).all(|(&a, b)| a.abs_diff(b) <= 40);
        let all = (0..self.height).flat_map(|y| (0..self.width).map(move |x| (x, y)));
        all.filter(|&(x, y)| like(self.at(x, y))).collect()
    }

    /// The same inside the plot of a figure without title and foot.
    fn curve(&self, colour: [u8; 3]) -> Vec<(usize, usize)> {
        let mut found = self.near(colour);
        found.retain(|&(x, y)| {
            x > self.width / 9 && y > self.height / 40 && y < self.height * 9 / 10
        });
        found
    }
}

fn figure(panel: Panel) -> Figure {
    Figure {
        panels: vec![panel],
        ..Figure::default()
    }
}

fn panel() -> Panel {
    Panel::new(
        Axis::linear("time, s").over(0.0, 10.0),
        Axis::linear("level, mm/s").over(-2.0, 2.0),
    )
}

fn with_line(role: Role, x: Vec<f64>, y: Vec<f64>) -> Figure {
    let mut panel = panel();
    panel.series.push(Series::line("", role, x, y));
    figure(panel)
}

#[test]
fn a_page_has_its_size_resolution_and_title() {
    let titled = Figure {
        title: "Pump P-3".to_owned(),
        ..figure(panel())
    };
    let bytes = render(&titled, &RenderOptions::default()).unwrap();
    let (picture, info) = Picture::decode(&bytes);
    assert_eq!((picture.width, picture.height), (2400, 1600));
    // 300 / 0.0254 m = 11811.02 pixels per metre
    let dims = info.pixel_dims.unwrap();
    assert_eq!(
        (dims.xppu, dims.yppu, dims.unit),
        (11811, 11811, png::Unit::Meter)
    );
    assert_eq!(info.utf8_text[0].get_text().unwrap(), "Pump P-3");
    let slide = Figure {
        size: FigureSize::SLIDE,
        ..figure(panel())
    };
    let picture = Picture::of(&slide, 150.0);
    assert_eq!((picture.width, picture.height), (1920, 1080));
}

#[test]
fn the_ground_is_white_and_nothing_reaches_the_edge() {
    for (name, figure) in gallery::figures() {
        let long = "a very long sentence that goes on and on ".repeat(12);
        let crowded = Figure {
            title: long.clone(),
            subtitle: long.clone(),
            foot: vec![long],
            ..figure.clone()
        };
        for figure in [figure, crowded] {
            let picture = Picture::of(&figure, 150.0);
            let edge = 6;
            for y in 0..picture.height {
                for x in 0..picture.width {
                    let outside = x < edge
                        || y < edge
                        || x >= picture.width - edge
                        || y >= picture.height - edge;
                    assert!(
                        !outside || picture.at(x, y) == [255; 3],
                        "{name}: ink at {x}, {y}"
                    );
                }
            }
            let white = picture.rgb.chunks(3).filter(|p| *p == [255; 3]).count();
            assert!(
                white * 10 > picture.width * picture.height * 6,
                "{name}: {white}"
            );
        }
    }
}

/// Plotters' own rasteriser fills a thick polyline as one polygon and throws
/// false peaks above a dense trace (its issue 549).
#[test]
fn a_dense_line_never_rises_above_its_true_maximum() {
    let count = 200_000_u32;
    let x: Vec<f64> = (0..count)
        .map(|i| 10.0 * f64::from(i) / f64::from(count))
        .collect();
    let y = (0..count)
        .map(|i| f64::from(i.wrapping_mul(2_654_435_761)) / f64::from(u32::MAX) * 2.0 - 1.0);
    let dense = Picture::of(&with_line(Role::Primary, x, y.collect()), 300.0);
    let top = |picture: &Picture| picture.curve(PRIMARY).iter().map(|p| p.1).min().unwrap();
    let bottom = |picture: &Picture| picture.curve(PRIMARY).iter().map(|p| p.1).max().unwrap();
    let level = |y: f64| {
        Picture::of(
            &with_line(Role::Primary, vec![0.0, 10.0], vec![y; 2]),
            300.0,
        )
    };
    // The same pen on the same level; a round join is at most as high.
    assert!(top(&dense) >= top(&level(1.0)) && bottom(&dense) <= bottom(&level(-1.0)));
    assert!(
        top(&dense) <= top(&level(1.0)) + 2,
        "the maximum itself is drawn"
    );
    // No holes: a column of the plot is inked from top to bottom.
    let (first, last) = (top(&dense) + 8, bottom(&dense) - 8);
    let inked = dense
        .curve(PRIMARY)
        .into_iter()
        .filter(|p| p.0 == 1200 && p.1 >= first && p.1 < last)
        .count();
    assert_eq!(inked, last - first);
}

#[test]
fn a_lone_peak_in_a_million_points_is_drawn() {
    let count = 1_000_000_u32;
    let x: Vec<f64> = (0..count)
        .map(|i| 10.0 * f64::from(i) / f64::from(count))
        .collect();
    let mut y = vec![0.0; count as usize];
    y[654_321] = 1.9;
    let spike = Picture::of(&with_line(Role::Primary, x, y), 150.0);
    let flat = Picture::of(
        &with_line(Role::Primary, vec![0.0, 10.0], vec![1.9; 2]),
        150.0,
    );
    let top = |p: &Picture| p.curve(PRIMARY).iter().map(|p| p.1).min().unwrap();
    assert!(
        top(&spike) <= top(&flat) + 2,
        "{} {}",
        top(&spike),
        top(&flat)
    );
}

#[test]
fn a_nan_leaves_a_gap() {
    let x: Vec<f64> = (0..=100).map(|i| f64::from(i) / 10.0).collect();
    let y = x
        .iter()
        .map(|&x| if x > 4.0 && x < 6.0 { f64::NAN } else { 1.0 })
        .collect();
    let picture = Picture::of(&with_line(Role::Primary, x, y), 150.0);
    let columns: HashSet<usize> = picture.curve(PRIMARY).into_iter().map(|p| p.0).collect();
    let gap: Vec<usize> = (200..1100).filter(|x| !columns.contains(x)).collect();
    // A fifth of the plot's width, which is between 1000 and 1200 pixels.
    assert!((195..=245).contains(&gap.len()), "{}", gap.len());
    assert_eq!(gap[gap.len() - 1] - gap[0] + 1, gap.len(), "one gap");
}

#[test]
fn the_same_figure_gives_the_same_bytes() {
    for (name, figure) in gallery::figures() {
        let options = RenderOptions { dpi: 100.0 };
        assert_eq!(
            render(&figure, &options).unwrap(),
            render(&figure, &options).unwrap(),
            "{name}"
        );
        assert_eq!(
            render_svg(&figure).unwrap(),
            render_svg(&figure).unwrap(),
            "{name}"
        );
    }
}

#[test]
fn a_page_of_lines_is_small() {
    for (name, figure) in gallery::figures() {
        let bytes = render(&figure, &RenderOptions::default()).unwrap().len();
        assert!(bytes < 400_000, "{name}: {bytes} bytes");
    }
}

#[test]
fn smeared_and_tracked_stay_apart_in_colour_and_in_grey() {
    let mut both = panel();
    for (role, level) in [(Role::Primary, 1.0), (Role::Secondary, -1.0)] {
        both.series
            .push(Series::line("", role, vec![0.0, 10.0], vec![level; 2]));
    }
    let picture = Picture::of(&figure(both), 150.0);
    let (tracked, smeared) = (picture.curve(PRIMARY), picture.curve(SECONDARY));
    assert!(tracked.len() > 900 && smeared.len() > 500);
    let grey = |pixels: &[(usize, usize)]| {
        let luma = pixels.iter().map(|&(x, y)| {
            let [r, g, b] = picture.at(x, y).map(f64::from);
            0.299 * r + 0.587 * g + 0.114 * b
        });
        luma.sum::<f64>() / pixels.len() as f64
    };
    assert!(grey(&smeared) - grey(&tracked) > 80.0);
    // Solid against dashed: every column here, two in three there.
    let columns =
        |pixels: &[(usize, usize)]| pixels.iter().map(|p| p.0).collect::<HashSet<_>>().len();
    let share = columns(&smeared) as f64 / columns(&tracked) as f64;
    assert!((0.45..0.8).contains(&share), "{share}");
}

#[test]
fn decades_are_evenly_spread_on_a_log_axis() {
    let mut log = Panel::new(
        Axis::linear("x").over(0.0, 1.0),
        Axis::log("y").over(0.1, 10_000.0),
    );
    for level in [1.0, 10.0, 100.0, 1000.0] {
        log.series.push(Series::line(
            "",
            Role::Primary,
            vec![0.0, 1.0],
            vec![level; 2],
        ));
    }
    // Gaps by rule: a logarithmic axis has no place for these.
    log.series.push(Series::line(
        "",
        Role::Primary,
        vec![0.0, 0.5, 1.0],
        vec![0.0, -1.0, 0.0],
    ));
    let picture = Picture::of(&figure(log), 150.0);
    let mut rows: Vec<usize> = picture
        .curve(PRIMARY)
        .into_iter()
        .filter(|p| p.0 == 700)
        .map(|p| p.1)
        .collect();
    rows.dedup_by(|a, b| a.abs_diff(*b) <= 2);
    assert_eq!(rows.len(), 4, "{rows:?}");
    let steps: Vec<usize> = rows.windows(2).map(|w| w[1] - w[0]).collect();
    assert!(steps.iter().all(|s| s.abs_diff(steps[0]) <= 1), "{steps:?}");
}

#[test]
fn a_label_puts_ink_above_its_peak_and_none_below_the_curve() {
    let plain = with_line(
        Role::Primary,
        vec![0.0, 4.9, 5.0, 5.1, 10.0],
        vec![0.0, 0.0, 1.0, 0.0, 0.0],
    );
    let mut labelled = plain.clone();
    let text = "2.00 · 1.31 mm/s".to_owned();
    labelled.panels[0].labels.push(PeakLabel {
        x: 5.0,
        y: 1.0,
        text,
        role: Role::Primary,
    });
    let (before, after) = (Picture::of(&plain, 150.0), Picture::of(&labelled, 150.0));
    let pixels = (0..800).flat_map(|y| (0..1200).map(move |x| (x, y)));
    let changed: Vec<_> = pixels
        .filter(|&(x, y)| before.at(x, y) != after.at(x, y))
        .collect();
    let peak = before
        .curve(PRIMARY)
        .into_iter()
        .min_by_key(|p| p.1)
        .unwrap();
    assert!(changed.len() > 300, "{}", changed.len());
    assert!(
        changed
            .iter()
            .all(|p| p.1 < peak.1 + 6 && p.1 + 40 > peak.1)
    );
    let (left, right) = (
        changed.iter().map(|p| p.0).min().unwrap(),
        changed.iter().map(|p| p.0).max().unwrap(),
    );
    assert!((left + right) / 2 > peak.0 - 4 && (left + right) / 2 < peak.0 + 4);
}

#[test]
fn of_two_labels_at_one_point_the_first_stays_there() {
    let mut crowded = panel();
    for name in ["first", "second", "third"] {
        crowded.labels.push(PeakLabel {
            x: 5.0,
            y: 1.0,
            text: name.repeat(40),
            role: Role::Primary,
        });
    }
    let svg = render_svg(&figure(crowded)).unwrap();
    assert!(
        !svg.contains("firstfirst"),
        "wider than the plot, so left out"
    );
    let mut fitting = panel();
    for name in ["first", "second"] {
        fitting.labels.push(PeakLabel {
            x: 5.0,
            y: 1.0,
            text: name.repeat(3),
            role: Role::Primary,
        });
    }
    let svg = render_svg(&figure(fitting)).unwrap();
    assert!(svg.contains("firstfirst") && svg.contains("secondsecond"));
}

#[test]
fn an_svg_is_balanced_complete_and_carries_its_words() {
    for (name, figure) in gallery::figures() {
        let svg = render_svg(&figure).unwrap();
        assert!(
            svg.starts_with("<svg ") && svg.ends_with("</svg>\n"),
            "{name}"
        );
        assert!(svg.contains("viewBox=\"0 0 9600 6400\""));
        assert_eq!(svg.matches("<g ").count(), svg.matches("</g>").count());
        assert!(!svg.contains("NaN") && !svg.contains("inf"), "{name}");
        let label = figure.title.replace('&', "&amp;");
        assert!(svg.contains(&format!("aria-label=\"{label}\"")), "{name}");
        for reference in svg.split("href=\"#").skip(1) {
            let id = reference.split('"').next().unwrap();
            assert!(svg.contains(&format!("id=\"{id}\"")), "{name}: {id}");
        }
    }
    let quoted = Figure {
        title: "a < b & \"c\"".to_owned(),
        ..figure(panel())
    };
    assert!(
        render_svg(&quoted)
            .unwrap()
            .contains("<title>a &lt; b &amp; &quot;c&quot;</title>")
    );
}

#[test]
fn odd_data_is_drawn_without_a_panic() {
    let nan = f64::NAN;
    let columns: [(&[f64], &[f64]); 9] = [
        (&[], &[]),
        (&[1.0], &[2.0]),
        (&[1.0, 2.0, 3.0], &[5.0, 5.0, 5.0]),
        (&[nan, nan], &[nan, nan]),
        (&[0.0, 1.0], &[1e308, -1e308]),
        (&[-1e300, 1e300], &[1e-320, 3e-320]),
        (&[0.0, 1.0, 2.0], &[f64::INFINITY, f64::NEG_INFINITY, 0.0]),
        (&[3.0, 1.0, 2.0], &[0.0, -4.0, 9.0]),
        (&[1e9, 1e9 + 1.0], &[1.0, 1.0 + 1e-15]),
    ];
    let styles = [
        SeriesStyle::Line,
        SeriesStyle::Area,
        SeriesStyle::Stem,
        SeriesStyle::Points,
        SeriesStyle::LinePoints,
    ];
    for (i, (x, y)) in columns.into_iter().enumerate() {
        let axes = [
            Axis::linear("a, b"),
            Axis::log("a, b"),
            Axis::linear("a, b").from_zero(),
            Axis::linear("a, b").every(1e-3),
        ];
        for (k, axis) in axes.iter().enumerate() {
            let mut panel = Panel::new(axes[(i + k) % 3].clone(), axis.clone());
            for style in styles {
                panel.series.push(Series {
                    name: "s".to_owned(),
                    x: x.to_vec(),
                    y: y.to_vec(),
                    role: Role::Secondary,
                    style,
                });
            }
            panel.bands.push(Band {
                name: "b".to_owned(),
                x: x.to_vec(),
                lower: y.to_vec(),
                upper: y.to_vec(),
                role: Role::Third,
                shade: BandShade::Strong,
            });
            panel.marks.push(Marks {
                name: "m".to_owned(),
                symbol: Symbol::Moved,
                role: Role::Warning,
                x: x.to_vec(),
                height: MarkHeight::Lane,
            });
            panel.marks.push(Marks {
                name: "n".to_owned(),
                symbol: Symbol::Ring,
                role: Role::Limit,
                x: x.to_vec(),
                height: MarkHeight::At(y.to_vec()),
            });
            for (&x, &y) in x.iter().zip(y) {
                panel.labels.push(PeakLabel {
                    x,
                    y,
                    text: "label · with more".to_owned(),
                    role: Role::Primary,
                });
                panel.rules.push(Rule {
                    at: y,
                    way: RuleWay::Across,
                    text: "rule".to_owned(),
                    role: Role::Limit,
                });
                panel.spans.push(Span {
                    from: x,
                    to: y,
                    kind: SpanKind::Excluded,
                    text: "span".to_owned(),
                });
            }
            panel.inset = Some(Inset::new(0.5, 1.5));
            let figure = figure(panel);
            let png = render(&figure, &RenderOptions { dpi: 75.0 });
            assert!(png.is_ok(), "column {i}, axis {k}: {png:?}");
            render_svg(&figure).unwrap();
        }
    }
}

#[test]
fn an_empty_panel_says_that_there_is_no_data() {
    assert!(
        render_svg(&figure(panel()))
            .unwrap()
            .contains("aria-label=\"no data\"")
    );
    let line = with_line(Role::Primary, vec![0.0, 1.0], vec![0.0, 1.0]);
    assert!(!render_svg(&line).unwrap().contains("no data"));
}

#[test]
fn what_cannot_be_drawn_is_refused_with_a_reason() {
    let refused = |figure: &Figure| render(figure, &RenderOptions::default()).unwrap_err();
    assert!(matches!(refused(&Figure::default()), Error::NoPanels));
    let uneven = with_line(Role::Primary, vec![0.0, 1.0], vec![0.0]);
    assert!(matches!(
        refused(&uneven),
        Error::Length {
            found: 1,
            expected: 2,
            ..
        }
    ));
    let upside = figure(Panel::new(
        Axis::linear("x").over(1.0, 0.0),
        Axis::linear("y"),
    ));
    assert_eq!(
        refused(&upside).to_string(),
        "range of axis \"x\" is 1 to 0, expected finite and ascending, above 0 on a logarithmic axis"
    );
    let crowded = Figure {
        panels: vec![panel(); 30],
        ..Figure::default()
    };
    assert!(matches!(refused(&crowded), Error::Room { .. }));
    let tiny = Figure {
        size: FigureSize {
            width: 10,
            height: 10,
        },
        ..figure(panel())
    };
    assert!(matches!(refused(&tiny), Error::Size { .. }));
    let mut steps = panel();
    steps.x = steps.x.every(f64::NAN);
    assert!(matches!(refused(&figure(steps)), Error::Value { .. }));
    let dpi = render(&figure(panel()), &RenderOptions { dpi: f64::NAN });
    assert!(matches!(dpi, Err(Error::Dpi { .. })));
}
