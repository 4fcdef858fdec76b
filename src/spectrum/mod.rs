//! How power spreads over frequency: windows, Welch spectra, band power.
//!
//! A [`Welch`] plan cuts a signal into [`Window`]ed segments and averages their periodograms into a
//! one-sided [`Spectrum`]; the power between two frequencies is a sum of its bins
//! ([`Spectrum::band_power`]). Segments never bridge a gap: clean spans go in as they are.
//!
//! Transforms choose their code by the processor at run time, so the last bits of a spectrum may differ
//! between processors; on one processor the same input gives the same bits, in any thread.

mod band;
mod density;
mod dpss;
mod freedom;
mod median;
mod options;
mod periodogram;
mod taper;
mod welch;
mod window;

pub use band::{Band, BandEdges};
pub use density::{Scaling, Spectrum};
pub use freedom::Freedom;
pub use median::median_bias;
pub use options::{Average, Detrend, Overlap, WelchOptions};
pub use welch::{Welch, WelchScratch, welch};
pub use window::Window;
