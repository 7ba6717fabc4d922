//! Measurement -> text, JSON, overlay picture. Formats only; computes no number.
