//! Names for contents, so that the same file or note is known again.

use sha2::{Digest, Sha256};

/// Names a file's content: the first 128 bits of its SHA-256, in hexadecimal. The same as a photo's or note's.
pub fn file_fingerprint(file: &[u8]) -> String {
    fingerprint(&[file])
}

/// The first 128 bits of the SHA-256 of the parts, in hexadecimal.
pub(super) fn fingerprint(parts: &[&[u8]]) -> String {
    let mut hash = Sha256::new();
    // In short calls: a WebAssembly engine exchanges slow first code for fast code only between calls.
    for piece in parts.iter().flat_map(|part| part.chunks(1 << 14)) {
        hash.update(piece);
    }
    hash.finalize()[..16].iter().map(|byte| format!("{byte:02x}")).collect()
}
