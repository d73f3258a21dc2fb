//! When an armed fault strikes.

use rand::RngExt;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;

use crate::scenario::{FaultSpec, What, When};
use crate::world::Disturbance;

/// Streams of random numbers from here on belong to faults; the world's are below.
const FIRST_STREAM: u64 = 1 << 62;

/// The bit that is stuck when nothing else is said: an eighth of a span of eight bits.
const USUAL_BIT: u32 = 5;
/// Where a leg clips when nothing else is said, as a part of the half span.
const USUAL_LEVEL: f64 = 0.5;

/// A fault that waits.
#[derive(Debug)]
pub(super) struct Armed {
    /// Its number.
    pub(super) number: u32,
    /// What it is.
    pub(super) spec: FaultSpec,
    rng: ChaCha8Rng,
    struck: u32,
    /// Since it was armed or struck last.
    replies: u64,
    bytes: u64,
    acquisitions: u64,
}

/// A fault that strikes.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Struck {
    /// The fault's number.
    pub(crate) number: u32,
    /// What it is.
    pub(crate) spec: FaultSpec,
    /// Where in the reply the wanted number of bytes is reached, if the fault goes by bytes.
    pub(crate) offset: Option<usize>,
    /// A number of chance for what is left to it.
    pub(crate) seed: u64,
}

impl Armed {
    /// A fault of this number.
    pub(super) fn new(number: u32, spec: FaultSpec, seed: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        rng.set_stream(FIRST_STREAM + u64::from(number));
        Self { number, spec, rng, struck: 0, replies: 0, bytes: 0, acquisitions: 0 }
    }

    /// Strikes, and begins to count again.
    pub(super) fn strike(&mut self) -> Struck {
        self.struck += 1;
        (self.replies, self.bytes, self.acquisitions) = (0, 0, 0);
        Struck { number: self.number, spec: self.spec.clone(), offset: None, seed: self.rng.random() }
    }

    /// A reply of `length` bytes to `message`; `taken` if another fault has it already.
    pub(super) fn at_reply(&mut self, message: &[u8], length: usize, has_block: bool, taken: bool) -> Option<Struck> {
        let what = self.spec.what;
        let wanted = self.spec.to.as_ref().is_none_or(|text| holds(message, text.as_bytes()));
        if !wanted || self.struck >= self.spec.most_times() {
            return None;
        }
        self.replies += 1;
        let before = self.bytes;
        self.bytes += length as u64;
        if what.of_acquisitions() || (what.of_blocks() && !has_block) || (what.of_wire() && taken) {
            return None;
        }
        let When { acquisitions, bytes, chance, queries } = self.spec.when;
        let due = match (acquisitions, bytes, chance, queries) {
            (Some(count), ..) => self.acquisitions >= count,
            (_, Some(count), ..) => self.bytes > count,
            (_, _, Some(chance), _) => self.rng.random::<f64>() < chance,
            (_, _, _, Some(count)) => self.replies >= count,
            _ => true,
        };
        if !due {
            return None;
        }
        let offset = bytes.map(|count| usize::try_from(count.saturating_sub(before)).unwrap_or(0));
        Some(Struck { offset, ..self.strike() })
    }

    /// An acquisition begins.
    pub(super) fn at_acquisition(&mut self) -> Option<Struck> {
        if self.struck >= self.spec.most_times() {
            return None;
        }
        self.acquisitions += 1;
        if !self.spec.what.of_acquisitions() {
            return None;
        }
        let When { acquisitions, bytes, chance, queries } = self.spec.when;
        let due = match (acquisitions, bytes, chance, queries) {
            (Some(count), ..) => self.acquisitions >= count,
            (_, Some(count), ..) => self.bytes >= count,
            (_, _, Some(chance), _) => self.rng.random::<f64>() < chance,
            (_, _, _, Some(count)) => self.replies >= count,
            _ => true,
        };
        due.then(|| self.strike())
    }
}

impl Struck {
    /// Adds what it does to an acquisition.
    pub(super) fn disturb(&self, disturbance: &mut Disturbance) {
        let channel = self.spec.channel.unwrap_or(1).saturating_sub(1);
        match self.spec.what {
            What::Clipped => disturbance.clipped.push((channel, self.spec.level.unwrap_or(USUAL_LEVEL))),
            What::Flat => disturbance.flat.push(channel),
            What::NoTrigger => disturbance.no_trigger = true,
            What::StuckBit => disturbance.stuck.push((channel, self.spec.bit.unwrap_or(USUAL_BIT))),
            What::Swapped => disturbance.swapped = true,
            _ => {}
        }
    }
}

/// Whether `text` stands in `message`, whatever the case of its letters.
fn holds(message: &[u8], text: &[u8]) -> bool {
    text.is_empty() || message.windows(text.len()).any(|window| window.eq_ignore_ascii_case(text))
}
