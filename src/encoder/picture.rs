//! Picture files in, upright pixels out: the same pixels natively and in a browser.

use std::io::Cursor;

use fast_image_resize::{FilterType, PixelType, ResizeAlg, ResizeOptions, Resizer, images};
use image::{
    DynamicImage, ImageDecoder, ImageError, ImageFormat, ImageReader, Limits, RgbImage, RgbaImage,
    codecs::jpeg::JpegEncoder, metadata::Orientation,
};
use zune_jpeg::{
    JpegDecoder,
    errors::DecodeErrors,
    zune_core::{bytestream::ZCursor, colorspace::ColorSpace, options::DecoderOptions},
};

use super::{EncoderError, MAX_PIXELS, MAX_SIDE};

/// Most bytes a decoder may take. A picture of `MAX_PIXELS` with alpha fits, one with 16 bits a channel does not.
const MAX_BYTES: u64 = 512 << 20;
/// Bytes from which a decoder's memory is tried out first: failing to get less would have failed already.
const LARGE: u64 = 32 << 20;
const THUMBNAIL_QUALITY: u8 = 80;

/// A decoded picture: 8-bit RGB as stored in the file, and how to turn it upright.
pub(super) struct Picture {
    pixels: RgbImage,
    orientation: Orientation,
}

impl Picture {
    /// Decodes a JPEG, PNG, WebP, GIF or BMP file, known by its content; of an animation, the first frame.
    ///
    /// Transparency is laid on white. Colour profiles are ignored: pixels count as sRGB (common practice, no source).
    pub(super) fn decode(file: &[u8]) -> Result<Self, EncoderError> {
        if file.is_empty() {
            return Err(EncoderError::ImageEmpty);
        }
        match image::guess_format(file) {
            Ok(ImageFormat::Jpeg) => decode_jpeg(file),
            Ok(format @ (ImageFormat::Png | ImageFormat::WebP | ImageFormat::Gif)) => decode_other(file, format),
            // "BM" begins many a text too; the four reserved bytes of the header are zero.
            Ok(ImageFormat::Bmp) if file.get(6..10) == Some(&[0; 4]) => decode_other(file, ImageFormat::Bmp),
            _ => Err(EncoderError::NotAnImage { found: kind_of_file(file) }),
        }
    }

    /// An upright picture from RGBA bytes (not premultiplied), row by row.
    pub(super) fn from_rgba(rgba: &[u8], width: u32, height: u32) -> Result<Self, EncoderError> {
        if width == 0 || height == 0 {
            return Err(EncoderError::ImageEmpty);
        }
        check_size(width, height)?;
        let bytes = rgba.len();
        let pixels = RgbaImage::from_raw(width, height, rgba.to_vec())
            .filter(|_| bytes as u64 == u64::from(width) * u64::from(height) * 4)
            .ok_or(EncoderError::FrameSize { width, height, bytes })?;
        Ok(Self { pixels: on_white(pixels), orientation: Orientation::NoTransforms })
    }

    /// Width and height of the upright picture in pixels, each at least 1.
    pub(super) fn size(&self) -> (u32, u32) {
        let (width, height) = self.pixels.dimensions();
        use Orientation::*;
        match self.orientation {
            Rotate90 | Rotate270 | Rotate90FlipH | Rotate270FlipH => (height, width),
            NoTransforms | Rotate180 | FlipHorizontal | FlipVertical => (width, height),
        }
    }

    /// The largest square in the middle, resampled to `side` × `side`, upright.
    pub(super) fn square(&self, side: u32) -> RgbImage {
        let (width, height) = self.pixels.dimensions();
        let edge = f64::from(width.min(height));
        // The exact middle, between two pixels if need be: then turning before or after makes no difference.
        let left = (f64::from(width) - edge) / 2.0;
        let top = (f64::from(height) - edge) / 2.0;
        self.upright(resample(&self.pixels, [left, top, edge, edge], side, side))
    }

