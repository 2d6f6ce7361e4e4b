//! Photos through the public door, beside what Pillow 13.0.0 reads from the same files (tests/data/pictures/expected.json,
//! made by pkg-scripts/reference/make_pictures.py).

use std::{
    collections::BTreeMap,
    fs,
    path::{Path, PathBuf},
    sync::LazyLock,
};

use kenspeckle::encoder::{Encoder, EncoderError, MAX_SIDE, PhotoEncoder};
use serde::Deserialize;

static ENCODER: LazyLock<PhotoEncoder> =
    LazyLock::new(|| PhotoEncoder::from_bytes(&fs::read(root().join("www/encoders/photo.onnx")).unwrap()).unwrap());

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn folder() -> PathBuf {
    root().join("tests/data/pictures")
}

fn picture(name: &str) -> Vec<u8> {
    fs::read(folder().join(name)).unwrap()
}

fn error(file: &[u8]) -> EncoderError {
    ENCODER.read(file, 64).unwrap_err()
}

fn cosine(a: &[f32], b: &[f32]) -> f64 {
    let dot = |a: &[f32], b: &[f32]| a.iter().zip(b).map(|(&a, &b)| f64::from(a) * f64::from(b)).sum::<f64>();
    dot(a, b) / (dot(a, a) * dot(b, b)).sqrt()
}

/// The upright size, and the mean colour of each cell of a 4 × 3 grid.
#[derive(Deserialize)]
struct Expected {
    width: u32,
    height: u32,
    cells: Vec<[f64; 3]>,
}

fn expected() -> BTreeMap<String, Expected> {
    serde_json::from_slice(&picture("expected.json")).unwrap()
}

fn cells(thumbnail: &[u8]) -> Vec<[f64; 3]> {
    let pixels = image::load_from_memory_with_format(thumbnail, image::ImageFormat::Jpeg).unwrap().into_rgb8();
    let (width, height) = (pixels.width() / 4, pixels.height() / 3);
    let mut means = Vec::new();
    for row in 0..3 {
        for column in 0..4 {
            let mut sum = [0.0; 3];
            for y in row * height..(row + 1) * height {
                for x in column * width..(column + 1) * width {
                    for (sum, value) in sum.iter_mut().zip(pixels.get_pixel(x, y).0) {
                        *sum += f64::from(value) / f64::from(width * height);
                    }
                }
            }
            means.push(sum);
        }
    }
    means
}

#[test]
fn every_kind_of_file_shows_what_pillow_shows() {
    let expected = expected();
    assert!(expected.len() >= 28);
    for (name, expected) in expected {
        let photo = ENCODER.read(&picture(&name), 4096).unwrap_or_else(|error| panic!("{name}: {error}"));
        assert_eq!((photo.width, photo.height), (expected.width, expected.height), "{name}");
        // The thumbnail is a JPEG of its own, and decoders differ by a level or two.
        for (ours, theirs) in cells(&photo.thumbnail).iter().zip(&expected.cells) {
            for (ours, theirs) in ours.iter().zip(theirs) {
                assert!((ours - theirs).abs() < 4.0, "{name}: {ours} instead of {theirs}");
            }
        }
    }
}

#[test]
fn all_eight_orientations_come_out_upright() {
    let upright = ENCODER.embed(&picture("orientation-1.jpg")).unwrap();
    for orientation in 2..=8 {
        let mut file = picture(&format!("orientation-{orientation}.jpg"));
        let turned = cosine(&upright, &ENCODER.embed(&file).unwrap());
        // The tag 0x0112, one 16-bit number, as the cameras that write big-endian EXIF have it.
        let tag = [1, 0x12, 0, 3, 0, 0, 0, 1, 0, orientation];
        let at = file.windows(tag.len()).position(|bytes| bytes == tag).unwrap();
        file[at + 9] = 1;
        let as_stored = cosine(&upright, &ENCODER.embed(&file).unwrap());
        // A picture turned before it is stored loses other details to JPEG.
        assert!(turned > 0.97 && as_stored < turned, "orientation {orientation}: {turned}, as stored {as_stored}");
    }
    let upright = ENCODER.embed(&picture("plain.png")).unwrap();
    for file in ["orientation-6.png", "orientation-6.webp"] {
        // Without loss, turning before or after the resampling differs by the rounding between its two passes.
        let turned = cosine(&upright, &ENCODER.embed(&picture(file)).unwrap());
        assert!(turned > 0.99, "{file}: {turned}");
    }
}

