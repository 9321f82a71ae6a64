use plotters::coord::Shift;
use plotters::prelude::*;
use plotters::style::FontTransform;
use plotters::style::text_anchor::Pos;
use plotters_backend::BackendColor;

pub(crate) use plotters::style::text_anchor::{HPos, VPos};

use crate::Error;
use crate::font::Fonts;
use crate::palette::Colour;
use crate::polyline::{Box2, Point};

/// Virtual units per logical pixel, so that plotters' whole numbers do not show.
pub(crate) const FINE: f64 = 8.0;

/// Drawing in design pixels, through plotters. A design pixel is a logical
/// pixel on a page of 1200 × 800 and grows with the layout. Plotters' own font
/// table is never asked: text is measured by the font that draws it.
pub(crate) struct Canvas<'a, DB: DrawingBackend> {
    pub(crate) area: DrawingArea<DB, Shift>,
    pub(crate) fonts: &'a Fonts,
    /// Virtual units per design pixel.
    pub(crate) grid: f64,
}

/// How a line of text is set.
#[derive(Clone, Copy)]
pub(crate) struct Lettering {
    pub(crate) size: f64,
    pub(crate) bold: bool,
    pub(crate) colour: Colour,
    pub(crate) h: HPos,
    pub(crate) v: VPos,
    /// Reads from bottom to top.
    pub(crate) upright: bool,
}

impl Lettering {
    pub(crate) fn new(size: f64, colour: Colour, h: HPos, v: VPos) -> Self {
        Self {
            size,
            bold: false,
            colour,
            h,
            v,
            upright: false,
        }
    }
}

impl<DB: DrawingBackend> Canvas<'_, DB> {
    pub(crate) fn virtual_point(&self, (x, y): Point) -> (i32, i32) {
        let limit = |v: f64| (v * self.grid).round().clamp(-1e6, 1e6) as i32;
        (limit(x), limit(y))
    }

    fn style(&self, colour: Colour, alpha: f64, width: f64) -> ShapeStyle {
        let (r, g, b) = colour;
        ShapeStyle {
            color: RGBAColor(r, g, b, alpha),
            filled: true,
            stroke_width: (width * self.grid).round().max(1.0) as u32,
        }
    }

    pub(crate) fn line(&self, points: &[Point], colour: Colour, width: f64) -> Result<(), Error> {
        let path: Vec<_> = points.iter().map(|&p| self.virtual_point(p)).collect();
        let style = self.style(colour, 1.0, width);
        self.area
            .draw(&PathElement::new(path, style))
            .map_err(drawing)
    }

    pub(crate) fn polygon(
        &self,
        corners: &[Point],
        colour: Colour,
        alpha: f64,
    ) -> Result<(), Error> {
        if corners.len() < 3 {
            return Ok(());
        }
        let path: Vec<_> = corners.iter().map(|&p| self.virtual_point(p)).collect();
        let style = self.style(colour, alpha, 0.0);
        self.area.draw(&Polygon::new(path, style)).map_err(drawing)
    }

    pub(crate) fn rectangle(&self, place: Box2, colour: Colour, alpha: f64) -> Result<(), Error> {
        let (a, b) = ((place.left, place.top), (place.right, place.bottom));
        let corners = [self.virtual_point(a), self.virtual_point(b)];
        let style = self.style(colour, alpha, 0.0);
        self.area
            .draw(&Rectangle::new(corners, style))
            .map_err(drawing)
    }

    pub(crate) fn disc(&self, centre: Point, radius: f64, colour: Colour) -> Result<(), Error> {
        let style = self.style(colour, 1.0, 0.0);
        let radius = (radius * self.grid).round() as i32;
        self.area
            .draw(&Circle::new(self.virtual_point(centre), radius, style))
            .map_err(drawing)
    }

    pub(crate) fn text(&self, text: &str, at: Point, lettering: Lettering) -> Result<(), Error> {
        let (r, g, b) = lettering.colour;
        let weight = if lettering.bold {
            FontStyle::Bold
        } else {
            FontStyle::Normal
        };
        let turn = if lettering.upright {
            FontTransform::Rotate270
        } else {
            FontTransform::None
        };
        let font = ("sans-serif", lettering.size * self.grid)
            .into_font()
            .style(weight)
            .transform(turn);
        let style = TextStyle {
            font,
            color: BackendColor {
                alpha: 1.0,
                rgb: (r, g, b),
            },
            pos: Pos::new(lettering.h, lettering.v),
        };
        self.area
            .draw_text(text, &style, self.virtual_point(at))
            .map_err(drawing)
    }
}

/// The drawing layer's errors carry the backend's type; its words are enough.
pub(crate) fn drawing<E: std::error::Error + Send + Sync>(error: DrawingAreaErrorKind<E>) -> Error {
    Error::Draw {
        reason: error.to_string(),
    }
}
