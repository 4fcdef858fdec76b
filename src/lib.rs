#![cfg_attr(docsrs, feature(doc_cfg))]
#![doc = include_str!("../README.md")]
//!
//! # The rooms
//!
//! Data flows one way, down this list; a module knows what stands above it and nothing below.
//!
//! | room | what it answers |
//! |---|---|
//! | [`error`], [`estimate`] | what can go wrong; how sure |
//! | [`recording`] | what was recorded |
//! | [`statistics`] | what a handful of numbers says |
//! | [`conditioning`] | made fit for analysis |
//! | [`events`] | what moved, and when |
//! | [`spectrum`] | how power spreads over frequency |
//! | [`simulation`] | known truth |
//! | [`tremor`] | was there tremor |
//! | [`stability`] | how noise averages down |
//! | [`instrument`] | what the instrument could have seen |
//! | `interchange` | files (feature of that name) |

pub mod conditioning;
pub mod error;
pub mod estimate;
pub mod events;
mod input;
pub mod instrument;
#[cfg(feature = "interchange")]
pub mod interchange;
mod random;
pub mod recording;
pub mod simulation;
pub mod spectrum;
pub mod stability;
pub mod statistics;
pub mod tremor;

pub use error::{Error, NotObservable, Result};
pub use estimate::Estimate;
pub use ndarray;
pub use recording::{Binocular, SamplingRate, ScreenGeometry, Spans, Trace};
