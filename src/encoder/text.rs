//! The text encoder: all-MiniLM-L6-v2 (Reimers & Gurevych 2019; Wang et al. 2020), the mean over a note's tokens.

use std::sync::Arc;

use super::{Encoder, EncoderError, MAX_CHARACTERS, fingerprint::fingerprint, language::Language, tokens::Tokenizer};

/// Most tokens the network reads at once, the two that mark start and end included.
const LONGEST_PART: usize = 256;

/// What is kept of one note.
#[derive(Debug, Clone, PartialEq)]
pub struct Note {
    /// The note's numbers, as many as the encoder's dimension; of unit length.
    pub embedding: Vec<f32>,
    /// Tokens in the note: mostly short words and parts of longer ones.
    pub tokens: usize,
    /// Parts the note was read in: 1 up to 254 tokens. What spans two parts is not seen as a whole.
    pub parts: usize,
    /// The first 32 hexadecimal digits of the SHA-256 of the text without the white space around it.
    pub fingerprint: String,
}

/// Turns notes into embeddings.
///
/// A call takes one thread. To use several, give each thread a [clone](Clone): clones share the weights.
///
/// ```no_run
/// use kenspeckle::encoder::{Encoder, NoteEncoder};
///
/// let encoder = NoteEncoder::from_bytes(std::fs::read("www/encoders/text.onnx")?)?;
/// let note = encoder.read("the zip is stuck halfway")?;
/// assert_eq!(note.embedding.len(), encoder.dimension());
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub struct NoteEncoder {
    language: Language,
    tokenizer: Arc<Tokenizer>,
    vocabulary: Arc<str>,
    identity: String,
}

impl NoteEncoder {
    /// Reads an encoder file: ONNX from tokens and their positions to a row of features each, its vocabulary in the
    /// metadata. The file is `www/encoders/text.onnx` of the repository; it is too large for the package on crates.io, and
    /// `pkg-scripts/make-encoder text` makes it again.
    ///
    /// # Errors
    /// [`EncoderError::EncoderFile`] when the file is damaged or of another shape.
    pub fn from_bytes(file: Vec<u8>) -> Result<Self, EncoderError> {
        let identity = format!("all-minilm-l6-v2:{}", fingerprint(&[&file]));
        let (language, vocabulary) = Language::from_bytes(file)?;
        Ok(Self {
            language,
            tokenizer: Arc::new(Tokenizer::new(&vocabulary)?),
            vocabulary: vocabulary.into(),
            identity,
        })
    }

    /// The encoder that is part of the program. Only with the feature `cli`: a page loads the file by itself.
    ///
    /// # Errors
    /// Never for a program that passed its tests.
    #[cfg(feature = "cli")]
    pub fn bundled() -> Result<Self, EncoderError> {
        Self::from_bytes(include_bytes!("../../www/encoders/text.onnx").to_vec())
    }

    /// Reads one note: embedding, fingerprint, and in how many parts it was read.
    ///
    /// Up to 254 tokens are read at once; a longer note in parts of equal length, the mean taken over all of its tokens.
    ///
    /// # Errors
    /// [`EncoderError::NoteEmpty`] and [`EncoderError::NoteTooLong`].
    pub fn read(&self, note: &str) -> Result<Note, EncoderError> {
        let tokens = self.tokens(note)?;
        let parts = self.parts(&tokens);
        let mut sums = vec![0.0_f64; self.dimension()];
        for part in &parts {
            let features = self.language.run(self.tokenizer.framed(part))?;
            for row in features.chunks_exact(sums.len()) {
                sums.iter_mut().zip(row).for_each(|(sum, &feature)| *sum += f64::from(feature));
            }
        }
        let length = sums.iter().map(|sum| sum * sum).sum::<f64>().sqrt();
        if length == 0.0 {
            return Err(EncoderError::EncoderFile("its output is all zeros".into()));
        }
        Ok(Note {
            embedding: sums.iter().map(|sum| (sum / length) as f32).collect(),
            tokens: tokens.len(),
            parts: parts.len(),
            fingerprint: fingerprint(&[note.trim().as_bytes()]),
        })
    }

    /// The rows of the encoder's token table that the note is read as, without start and end.
    ///
    /// # Errors
    /// See [`read`](Self::read).
    pub fn tokens(&self, note: &str) -> Result<Vec<i32>, EncoderError> {
        let characters = note.chars().count();
        if characters > MAX_CHARACTERS {
            return Err(EncoderError::NoteTooLong(characters));
        }
        let tokens = self.tokenizer.tokens(note);
        if tokens.is_empty() { Err(EncoderError::NoteEmpty) } else { Ok(tokens) }
    }

    /// The token in this row of the table; a piece that goes on with a word begins with `##`.
    pub fn token(&self, row: i32) -> Option<&str> {
        self.vocabulary.split('\n').nth(usize::try_from(row).ok()?)
    }

    /// The tokens in parts of nearly equal length that the network can read, cut between words where there are any.
    fn parts<'a>(&self, tokens: &'a [i32]) -> Vec<&'a [i32]> {
        let most = LONGEST_PART - 2;
        let target = tokens.len().div_ceil(tokens.len().div_ceil(most).max(1));
        let mut parts = Vec::new();
        let mut rest = tokens;
        while rest.len() > most {
            let within = |&end: &usize| !self.tokenizer.continues(rest[end]);
            let end = (1..=target).rev().find(within).unwrap_or(target);
            let (part, after) = rest.split_at(end);
            parts.push(part);
            rest = after;
        }
        parts.push(rest);
        parts
    }
}

impl Clone for NoteEncoder {
    fn clone(&self) -> Self {
        let mut language = self.language.clone();
        language.detach();
        let (tokenizer, vocabulary) = (Arc::clone(&self.tokenizer), Arc::clone(&self.vocabulary));
        Self { language, tokenizer, vocabulary, identity: self.identity.clone() }
    }
}

impl Encoder for NoteEncoder {
    type Item = str;

    fn identity(&self) -> &str {
        &self.identity
    }

    fn dimension(&self) -> usize {
        self.language.dimension()
    }

    fn non_negative(&self) -> bool {
        false
    }

    fn embed(&self, note: &str) -> Result<Vec<f32>, EncoderError> {
        Ok(self.read(note)?.embedding)
    }
}
