//! The figures that are known: names, units and meanings, in one place.

use crate::units::Unit;

/// A figure of a capture.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum FigureKind {
    /// Waveform amplitude: high level less low level.
    Amplitude,
    /// Integral of the difference over the valid record.
    Area,
    /// Rms of the common mode, noise power removed.
    CommonRms,
    /// Steepest slope of the common mode, either way, mean over the cycles where there are at least two.
    CommonSlew,
    /// Highest less lowest value of the common mode.
    CommonSwing,
    /// Share of the period in the high state, between 50 % points.
    Duty,
    /// Mean slope between 90 % and 10 % of the transitions from high to low, as a magnitude.
    FallSlew,
    /// Duration of the transitions from high to low, 90 % to 10 %, mean.
    FallTime,
    /// 1/period.
    Frequency,
    /// Level of the high state.
    HighLevel,
    /// Rms scatter of like 50 % points about a straight line in time, the noise's own part removed.
    Jitter,
    /// Level of the low state.
    LowLevel,
    /// Highest value, mean over the cycles where there are at least two.
    Maximum,
    /// Mean over the valid record.
    Mean,
    /// Lowest value, mean over the cycles where there are at least two.
    Minimum,
    /// How far the waveform goes above the high level after rising transitions, relative to the amplitude.
    Overshoot,
    /// Maximum less minimum.
    PeakToPeak,
    /// Time between alike 50 % points.
    Period,
    /// Pre-transition aberration: how far the waveform departs from its level, either way, before it leaves it, relative
    /// to the amplitude.
    PreAberration,
    /// Mean slope between 10 % and 90 % of the transitions from low to high.
    RiseSlew,
    /// Duration of the transitions from low to high, 10 % to 90 %, mean.
    RiseTime,
    /// Rms over the valid record, noise power removed.
    Rms,
    /// Time from the 50 % point of a transition until the waveform stays within a band round its new level, mean.
    SettlingTime,
    /// Total harmonic distortion of a sine: rms of the harmonics relative to the fundamental's.
    Thd,
    /// Time above a threshold in each period, mean.
    TimeAbove,
    /// Time below a threshold in each period, mean.
    TimeBelow,
    /// How far the waveform goes below the low level after falling transitions, relative to the amplitude.
    Undershoot,
}

use FigureKind as K;

/// Every figure in the order in which they are reported.
const TABLE: [(FigureKind, &str, Unit); 27] = [
    (K::HighLevel, "high_level", Unit::Volt),
    (K::LowLevel, "low_level", Unit::Volt),
    (K::Amplitude, "amplitude", Unit::Volt),
    (K::RiseTime, "rise_time", Unit::Second),
    (K::FallTime, "fall_time", Unit::Second),
    (K::RiseSlew, "rise_slew", Unit::VoltPerSecond),
    (K::FallSlew, "fall_slew", Unit::VoltPerSecond),
    (K::PreAberration, "pre_aberration", Unit::One),
    (K::Overshoot, "overshoot", Unit::One),
    (K::Undershoot, "undershoot", Unit::One),
    (K::SettlingTime, "settling_time", Unit::Second),
    (K::Frequency, "frequency", Unit::Hertz),
    (K::Period, "period", Unit::Second),
    (K::Duty, "duty", Unit::One),
    (K::Jitter, "jitter", Unit::Second),
    (K::TimeAbove, "time_above", Unit::Second),
    (K::TimeBelow, "time_below", Unit::Second),
    (K::Mean, "mean", Unit::Volt),
    (K::Rms, "rms", Unit::Volt),
    (K::Maximum, "maximum", Unit::Volt),
    (K::Minimum, "minimum", Unit::Volt),
    (K::PeakToPeak, "peak_to_peak", Unit::Volt),
    (K::Area, "area", Unit::VoltSecond),
    (K::Thd, "thd", Unit::One),
    (K::CommonRms, "common_rms", Unit::Volt),
    (K::CommonSwing, "common_swing", Unit::Volt),
    (K::CommonSlew, "common_slew", Unit::VoltPerSecond),
];

impl FigureKind {
    /// Every figure, in the order in which they are reported.
    pub fn all() -> impl Iterator<Item = Self> {
        TABLE.iter().map(|(kind, ..)| *kind)
    }

    /// Its name, such as `rise_time`.
    #[must_use]
    pub fn name(self) -> &'static str {
        TABLE.iter().find(|(kind, ..)| *kind == self).map_or("", |(_, name, _)| name)
    }

    /// Its unit.
    #[must_use]
    pub fn unit(self) -> Unit {
        TABLE.iter().find(|(kind, ..)| *kind == self).map_or(Unit::One, |(.., unit)| *unit)
    }

    /// The figure with this name.
    #[must_use]
    pub fn parse(name: &str) -> Option<Self> {
        TABLE.iter().find(|(_, known, _)| *known == name).map(|(kind, ..)| *kind)
    }
}
