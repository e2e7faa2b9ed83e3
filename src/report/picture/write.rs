//! Pictures as files: SVG as it was drawn, or PNG.

use std::path::Path;
use std::sync::Arc;

use resvg::tiny_skia::{Color, Pixmap, Transform};
use resvg::usvg::{self, ImageHrefResolver, Options, Tree, fontdb};

use crate::error::{Error, Kind, Result};
use crate::format::write_whole;

/// Most pixels of a picture; one takes four bytes.
const MOST_PIXELS: f64 = 32e6;
/// Longest SVG text that is turned into pixels; what it is read into takes several times as much.
const MOST_TEXT: usize = 64 << 20;
/// Pixels along a side for each unit of the drawing: sharp on fine screens and on paper.
const SCALE: f64 = 2.0;

/// What kind of file a picture becomes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PictureFormat {
    /// Lines and text, at any size.
    Svg,
    /// Pixels.
    Png,
}

impl PictureFormat {
    /// By the ending of the file's name.
    ///
    /// # Errors
    /// `usage` for any but `.svg` and `.png`.
    pub fn of(path: &Path) -> Result<Self> {
        let ending = path.extension().map(|e| e.to_ascii_lowercase());
        match ending.as_ref().and_then(|e| e.to_str()) {
            Some("svg") => Ok(Self::Svg),
            Some("png") => Ok(Self::Png),
            _ => Err(Error::new(
                Kind::Usage,
                "pictures are written as SVG or PNG",
                "end the picture's name in .svg or .png",
            )
            .in_file(path)),
        }
    }
}

/// Writes a picture given as SVG text, whole or not at all; the ending of `path` says as what.
///
/// # Errors
/// `usage` (the ending), `too-large` (as for [`png`]), `cannot-write`.
pub fn write_picture(path: &Path, svg: &str) -> Result<()> {
    match PictureFormat::of(path)? {
        PictureFormat::Svg => write_whole(path, |w| w.write_all(svg.as_bytes())),
        PictureFormat::Png => {
            let bytes = png(svg).map_err(|e| e.in_file(path))?;
            write_whole(path, |w| w.write_all(&bytes))
        }
    }
}

/// PNG bytes of SVG text: two pixels along a side for each unit of its width and height, on white.
/// Text is set in the typeface that the program carries, so that the same drawing gives the same
/// pixels on every machine. No other file is read, whatever the drawing refers to.
///
/// # Errors
/// `too-large` past 64 MiB of text or 32 million pixels; `cannot-write` for what is no SVG.
pub fn png(svg: &str) -> Result<Vec<u8>> {
    let too_large = |what: String| Error::new(Kind::TooLarge, what, "draw it as .svg");
    let failed = |what: String| {
        Error::new(
            Kind::CannotWrite,
            format!("the picture cannot be turned into pixels: {what}"),
            "draw it as .svg",
        )
    };
    if svg.len() > MOST_TEXT {
        return Err(too_large(format!(
            "the drawing takes {} MB, and at most {} MB are turned into pixels",
            svg.len() / 1_000_000,
            MOST_TEXT / 1_000_000
        )));
    }
    let tree = Tree::from_str(svg, &options()).map_err(|e| failed(e.to_string()))?;
    let size = tree.size();
    let [width, height] =
        [size.width(), size.height()].map(|side| (f64::from(side) * SCALE).ceil().max(1.0));
    if width * height > MOST_PIXELS {
        return Err(too_large(format!(
            "the picture would have {width} × {height} pixels"
        )));
    }
    // Both are at most the product, which has just been checked.
    let mut pixels = Pixmap::new(width as u32, height as u32)
        .ok_or_else(|| failed("it has no size".to_owned()))?;
    pixels.fill(Color::WHITE);
    let scale = SCALE as f32;
    resvg::render(
        &tree,
        Transform::from_scale(scale, scale),
        &mut pixels.as_mut(),
    );
    pixels.encode_png().map_err(|e| failed(e.to_string()))
}

