use std::convert::Infallible;

use plotters_backend::text_anchor::{HPos, VPos};
use plotters_backend::{
    BackendColor, BackendCoord, BackendStyle, BackendTextStyle, DrawingBackend, DrawingErrorKind,
    FontStyle, FontTransform,
};
use tiny_skia::{
    Color, FillRule, LineCap, LineJoin, Paint, Path, PathBuilder, Pixmap, Rect, Stroke, Transform,
};

use crate::font::{Fonts, Pen, cap_height};

/// Most points of a path stroked at once.
const PART: usize = 256;

type Drawn = Result<(), DrawingErrorKind<Infallible>>;

/// A plotters backend on an anti-aliasing rasteriser.
///
/// Plotters counts in whole units, here a virtual grid finer than the pixels.
/// Its own rasteriser turns a thick polyline into one polygon and fills that,
/// which loses segments and grows false peaks where a dense trace crosses
/// itself; here every path is stroked.
pub(crate) struct Bitmap<'a> {
    pixmap: &'a mut Pixmap,
    fonts: &'a Fonts,
    grid: (u32, u32),
    /// Pixels per virtual unit.
    scale: f32,
}

impl<'a> Bitmap<'a> {
    pub(crate) fn new(pixmap: &'a mut Pixmap, fonts: &'a Fonts, grid: (u32, u32)) -> Self {
        let scale = pixmap.width() as f32 / grid.0 as f32;
        pixmap.fill(Color::WHITE);
        Self {
            pixmap,
            fonts,
            grid,
            scale,
        }
    }

    fn polyline(points: impl IntoIterator<Item = BackendCoord>, close: bool) -> Option<Path> {
        let mut path = PathBuilder::new();
        for (i, (x, y)) in points.into_iter().enumerate() {
            if i == 0 {
                path.move_to(x as f32, y as f32);
            } else {
                path.line_to(x as f32, y as f32);
            }
        }
        if close {
            path.close();
        }
        path.finish()
    }

    fn fill(&mut self, path: Option<Path>, colour: BackendColor) {
        if let Some(path) = path {
            self.pixmap.fill_path(
                &path,
                &paint(colour),
                FillRule::Winding,
                Transform::from_scale(self.scale, self.scale),
                None,
            );
        }
    }

    fn stroke(&mut self, path: Option<Path>, colour: BackendColor, width: u32) {
        if let Some(path) = path {
            let stroke = Stroke {
                width: width as f32,
                line_cap: LineCap::Butt,
                line_join: LineJoin::Round,
                ..Stroke::default()
            };
            let scale = Transform::from_scale(self.scale, self.scale);
            self.pixmap
                .stroke_path(&path, &paint(colour), &stroke, scale, None);
        }
    }
}

fn paint(colour: BackendColor) -> Paint<'static> {
    let mut paint = Paint::default();
    let (r, g, b) = colour.rgb;
    paint.set_color_rgba8(
        r,
        g,
        b,
        (colour.alpha.clamp(0.0, 1.0) * 255.0).round() as u8,
    );
    paint.anti_alias = true;
    paint
}

/// Where a line's baseline starts relative to its anchor, before it is turned.
/// Heights are those of a capital: the eye takes that for the text's box.
pub(crate) fn baseline<S: BackendTextStyle>(style: &S, width: f64) -> (f64, f64) {
    let capital = cap_height(style.size());
    let x = match style.anchor().h_pos {
        HPos::Left => 0.0,
        HPos::Center => -0.5 * width,
        HPos::Right => -width,
    };
    let y = match style.anchor().v_pos {
        VPos::Top => capital,
        VPos::Center => 0.5 * capital,
        VPos::Bottom => 0.0,
    };
    (x, y)
}

/// Cosine and sine of the text's turn, clockwise on the page.
pub(crate) fn turn(transform: &FontTransform) -> (f64, f64) {
    match transform {
        FontTransform::None => (1.0, 0.0),
        FontTransform::Rotate90 => (0.0, 1.0),
        FontTransform::Rotate180 => (-1.0, 0.0),
        FontTransform::Rotate270 => (0.0, -1.0),
    }
}

struct PathPen {
    path: PathBuilder,
    size: f64,
    origin: (f64, f64),
    turn: (f64, f64),
    at: (f64, f64),
}

