//! Photos: a file in, an embedding and a thumbnail out.

use wasm_bindgen::prelude::*;

use super::js_error;
use crate::encoder::{self, Encoder, EncoderError};

fn thrown(error: EncoderError) -> JsValue {
    js_error(error.code(), &error.to_string())
}

/// Turns photos into embeddings. Reading one photo takes a while and blocks: run it in a worker.
#[wasm_bindgen]
pub struct PhotoEncoder(encoder::PhotoEncoder);

#[wasm_bindgen]
impl PhotoEncoder {
    /// Reads the encoder file, `encoders/photo.onnx`.
    ///
    /// Throws "encoder-file" when the file is damaged or another one.
    #[wasm_bindgen(constructor)]
    pub fn new(file: &[u8]) -> Result<PhotoEncoder, JsValue> {
        encoder::PhotoEncoder::from_bytes(file).map(Self).map_err(thrown)
    }

    /// Numbers in an embedding.
    #[wasm_bindgen(getter)]
    pub fn dimension(&self) -> usize {
        self.0.dimension()
    }

    /// Names the network and its file: embeddings with different identities can't be compared.
    #[wasm_bindgen(getter)]
    pub fn identity(&self) -> String {
        self.0.identity().to_owned()
    }

    /// Whether no number of an embedding is ever below zero.
    #[wasm_bindgen(getter = nonNegative)]
    pub fn non_negative(&self) -> bool {
        self.0.non_negative()
    }

    /// Reads the bytes of a JPEG, PNG, WebP, GIF or BMP file. The thumbnail's longest side is at most `thumbnailSide`.
    ///
    /// Throws "image-empty", "not-an-image", "image-too-large" or "image-unreadable"; the message is a clause about
    /// the file, to put after its name and a colon.
    pub fn read(
        &self,
        bytes: &[u8],
        #[wasm_bindgen(js_name = thumbnailSide)] thumbnail_side: u32,
    ) -> Result<Photo, JsValue> {
        self.0.read(bytes, thumbnail_side).map(Photo).map_err(thrown)
    }

    /// Reads one frame of a camera: the RGBA bytes of `width` × `height` pixels, row by row.
    ///
    /// Throws like `read`.
    #[wasm_bindgen(js_name = readPixels)]
    pub fn read_pixels(
        &self,
        rgba: &[u8],
        width: u32,
        height: u32,
        #[wasm_bindgen(js_name = thumbnailSide)] thumbnail_side: u32,
    ) -> Result<Photo, JsValue> {
        self.0.read_pixels(rgba, width, height, thumbnail_side).map(Photo).map_err(thrown)
    }
}

/// What is kept of one photo.
#[wasm_bindgen]
pub struct Photo(encoder::Photo);

#[wasm_bindgen]
impl Photo {
    /// The photo's numbers, as many as the encoder's dimension.
    pub fn embedding(&self) -> Vec<f32> {
        self.0.embedding.clone()
    }

    /// A small JPEG file of the whole upright photo, transparency on white.
    pub fn thumbnail(&self) -> Vec<u8> {
        self.0.thumbnail.clone()
    }

    /// Pixels across the upright original.
    #[wasm_bindgen(getter)]
    pub fn width(&self) -> u32 {
        self.0.width
    }

    /// Pixels down the upright original.
    #[wasm_bindgen(getter)]
    pub fn height(&self) -> u32 {
        self.0.height
    }

    /// 32 hexadecimal digits that stand for the file's content: the first half of its SHA-256.
    #[wasm_bindgen(getter)]
    pub fn fingerprint(&self) -> String {
        self.0.fingerprint.clone()
    }
}
