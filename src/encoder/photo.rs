//! The photo encoder: EfficientNet-Lite0 (Tan & Le 2019; Lite variant 2020) on the middle square of a picture.

use super::{
    Encoder, EncoderError,
    fingerprint::fingerprint,
    network::{Network, SIDE},
    picture::Picture,
};

/// What is kept of one picture.
#[derive(Debug, Clone, PartialEq)]
pub struct Photo {
    /// The picture's numbers, as many as the encoder's dimension.
    pub embedding: Vec<f32>,
    /// A small JPEG file of the whole upright picture, transparency on white.
    pub thumbnail: Vec<u8>,
    /// Pixels across the upright original, at least 1.
    pub width: u32,
    /// Pixels down the upright original, at least 1.
    pub height: u32,
    /// The first 32 hexadecimal digits of the SHA-256 of the file, so the same file has the same fingerprint. For a
    /// frame, of its width and height (32 bits each, little-endian) and its bytes.
    pub fingerprint: String,
}

/// Turns photos into embeddings.
///
/// A call takes one thread. To use several, give each thread a [clone](Clone): clones share the weights.
///
/// ```no_run
/// use kenspeckle::encoder::{Encoder, PhotoEncoder};
///
/// let encoder = PhotoEncoder::from_bytes(&std::fs::read("www/encoders/photo.onnx")?)?;
/// let photo = encoder.read(&std::fs::read("shard.jpg")?, 256)?;
/// assert_eq!(photo.embedding.len(), encoder.dimension());
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub struct PhotoEncoder {
    network: Network,
    identity: String,
}

impl PhotoEncoder {
    /// Reads an encoder file: ONNX, input 1 × 3 × 224 × 224, output one row that is never negative.
    ///
    /// # Errors
    /// [`EncoderError::EncoderFile`] when the file is damaged or of another shape.
    pub fn from_bytes(file: &[u8]) -> Result<Self, EncoderError> {
        let network = Network::from_bytes(file)?;
        Ok(Self { network, identity: format!("efficientnet-lite0:{}", fingerprint(&[file])) })
    }

    /// The encoder that is part of the program. Only with the feature `cli`: a page loads the file by itself.
    ///
    /// # Errors
    /// Never for a program that passed its tests.
    #[cfg(feature = "cli")]
    pub fn bundled() -> Result<Self, EncoderError> {
        Self::from_bytes(include_bytes!("../../www/encoders/photo.onnx"))
    }

    /// Reads a JPEG, PNG, WebP, GIF or BMP file, known by its content, whatever its name: embedding, fingerprint, and
    /// a thumbnail whose longest side is at most `thumbnail_side` pixels. Of an animation it takes the first frame.
    ///
    /// # Errors
    /// The file is empty, no picture, too large, cut off or damaged: see [`EncoderError`].
    pub fn read(&self, file: &[u8], thumbnail_side: u32) -> Result<Photo, EncoderError> {
        self.keep(&Picture::decode(file)?, thumbnail_side, fingerprint(&[file]))
    }

    /// Like [`read`](Self::read), for one frame of a camera: `width × height` pixels of RGBA bytes, row by row.
    ///
    /// # Errors
    /// The frame is empty or too large, or `rgba` is not `4 × width × height` bytes long.
    pub fn read_pixels(
        &self,
        rgba: &[u8],
        width: u32,
        height: u32,
        thumbnail_side: u32,
    ) -> Result<Photo, EncoderError> {
        let picture = Picture::from_rgba(rgba, width, height)?;
        let fingerprint = fingerprint(&[&width.to_le_bytes(), &height.to_le_bytes(), rgba]);
        self.keep(&picture, thumbnail_side, fingerprint)
    }

    fn keep(&self, picture: &Picture, thumbnail_side: u32, fingerprint: String) -> Result<Photo, EncoderError> {
        let (width, height) = picture.size();
        Ok(Photo {
            embedding: self.embed_picture(picture)?,
            thumbnail: picture.thumbnail(thumbnail_side),
            width,
            height,
            fingerprint,
        })
    }

    fn embed_picture(&self, picture: &Picture) -> Result<Vec<f32>, EncoderError> {
        let square = picture.square(SIDE as u32);
        let plane = SIDE * SIDE;
        let mut values = vec![0.0; 3 * plane];
        for (index, pixel) in square.pixels().enumerate() {
            for (channel, value) in pixel.0.into_iter().enumerate() {
                values[channel * plane + index] = (f32::from(value) - 127.0) / 128.0;
            }
        }
        self.network.run(values)
    }
}

impl Clone for PhotoEncoder {
    fn clone(&self) -> Self {
        let mut network = self.network.clone();
        network.detach();
        Self { network, identity: self.identity.clone() }
    }
}

impl Encoder for PhotoEncoder {
    type Item = [u8];

    fn identity(&self) -> &str {
        &self.identity
    }

    fn dimension(&self) -> usize {
        self.network.dimension()
    }

    fn non_negative(&self) -> bool {
        true
    }

    fn embed(&self, file: &[u8]) -> Result<Vec<f32>, EncoderError> {
        self.embed_picture(&Picture::decode(file)?)
    }
}
