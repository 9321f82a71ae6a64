use ab_glyph::{Font, FontRef, GlyphId, OutlineCurve};

use crate::Error;

/// Height of a capital letter in DejaVu Sans, in ems (1493 of 2048 units).
const CAP_HEIGHT_EM: f64 = 1493.0 / 2048.0;

/// The two embedded faces.
pub(crate) struct Fonts {
    regular: FontRef<'static>,
    bold: FontRef<'static>,
}

/// A line of text set out along a baseline that starts at 0.
pub(crate) struct SetLine {
    /// Each letter and where it starts, in ems.
    pub(crate) letters: Vec<(GlyphId, f64)>,
    /// Width in ems.
    pub(crate) width_em: f64,
}

/// Receives a glyph's outline in ems, y downwards.
pub(crate) trait Pen {
    fn move_to(&mut self, x: f64, y: f64);
    fn line_to(&mut self, x: f64, y: f64);
    fn quad_to(&mut self, x1: f64, y1: f64, x: f64, y: f64);
    fn cubic_to(&mut self, x1: f64, y1: f64, x2: f64, y2: f64, x: f64, y: f64);
    fn close(&mut self);
}

impl Fonts {
    pub(crate) fn load() -> Result<Self, Error> {
        let face = |bytes| FontRef::try_from_slice(bytes).map_err(Error::Font);
        Ok(Self {
            regular: face(include_bytes!("../assets/DejaVuSans-subset.ttf"))?,
            bold: face(include_bytes!("../assets/DejaVuSans-Bold-subset.ttf"))?,
        })
    }

    fn face(&self, bold: bool) -> &FontRef<'static> {
        if bold { &self.bold } else { &self.regular }
    }

    /// Sets one line with its kerning; a sign the font lacks becomes its box.
    pub(crate) fn set(&self, text: &str, bold: bool) -> SetLine {
        let face = self.face(bold);
        let em = units_per_em(face);
        let mut letters = Vec::with_capacity(text.len());
        let mut at = 0.0;
        let mut previous = None;
        for character in text.chars() {
            let glyph = face.glyph_id(character);
            if let Some(previous) = previous {
                at += f64::from(face.kern_unscaled(previous, glyph)) / em;
            }
            letters.push((glyph, at));
            at += f64::from(face.h_advance_unscaled(glyph)) / em;
            previous = Some(glyph);
        }
        SetLine {
            letters,
            width_em: at,
        }
    }

    /// Width of one line at a size in pixels per em.
    pub(crate) fn width(&self, text: &str, size: f64, bold: bool) -> f64 {
        self.set(text, bold).width_em * size
    }

    /// Breaks text at spaces so that no line is wider than `width`; what does
    /// not fit into `most` lines ends in an ellipsis.
    pub(crate) fn wrap(
        &self,
        text: &str,
        size: f64,
        bold: bool,
        width: f64,
        most: usize,
    ) -> Vec<String> {
        let mut lines: Vec<String> = Vec::new();
        for word in text.split_whitespace() {
            match lines.last_mut() {
                Some(line) if self.width(&format!("{line} {word}"), size, bold) <= width => {
                    line.push(' ');
                    line.push_str(word);
                }
                _ => lines.push(word.to_owned()),
            }
        }
        if lines.len() > most {
            let rest = lines.split_off(most.max(1)).join(" ");
            if let Some(last) = lines.last_mut() {
                last.push(' ');
                last.push_str(&rest);
            }
        }
        for line in &mut lines {
            if self.width(line, size, bold) > width {
                while !line.is_empty() && self.width(&format!("{line}…"), size, bold) > width {
                    line.pop();
                }
                line.truncate(line.trim_end().len());
                line.push('…');
            }
        }
        lines
    }

    /// Walks one glyph's outline.
    pub(crate) fn outline(&self, glyph: GlyphId, bold: bool, pen: &mut impl Pen) {
        let face = self.face(bold);
        let em = units_per_em(face);
        let Some(outline) = face.outline(glyph) else {
            return;
        };
        let place = |p: ab_glyph::Point| (f64::from(p.x) / em, -f64::from(p.y) / em);
        // The reader yields curves only; a contour ends where the next curve
        // does not start at the last one's end.
        let mut end: Option<(f64, f64)> = None;
        for curve in &outline.curves {
            let (from, to) = match curve {
                OutlineCurve::Line(a, b) => (place(*a), place(*b)),
                OutlineCurve::Quad(a, _, b) => (place(*a), place(*b)),
                OutlineCurve::Cubic(a, _, _, b) => (place(*a), place(*b)),
            };
            if end != Some(from) {
                if end.is_some() {
                    pen.close();
                }
                pen.move_to(from.0, from.1);
            }
            match curve {
                OutlineCurve::Line(..) => pen.line_to(to.0, to.1),
                OutlineCurve::Quad(_, c, _) => {
                    let c = place(*c);
                    pen.quad_to(c.0, c.1, to.0, to.1);
                }
                OutlineCurve::Cubic(_, c, d, _) => {
                    let (c, d) = (place(*c), place(*d));
                    pen.cubic_to(c.0, c.1, d.0, d.1, to.0, to.1);
                }
            }
            end = Some(to);
        }
        if end.is_some() {
            pen.close();
        }
    }
}

fn units_per_em(face: &FontRef<'static>) -> f64 {
    f64::from(face.units_per_em().unwrap_or(2048.0))
}

/// Height of a capital letter at a size in pixels per em.
pub(crate) fn cap_height(size: f64) -> f64 {
    CAP_HEIGHT_EM * size
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    #[test]
    fn every_sign_we_print_is_in_both_faces() {
        let fonts = Fonts::load().unwrap();
        for sign in "abcXYZ0123456789 ²³µ°·±√×–−…≤≥→▲▼◆●○αβγσφωΩ⁰¹⁴⁵⁶⁷⁸⁹⁻₀₁₂äöüßéÅ\u{2032}".chars()
        {
            for bold in [false, true] {
                assert_ne!(fonts.face(bold).glyph_id(sign).0, 0, "{sign} bold {bold}");
            }
        }
    }

    #[test]
    fn pairs_are_kerned() {
        let fonts = Fonts::load().unwrap();
        let apart = fonts.width("A", 100.0, false) + fonts.width("V", 100.0, false);
        assert!(fonts.width("AV", 100.0, false) < apart - 2.0);
    }

    #[test]
    fn wrapping_keeps_every_line_within_the_width_and_every_word() {
        let fonts = Fonts::load().unwrap();
        let text = "channel 2 drive end, acceleration in m/s², 1/16 order, Hann, 50 % overlap";
        let lines = fonts.wrap(text, 13.0, false, 180.0, 9);
        assert!(lines.len() > 2);
        assert!(lines.iter().all(|l| fonts.width(l, 13.0, false) <= 180.0));
        assert_eq!(lines.join(" "), text);
        let cut = fonts.wrap(text, 13.0, false, 180.0, 2);
        assert_eq!(cut.len(), 2);
        assert!(cut[1].ends_with('…') && fonts.width(&cut[1], 13.0, false) <= 180.0);
    }
}
