//! How noise averages down: the Allan family of deviations.
