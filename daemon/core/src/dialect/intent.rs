//! What the daemon can want of an instrument: a closed list of intents, with their arguments and replies.
//!
//! An intent is said without any instrument's words; a dialect turns it into text. Adding one here is the only place
//! that has to change before dialects may speak it.

use ArgKind::{Channel, Channels, Flag, Keyword, Number, Whole};

/// Something that an instrument is asked to do or to tell.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Intent {
    /// Who are you?
    Identify,
    /// Which options does this model have?
    Options,
    /// Clear the status registers and the error queue.
    Clear,
    /// Go to the known default settings.
    Reset,
    /// Take one entry from the error queue.
    Error,
    /// Is everything that was begun complete?
    Complete,
    /// Vertical span and offset of one channel, in volts at the input.
    VerticalSet,
    /// Tells the vertical span and offset of one channel.
    VerticalGet,
    /// Input coupling of one channel.
    CouplingSet,
    /// Tells the input coupling of one channel.
    CouplingGet,
    /// Sample interval, record length, and where in the record (0 to 1) the trigger lies.
    TimebaseSet,
    /// Tells the time base.
    TimebaseGet,
    /// Trigger source (a channel, 0 for the external input, −1 for none: at once), level in volts at the input, slope.
    TriggerSet,
    /// Tells the trigger settings.
    TriggerGet,
    /// How many acquisitions are averaged; 1 switches averaging off.
    AverageSet,
    /// Tells the averaging.
    AverageGet,
    /// Makes the instrument send samples in the format that the dialect reads.
    FormatSet,
    /// Starts one (averaged) acquisition of all channels.
    AcquireStart,
    /// Ends an acquisition that was started.
    AcquireAbort,
    /// What turns the last acquisition's codes into volts and seconds.
    RecordPreamble,
    /// The samples of one channel.
    RecordData,
    /// Shifts one channel's record earlier by this many seconds: takes a late leg back.
    SkewSet,
    /// Tells by how much one channel's record is shifted.
    SkewGet,
    /// A square wave; amplitude peak to peak and offset in volts, open circuit; edge is the 10-90 % time.
    SourceSquare,
    /// A sine wave; amplitude peak to peak and offset in volts, open circuit.
    SourceSine,
    /// A pulse train; duty is a fraction of the period.
    SourcePulse,
    /// Several sines at once, above and at the given frequency.
    SourceMultitone,
    /// A direct voltage in volts.
    SourceVoltage,
    /// A direct current, or its limit, in amperes.
    SourceCurrent,
    /// Switches one output on or off.
    OutputSet,
    /// Tells whether one output is on.
    OutputGet,
    /// Measures the voltage at one output.
    MeasureVoltage,
    /// Measures the current out of one output.
    MeasureCurrent,
    /// Closes channels of a switch unit.
    RouteClose,
    /// Opens channels of a switch unit.
    RouteOpen,
    /// Opens all channels of a switch unit.
    RouteOpenAll,
    /// Tells which of the channels are closed, 1 or 0 each.
    RouteGet,
}

/// What sort of thing an intent is; it decides what may be repeated after a lost connection.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum IntentKind {
    /// Sets something to a value: may be sent again, and is sent again after the instrument lost its settings.
    Setting,
    /// Asks without changing anything: may be asked again.
    Query,
    /// Has an effect of its own: never sent again by itself.
    Action,
    /// Starts an acquisition: never sent again by itself; completion has to be waited for.
    Acquire,
    /// Asks for samples: may be asked again while the acquisition is the same.
    Data,
}

impl IntentKind {
    /// Whether doing it twice is the same as doing it once.
    #[must_use]
    pub fn idempotent(self) -> bool {
        !matches!(self, Self::Action | Self::Acquire)
    }
}

/// What an argument must be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum ArgKind {
    /// The number of a channel or an output, from 1 to [`HIGHEST_CHANNEL`].
    Channel,
    /// A list of the numbers of a switch unit's channels, not empty.
    Channels,
    /// On or off.
    Flag,
    /// One of these words.
    Keyword(&'static [&'static str]),
    /// A finite number in the unit of the name's suffix.
    Number,
    /// A whole number within these ends.
    Whole(i64, i64),
}

/// The highest channel number that is sent: larger than any switch unit's, small enough to be a numeric suffix.
pub const HIGHEST_CHANNEL: i64 = 99_999;

/// What a field of a reply is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum ReplyKind {
    /// The samples of a record, as sent.
    Block,
    /// True or false.
    Flag,
    /// One of these words.
    Keyword(&'static [&'static str]),
    /// A list of whole numbers.
    List,
    /// A number in the unit of the name's suffix.
    Number,
    /// Any text.
    Text,
    /// A whole number.
    Whole,
}

