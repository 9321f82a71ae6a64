use std::collections::BTreeSet;
use std::convert::Infallible;
use std::fmt::Write;

use ab_glyph::GlyphId;
use plotters_backend::{
    BackendColor, BackendCoord, BackendStyle, BackendTextStyle, DrawingBackend, DrawingErrorKind,
    FontStyle,
};

use crate::bitmap::checked;
use crate::figure::{Figure, FigureSize};
use crate::font::{Fonts, Pen, cap_height};
use crate::raster::{baseline, turn};
use crate::{Error, sheet};

type Drawn = Result<(), DrawingErrorKind<Infallible>>;

/// Units of a glyph's outline in the file, per em.
const GLYPH_UNITS: f64 = 2048.0;

/// The SVG as it grows.
pub(crate) struct Svg {
    body: String,
    letters: BTreeSet<(bool, u16)>,
    grid: (u32, u32),
}

impl Svg {
    pub(crate) fn new(grid: (u32, u32)) -> Self {
        Self {
            body: String::new(),
            letters: BTreeSet::new(),
            grid,
        }
    }

    /// The whole file, `width` × `height` in CSS pixels.
    pub(crate) fn finish(self, fonts: &Fonts, title: &str, width: u32, height: u32) -> String {
        let (w, h) = self.grid;
        let mut out = String::with_capacity(self.body.len() + 65_536);
        let _ = write!(
            out,
            "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width}\" height=\"{height}\" \
             viewBox=\"0 0 {w} {h}\" role=\"img\">\n<title>{}</title>\n<defs>\n",
            escaped(title)
        );
        for &(bold, glyph) in &self.letters {
            let mut pen = TextPen(String::new());
            fonts.outline(GlyphId(glyph), bold, &mut pen);
            let _ = writeln!(
                out,
                "<path id=\"{}\" d=\"{}\"/>",
                letter_name(bold, glyph),
                pen.0
            );
        }
        let _ = write!(
            out,
            "</defs>\n<rect width=\"{w}\" height=\"{h}\" fill=\"#ffffff\"/>\n\
             <g fill=\"none\" stroke-linejoin=\"round\">\n{}</g>\n</svg>\n",
            self.body
        );
        out
    }
}

/// A plotters backend that writes paths; letters become references to their
/// outlines, so that no font is needed where the picture is opened.
///
/// Plotters' own SVG backend would name a font and leave its metrics, and so
/// every overlap, to the reader's machine.
pub(crate) struct Vector<'a> {
    pub(crate) svg: &'a mut Svg,
    pub(crate) fonts: &'a Fonts,
}

fn letter_name(bold: bool, glyph: u16) -> String {
    format!("shaftwise-{}{glyph}", if bold { 'b' } else { 'r' })
}

fn escaped(text: &str) -> String {
    text.replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
        .replace('"', "&quot;")
}

fn colour(attribute: &str, colour: BackendColor) -> String {
    let (r, g, b) = colour.rgb;
    let mut text = format!("{attribute}=\"#{r:02x}{g:02x}{b:02x}\"");
    if colour.alpha < 1.0 {
        let _ = write!(
            text,
            " {attribute}-opacity=\"{:.3}\"",
            colour.alpha.max(0.0)
        );
    }
    text
}

/// Moves in whole units, each relative to the one before: shorter by half.
fn moves(points: impl IntoIterator<Item = BackendCoord>) -> String {
    let mut text = String::new();
    let mut last: Option<BackendCoord> = None;
    for (x, y) in points {
        match last {
            None => {
                let _ = write!(text, "M{x} {y}l");
            }
            Some((x0, y0)) => {
                let _ = write!(text, "{} {} ", x - x0, y - y0);
            }
        }
        last = Some((x, y));
    }
    text.truncate(text.trim_end().len());
    text
}

struct TextPen(String);

impl TextPen {
    fn put(&mut self, letter: char, numbers: &[f64]) {
        self.0.push(letter);
        for (i, number) in numbers.iter().enumerate() {
            let _ = write!(
                self.0,
                "{}{:.0}",
                if i == 0 { "" } else { " " },
                number * GLYPH_UNITS
            );
        }
    }
}

impl Pen for TextPen {
    fn move_to(&mut self, x: f64, y: f64) {
        self.put('M', &[x, y]);
    }
    fn line_to(&mut self, x: f64, y: f64) {
        self.put('L', &[x, y]);
    }
    fn quad_to(&mut self, x1: f64, y1: f64, x: f64, y: f64) {
        self.put('Q', &[x1, y1, x, y]);
    }
    fn cubic_to(&mut self, x1: f64, y1: f64, x2: f64, y2: f64, x: f64, y: f64) {
        self.put('C', &[x1, y1, x2, y2, x, y]);
    }
    fn close(&mut self) {
        self.0.push('Z');
    }
}

