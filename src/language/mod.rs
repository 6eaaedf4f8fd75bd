//! The language: text to syntax tree.
