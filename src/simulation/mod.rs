//! Known truth: seeded sessions with known events.