#[test]
fn an_embedding_is_finite_and_never_negative_and_the_same_each_time() {
    let photo = ENCODER.read(&picture("plain.png"), 32).unwrap();
    assert_eq!(photo.embedding.len(), ENCODER.dimension());
    assert!(ENCODER.non_negative() && photo.embedding.iter().all(|value| value.is_finite() && *value >= 0.0));
    assert!(photo.embedding.iter().any(|value| *value > 0.0));
    assert_eq!(photo, ENCODER.clone().read(&picture("plain.png"), 32).unwrap());
    assert_eq!(photo.embedding, ENCODER.embed(&picture("plain.png")).unwrap());
}

#[test]
fn pictures_of_one_pixel_and_of_one_row_work() {
    for (name, size, colour) in [("one-pixel.png", (1, 1), [200, 30, 90]), ("sliver.png", (3000, 1), [10, 160, 90])] {
        let photo = ENCODER.read(&picture(name), 256).unwrap();
        assert_eq!((photo.width, photo.height), size);
        let thumbnail = image::load_from_memory(&photo.thumbnail).unwrap().into_rgb8();
        assert_eq!(thumbnail.dimensions(), (size.0.min(256), 1));
        for (ours, theirs) in thumbnail.get_pixel(0, 0).0.into_iter().zip(colour) {
            assert!(u8::abs_diff(ours, theirs) < 6, "{name}");
        }
    }
}

#[test]
fn a_thumbnail_keeps_to_its_side_and_is_never_enlarged() {
    for (side, size) in [(48, (48, 30)), (1, (1, 1)), (0, (1, 1)), (1000, (96, 60))] {
        let photo = ENCODER.read(&picture("orientation-6.jpg"), side).unwrap();
        assert_eq!(image::load_from_memory(&photo.thumbnail).unwrap().into_rgb8().dimensions(), size);
    }
}

#[test]
fn a_frame_of_pixels_embeds_like_the_file() {
    let pixels = image::load_from_memory(&picture("transparent.png")).unwrap().into_rgba8();
    let frame = ENCODER.read_pixels(pixels.as_raw(), 96, 60, 64).unwrap();
    let file = ENCODER.read(&picture("transparent.png"), 64).unwrap();
    assert_eq!(frame.embedding, file.embedding);
    assert_eq!(frame.thumbnail, file.thumbnail);
    assert_ne!(frame.fingerprint, file.fingerprint);

    let code = |rgba: &[u8], width, height| ENCODER.read_pixels(rgba, width, height, 64).unwrap_err().code();
    assert_eq!(code(&[], 0, 10), "image-empty");
    assert_eq!(code(&[0; 12], 2, 2), "image-unreadable");
    assert_eq!(code(&[0; 20], 2, 2), "image-unreadable");
    assert_eq!(code(&[], u32::MAX, u32::MAX), "image-too-large");
}

#[test]
fn the_fingerprint_is_the_first_half_of_the_sha_256() {
    let photo = ENCODER.read(&picture("one-pixel.png"), 16).unwrap();
    // sha256sum (GNU coreutils 9.1) of the same file.
    assert_eq!(photo.fingerprint, "90466574be5abac89fcf194c71ac98e3");
    let recorded = fs::read_to_string(root().join("www/encoders/photo.sha256")).unwrap();
    assert_eq!(ENCODER.identity(), format!("efficientnet-lite0:{}", &recorded[..32]));
}

#[test]
fn what_is_no_picture_is_named() {
    assert_eq!(error(b""), EncoderError::ImageEmpty);
    for (file, found) in [
        (b"Find no. 12, trench B: two sherds.\n".as_slice(), "a text"),
        (b"BM is how this text begins", "a text"),
        (b"%PDF-1.7\n", "a PDF document"),
        (b"\0\0\0\x18ftypheic\0\0\0\0", "a HEIC picture"),
        (b"II*\0\x08\0\0\0\0\0", "a TIFF picture or a camera's raw file"),
        (b"<svg xmlns=\"http://www.w3.org/2000/svg\"/>", "an SVG drawing"),
        (b"\0\x01\x02\x03", "a file of another kind"),
    ] {
        let error = error(file);
        assert_eq!(error, EncoderError::NotAnImage { found });
        assert_eq!(error.code(), "not-an-image");
    }
}

