//! The samples of a corrected waveform, whose memory is used again by the next capture.
//!
//! Fresh memory for a long record costs the system about as much time as the correction itself takes: every page is
//! cleared and mapped. So a few waveforms that are no longer needed are kept. Results never depend on it.

use std::ops::Deref;
use std::sync::{Mutex, PoisonError};

use super::super::signal::Signal;

/// Shorter waveforms are not worth keeping.
const LEAST_KEPT: usize = 65_536;

/// The waveforms of two captures.
const MOST_KEPT: usize = 4;

/// A kept waveform that is longer than so many times what is wanted is given back to the system.
const MOST_TOO_LONG: usize = 4;

/// Waveforms that are no longer needed; only their memory counts.
static KEPT: Mutex<Vec<Vec<f32>>> = Mutex::new(Vec::new());

/// Samples in single precision.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Wave(Vec<f32>);

impl Wave {
    /// Without samples, with room for so many.
    pub(super) fn with_capacity(points: usize) -> Self {
        let mut kept = KEPT.lock().unwrap_or_else(PoisonError::into_inner);
        kept.retain(|wave| wave.capacity() <= MOST_TOO_LONG * points.max(LEAST_KEPT));
        let fitting = (0..kept.len()).filter(|&i| kept[i].capacity() >= points);
        match fitting.min_by_key(|&i| kept[i].capacity()) {
            Some(place) => Self(kept.swap_remove(place)),
            None => Self(Vec::with_capacity(points)),
        }
    }

    /// Adds samples at the end.
    pub(super) fn extend(&mut self, samples: &[f32]) {
        self.0.extend_from_slice(samples);
    }

    /// The samples, for keeps.
    #[must_use]
    pub fn into_vec(mut self) -> Vec<f32> {
        std::mem::take(&mut self.0)
    }
}

impl From<Vec<f32>> for Wave {
    fn from(samples: Vec<f32>) -> Self {
        Self(samples)
    }
}

impl Deref for Wave {
    type Target = [f32];

    fn deref(&self) -> &[f32] {
        &self.0
    }
}

impl<'a> IntoIterator for &'a Wave {
    type Item = &'a f32;
    type IntoIter = std::slice::Iter<'a, f32>;

    fn into_iter(self) -> Self::IntoIter {
        self.0.iter()
    }
}

impl Drop for Wave {
    fn drop(&mut self) {
        if self.0.capacity() < LEAST_KEPT {
            return;
        }
        let mut wave = std::mem::take(&mut self.0);
        wave.clear();
        let mut kept = KEPT.lock().unwrap_or_else(PoisonError::into_inner);
        if kept.len() < MOST_KEPT {
            kept.push(wave);
        }
    }
}

impl Signal for Wave {
    fn points(&self) -> usize {
        self.0.len()
    }

    fn at(&self, index: usize) -> f64 {
        f64::from(self.0[index])
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        self.0.as_slice().load(from, out);
    }

    fn samples(&self) -> Option<&[f32]> {
        Some(&self.0)
    }
}