    /// A JPEG file of the whole upright picture, its longest side at most `side` pixels and never enlarged.
    pub(super) fn thumbnail(&self, side: u32) -> Vec<u8> {
        let (width, height) = self.pixels.dimensions();
        let scale = (f64::from(side.max(1)) / f64::from(width.max(height))).min(1.0);
        let scaled = |length: u32| ((f64::from(length) * scale).round() as u32).max(1);
        let whole = [0.0, 0.0, f64::from(width), f64::from(height)];
        let small = self.upright(resample(&self.pixels, whole, scaled(width), scaled(height)));
        let mut file = Vec::new();
        // Writing RGB to memory fails for sides beyond 65 535 only, and `check_size` refuses those.
        let written = JpegEncoder::new_with_quality(&mut file, THUMBNAIL_QUALITY).encode_image(&small);
        debug_assert!(written.is_ok());
        file
    }

    fn upright(&self, pixels: RgbImage) -> RgbImage {
        let mut turned = DynamicImage::ImageRgb8(pixels);
        turned.apply_orientation(self.orientation);
        turned.into_rgb8()
    }
}

/// Antialiased bicubic resampling (Keys 1981, a = −½) of the part `[left, top, width, height]`, in one step.
fn resample(pixels: &RgbImage, [left, top, width, height]: [f64; 4], to_width: u32, to_height: u32) -> RgbImage {
    let mut resized = images::Image::new(to_width, to_height, PixelType::U8x3);
    let options = ResizeOptions::new()
        .resize_alg(ResizeAlg::Convolution(FilterType::CatmullRom))
        .crop(left, top, width, height);
    let done = images::ImageRef::new(pixels.width(), pixels.height(), pixels.as_raw(), PixelType::U8x3)
        .map(|source| Resizer::new().resize(&source, &mut resized, &options));
    // Sizes are at least 1 and the part lies inside, which is all that can go wrong.
    debug_assert!(matches!(done, Ok(Ok(()))));
    RgbImage::from_raw(to_width, to_height, resized.into_vec()).unwrap_or_else(|| RgbImage::new(to_width, to_height))
}

fn decode_jpeg(file: &[u8]) -> Result<Picture, EncoderError> {
    // Headers leniently, as cameras write them; the pixels strictly, or a picture cut off half-way would count as a
    // good one with a grey lower half.
    let lenient = DecoderOptions::default().set_max_width(usize::MAX).set_max_height(usize::MAX);
    let mut decoder = JpegDecoder::new_with_options(ZCursor::new(file), lenient.set_strict_mode(false));
    decoder.decode_headers().map_err(jpeg_error)?;
    let incomplete = || jpeg_error(DecodeErrors::FormatStatic("its header is incomplete"));
    let info = decoder.info().ok_or_else(incomplete)?;
    let (width, height) = (u32::from(info.width), u32::from(info.height));
    check_size(width, height)?;
    let grey = decoder.input_colorspace() == Some(ColorSpace::Luma);
    let colours = if grey { ColorSpace::Luma } else { ColorSpace::RGB };
    let bytes = width as usize * height as usize * if grey { 1 } else { 3 };
    // A progressive picture keeps its 16-bit coefficients until the last scan.
    let coefficients = if info.sof.is_sequential_dct() { 0 } else { bytes * 2 };
    check_memory((bytes + coefficients) as u64, width, height)?;

    decoder.set_options(lenient.set_strict_mode(true).jpeg_set_out_colorspace(colours));
    if decoder.output_buffer_size() != Some(bytes) {
        return Err(incomplete());
    }
    let mut pixels = vec![0; bytes];
    decoder.decode_into(&mut pixels).map_err(jpeg_error)?;
    let orientation =
        decoder.exif().and_then(|exif| Orientation::from_exif_chunk(exif)).unwrap_or(Orientation::NoTransforms);
    let pixels = if grey { pixels.into_iter().flat_map(|value| [value; 3]).collect() } else { pixels };
    let pixels = RgbImage::from_raw(width, height, pixels).ok_or_else(incomplete)?;
    Ok(Picture { pixels, orientation })
}

fn jpeg_error(error: DecodeErrors) -> EncoderError {
    let format = "JPEG";
    match error {
        DecodeErrors::Unsupported(scheme) => EncoderError::ImageUnsupported { format, reason: format!("{scheme:?}") },
        other => EncoderError::ImageUnreadable { format, reason: other.to_string() },
    }
}

