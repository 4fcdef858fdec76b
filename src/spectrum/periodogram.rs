use super::options::Layout;
use super::taper::Taper;
use crate::{Error, Result};
use num_complex::Complex;
use realfft::{RealFftPlanner, RealToComplex};
use rustfft::{Fft, FftPlanner};
use std::sync::Arc;

/// Turns tapered segments into `|X|²`, alone or two at a time.
#[derive(Clone)]
pub(super) struct Periodogram {
    layout: Layout,
    taper: Taper,
    real: Arc<dyn RealToComplex<f64>>,
    complex: Arc<dyn Fft<f64>>,
}

/// What a transform works in; grows as needed.
#[derive(Debug, Clone, Default)]
pub(super) struct Buffers {
    samples: Vec<f64>,
    transform: Vec<Complex<f64>>,
    work: Vec<Complex<f64>>,
}

impl Periodogram {
    pub(super) fn new(layout: Layout, taper: Taper) -> Self {
        let real = RealFftPlanner::new().plan_fft_forward(layout.fft_length);
        let complex = FftPlanner::new().plan_fft_forward(layout.fft_length);
        Self { layout, taper, real, complex }
    }

    pub(super) fn window(&self) -> &[f64] {
        self.taper.window()
    }

    /// `|X(k)|²` of one segment, k = 0, …, ⌊N/2⌋, with N the length of the transform.
    pub(super) fn of_one<'b>(
        &self,
        segment: &[f64],
        buffers: &'b mut Buffers,
    ) -> Result<impl Iterator<Item = f64> + use<'b>> {
        let length = self.layout.fft_length;
        let samples = room(&mut buffers.samples, length);
        let transform = room(&mut buffers.transform, self.layout.bins());
        let work = room(&mut buffers.work, self.real.get_scratch_len());
        let (tapered, padding) = samples.split_at_mut(self.layout.segment);
        self.taper.apply(segment, tapered);
        padding.fill(0.0);
        // Wrong lengths are the only errors there are, and none is wrong here.
        self.real.process_with_scratch(samples, transform, work).map_err(|_| {
            let (left, right) = ("segment", "transform");
            Error::LengthMismatch { left, left_len: segment.len(), right, right_len: length }
        })?;
        Ok(transform.iter().map(squared))
    }

    /// `|Z(k)|²`, k = 0, …, N − 1, of the complex signal whose parts are two segments.
    ///
    /// One complex transform costs less than two real ones; [`fold`] undoes the mixture.
    pub(super) fn of_two<'b>(
        &self,
        re: &[f64],
        im: &[f64],
        buffers: &'b mut Buffers,
    ) -> impl Iterator<Item = f64> + use<'b> {
        let transform = room(&mut buffers.transform, self.layout.fft_length);
        let work = room(&mut buffers.work, self.complex.get_inplace_scratch_len());
        let (tapered, padding) = transform.split_at_mut(self.layout.segment);
        self.taper.apply_two(re, im, tapered);
        padding.fill(Complex::new(0.0, 0.0));
        self.complex.process_with_scratch(transform, work);
        transform.iter().map(squared)
    }
}

/// What two segments a and b have together, k = 0, …, ⌊N/2⌋, from the N values `|Z(k)|²` of `a + ib`, or
/// from sums of such values over many pairs:
///
/// ```text
/// |A(k)|² + |B(k)|² = ( |Z(k)|² + |Z(N − k)|² ) / 2
/// ```
pub(super) fn fold(sums: &[f64]) -> impl Iterator<Item = f64> {
    let mirrored = sums.iter().take(1).chain(sums.iter().skip(1).rev());
    sums.iter().zip(mirrored).take(sums.len() / 2 + 1).map(|(z, m)| z / 2.0 + m / 2.0)
}

#[inline(always)]
fn squared(z: &Complex<f64>) -> f64 {
    z.re * z.re + z.im * z.im
}

/// The first `len` elements of a buffer, made longer if it is too short.
#[expect(clippy::indexing_slicing, reason = "the buffer was just given that length")]
fn room<T: Copy + Default>(buffer: &mut Vec<T>, len: usize) -> &mut [T] {
    if buffer.len() < len {
        buffer.resize(len, T::default());
    }
    &mut buffer[..len]
}
