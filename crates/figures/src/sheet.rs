use plotters::prelude::{DrawingBackend, IntoDrawingArea};

use crate::Error;
use crate::canvas::{Canvas, FINE, HPos, Lettering, VPos, drawing};
use crate::figure::Figure;
use crate::figure::Role;
use crate::font::{Fonts, cap_height};
use crate::layout::{
    EDGE, FOOT, FOOT_PITCH, SUBTITLE, SUBTITLE_PITCH, TITLE, TITLE_PITCH, lay_out,
};
use crate::palette::{self, GRID, INK, SOFT_INK};
use crate::plot;
use crate::polyline::Box2;

/// Size of the virtual grid a figure is drawn on.
pub(crate) fn grid(figure: &Figure) -> (u32, u32) {
    let fine = FINE as u32;
    (figure.size.width * fine, figure.size.height * fine)
}

/// Draws a whole figure.
pub(crate) fn draw<DB: DrawingBackend>(
    figure: &Figure,
    backend: DB,
    fonts: &Fonts,
) -> Result<(), Error> {
    let (width, height) = (f64::from(figure.size.width), f64::from(figure.size.height));
    // Letters keep their share of the page, whichever side is the tight one.
    let unit = (width / 1200.0).min(height / 800.0);
    let sheet = lay_out(figure, fonts, width / unit, height / unit)?;
    let canvas = Canvas {
        area: backend.into_drawing_area(),
        fonts,
        grid: FINE * unit,
    };

    let left = if sheet.title.is_empty() && sheet.subtitle.is_empty() {
        EDGE
    } else {
        EDGE + 14.0
    };
    let mut y = EDGE + cap_height(TITLE);
    for line in &sheet.title {
        let lettering = Lettering {
            bold: true,
            ..Lettering::new(TITLE, INK, HPos::Left, VPos::Bottom)
        };
        canvas.text(line, (left, y), lettering)?;
        y += TITLE_PITCH;
    }
    if sheet.title.is_empty() {
        y = EDGE + cap_height(SUBTITLE);
    } else {
        y -= 1.0;
    }
    for line in &sheet.subtitle {
        let lettering = Lettering::new(SUBTITLE, SOFT_INK, HPos::Left, VPos::Bottom);
        canvas.text(
            line,
            (left, y - cap_height(TITLE) + cap_height(SUBTITLE) + 4.0),
            lettering,
        )?;
        y += SUBTITLE_PITCH;
    }
    if left > EDGE {
        let bar = Box2::new(EDGE, EDGE, EDGE + 4.0, y - cap_height(TITLE) - 6.0);
        canvas.rectangle(bar, palette::stroke(Role::Primary).colour, 1.0)?;
    }

    for plot in &sheet.plots {
        plot::draw(&canvas, plot, sheet.label_x)?;
    }

    let mut y = sheet.height - 0.6 * EDGE - FOOT_PITCH * (sheet.foot.len() as f64 - 1.0);
    if !sheet.foot.is_empty() {
        let line = y - cap_height(FOOT) - 9.0;
        canvas.line(&[(EDGE, line), (sheet.width - EDGE, line)], GRID, 1.0)?;
    }
    for line in &sheet.foot {
        canvas.text(
            line,
            (EDGE, y),
            Lettering::new(FOOT, SOFT_INK, HPos::Left, VPos::Bottom),
        )?;
        y += FOOT_PITCH;
    }
    // Plotters would swallow an error in its destructor.
    canvas.area.present().map_err(drawing)
}
