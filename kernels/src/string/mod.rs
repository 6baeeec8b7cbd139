//! Byte moves: every alignment, every short length, overlaps, string instructions.