impl PathPen {
    fn place(&self, x: f64, y: f64) -> (f32, f32) {
        let (x, y) = (x * self.size + self.origin.0, y * self.size + self.origin.1);
        let (c, s) = self.turn;
        (
            (self.at.0 + c * x - s * y) as f32,
            (self.at.1 + s * x + c * y) as f32,
        )
    }
}

impl Pen for PathPen {
    fn move_to(&mut self, x: f64, y: f64) {
        let p = self.place(x, y);
        self.path.move_to(p.0, p.1);
    }
    fn line_to(&mut self, x: f64, y: f64) {
        let p = self.place(x, y);
        self.path.line_to(p.0, p.1);
    }
    fn quad_to(&mut self, x1: f64, y1: f64, x: f64, y: f64) {
        let (c, p) = (self.place(x1, y1), self.place(x, y));
        self.path.quad_to(c.0, c.1, p.0, p.1);
    }
    fn cubic_to(&mut self, x1: f64, y1: f64, x2: f64, y2: f64, x: f64, y: f64) {
        let (c, d, p) = (self.place(x1, y1), self.place(x2, y2), self.place(x, y));
        self.path.cubic_to(c.0, c.1, d.0, d.1, p.0, p.1);
    }
    fn close(&mut self) {
        self.path.close();
    }
}

impl DrawingBackend for Bitmap<'_> {
    type ErrorType = Infallible;

    fn get_size(&self) -> (u32, u32) {
        self.grid
    }

    fn ensure_prepared(&mut self) -> Drawn {
        Ok(())
    }

    fn present(&mut self) -> Drawn {
        Ok(())
    }

    fn draw_pixel(&mut self, (x, y): BackendCoord, colour: BackendColor) -> Drawn {
        let cell = Rect::from_xywh(x as f32, y as f32, 1.0, 1.0);
        self.fill(cell.map(PathBuilder::from_rect), colour);
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
        let corners = [(x0, y0), (x1, y0), (x1, y1), (x0, y1)];
        if fill {
            self.fill_polygon(corners, style)
        } else {
            let path = Self::polyline(corners, true);
            self.stroke(path, style.color(), style.stroke_width());
            Ok(())
        }
    }

    fn draw_path<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        path: I,
        style: &S,
    ) -> Drawn {
        let points: Vec<_> = path.into_iter().collect();
        // The rasteriser's work grows faster than a path's length. Parts share
        // a segment, so that the joint at either end of it is round.
        let mut start = 0;
        while start + 1 < points.len() {
            let end = (start + PART).min(points.len());
            let part = Self::polyline(points[start..end].iter().copied(), false);
            self.stroke(part, style.color(), style.stroke_width());
            if end == points.len() {
                break;
            }
            start = end - 2;
        }
        Ok(())
    }

    fn draw_circle<S: BackendStyle>(
        &mut self,
        (x, y): BackendCoord,
        radius: u32,
        style: &S,
        fill: bool,
    ) -> Drawn {
        let path = PathBuilder::from_circle(x as f32, y as f32, radius as f32);
        if fill {
            self.fill(path, style.color());
        } else {
            self.stroke(path, style.color(), style.stroke_width());
        }
        Ok(())
    }

    fn fill_polygon<S: BackendStyle, I: IntoIterator<Item = BackendCoord>>(
        &mut self,
        corners: I,
        style: &S,
    ) -> Drawn {
        self.fill(Self::polyline(corners, true), style.color());
        Ok(())
    }

    fn draw_text<S: BackendTextStyle>(&mut self, text: &str, style: &S, at: BackendCoord) -> Drawn {
        let bold = matches!(style.style(), FontStyle::Bold);
        let set = self.fonts.set(text, bold);
        let (x, y) = baseline(style, set.width_em * style.size());
        let mut pen = PathPen {
            path: PathBuilder::new(),
            size: style.size(),
            origin: (x, y),
            turn: turn(&style.transform()),
            at: (f64::from(at.0), f64::from(at.1)),
        };
        for (glyph, offset) in set.letters {
            pen.origin.0 = x + offset * style.size();
            self.fonts.outline(glyph, bold, &mut pen);
        }
        self.fill(pen.path.finish(), style.color());
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