fn decode_other(file: &[u8], format: ImageFormat) -> Result<Picture, EncoderError> {
    let mut reader = ImageReader::with_format(Cursor::new(file), format);
    let mut limits = Limits::no_limits();
    limits.max_alloc = Some(MAX_BYTES);
    reader.limits(limits);
    let mut decoder = reader.into_decoder().map_err(|error| image_error(error, format, 0, 0))?;
    let (width, height) = decoder.dimensions();
    check_size(width, height)?;
    check_memory(decoder.total_bytes(), width, height)?;
    let orientation = decoder.orientation().unwrap_or(Orientation::NoTransforms);
    let decoded =
        DynamicImage::from_decoder(decoder).map_err(|error| image_error(error, format, width, height))?;
    let pixels = if decoded.color().has_alpha() { on_white(decoded.into_rgba8()) } else { decoded.into_rgb8() };
    Ok(Picture { pixels, orientation })
}

fn image_error(error: ImageError, format: ImageFormat, width: u32, height: u32) -> EncoderError {
    let format = match format {
        ImageFormat::Png => "PNG",
        ImageFormat::WebP => "WebP",
        ImageFormat::Gif => "GIF",
        _ => "BMP",
    };
    match error {
        ImageError::Limits(_) if width > 0 => EncoderError::NoMemory { width, height },
        ImageError::Unsupported(error) => EncoderError::ImageUnsupported { format, reason: error.to_string() },
        ImageError::Decoding(error) => EncoderError::ImageUnreadable { format, reason: innermost(&error) },
        other => EncoderError::ImageUnreadable { format, reason: other.to_string() },
    }
}

/// What went wrong at the bottom; the layers above only repeat the format's name.
fn innermost(error: &dyn std::error::Error) -> String {
    let mut deepest = error;
    while let Some(source) = deepest.source() {
        deepest = source;
    }
    deepest.to_string()
}

fn check_size(width: u32, height: u32) -> Result<(), EncoderError> {
    if width == 0 || height == 0 {
        return Err(EncoderError::ImageEmpty);
    }
    if width > MAX_SIDE || height > MAX_SIDE || u64::from(width) * u64::from(height) > MAX_PIXELS {
        return Err(EncoderError::ImageTooLarge { width, height });
    }
    Ok(())
}

/// Tries the memory out before the decoder takes it: in WebAssembly a decoder that gets none ends the whole module.
fn check_memory(bytes: u64, width: u32, height: u32) -> Result<(), EncoderError> {
    let available = bytes <= 2 * MAX_BYTES
        && (bytes < LARGE || Vec::<u8>::new().try_reserve_exact(usize::try_from(bytes).unwrap_or(usize::MAX)).is_ok());
    if available { Ok(()) } else { Err(EncoderError::NoMemory { width, height }) }
}

/// Lays the picture on white, in place: a second copy of a large picture would double the memory.
fn on_white(pixels: RgbaImage) -> RgbImage {
    let (width, height) = pixels.dimensions();
    let mut bytes = pixels.into_raw();
    let count = bytes.len() / 4;
    for pixel in 0..count {
        let alpha = u32::from(bytes[4 * pixel + 3]);
        for channel in 0..3 {
            let value = u32::from(bytes[4 * pixel + channel]);
            bytes[3 * pixel + channel] = ((value * alpha + 255 * (255 - alpha) + 127) / 255) as u8;
        }
    }
    bytes.truncate(3 * count);
    RgbImage::from_raw(width, height, bytes).unwrap_or_else(|| RgbImage::new(width, height))
}

/// What a file that is no picture of ours looks like, for the message.
fn kind_of_file(file: &[u8]) -> &'static str {
    let starts = |magic: &[u8]| file.starts_with(magic);
    match file.get(4..12) {
        Some(b"ftypavif" | b"ftypavis") => return "an AVIF picture",
        Some(b"ftypheic" | b"ftypheix" | b"ftyphevc" | b"ftypmif1" | b"ftypmsf1") => return "a HEIC picture",
        Some(kind) if kind.starts_with(b"ftyp") => return "a film",
        _ => {}
    }
    if starts(b"II*\0") || starts(b"MM\0*") {
        "a TIFF picture or a camera's raw file"
    } else if starts(b"%PDF") {
        "a PDF document"
    } else if starts(b"PK\x03\x04") {
        "a ZIP archive or an office document"
    } else if !file.contains(&0) && str::from_utf8(file).is_ok() {
        if file.windows(4).take(1024).any(|tag| tag == b"<svg") { "an SVG drawing" } else { "a text" }
    } else {
        "a file of another kind"
    }
}