/// An intent's arguments, its reply's fields and its kind.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct IntentSpec {
    /// Every argument that is always given.
    pub args: &'static [(&'static str, ArgKind)],
    /// Arguments that are given only to a dialect that wants them, see `[window]` of dialect files.
    pub optional: &'static [(&'static str, ArgKind)],
    /// Every field of the reply.
    pub reply: &'static [(&'static str, ReplyKind)],
    /// What sort of thing it is.
    pub kind: IntentKind,
}

/// The words for input coupling.
pub const COUPLINGS: &[&str] = &["ac", "dc", "ground"];
/// The words for a trigger slope.
pub const SLOPES: &[&str] = &["positive", "negative"];

const CHANNEL: (&str, ArgKind) = ("channel", Channel);
/// The longest record and the largest average that are asked for: what a 32-bit counter holds, so that no sum overflows.
const MANY: i64 = u32::MAX as i64;
/// Amplitude and offset are given together for every shape of a source.
const FREQUENCY: (&str, ArgKind) = ("frequency_hz", Number);
const AMPLITUDE: (&str, ArgKind) = ("amplitude_v", Number);
const OFFSET: (&str, ArgKind) = ("offset_v", Number);
const VALUE: (&str, ReplyKind) = ("value", ReplyKind::Number);

const fn spec(
    kind: IntentKind,
    args: &'static [(&'static str, ArgKind)],
    reply: &'static [(&'static str, ReplyKind)],
) -> IntentSpec {
    IntentSpec { args, optional: &[], reply, kind }
}

/// Samples are read as a whole, or window after window: `count` samples from the one numbered `first`, from 0.
const SAMPLES: IntentSpec = IntentSpec {
    args: &[CHANNEL],
    optional: &[("first", Whole(0, MANY)), ("count", Whole(1, MANY))],
    reply: &[("block", ReplyKind::Block)],
    kind: Data,
};

use IntentKind::{Acquire, Action, Data, Query, Setting};

/// Every intent with its name and its specification.
const TABLE: &[(Intent, &str, IntentSpec)] = &[
    (Intent::Identify, "identify", spec(Query, &[], &[("identity", ReplyKind::Text)])),
    (Intent::Options, "options", spec(Query, &[], &[("options", ReplyKind::Text)])),
    (Intent::Clear, "clear", spec(Action, &[], &[])),
    (Intent::Reset, "reset", spec(Action, &[], &[])),
    // Asking takes the entry out of the queue, so it is an action.
    (Intent::Error, "error", spec(Action, &[], &[("number", ReplyKind::Whole), ("text", ReplyKind::Text)])),
    (Intent::Complete, "complete", spec(Query, &[], &[("done", ReplyKind::Flag)])),
    (Intent::VerticalSet, "vertical.set", spec(Setting, &[CHANNEL, ("span_v", Number), OFFSET], &[])),
    (
        Intent::VerticalGet,
        "vertical.get",
        spec(Query, &[CHANNEL], &[("span_v", ReplyKind::Number), ("offset_v", ReplyKind::Number)]),
    ),
    (Intent::CouplingSet, "coupling.set", spec(Setting, &[CHANNEL, ("coupling", Keyword(COUPLINGS))], &[])),
    (Intent::CouplingGet, "coupling.get", spec(Query, &[CHANNEL], &[("coupling", ReplyKind::Keyword(COUPLINGS))])),
    (
        Intent::TimebaseSet,
        "timebase.set",
        spec(Setting, &[("interval_s", Number), ("points", Whole(1, MANY)), ("position", Number)], &[]),
    ),
    (
        Intent::TimebaseGet,
        "timebase.get",
        spec(
            Query,
            &[],
            &[("interval_s", ReplyKind::Number), ("points", ReplyKind::Whole), ("position", ReplyKind::Number)],
        ),
    ),
    (
        Intent::TriggerSet,
        "trigger.set",
        spec(Setting, &[("channel", Whole(-1, HIGHEST_CHANNEL)), ("level_v", Number), ("slope", Keyword(SLOPES))], &[]),
    ),
    (
        Intent::TriggerGet,
        "trigger.get",
        spec(
            Query,
            &[],
            &[("channel", ReplyKind::Whole), ("level_v", ReplyKind::Number), ("slope", ReplyKind::Keyword(SLOPES))],
        ),
    ),
    (Intent::AverageSet, "average.set", spec(Setting, &[("count", Whole(1, MANY))], &[])),
    (Intent::AverageGet, "average.get", spec(Query, &[], &[("count", ReplyKind::Whole)])),
    (Intent::FormatSet, "format.set", spec(Setting, &[], &[])),
    (Intent::AcquireStart, "acquire.start", spec(Acquire, &[], &[])),
    (Intent::AcquireAbort, "acquire.abort", spec(Action, &[], &[])),
    (Intent::RecordPreamble, "record.preamble", spec(Query, &[CHANNEL], PREAMBLE)),
    (Intent::RecordData, "record.data", SAMPLES),
    (Intent::SkewSet, "skew.set", spec(Setting, &[CHANNEL, ("delay_s", Number)], &[])),
    (Intent::SkewGet, "skew.get", spec(Query, &[CHANNEL], &[("delay_s", ReplyKind::Number)])),
    (
        Intent::SourceSquare,
        "source.square",
        spec(Setting, &[CHANNEL, FREQUENCY, AMPLITUDE, OFFSET, ("edge_s", Number)], &[]),
    ),
    (Intent::SourceSine, "source.sine", spec(Setting, &[CHANNEL, FREQUENCY, AMPLITUDE, OFFSET], &[])),
    (
        Intent::SourcePulse,
        "source.pulse",
        spec(Setting, &[CHANNEL, FREQUENCY, AMPLITUDE, OFFSET, ("duty", Number), ("edge_s", Number)], &[]),
    ),
    (Intent::SourceMultitone, "source.multitone", spec(Setting, &[CHANNEL, FREQUENCY, AMPLITUDE, OFFSET], &[])),
    (Intent::SourceVoltage, "source.voltage", spec(Setting, &[CHANNEL, ("value", Number)], &[])),
    (Intent::SourceCurrent, "source.current", spec(Setting, &[CHANNEL, ("value", Number)], &[])),
    (Intent::OutputSet, "output.set", spec(Setting, &[CHANNEL, ("state", Flag)], &[])),
    (Intent::OutputGet, "output.get", spec(Query, &[CHANNEL], &[("state", ReplyKind::Flag)])),
    (Intent::MeasureVoltage, "measure.voltage", spec(Query, &[CHANNEL], &[VALUE])),
    (Intent::MeasureCurrent, "measure.current", spec(Query, &[CHANNEL], &[VALUE])),
    // Order matters between closing and opening, so none of them is repeated out of turn.
    (Intent::RouteClose, "route.close", spec(Action, &[("channels", Channels)], &[])),
    (Intent::RouteOpen, "route.open", spec(Action, &[("channels", Channels)], &[])),
    (Intent::RouteOpenAll, "route.open_all", spec(Action, &[], &[])),
    (Intent::RouteGet, "route.get", spec(Query, &[("channels", Channels)], &[("closed", ReplyKind::List)])),
];

