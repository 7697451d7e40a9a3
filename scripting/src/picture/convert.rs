//! From a drawing to a file's bytes: SVG as it is, PNG and PDF from the SVG.

use std::path::Path;

use resvg::{tiny_skia, usvg};

use super::error::PictureError;

/// Dots per inch of a PNG.
const DOTS_PER_INCH: f64 = 300.0;

/// The most dots along a side of a PNG.
const MOST_DOTS: u32 = 20_000;

/// A format of pictures.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Format {
    /// Scalable Vector Graphics.
    Svg,
    /// Portable Network Graphics, 300 dots per inch.
    Png,
    /// Portable Document Format.
    Pdf,
}

impl Format {
    /// The format that a file's name asks for.
    ///
    /// # Errors
    /// Any other ending.
    pub fn of(path: &Path) -> Result<Format, PictureError> {
        let ending = path.extension().unwrap_or_default().to_string_lossy();
        match ending.to_ascii_lowercase().as_str() {
            "svg" => Ok(Format::Svg),
            "png" => Ok(Format::Png),
            "pdf" => Ok(Format::Pdf),
            _ => Err(PictureError::UnknownEnding { ending: ending.into_owned() }),
        }
    }
}

/// The bytes of a file of that format.
///
/// # Errors
/// What the converters refuse.
pub fn bytes(svg: &str, format: Format) -> Result<Vec<u8>, PictureError> {
    match format {
        Format::Svg => Ok(svg.as_bytes().to_vec()),
        Format::Png => png(svg),
        Format::Pdf => {
            let fault = |reason: String| PictureError::Conversion { format: "PDF", reason };
            let tree = svg2pdf::usvg::Tree::from_str(svg, &svg2pdf::usvg::Options::default())
                .map_err(|e| fault(e.to_string()))?;
            let page = svg2pdf::PageOptions { dpi: 96.0 };
            svg2pdf::to_pdf(&tree, svg2pdf::ConversionOptions::default(), page)
                .map_err(|e| fault(e.to_string()))
        }
    }
}

fn png(svg: &str) -> Result<Vec<u8>, PictureError> {
    let fault = |reason: String| PictureError::Conversion { format: "PNG", reason };
    let tree = usvg::Tree::from_str(svg, &usvg::Options::default()).map_err(|e| fault(e.to_string()))?;
    // the tree's lengths are in steps of 1/96 inch
    let zoom = (DOTS_PER_INCH / 96.0) as f32;
    let size = tree.size().to_int_size().scale_by(zoom).filter(|s| s.width().max(s.height()) <= MOST_DOTS);
    let size = size.ok_or_else(|| fault("it is too large".to_string()))?;
    let mut canvas = tiny_skia::Pixmap::new(size.width(), size.height())
        .ok_or_else(|| fault("it is too large".to_string()))?;
    let scale = tiny_skia::Transform::from_scale(zoom, zoom);
    resvg::render(&tree, scale, &mut canvas.as_mut());
    canvas.encode_png().map_err(|e| fault(e.to_string()))
}
