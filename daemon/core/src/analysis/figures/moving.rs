//! Sensitivities of a figure to gain and skew, by reading it again on the difference moved a little along what each of
//! them adds to it.

use super::super::signal::{Moved, Signal};
use super::compute::Bench;

impl Bench<'_> {
    /// What `read` changes per relative error of the gain and per second of skew. It is given the moved difference and the
    /// levels that this then has; where it reads nothing the sensitivity is 0.
    pub(super) fn by_moving(&self, read: impl Fn(&dyn Signal, (f64, f64)) -> Option<f64>) -> [f64; 2] {
        let corrected = self.input.corrected;
        let (signal, negative, slope) = (&corrected.difference_v, &corrected.negative_v, corrected.slope());
        let change = |error: usize, read: &dyn Fn(f64) -> Option<f64>| {
            let step = self.sources.step(error);
            if step <= 0.0 {
                return 0.0;
            }
            let (up, down) = (read(step), read(-step));
            up.zip(down).map_or(0.0, |(up, down)| 0.5 * (up - down) / step)
        };
        let gain =
            change(0, &|step| read(&Moved { signal: &signal[..], along: &negative[..], step }, self.between(0, step)));
        let skew = change(1, &|step| read(&Moved { signal: &signal[..], along: &slope, step }, self.between(1, step)));
        [gain, -skew]
    }
}