/// The fields that every preamble has once the dialect has read it.
pub(super) const PREAMBLE: &[(&str, ReplyKind)] = &[
    ("points", ReplyKind::Whole),
    ("interval_s", ReplyKind::Number),
    ("start_s", ReplyKind::Number),
    ("volts_per_code", ReplyKind::Number),
    ("zero_v", ReplyKind::Number),
    ("low_code", ReplyKind::Number),
    ("high_code", ReplyKind::Number),
    ("step_v", ReplyKind::Number),
    ("averages", ReplyKind::Whole),
    ("acquisition", ReplyKind::Whole),
];

/// Fields that a reply may have besides those of the specification: a scope that switches averaging and sets its count
/// apart says both, and [`Intent::AverageGet`] makes one count of them.
pub(super) const BESIDES: &[(Intent, &str, ReplyKind)] = &[(Intent::AverageGet, "state", ReplyKind::Flag)];

/// What stands for an intent that the table lacks; a test shows that it lacks none.
const NOTHING: IntentSpec = spec(Action, &[], &[]);

impl Intent {
    /// Every intent.
    pub fn all() -> impl Iterator<Item = Self> {
        TABLE.iter().map(|(intent, ..)| *intent)
    }

    /// Its name in dialects, bench files and sequences, such as `vertical.set`.
    #[must_use]
    pub fn name(self) -> &'static str {
        self.row().map_or("", |(_, name, _)| name)
    }

    /// The intent of this name.
    #[must_use]
    pub fn parse(name: &str) -> Option<Self> {
        TABLE.iter().find(|(_, known, _)| *known == name).map(|(intent, ..)| *intent)
    }

    /// Its arguments, its reply and its kind.
    #[must_use]
    pub fn spec(self) -> IntentSpec {
        self.row().map_or(NOTHING, |(.., spec)| *spec)
    }

    fn row(self) -> Option<&'static (Self, &'static str, IntentSpec)> {
        TABLE.iter().find(|(intent, ..)| *intent == self)
    }
}

impl std::fmt::Display for Intent {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(self.name())
    }
}
