//! How power spreads over frequency: windows, Welch spectra, band power.
