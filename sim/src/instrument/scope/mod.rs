//! The scope: four channels behind 1 MOhm inputs. What it can do, without any header.

mod acquire;
mod settings;
mod transfer;

use std::sync::{Arc, Mutex};

use super::bench::{Bench, lock};
use super::core::Core;
use super::tree::{Call, Model, Number, Word, number};
use crate::message::Quantity;
use crate::scenario::Setting;
use crate::status::Fault;
use crate::world::{Coupling, TriggerSource};
use acquire::Acquirer;
pub(crate) use acquire::Record;
pub(crate) use settings::{CHANNELS, Encoding, Settings, delay_step, interval_step};
pub(crate) use transfer::{binary, facts, preamble, text};

/// The scope on a bench.
pub(crate) struct Scope {
    bench: Arc<Bench>,
    settings: Arc<Mutex<Settings>>,
    acquirer: Arc<Acquirer>,
}

impl Scope {
    /// A scope on `bench` whose status is `core`.
    pub(crate) fn new(bench: Arc<Bench>, core: Arc<Core>) -> Self {
        let settings = Arc::new(Mutex::new(Settings::default()));
        let acquirer = Arc::new(Acquirer::new(Arc::clone(&bench), core, Arc::clone(&settings)));
        Self { bench, settings, acquirer }
    }

    /// Starts an acquisition.
    ///
    /// # Errors
    /// -213 if one is under way.
    pub(crate) fn start(&self) -> Result<(), Fault> {
        self.acquirer.start()
    }

    /// Drops the acquisition under way, if there is one.
    pub(crate) fn abort(&self) {
        self.acquirer.abort();
    }

    /// The last record.
    ///
    /// # Errors
    /// -230 if there is none.
    pub(crate) fn record(&self) -> Result<Arc<Record>, Fault> {
        self.acquirer.record()
    }

    /// What triggers.
    pub(crate) fn source(&self) -> TriggerSource {
        self.with(|settings| settings.source)
    }

    /// Sets what triggers.
    pub(crate) fn set_source(&self, source: TriggerSource) {
        self.with(|settings| settings.source = source);
        self.changed();
    }
}

impl Model for Scope {
    type Settings = Settings;

    fn with<R>(&self, act: impl FnOnce(&mut Settings) -> R) -> R {
        act(&mut lock(&self.settings))
    }

    fn changed(&self) {
        self.bench.touch();
    }

    fn reset(&self) {
        self.acquirer.abort();
        self.acquirer.forget();
        self.with(|settings| *settings = Settings::default());
    }

    /// A scope that runs free takes a new acquisition for every reading.
    fn renew(&self) -> Result<bool, Fault> {
        if self.with(|settings| settings.free) {
            match self.start() {
                Ok(()) | Err(Fault::InitIgnored) => return Ok(true),
                Err(fault) => return Err(fault),
            }
        }
        Ok(false)
    }
}

/// Where a number lives among the settings.
type Placed = fn(&mut Settings, usize) -> &mut f64;

/// Full vertical span at the input.
pub(crate) fn span() -> Number<Scope> {
    let place: Placed = |settings, channel| &mut settings.channels[channel].span_v;
    Number {
        clamp: Some(Setting::Span),
        snap: settings::span_step,
        ..number(Quantity::Volt, &[settings::SPAN], CHANNELS, place)
    }
}

/// Voltage at the middle of the span.
pub(crate) fn offset() -> Number<Scope> {
    let place: Placed = |settings, channel| &mut settings.channels[channel].offset_v;
    number(Quantity::Volt, &[settings::OFFSET], CHANNELS, place)
}

/// The scope's own skew setting.
pub(crate) fn delay() -> Number<Scope> {
    let place: Placed = |settings, channel| &mut settings.channels[channel].delay_s;
    Number { snap: delay_step, ..number(Quantity::Second, &[settings::DELAY], CHANNELS, place) }
}

