//! What the scope is asked for and what it gives back.

/// The scope's settings for one acquisition.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct ScopeSettings {
    /// The channels, the first of them at index 0.
    pub(crate) channels: Vec<ChannelSettings>,
    /// Seconds from sample to sample.
    pub(crate) interval_s: f64,
    /// Samples in a record.
    pub(crate) points: usize,
    /// Where in the record the trigger lies: 0 its first sample, 1 its last.
    pub(crate) trigger_position: f64,
    /// What starts a sweep.
    pub(crate) trigger: Trigger,
    /// Sweeps to average; 0 and 1 are a single sweep.
    pub(crate) averages: u32,
}

/// One channel's settings.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct ChannelSettings {
    /// Full vertical span at the input, in volts.
    pub(crate) span_v: f64,
    /// The voltage at the middle of the span.
    pub(crate) offset_v: f64,
    /// How the input is coupled.
    pub(crate) coupling: Coupling,
    /// The scope's own skew setting: positive shifts the record earlier.
    pub(crate) delay_s: f64,
}

/// How an input is coupled.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Coupling {
    /// Without the mean. A simplification: a real input has a corner of some hertz.
    Ac,
    /// As it is.
    Dc,
    /// Nought.
    Ground,
}

/// What starts a sweep.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Trigger {
    /// Which signal.
    pub(crate) source: TriggerSource,
    /// For a channel: the level at its input, in volts.
    pub(crate) level_v: f64,
    /// The direction of the crossing.
    pub(crate) rising: bool,
}

/// Which signal starts a sweep.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum TriggerSource {
    /// A channel, counted from 0.
    Channel(usize),
    /// The generator's sync edge: of output 1 if it is on, else of output 2.
    External,
    /// None: the sweep starts anywhere.
    Immediate,
}

/// What goes wrong with one acquisition.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct Disturbance {
    /// Channels (from 0) that clip at a part of the half span.
    pub(crate) clipped: Vec<(usize, f64)>,
    /// Channels whose probe fell off: its tip is at nought.
    pub(crate) flat: Vec<usize>,
    /// No trigger comes.
    pub(crate) no_trigger: bool,
    /// Channels with a bit of their converter stuck at one.
    pub(crate) stuck: Vec<(usize, u32)>,
    /// The probes of the pair are exchanged: P's is on the negative tip.
    pub(crate) swapped: bool,
}

impl Disturbance {
    /// What it does to the codes of a channel. A stuck bit is that of the average if there is one.
    pub(super) fn spoil(&self, channel: usize, data: &mut ChannelData) {
        let finer = (data.step_v / data.volts_per_code).round() as i32;
        for (_, bit) in self.stuck.iter().filter(|(other, _)| *other == channel) {
            let bit = finer << bit;
            for code in &mut data.codes {
                // Counted from the lowest code, as a converter does. Both ends fit, so does what lies between.
                let stuck = (i32::from(*code) - data.low_code) | bit;
                *code = (stuck + data.low_code).min(data.high_code) as i16;
            }
        }
        for (_, level) in self.clipped.iter().filter(|(other, _)| *other == channel) {
            let (low, high) = (f64::from(data.low_code) * level, f64::from(data.high_code) * level);
            for code in &mut data.codes {
                if f64::from(*code) >= high {
                    *code = data.high_code as i16;
                } else if f64::from(*code) <= low {
                    *code = data.low_code as i16;
                }
            }
        }
    }
}

/// The records of one acquisition.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Acquisition {
    /// One record for every channel of the settings.
    pub(crate) channels: Vec<ChannelData>,
    /// Time of sample 0 relative to the trigger, in seconds.
    pub(crate) start_s: f64,
    /// Counts the acquisitions, from 1.
    pub(crate) number: u64,
}

/// One record and how to read it: `volts = zero_v + code·volts_per_code`, at the input.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct ChannelData {
    /// Codes; of an average on a grid 256 times finer than the converter's.
    pub(crate) codes: Vec<i16>,
    /// Volts from code to code.
    pub(crate) volts_per_code: f64,
    /// Volts at code 0.
    pub(crate) zero_v: f64,
    /// The code of the converter's lowest value: a sample there may be clipped.
    pub(crate) low_code: i32,
    /// The code of the converter's highest value.
    pub(crate) high_code: i32,
    /// One converter step, in volts, averaged or not.
    pub(crate) step_v: f64,
}

/// Nothing crossed the trigger level, or there is no sync edge.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("no trigger: the chosen source does not cross the level within a period")]
pub(crate) struct NoTrigger;
