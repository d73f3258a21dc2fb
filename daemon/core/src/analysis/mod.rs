//! The mathematics of two legs that must agree.
//!
//! The model, used everywhere: with both tips on one node `s(t)`, the positive leg gives `P(t) = s(t)` and the
//! negative leg `N(t) = g·s(t − τ) + o`. *Skew* τ > 0: the negative leg arrives late. *Gain* g: N relative to P.
//! *Offset* o: volts at the tips. The corrected difference is `D(t) = P(t) − (N(t + τ) − o)/g`, the common mode
//! `C = (P + N_corrected)/2`.

pub mod apply;
mod band;
pub mod beyond;
pub mod budget;
pub mod coarse;
pub mod compensation;
pub mod correction;
pub mod density;
pub mod deskew;
pub mod figures;
pub mod grade;
pub mod harmonics;
pub mod interpolate;
pub mod leak;
pub mod levels;
pub mod line;
pub mod measured;
pub mod montecarlo;
pub mod noise;
pub mod peaks;
pub mod record;
pub mod rejection;
pub mod response;
pub mod saved;
pub mod signal;
pub mod skew;
pub mod spectrum;
pub mod steepest;
pub mod transfer;
pub mod transition;
mod wide;

pub use beyond::Beyond;
pub use correction::{Correction, Drift, Estimate, Freedom};
pub use record::{Record, Samples};
