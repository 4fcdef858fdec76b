//! What the instrument could have seen: precision of a recording.