fn options() -> Options<'static> {
    const FAMILY: &str = "DejaVu Sans";
    let mut fonts = fontdb::Database::new();
    fonts.load_font_data(include_bytes!("fonts/DejaVuSans.ttf").to_vec());
    fonts.load_font_data(include_bytes!("fonts/DejaVuSans-Bold.ttf").to_vec());
    fonts.set_sans_serif_family(FAMILY);
    fonts.set_serif_family(FAMILY);
    fonts.set_monospace_family(FAMILY);
    Options {
        font_family: FAMILY.to_owned(),
        fontdb: Arc::new(fonts),
        image_href_resolver: ImageHrefResolver {
            resolve_data: Box::new(|_, _, _| None),
            resolve_string: Box::new(|_, _| None),
        },
        ..usvg::Options::default()
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    fn drawing(width: f64, inner: &str) -> String {
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {width} 40\" width=\"{width}\" height=\"40\" font-family=\"sans-serif\" font-size=\"30\">{inner}</svg>"
        )
    }

    fn pixels(svg: &str) -> Pixmap {
        Pixmap::decode_png(&png(svg).unwrap()).unwrap()
    }

    fn dark(picture: &Pixmap) -> usize {
        picture.pixels().iter().filter(|p| p.red() < 128).count()
    }

    fn text(of: &str) -> String {
        drawing(60.0, &format!("<text x=\"4\" y=\"32\">{of}</text>"))
    }

    #[test]
    fn what_is_drawn_is_where_it_should_be() {
        let picture = pixels(&drawing(
            60.0,
            "<rect x=\"10\" y=\"5\" width=\"20\" height=\"30\" fill=\"#000\"/>",
        ));
        assert_eq!((picture.width(), picture.height()), (120, 80));
        // 40 × 60 pixels of black, on opaque white.
        assert_eq!(dark(&picture), 2400);
        assert_eq!(picture.pixel(19, 30).unwrap().red(), 255);
        assert_eq!(picture.pixel(20, 30).unwrap().red(), 0);
        assert!(picture.pixels().iter().all(|p| p.alpha() == 255));
    }

    #[test]
    fn every_sign_that_pictures_use_has_an_outline_of_its_own() {
        // What the typeface lacks is drawn as a box, like this character of another script.
        let lacking = pixels(&text("\u{6f22}"));
        let signs = "aZ09äßÉøčłő±−∫²³→·°×…≤≥≈αβμρσωΔΩ–—‘’“”Жя";
        for sign in signs.chars() {
            let drawn = pixels(&text(&sign.to_string()));
            assert!(dark(&drawn) > 8, "{sign} is not drawn");
            assert_ne!(drawn.data(), lacking.data(), "{sign} is missing");
        }
    }

    #[test]
    fn bold_is_heavier() {
        let bold = "<text x=\"4\" y=\"32\" font-weight=\"bold\">am</text>";
        assert!(dark(&pixels(&drawing(60.0, bold))) > dark(&pixels(&text("am"))) * 5 / 4);
    }

    #[test]
    fn sizes_are_judged_before_memory_is_taken() {
        let kind = |svg: &str| png(svg).unwrap_err().kind;
        // 400,002 × 80 pixels: 160 more than 32 million.
        assert_eq!(kind(&drawing(200_001.0, "")), Kind::TooLarge);
        assert_eq!(kind(&drawing(1e9, "")), Kind::TooLarge);
        assert_eq!(kind(&" ".repeat(MOST_TEXT + 1)), Kind::TooLarge);
        assert_eq!(kind("<p>no drawing</p>"), Kind::CannotWrite);
        assert_eq!(kind(""), Kind::CannotWrite);
    }

    #[test]
    fn a_drawing_reads_no_other_file() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("other.svg");
        let black = "<rect width=\"60\" height=\"40\" fill=\"#000\"/>";
        std::fs::write(&file, drawing(60.0, black)).unwrap();
        let image = format!(
            "<image href=\"{}\" width=\"60\" height=\"40\"/>",
            file.display()
        );
        let svg = drawing(60.0, &image);
        assert_eq!(dark(&pixels(&svg)), 0);
    }

    #[test]
    fn the_ending_says_what_is_written() {
        let of = |p: &str| PictureFormat::of(Path::new(p)).map_err(|e| (e.kind, e.advice));
        assert_eq!(of("a.SVG"), Ok(PictureFormat::Svg));
        assert_eq!(of("b.svg.png"), Ok(PictureFormat::Png));
        for wrong in ["a", "a.jpg", ".png", "svg"] {
            let (kind, advice) = of(wrong).unwrap_err();
            assert_eq!(kind, Kind::Usage);
            assert!(advice.contains(".svg") && advice.contains(".png"));
        }
    }
}
