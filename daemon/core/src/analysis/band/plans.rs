//! Plans of transforms, kept from one use to the next: making one takes longer than carrying it out.

use realfft::RealFftPlanner;
use std::sync::{Mutex, PoisonError};

/// Plans are thrown away once so many were asked for, so that a program which meets ever new lengths does not keep them
/// all. An analysis uses about ten.
const MOST_USES: usize = 4096;

/// A planner, and how often it was asked.
type Kept<T> = Mutex<Option<(RealFftPlanner<T>, usize)>>;

/// A plan in single precision.
pub(in crate::analysis) fn single<P>(plan: impl FnOnce(&mut RealFftPlanner<f32>) -> P) -> P {
    static KEPT: Kept<f32> = Mutex::new(None);
    ask(&KEPT, plan)
}

/// A plan in double precision.
pub(in crate::analysis) fn double<P>(plan: impl FnOnce(&mut RealFftPlanner<f64>) -> P) -> P {
    static KEPT: Kept<f64> = Mutex::new(None);
    ask(&KEPT, plan)
}

fn ask<T: realfft::FftNum, P>(kept: &Kept<T>, plan: impl FnOnce(&mut RealFftPlanner<T>) -> P) -> P {
    // Whoever failed while planning has left nothing half-done that matters: a plan is kept when it is whole.
    let mut kept = kept.lock().unwrap_or_else(PoisonError::into_inner);
    let (planner, uses) = kept.get_or_insert_with(|| (RealFftPlanner::new(), 0));
    *uses += 1;
    let made = plan(planner);
    if *uses >= MOST_USES {
        *kept = None;
    }
    made
}
