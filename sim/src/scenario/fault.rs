//! What goes wrong, and when.

use serde::Deserialize;

use super::check::require;
use super::{Scenario, ScenarioError};

/// One fault, in a scenario or told to the control port.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct FaultSpec {
    /// The instrument that it befalls.
    pub(crate) instrument: String,
    /// What goes wrong.
    pub(crate) what: What,
    /// When it strikes; at once if nothing is said.
    #[serde(default)]
    pub(crate) when: When,
    /// How often it strikes; 0 is without end. Once, but without end when it strikes by chance.
    #[serde(default)]
    pub(crate) times: Option<u32>,
    /// Only replies to messages that hold this text count.
    #[serde(default)]
    pub(crate) to: Option<String>,
    /// Bytes: where in the reply, how many, or how many at a time.
    #[serde(default)]
    pub(crate) bytes: Option<usize>,
    /// How long.
    #[serde(default)]
    pub(crate) seconds: Option<f64>,
    /// How many connections are refused.
    #[serde(default)]
    pub(crate) connections: Option<u32>,
    /// A late reply outlives its connection.
    #[serde(default)]
    pub(crate) across: bool,
    /// What another client sends.
    #[serde(default)]
    pub(crate) send: Option<String>,
    /// The setting that is clamped.
    #[serde(default)]
    pub(crate) setting: Option<Setting>,
    /// Its largest value, in its unit.
    #[serde(default)]
    pub(crate) most: Option<f64>,
    /// The channel, from 1.
    #[serde(default)]
    pub(crate) channel: Option<usize>,
    /// The bit of the converter, from 0.
    #[serde(default)]
    pub(crate) bit: Option<u32>,
    /// Where it clips, as a part of the half span.
    #[serde(default)]
    pub(crate) level: Option<f64>,
}

/// What can go wrong.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub(crate) enum What {
    /// A number is set no higher than `most`, silently, from then on.
    Clamp,
    /// A leg clips: what is beyond `level` is told as the converter's end code.
    Clipped,
    /// The connection is closed behind `bytes` of the reply.
    Cut,
    /// The reply comes `bytes` at a time, `seconds` apart.
    Drip,
    /// A probe fell off.
    Flat,
    /// Bytes of chance come before the reply.
    Garbage,
    /// Something stands between the reply and its end.
    Junk,
    /// The reply comes just before the next one.
    Late,
    /// A block declares a length of ten digits, which no block has.
    LengthAbsurd,
    /// A block declares more than it holds.
    LengthLong,
    /// A block declares less than it holds.
    LengthShort,
    /// Another client sends something.
    Meddle,
    /// The reply never comes.
    Mute,
    /// No trigger comes until the acquisition is dropped.
    NoTrigger,
    /// The error queue runs over.
    Overflow,
    /// The instrument is switched off and on.
    Reboot,
    /// The connection is closed, and others are for a while as soon as they are opened.
    Refuse,
    /// The reply stops behind `bytes` for `seconds`.
    Stall,
    /// A bit of a converter is stuck at one.
    StuckBit,
    /// The probes are exchanged.
    Swapped,
    /// A block holds less than it declares; further replies follow.
    Truncate,
    /// The reply comes twice.
    Twice,
}

/// When a fault strikes; at most one of them.
#[derive(Debug, Clone, PartialEq, Default, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub(crate) struct When {
    /// At every so many-th acquisition.
    pub(crate) acquisitions: Option<u64>,
    /// Whenever so many bytes of replies have been sent; in the reply that reaches it.
    pub(crate) bytes: Option<u64>,
    /// With this probability at each reply, or at each acquisition.
    pub(crate) chance: Option<f64>,
    /// At every so many-th reply.
    pub(crate) queries: Option<u64>,
}

/// A number that can be clamped.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub(crate) enum Setting {
    /// Of the generator, volts peak to peak.
    Amplitude,
    /// Sweeps to average.
    Averages,
    /// Of the supply, amperes.
    Current,
    /// Of the generator, hertz.
    Frequency,
    /// Seconds from sample to sample.
    Interval,
    /// Trigger level, volts.
    Level,
    /// Samples of a record.
    Points,
    /// Full vertical span, volts.
    Span,
    /// Of the supply, volts.
    Voltage,
}

impl What {
    /// Whether it befalls acquisitions, not replies.
    pub(crate) fn of_acquisitions(self) -> bool {
        matches!(self, Self::Clipped | Self::Flat | Self::NoTrigger | Self::StuckBit | Self::Swapped)
    }

    /// Whether it needs a reply with a block.
    pub(crate) fn of_blocks(self) -> bool {
        matches!(self, Self::LengthAbsurd | Self::LengthLong | Self::LengthShort | Self::Truncate)
    }

    /// Whether it changes how a reply is sent; of these only one can befall a reply.
    pub(crate) fn of_wire(self) -> bool {
        !self.of_acquisitions() && !matches!(self, Self::Clamp | Self::Meddle | Self::Overflow)
    }

