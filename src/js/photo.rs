//! Photos: a file in, an embedding and a thumbnail out.
