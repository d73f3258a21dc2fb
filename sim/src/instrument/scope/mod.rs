//! The scope: four channels behind 1 MOhm inputs. Headers after SCPI-99's digitizer class; `INPut:DELay` (the scope's own
//! skew setting) and `TRACe:PREamble` are ours.

mod acquire;
mod settings;
mod transfer;

use std::sync::{Arc, Mutex};

use super::bench::{Bench, lock};
use super::core::Core;
use super::tree::{Action, Call, Model, Number, Place, Word, number};
use crate::message::Quantity;
use crate::status::Fault;
use crate::world::TriggerSource;
use acquire::Acquirer;
use settings::{CHANNELS, COUPLINGS, Encoding, Settings};

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

    fn commands() -> Vec<(&'static str, Action<Self>)> {
        use Action::{Command, Flag, Query};
        vec![
            ("[:SENSe#]:VOLTage[:DC]:RANGe:PTPeak", span()),
            ("[:SENSe#]:VOLTage[:DC]:RANGe:OFFSet", offset()),
            (":INPut#:COUPling", coupling()),
            (":INPut#:DELay", delay()),
            ("[:SENSe]:SWEep:TINTerval", interval()),
            ("[:SENSe]:SWEep:POINts", points()),
            ("[:SENSe]:SWEep:OREFerence:LOCation", position()),
            ("[:SENSe]:AVERage[:STATe]", Flag(Place { count: 1, of: |settings, _| &mut settings.averaging })),
            ("[:SENSe]:AVERage:COUNt", averages()),
            (":TRIGger[:SEQuence]:SOURce", Command(set_source)),
            (":TRIGger[:SEQuence]:SOURce", Query(tell_source)),
            (":TRIGger[:SEQuence]:LEVel", level()),
            (":TRIGger[:SEQuence]:SLOPe", slope()),
            (":INITiate[:IMMediate]", Command(initiate)),
            (":ABORt", Command(abort)),
            (":FORMat[:DATA]", Command(set_format)),
            (":FORMat[:DATA]", Query(tell_format)),
            (":FORMat:BORDer", border()),
            (":TRACe[:DATA]:PREamble", Query(preamble)),
            (":TRACe[:DATA][:DATA]", Query(data)),
        ]
    }
}

type Entry = Action<Scope>;
/// Where a number lives among the settings.
type Placed = fn(&mut Settings, usize) -> &mut f64;

fn span() -> Entry {
    let place: Placed = |settings, channel| &mut settings.channels[channel].span_v;
    Action::Number(Number { snap: settings::span_step, ..number(Quantity::Volt, &[settings::SPAN], CHANNELS, place) })
}

fn offset() -> Entry {
    let place: Placed = |settings, channel| &mut settings.channels[channel].offset_v;
    Action::Number(number(Quantity::Volt, &[settings::OFFSET], CHANNELS, place))
}

fn delay() -> Entry {
    let place: Placed = |settings, channel| &mut settings.channels[channel].delay_s;
    Action::Number(Number {
        snap: settings::delay_step,
        ..number(Quantity::Second, &[settings::DELAY], CHANNELS, place)
    })
}

fn coupling() -> Entry {
    Action::Word(Word {
        forms: &["AC", "DC", "GROund"],
        count: CHANNELS,
        read: |settings, channel| {
            let set = settings.channels[channel].coupling;
            COUPLINGS.iter().position(|coupling| *coupling == set).unwrap_or_default()
        },
        write: |settings, channel, place| settings.channels[channel].coupling = COUPLINGS[place],
    })
}

fn interval() -> Entry {
    let place: Placed = |settings, _| &mut settings.interval_s;
    Action::Number(Number {
        snap: settings::interval_step,
        ..number(Quantity::Second, &[settings::INTERVAL], 1, place)
    })
}

fn points() -> Entry {
    let place: Placed = |settings, _| &mut settings.points;
    Action::Number(Number { snap: f64::round, ..number(Quantity::Count, &[settings::POINTS], 1, place) })
}

fn position() -> Entry {
    Action::Number(number(Quantity::None, &[settings::POSITION], 1, |settings: &mut Settings, _| {
        &mut settings.position
    }))
}