/// Seconds from sample to sample.
pub(crate) fn interval() -> Number<Scope> {
    let place: Placed = |settings, _| &mut settings.interval_s;
    Number {
        clamp: Some(Setting::Interval),
        snap: interval_step,
        ..number(Quantity::Second, &[settings::INTERVAL], 1, place)
    }
}

/// Samples in a record.
pub(crate) fn points() -> Number<Scope> {
    let place: Placed = |settings, _| &mut settings.points;
    Number { clamp: Some(Setting::Points), snap: f64::round, ..number(Quantity::Count, &[settings::POINTS], 1, place) }
}

/// Where in the record the trigger lies, 0 to 1.
pub(crate) fn position() -> Number<Scope> {
    number(Quantity::None, &[settings::POSITION], 1, |settings: &mut Settings, _| &mut settings.position)
}

/// How many sweeps are averaged.
pub(crate) fn averages() -> Number<Scope> {
    let place: Placed = |settings, _| &mut settings.averages;
    Number {
        clamp: Some(Setting::Averages),
        snap: f64::round,
        ..number(Quantity::Count, &[settings::AVERAGES], 1, place)
    }
}

/// Trigger level at the input.
pub(crate) fn level() -> Number<Scope> {
    let place: Placed = |settings, _| &mut settings.level_v;
    Number { clamp: Some(Setting::Level), ..number(Quantity::Volt, &[settings::LEVEL], 1, place) }
}

/// How an input is coupled; the keywords stand for AC, DC and ground in this order.
pub(crate) fn coupling(forms: &'static [&'static str; 3]) -> Word<Scope> {
    const COUPLINGS: [Coupling; 3] = [Coupling::Ac, Coupling::Dc, Coupling::Ground];
    Word {
        forms,
        count: CHANNELS,
        read: |settings, channel| {
            let set = settings.channels[channel].coupling;
            COUPLINGS.iter().position(|coupling| *coupling == set).unwrap_or_default()
        },
        write: |settings, channel, place| settings.channels[channel].coupling = COUPLINGS[place],
    }
}

/// The direction of the trigger's crossing; the keywords stand for rising and falling in this order.
pub(crate) fn slope(forms: &'static [&'static str; 2]) -> Word<Scope> {
    Word {
        forms,
        count: 1,
        read: |settings, _| usize::from(!settings.rising),
        write: |settings, _, place| settings.rising = place == 0,
    }
}

/// The channel of a number counted from 1, counted from 0.
///
/// # Errors
/// -222 if there is no such channel.
pub(crate) fn channel_index(number: u32) -> Result<usize, Fault> {
    let index = usize::try_from(number.wrapping_sub(1)).unwrap_or(usize::MAX);
    if index < CHANNELS { Ok(index) } else { Err(Fault::OutOfRange) }
}

/// Sets how many sweeps are averaged; one switches averaging off.
pub(crate) fn set_sweeps(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let limits = settings::AVERAGES;
    let count = call.args.number(&limits, Quantity::Count)?.round().clamp(limits.min, limits.max);
    let count = call.core.faults.clamped(Setting::Averages, count);
    call.args.finish()?;
    scope.with(|settings| (settings.averaging, settings.averages) = (count > 1.0, count));
    scope.changed();
    Ok(())
}

/// Answers with how many sweeps are averaged; one when averaging is off.
pub(crate) fn tell_sweeps(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    let count = scope.with(|settings| if settings.averaging { settings.averages } else { 1.0 });
    call.answer_number(count, Quantity::Count);
    Ok(())
}

/// Starts an acquisition.
pub(crate) fn start(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    scope.start()
}

/// Drops the acquisition under way.
pub(crate) fn abort(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    scope.abort();
    Ok(())
}

/// The record and channel that a header with a numeric suffix asks for.
///
/// # Errors
/// -222 if there is no such channel, -230 if there is no record.
pub(crate) fn asked(scope: &Scope, call: &Call<'_>) -> Result<(Arc<Record>, usize), Fault> {
    if call.index >= CHANNELS {
        return Err(Fault::OutOfRange);
    }
    Ok((scope.record()?, call.index))
}
