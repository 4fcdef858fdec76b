//! What moved, and when: events in a trace, each with its measures.
