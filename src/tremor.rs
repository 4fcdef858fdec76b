//! Was there tremor: band power of the clean stretches between events.