#[test]
fn a_picture_cut_off_anywhere_is_an_error() {
    for name in [
        "orientation-1.jpg",
        "progressive.jpg",
        "restarts.jpg",
        "grey.jpg",
        "cmyk.jpg",
        "plain.png",
        "plain.bmp",
        "lossy.webp",
        "lossless.webp",
        "animated.gif",
    ] {
        let whole = picture(name);
        for percent in [3, 10, 30, 60, 80] {
            let error = error(&whole[..whole.len() * percent / 100]);
            assert!(matches!(error.code(), "image-unreadable"), "{name} at {percent} %: {error:?}");
        }
    }
}

#[test]
fn an_enormous_picture_is_refused_by_its_header() {
    assert_eq!(error(&picture("huge.png")), EncoderError::ImageTooLarge { width: 20_000, height: 20_000 });

    let mut jpeg = picture("orientation-1.jpg");
    let frame = jpeg.windows(2).position(|marker| marker == [0xFF, 0xC0]).unwrap();
    jpeg[frame + 5..frame + 9].copy_from_slice(&[0xFF; 4]);
    let mut bmp = picture("plain.bmp");
    bmp[18..22].copy_from_slice(&40_000_u32.to_le_bytes());
    let mut gif = picture("animated.gif");
    gif[6..10].copy_from_slice(&[0xFF; 4]);
    let mut webp = picture("lossless.webp");
    // The lossless header: the chunk's name and length, a signature byte, 14 bits each of width − 1 and height − 1.
    let start = webp.windows(4).position(|name| name == b"VP8L").unwrap();
    webp[start + 9..start + 13].copy_from_slice(&[0xFE, 0xBF, 0xFF, 0x0F]);
    for (name, file) in [("JPEG", jpeg), ("BMP", bmp), ("GIF", gif), ("WebP", webp)] {
        let error = error(&file);
        assert_eq!(error.code(), "image-too-large", "{name}: {error:?}");
        assert!(error.to_string().contains("smaller copy"), "{name}: {error}");
    }
    const { assert!(MAX_SIDE < 40_000) };
}

#[test]
fn an_encoder_file_of_another_kind_is_refused() {
    let file = fs::read(root().join("www/encoders/photo.onnx")).unwrap();
    for bytes in [&[][..], b"not a network", &file[..file.len() / 2], &file[..1000]] {
        let error = PhotoEncoder::from_bytes(bytes).err().unwrap();
        assert_eq!(error.code(), "encoder-file", "{error}");
    }
}

/// A small fixed generator, so that the mutations are the same everywhere (SplitMix64, Steele, Lea & Flood 2014).
struct Mix(u64);

impl Mix {
    fn below(&mut self, end: usize) -> usize {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut mixed = self.0;
        mixed = (mixed ^ (mixed >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((mixed ^ (mixed >> 31)) % end as u64) as usize
    }
}

#[test]
fn damaged_files_give_an_error_or_a_picture_and_never_a_panic() {
    let mut mix = Mix(7);
    let mut outcomes = BTreeMap::new();
    for name in expected().into_keys() {
        let whole = picture(&name);
        for _ in 0..24 {
            let mut file = whole.clone();
            for _ in 0..=mix.below(4) {
                // Half of the damage goes into the header, where decoders trust what they read.
                let end = if mix.below(2) == 0 { file.len().min(80) } else { file.len() };
                let at = mix.below(end);
                match mix.below(4) {
                    0 => file[at] = mix.below(256) as u8,
                    1 => file[at] ^= 1 << mix.below(8),
                    2 => drop(file.drain(at..(at + mix.below(12)).min(file.len()))),
                    _ => file.insert(at, [0, 0xFF, 0x7F, 0x80][mix.below(4)]),
                }
                if file.is_empty() {
                    break;
                }
            }
            let outcome = match ENCODER.read(&file, 16) {
                Ok(photo) => {
                    assert!(photo.embedding.iter().all(|value| value.is_finite()), "{name}");
                    "read"
                }
                Err(error) => error.code(),
            };
            *outcomes.entry(outcome).or_insert(0) += 1;
        }
    }
    // The mutations reach both sides: pictures that still read, and decoders that give up.
    assert!(outcomes["read"] > 50 && outcomes["image-unreadable"] > 50, "{outcomes:?}");
}