impl DrawingBackend for Vector<'_> {
    type ErrorType = Infallible;

    fn get_size(&self) -> (u32, u32) {
        self.svg.grid
    }

    fn ensure_prepared(&mut self) -> Drawn {
        Ok(())
    }

    fn present(&mut self) -> Drawn {
        Ok(())
    }

    fn draw_pixel(&mut self, (x, y): BackendCoord, paint: BackendColor) -> Drawn {
        let _ = writeln!(
            self.svg.body,
            "<rect x=\"{x}\" y=\"{y}\" width=\"1\" height=\"1\" {}/>",
            colour("fill", paint)
        );
        Ok(())
    }

    fn draw_line<S: BackendStyle>(
        &mut self,
        from: BackendCoord,
        to: BackendCoord,
        style: &S,
    ) -> Drawn {
        self.draw_path([from, to], style)
    }

    fn draw_rect<S: BackendStyle>(
        &mut self,
        (x0, y0): BackendCoord,
        (x1, y1): BackendCoord,
        style: &S,
        fill: bool,
    ) -> Drawn {
        if fill {
            self.fill_polygon([(x0, y0), (x1, y0), (x1, y1), (x0, y1)], style)
        } else {
            self.draw_path([(x0, y0), (x1, y0), (x1, y1), (x0, y1), (x0, y0)], style)
        }
    }

    fn draw_path<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        path: I,
        style: &S,
    ) -> Drawn {
        let _ = writeln!(
            self.svg.body,
            "<path d=\"{}\" {} stroke-width=\"{}\"/>",
            moves(path),
            colour("stroke", style.color()),
            style.stroke_width()
        );
        Ok(())
    }

    fn draw_circle<S: BackendStyle>(
        &mut self,
        (x, y): BackendCoord,
        radius: u32,
        style: &S,
        fill: bool,
    ) -> Drawn {
        let paint = if fill {
            colour("fill", style.color())
        } else {
            format!(
                "{} stroke-width=\"{}\"",
                colour("stroke", style.color()),
                style.stroke_width()
            )
        };
        let _ = writeln!(
            self.svg.body,
            "<circle cx=\"{x}\" cy=\"{y}\" r=\"{radius}\" {paint}/>"
        );
        Ok(())
    }

    fn fill_polygon<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        corners: I,
        style: &S,
    ) -> Drawn {
        let _ = writeln!(
            self.svg.body,
            "<path d=\"{}z\" {}/>",
            moves(corners),
            colour("fill", style.color())
        );
        Ok(())
    }

    fn draw_text<S: BackendTextStyle>(&mut self, text: &str, style: &S, at: BackendCoord) -> Drawn {
        let bold = matches!(style.style(), FontStyle::Bold);
        let set = self.fonts.set(text, bold);
        let (x, y) = baseline(style, set.width_em * style.size());
        let (c, s) = turn(&style.transform());
        let k = style.size() / GLYPH_UNITS;
        let (x, y) = (
            f64::from(at.0) + c * x - s * y,
            f64::from(at.1) + s * x + c * y,
        );
        let _ = write!(
            self.svg.body,
            "<g aria-label=\"{}\" {} transform=\"matrix({:.5} {:.5} {:.5} {:.5} {x:.1} {y:.1})\">",
            escaped(text),
            colour("fill", style.color()),
            c * k,
            s * k,
            -s * k,
            c * k
        );
        for (glyph, offset) in set.letters {
            self.svg.letters.insert((bold, glyph.0));
            let _ = write!(
                self.svg.body,
                "<use href=\"#{}\" x=\"{:.0}\"/>",
                letter_name(bold, glyph.0),
                offset * GLYPH_UNITS
            );
        }
        self.svg.body.push_str("</g>\n");
        Ok(())
    }

    fn estimate_text_size<S: BackendTextStyle>(
        &self,
        text: &str,
        style: &S,
    ) -> Result<(u32, u32), DrawingErrorKind<Infallible>> {
        let bold = matches!(style.style(), FontStyle::Bold);
        let width = self.fonts.width(text, style.size(), bold);
        Ok((width.ceil() as u32, cap_height(style.size()).ceil() as u32))
    }
}

/// Draws a figure as SVG, letters as outlines, so that it looks the same
/// wherever it is opened.
///
/// # Errors
///
/// As [`crate::render`].
pub fn render_svg(figure: &Figure) -> Result<String, Error> {
    let FigureSize { width, height } = checked(figure.size)?;
    let fonts = Fonts::load()?;
    let mut svg = Svg::new(sheet::grid(figure));
    sheet::draw(
        figure,
        Vector {
            svg: &mut svg,
            fonts: &fonts,
        },
        &fonts,
    )?;
    Ok(svg.finish(&fonts, &figure.title, width, height))
}
