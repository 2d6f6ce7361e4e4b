//! Picture files in, upright pixels out: the same pixels natively and in a browser.

use std::io::Cursor;

use fast_image_resize::{
    FilterType, ResizeAlg, ResizeOptions, Resizer,
    images::{TypedImage, TypedImageRef},
    pixels::U8x3,
};
use image::{
    ColorType, ImageDecoder, ImageError, ImageFormat, ImageResult, Limits, RgbImage,
    codecs::{bmp::BmpDecoder, gif::GifDecoder, jpeg::JpegEncoder, png::PngDecoder, webp::WebPDecoder},
    imageops,
    metadata::Orientation,
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
        if rgba.len() as u64 != u64::from(width) * u64::from(height) * 4 {
            return Err(EncoderError::FrameSize { width, height, bytes: rgba.len() });
        }
        Ok(Self {
            pixels: rgb_image(width, height, to_rgb8(rgba.to_vec(), 4, 1)),
            orientation: Orientation::NoTransforms,
        })
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
        match self.orientation {
            Orientation::NoTransforms => pixels,
            Orientation::Rotate90 => imageops::rotate90(&pixels),
            Orientation::Rotate180 => imageops::rotate180(&pixels),
            Orientation::Rotate270 => imageops::rotate270(&pixels),
            Orientation::FlipHorizontal => imageops::flip_horizontal(&pixels),
            Orientation::FlipVertical => imageops::flip_vertical(&pixels),
            Orientation::Rotate90FlipH => imageops::flip_horizontal(&imageops::rotate90(&pixels)),
            Orientation::Rotate270FlipH => imageops::flip_horizontal(&imageops::rotate270(&pixels)),
        }
    }
}

/// Antialiased bicubic resampling (Keys 1981, a = −½) of the part `[left, top, width, height]`, in one step.
fn resample(pixels: &RgbImage, [left, top, width, height]: [f64; 4], to_width: u32, to_height: u32) -> RgbImage {
    let mut bytes = vec![0; to_width as usize * to_height as usize * 3];
    let options =
        ResizeOptions::new().resize_alg(ResizeAlg::Convolution(FilterType::CatmullRom)).crop(left, top, width, height);
    // The typed views keep the code for other kinds of pixels out of the WebAssembly module.
    let source = TypedImageRef::<U8x3>::from_buffer(pixels.width(), pixels.height(), pixels.as_raw());
    let target = TypedImage::<U8x3>::from_buffer(to_width, to_height, &mut bytes);
    if let (Ok(source), Ok(mut target)) = (source, target) {
        // Sizes are at least 1 and the part lies inside, which is all that can go wrong.
        let done = Resizer::new().resize_typed(&source, &mut target, &options);
        debug_assert!(done.is_ok());
    }
    rgb_image(to_width, to_height, bytes)
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
    let (colours, channels) = if grey { (ColorSpace::Luma, 1) } else { (ColorSpace::RGB, 3) };
    let bytes = width as usize * height as usize * channels;
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
    Ok(Picture { pixels: rgb_image(width, height, to_rgb8(pixels, channels, 1)), orientation })
}

fn jpeg_error(error: DecodeErrors) -> EncoderError {
    let format = "JPEG";
    match error {
        DecodeErrors::Unsupported(scheme) => EncoderError::ImageUnsupported { format, reason: format!("{scheme:?}") },
        other => EncoderError::ImageUnreadable { format, reason: other.to_string() },
    }
}

fn decode_other(file: &[u8], format: ImageFormat) -> Result<Picture, EncoderError> {
    let mut limits = Limits::no_limits();
    limits.max_alloc = Some(MAX_BYTES);
    let mut decoder = open(file, format, &limits).map_err(|error| image_error(error, format, 0, 0))?;
    let (width, height) = decoder.dimensions();
    check_size(width, height)?;
    check_memory(decoder.total_bytes(), width, height)?;
    let failed = |error| image_error(error, format, width, height);
    decoder.set_limits(limits).map_err(failed)?;
    let (channels, depth) = match decoder.color_type() {
        ColorType::L8 => (1, 1),
        ColorType::La8 => (2, 1),
        ColorType::Rgb8 => (3, 1),
        ColorType::Rgba8 => (4, 1),
        ColorType::L16 => (1, 2),
        ColorType::La16 => (2, 2),
        ColorType::Rgb16 => (3, 2),
        ColorType::Rgba16 => (4, 2),
        other => {
            let reason = format!("{other:?}");
            return Err(EncoderError::ImageUnsupported { format: name(format), reason });
        }
    };
    let orientation = decoder.orientation().unwrap_or(Orientation::NoTransforms);
    let mut bytes = vec![0; width as usize * height as usize * channels * depth];
    decoder.read_image_boxed(&mut bytes).map_err(failed)?;
    Ok(Picture { pixels: rgb_image(width, height, to_rgb8(bytes, channels, depth)), orientation })
}

/// The format's decoder. Not `image::ImageReader`, which would bring a second JPEG decoder into the module.
fn open<'a>(file: &'a [u8], format: ImageFormat, limits: &Limits) -> ImageResult<Box<dyn ImageDecoder + 'a>> {
    let file = Cursor::new(file);
    Ok(match format {
        ImageFormat::Png => Box::new(PngDecoder::with_limits(file, limits.clone())?),
        ImageFormat::WebP => Box::new(WebPDecoder::new(file)?),
        ImageFormat::Gif => Box::new(GifDecoder::new(file)?),
        _ => Box::new(BmpDecoder::new(file)?),
    })
}

fn name(format: ImageFormat) -> &'static str {
    match format {
        ImageFormat::Png => "PNG",
        ImageFormat::WebP => "WebP",
        ImageFormat::Gif => "GIF",
        _ => "BMP",
    }
}

fn image_error(error: ImageError, format: ImageFormat, width: u32, height: u32) -> EncoderError {
    let format = name(format);
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

/// Grey or colour pixels, with alpha or without, `depth` 1 or 2 bytes a channel (in this machine's order), as RGB on
/// white. In place where that is possible: a second copy of a large picture would double the memory.
fn to_rgb8(mut bytes: Vec<u8>, channels: usize, depth: usize) -> Vec<u8> {
    let stride = channels * depth;
    if (channels, depth) == (3, 1) {
        return bytes;
    }
    if stride < 3 {
        return bytes.chunks_exact(stride).flat_map(|pixel| on_white(pixel, channels, depth)).collect();
    }
    let count = bytes.len() / stride;
    for index in 0..count {
        let rgb = on_white(&bytes[stride * index..][..stride], channels, depth);
        bytes[3 * index..][..3].copy_from_slice(&rgb);
    }
    bytes.truncate(3 * count);
    bytes
}

fn on_white(pixel: &[u8], channels: usize, depth: usize) -> [u8; 3] {
    let value = |channel: usize| match depth {
        1 => u32::from(pixel[channel]),
        _ => (u32::from(u16::from_ne_bytes([pixel[2 * channel], pixel[2 * channel + 1]])) + 128) / 257,
    };
    let alpha = if matches!(channels, 2 | 4) { value(channels - 1) } else { 255 };
    let mixed = |channel| ((value(channel) * alpha + 255 * (255 - alpha) + 127) / 255) as u8;
    if channels < 3 { [mixed(0); 3] } else { [mixed(0), mixed(1), mixed(2)] }
}

/// `bytes` always holds the whole picture; were it too short, the picture would be black rather than a panic.
fn rgb_image(width: u32, height: u32, bytes: Vec<u8>) -> RgbImage {
    debug_assert_eq!(bytes.len(), width as usize * height as usize * 3);
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
