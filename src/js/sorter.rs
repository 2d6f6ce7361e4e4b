//! The sorter.
