use crate::figure::Role;

/// Red, green, blue.
pub(crate) type Colour = (u8, u8, u8);

/// How the line of a role is drawn. Lengths in layout pixels.
pub(crate) struct Stroke {
    pub(crate) colour: Colour,
    pub(crate) width: f64,
    /// Lengths of line and gap in turn; empty: solid.
    pub(crate) dash: &'static [f64],
}

pub(crate) const WHITE: Colour = (255, 255, 255);
pub(crate) const INK: Colour = (0x1b, 0x25, 0x30);
pub(crate) const SOFT_INK: Colour = (0x55, 0x61, 0x6d);
pub(crate) const AXIS: Colour = (0x5a, 0x66, 0x72);
pub(crate) const GRID: Colour = (0xe2, 0xe6, 0xea);
pub(crate) const FINE_GRID: Colour = (0xf0, 0xf2, 0xf4);
pub(crate) const SHADE: Colour = (0xec, 0xee, 0xf1);
pub(crate) const HATCH: Colour = (0xc6, 0xcc, 0xd3);

/// Colours chosen for three readers at once: full sight, the common colour
/// deficiencies (hues kept apart along blue to orange), and grey print
/// (luma 0.299 R + 0.587 G + 0.114 B of primary 48, third 95, fourth 131,
/// secondary 153; dashes tell the rest).
pub(crate) fn stroke(role: Role) -> Stroke {
    let (colour, width, dash): (Colour, f64, &'static [f64]) = match role {
        Role::Primary => ((0x10, 0x36, 0x60), 1.8, &[]),
        Role::Secondary => ((0xe2, 0x8c, 0x1e), 1.8, &[6.0, 3.0]),
        Role::Third => ((0x16, 0x80, 0x70), 1.7, &[13.0, 4.0]),
        Role::Fourth => ((0xa8, 0x66, 0xa8), 1.7, &[9.0, 3.0, 2.0, 3.0]),
        Role::Reference => ((0x6a, 0x74, 0x80), 1.3, &[5.0, 4.0]),
        Role::Limit => ((0x96, 0x1c, 0x34), 1.6, &[12.0, 5.0]),
        Role::Warning => ((0x96, 0x1c, 0x34), 1.1, &[]),
        Role::Muted => ((0xa9, 0xb1, 0xba), 1.1, &[]),
    };
    Stroke {
        colour,
        width,
        dash,
    }
}

/// Colour of text that belongs to a role: dark enough to read.
pub(crate) fn text(role: Role) -> Colour {
    match role {
        Role::Primary => INK,
        Role::Secondary => (0x94, 0x55, 0x06),
        Role::Third => (0x0e, 0x5f, 0x53),
        Role::Fourth => (0x78, 0x3d, 0x78),
        Role::Limit | Role::Warning => (0x96, 0x1c, 0x34),
        Role::Reference | Role::Muted => SOFT_INK,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn luma(role: Role) -> f64 {
        let (r, g, b) = stroke(role).colour;
        0.299 * f64::from(r) + 0.587 * f64::from(g) + 0.114 * f64::from(b)
    }

    #[test]
    fn curves_differ_in_grey_print() {
        let curves = [Role::Primary, Role::Third, Role::Fourth, Role::Secondary];
        for pair in curves.windows(2) {
            assert!(luma(pair[1]) - luma(pair[0]) > 20.0, "{pair:?}");
            assert_ne!(stroke(pair[0]).dash, stroke(pair[1]).dash);
        }
        assert!(luma(Role::Secondary) - luma(Role::Primary) > 90.0);
    }

    /// WCAG 2 contrast against white, from memory: 4.5 is asked of body text.
    #[test]
    fn text_reads_on_white() {
        let linear = |v: u8| {
            let v = f64::from(v) / 255.0;
            if v <= 0.04045 {
                v / 12.92
            } else {
                ((v + 0.055) / 1.055).powf(2.4)
            }
        };
        for role in [
            Role::Primary,
            Role::Secondary,
            Role::Third,
            Role::Fourth,
            Role::Limit,
            Role::Muted,
        ] {
            let (r, g, b) = text(role);
            let y = 0.2126 * linear(r) + 0.7152 * linear(g) + 0.0722 * linear(b);
            assert!(1.05 / (y + 0.05) > 4.5, "{role:?}");
        }
    }
}