    /// Its name in a scenario.
    pub(crate) fn name(self) -> &'static str {
        match self {
            Self::Clamp => "clamp",
            Self::Clipped => "clipped",
            Self::Cut => "cut",
            Self::Drip => "drip",
            Self::Flat => "flat",
            Self::Garbage => "garbage",
            Self::Junk => "junk",
            Self::Late => "late",
            Self::LengthAbsurd => "length-absurd",
            Self::LengthLong => "length-long",
            Self::LengthShort => "length-short",
            Self::Meddle => "meddle",
            Self::Mute => "mute",
            Self::NoTrigger => "no-trigger",
            Self::Overflow => "overflow",
            Self::Reboot => "reboot",
            Self::Refuse => "refuse",
            Self::Stall => "stall",
            Self::StuckBit => "stuck-bit",
            Self::Swapped => "swapped",
            Self::Truncate => "truncate",
            Self::Twice => "twice",
        }
    }

    /// The keys that it takes beside those of all faults.
    fn keys(self) -> &'static [&'static str] {
        match self {
            Self::Clamp => &["setting", "most"],
            Self::Clipped => &["channel", "level"],
            Self::Cut | Self::Garbage | Self::LengthLong | Self::LengthShort | Self::Truncate => &["bytes"],
            Self::Drip | Self::Stall => &["bytes", "seconds"],
            Self::Flat => &["channel"],
            Self::Late => &["across"],
            Self::Meddle => &["send"],
            Self::Reboot => &["connections"],
            Self::Refuse => &["connections", "seconds"],
            Self::StuckBit => &["channel", "bit"],
            Self::Junk
            | Self::LengthAbsurd
            | Self::Mute
            | Self::NoTrigger
            | Self::Overflow
            | Self::Swapped
            | Self::Twice => &[],
        }
    }

    /// Those without which it means nothing.
    fn needed(self) -> &'static [&'static str] {
        match self {
            Self::Clamp => &["setting", "most"],
            Self::Clipped | Self::Flat | Self::StuckBit => &["channel"],
            Self::Drip | Self::Stall => &["seconds"],
            Self::Meddle => &["send"],
            _ => &[],
        }
    }
}

impl FaultSpec {
    /// Checks what the types cannot say.
    ///
    /// # Errors
    /// The first mistake.
    pub(crate) fn check(&self, scenario: &Scenario) -> Result<(), ScenarioError> {
        let known = scenario.instruments.iter().any(|instrument| instrument.name == self.instrument);
        require(known, "fault.instrument", &self.instrument, "the name of an instrument of this scenario")?;
        let given = [
            ("across", self.across),
            ("bit", self.bit.is_some()),
            ("bytes", self.bytes.is_some()),
            ("channel", self.channel.is_some()),
            ("connections", self.connections.is_some()),
            ("level", self.level.is_some()),
            ("most", self.most.is_some()),
            ("seconds", self.seconds.is_some()),
            ("send", self.send.is_some()),
            ("setting", self.setting.is_some()),
        ];
        for (key, set) in given {
            let fits = !set || self.what.keys().contains(&key);
            require(fits, &format!("fault.{key}"), "given", "left out: this fault does not take it")?;
            let there = set || !self.what.needed().contains(&key);
            require(there, &format!("fault.{key}"), "left out", "given: this fault needs it")?;
        }
        let of_replies = self.to.is_none() || !self.what.of_acquisitions();
        require(of_replies, "fault.to", "given", "left out: this fault befalls acquisitions")?;
        let When { acquisitions, bytes, chance, queries } = self.when;
        let ways = [acquisitions.is_some(), bytes.is_some(), chance.is_some(), queries.is_some()];
        let ways = ways.iter().filter(|given| **given).count();
        require(ways <= 1, "fault.when", ways, "at most one of acquisitions, bytes, chance and queries")?;
        for (key, count) in [("acquisitions", acquisitions), ("queries", queries)] {
            require(count != Some(0), &format!("fault.when.{key}"), 0, "1 or more")?;
        }
        let chance = chance.unwrap_or(0.5);
        require((0.0..=1.0).contains(&chance), "fault.when.chance", chance, "between 0 and 1")?;
        let seconds = self.seconds.unwrap_or(0.0);
        require((0.0..=3600.0).contains(&seconds), "fault.seconds", seconds, "between 0 and 3600")?;
        require(self.bytes != Some(0) || self.what != What::Drip, "fault.bytes", 0, "1 or more")?;
        let channel = self.channel.unwrap_or(1);
        require((1..=4).contains(&channel), "fault.channel", channel, "between 1 and 4")?;
        let bit = self.bit.unwrap_or(0);
        require(bit < scenario.scope.converter_bits, "fault.bit", bit, "below the converter's bits")?;
        let level = self.level.unwrap_or(0.5);
        require(level > 0.0 && level <= 1.0, "fault.level", level, "above 0 and at most 1")?;
        let most = self.most.unwrap_or(0.0);
        require(most.is_finite(), "fault.most", most, "a finite number")
    }

    /// How often it may strike.
    pub(crate) fn most_times(&self) -> u32 {
        let usual = if self.when.chance.is_some() { 0 } else { 1 };
        match self.times.unwrap_or(usual) {
            0 => u32::MAX,
            times => times,
        }
    }
}
