use png::{BitDepth, ColorType, Compression, Encoder, Filter, PixelDimensions, Unit};
use tiny_skia::Pixmap;

use crate::Error;
use crate::figure::{Figure, FigureSize};
use crate::font::Fonts;
use crate::raster::Bitmap;
use crate::sheet;

/// Layout pixels per inch at which one layout pixel is one bitmap pixel.
const LAYOUT_DPI: f64 = 150.0;

/// How a [`Figure`] becomes a bitmap.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RenderOptions {
    /// Pixels per inch written into the file, 50 to 1200; the bitmap has
    /// `dpi / 150` pixels for every pixel of the layout. Default: 300.
    pub dpi: f64,
}

impl Default for RenderOptions {
    fn default() -> Self {
        Self { dpi: 300.0 }
    }
}

/// Draws a figure as PNG: RGB, 8 bits, with its resolution and title inside.
///
/// # Errors
///
/// If the figure has no panel, a size, range or share out of bounds, no room
/// for its panels, or columns of unequal length.
pub fn render(figure: &Figure, options: &RenderOptions) -> Result<Vec<u8>, Error> {
    let dpi = options.dpi;
    if !(50.0..=1200.0).contains(&dpi) {
        return Err(Error::Dpi { dpi });
    }
    let FigureSize { width, height } = checked(figure.size)?;
    let pixels = |side: u32| (f64::from(side) * dpi / LAYOUT_DPI).round() as u32;
    let fonts = Fonts::load()?;
    let mut pixmap =
        Pixmap::new(pixels(width), pixels(height)).ok_or(Error::Size { width, height })?;
    sheet::draw(
        figure,
        Bitmap::new(&mut pixmap, &fonts, sheet::grid(figure)),
        &fonts,
    )?;
    encode(&pixmap, dpi, &figure.title)
}

/// The size, if it is one that can be laid out.
pub(crate) fn checked(size: FigureSize) -> Result<FigureSize, Error> {
    let FigureSize { width, height } = size;
    if (320..=4096).contains(&width) && (240..=4096).contains(&height) {
        Ok(size)
    } else {
        Err(Error::Size { width, height })
    }
}

fn encode(pixmap: &Pixmap, dpi: f64, title: &str) -> Result<Vec<u8>, Error> {
    // The ground is opaque, so premultiplied colours are the colours.
    let rgb: Vec<u8> = pixmap
        .data()
        .chunks_exact(4)
        .flat_map(|p| [p[0], p[1], p[2]])
        .collect();
    let mut out = Vec::new();
    let mut encoder = Encoder::new(&mut out, pixmap.width(), pixmap.height());
    encoder.set_color(ColorType::Rgb);
    encoder.set_depth(BitDepth::Eight);
    encoder.set_compression(Compression::Balanced);
    encoder.set_filter(Filter::Adaptive);
    let per_metre = (dpi / 0.0254).round() as u32;
    encoder.set_pixel_dims(Some(PixelDimensions {
        xppu: per_metre,
        yppu: per_metre,
        unit: Unit::Meter,
    }));
    if !title.is_empty() {
        encoder.add_itxt_chunk("Title".to_owned(), title.to_owned())?;
    }
    let mut writer = encoder.write_header()?;
    writer.write_image_data(&rgb)?;
    writer.finish()?;
    Ok(out)
}
