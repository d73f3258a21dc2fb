//! What a deskew finds beyond gain, skew and offset, from the acquisitions it has made anyway.
//!
//! Always: how far slow and fast gain of the legs may differ, from the levels of the reference that gain is taken from. Where
//! it is asked for: the response that is left, from both references (`evenpair_core::analysis::response::combined` says
//! what is taken from which).

use std::sync::Arc;

use evenpair_core::analysis::compensation::{self, Compensation};
use evenpair_core::analysis::response::{Acquired, Response, combined};
use evenpair_core::analysis::skew::Reference;
use evenpair_core::analysis::{Correction, Record};

use super::trouble::Trouble;
use super::workshop::compute;

/// The most samples of a leg that are kept of one reference: 64 megabytes of codes, and seconds of work for the response.
const MOST_SAMPLES: usize = 16_000_000;

/// The most acquisitions that are kept: half of them judge, and 32 show what is worth correcting.
const MOST_KEPT: usize = 64;

/// Acquisitions of one reference.
#[derive(Debug, Default)]
pub(super) struct Kept {
    pub(super) positive: Vec<Record>,
    pub(super) negative: Vec<Record>,
}

impl Kept {
    pub(super) fn add(&mut self, positive: Record, negative: Record) {
        let count = self.positive.len() + 1;
        if count <= MOST_KEPT && count * positive.samples.len() <= MOST_SAMPLES {
            self.positive.push(positive);
            self.negative.push(negative);
        }
    }

    pub(super) fn clear(&mut self) {
        *self = Self::default();
    }
}

/// One reference: what was acquired, what is known of it, and the correction that holds for it.
#[derive(Debug, Clone)]
pub(super) struct Seen {
    pub(super) kept: Arc<Kept>,
    pub(super) reference: Reference,
    pub(super) correction: Correction,
}

impl Seen {
    fn acquired(&self) -> Acquired<'_> {
        Acquired {
            p: &self.kept.positive,
            n: &self.kept.negative,
            correction: &self.correction,
            reference: &self.reference,
        }
    }
}

/// What was found, and what a person should know about it.
#[derive(Debug, Clone, Default)]
pub(super) struct Found {
    pub(super) compensation: Option<Compensation>,
    pub(super) response: Option<Response>,
    pub(super) warnings: Vec<String>,
}

/// Looks at what was acquired. `skew` is the other reference, where skew is taken from one of its own.
pub(super) async fn find(
    gain: Seen,
    skew: Option<Seen>,
    time_constant_s: f64,
    response: bool,
) -> Result<Found, Trouble> {
    compute("fitting the response", move || {
        let mut found = Found::default();
        let Seen { kept, reference, correction } = &gain;
        let (p, n) = (&kept.positive, &kept.negative);
        found.compensation =
            compensation::estimate(p, n, correction, reference.period_s, time_constant_s).unwrap_or_default();
        if found.compensation.is_none() {
            found.warnings.push(
                "the gain's reference does not show whether the probes are compensated alike; a difference of their slow \
                 gains is in no uncertainty"
                    .to_owned(),
            );
        }
        if response {
            let skew = skew.as_ref().map(Seen::acquired);
            match combined(&gain.acquired(), skew.as_ref(), Some(time_constant_s)) {
                Ok(fitted) => found.response = Some(fitted),
                Err(error) => found.warnings.push(format!("no response was fitted: {error}")),
            }
        }
        found
    })
    .await
}