fn averages() -> Entry {
    let place: Placed = |settings, _| &mut settings.averages;
    Action::Number(Number { snap: f64::round, ..number(Quantity::Count, &[settings::AVERAGES], 1, place) })
}

fn level() -> Entry {
    Action::Number(number(Quantity::Volt, &[settings::LEVEL], 1, |settings: &mut Settings, _| &mut settings.level_v))
}

fn slope() -> Entry {
    Action::Word(Word {
        forms: &["POSitive", "NEGative"],
        count: 1,
        read: |settings, _| usize::from(!settings.rising),
        write: |settings, _, place| settings.rising = place == 0,
    })
}

fn border() -> Entry {
    Action::Word(Word {
        forms: &["NORMal", "SWAPped"],
        count: 1,
        read: |settings, _| usize::from(settings.swapped),
        write: |settings, _, place| settings.swapped = place == 1,
    })
}

fn set_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let source = match call.args.word(&["INTernal", "EXTernal", "IMMediate"])? {
        (0, number) => TriggerSource::Channel(channel_index(number)?),
        (1, None) => TriggerSource::External,
        (2, None) => TriggerSource::Immediate,
        _ => return Err(Fault::InvalidCharacterData),
    };
    call.args.finish()?;
    scope.with(|settings| settings.source = source);
    scope.changed();
    Ok(())
}

fn tell_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    match scope.with(|settings| settings.source) {
        TriggerSource::Channel(index) => call.answer(format!("INT{}", index + 1)),
        TriggerSource::External => call.answer("EXT"),
        TriggerSource::Immediate => call.answer("IMM"),
    }
    Ok(())
}

fn initiate(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    scope.acquirer.start()
}

fn abort(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    scope.acquirer.abort();
    Ok(())
}

/// `FORMat ASCii`, `INTeger,8`, `INTeger,16` (also without a length) and `REAL,32`.
fn set_format(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let kind = call.args.plain_word(&["ASCii", "INTeger", "REAL"])?;
    let bits = call.args.optional_number()?;
    call.args.finish()?;
    let is = |wanted: f64| bits.is_none_or(|bits| (bits - wanted).abs() < 0.5);
    let encoding = match kind {
        0 => Encoding::Text,
        1 if is(16.0) => Encoding::Integer16,
        1 if is(8.0) => Encoding::Integer8,
        2 if is(32.0) => Encoding::Real32,
        _ => return Err(Fault::OutOfRange),
    };
    scope.with(|settings| settings.encoding = encoding);
    Ok(())
}

fn tell_format(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    call.answer(match scope.with(|settings| settings.encoding) {
        Encoding::Integer16 => "INT,16",
        Encoding::Integer8 => "INT,8",
        Encoding::Real32 => "REAL,32",
        Encoding::Text => "ASC,0",
    });
    Ok(())
}

fn preamble(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let channel = asked_channel(call)?;
    let record = scope.acquirer.record()?;
    let encoding = scope.with(|settings| settings.encoding);
    call.answer(transfer::preamble(&record, channel, encoding)?);
    Ok(())
}

fn data(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let channel = asked_channel(call)?;
    let record = scope.acquirer.record()?;
    let (encoding, swapped) = scope.with(|settings| (settings.encoding, settings.swapped));
    match encoding {
        Encoding::Text => call.answer(transfer::text(&record, channel)?),
        _ => call.reply.add_block(&transfer::binary(&record, channel, encoding, swapped)?),
    }
    Ok(())
}

/// The channel that `CHANnel<n>` names, counted from 0.
fn asked_channel(call: &mut Call<'_>) -> Result<usize, Fault> {
    let (_, number) = call.args.word(&["CHANnel"])?;
    call.args.finish()?;
    channel_index(number)
}

fn channel_index(number: Option<u32>) -> Result<usize, Fault> {
    let index = usize::try_from(number.unwrap_or(1).wrapping_sub(1)).unwrap_or(usize::MAX);
    if index < CHANNELS { Ok(index) } else { Err(Fault::OutOfRange) }
}
