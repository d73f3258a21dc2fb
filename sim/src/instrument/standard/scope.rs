//! The scope's headers after SCPI-99's digitizer class; `INPut:DELay` (the scope's own skew setting) and
//! `TRACe:PREamble` are ours.

use crate::instrument::scope::{self, Encoding, Scope, channel_index};
use crate::instrument::tree::{Action, Call, Model, Place, Table, Word};
use crate::status::Fault;
use crate::world::TriggerSource;

/// The headers.
pub(super) fn table() -> Table<Scope> {
    use Action::{Command, Flag, Number, Query};
    vec![
        ("[:SENSe#]:VOLTage[:DC]:RANGe:PTPeak", Number(scope::span())),
        ("[:SENSe#]:VOLTage[:DC]:RANGe:OFFSet", Number(scope::offset())),
        (":INPut#:COUPling", Action::Word(scope::coupling(&["AC", "DC", "GROund"]))),
        (":INPut#:DELay", Number(scope::delay())),
        ("[:SENSe]:SWEep:TINTerval", Number(scope::interval())),
        ("[:SENSe]:SWEep:POINts", Number(scope::points())),
        ("[:SENSe]:SWEep:OREFerence:LOCation", Number(scope::position())),
        ("[:SENSe]:AVERage[:STATe]", Flag(Place { count: 1, of: |settings, _| &mut settings.averaging })),
        ("[:SENSe]:AVERage:COUNt", Number(scope::averages())),
        (":TRIGger[:SEQuence]:SOURce", Command(set_source)),
        (":TRIGger[:SEQuence]:SOURce", Query(tell_source)),
        (":TRIGger[:SEQuence]:LEVel", Number(scope::level())),
        (":TRIGger[:SEQuence]:SLOPe", Action::Word(scope::slope(&["POSitive", "NEGative"]))),
        (":INITiate[:IMMediate]", Command(scope::start)),
        (":ABORt", Command(scope::abort)),
        (":FORMat[:DATA]", Command(set_format)),
        (":FORMat[:DATA]", Query(tell_format)),
        (":FORMat:BORDer", border()),
        (":TRACe[:DATA]:PREamble", Query(preamble)),
        (":TRACe[:DATA][:DATA]", Query(data)),
    ]
}

fn border() -> Action<Scope> {
    Action::Word(Word {
        forms: &["NORMal", "SWAPped"],
        count: 1,
        read: |settings, _| usize::from(settings.swapped),
        write: |settings, _, place| settings.swapped = place == 1,
    })
}

fn set_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let source = match call.args.word(&["INTernal", "EXTernal", "IMMediate"])? {
        (0, number) => TriggerSource::Channel(channel_index(number.unwrap_or(1))?),
        (1, None) => TriggerSource::External,
        (2, None) => TriggerSource::Immediate,
        _ => return Err(Fault::InvalidCharacterData),
    };
    call.args.finish()?;
    scope.set_source(source);
    Ok(())
}

fn tell_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    match scope.source() {
        TriggerSource::Channel(index) => call.answer(format!("INT{}", index + 1)),
        TriggerSource::External => call.answer("EXT"),
        TriggerSource::Immediate => call.answer("IMM"),
    }
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

fn preamble(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let channel = asked_channel(call)?;
    let record = model.record()?;
    let encoding = model.with(|settings| settings.encoding);
    call.answer(scope::preamble(&record, channel, encoding)?);
    Ok(())
}

fn data(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let channel = asked_channel(call)?;
    let record = model.record()?;
    let (encoding, swapped) = model.with(|settings| (settings.encoding, settings.swapped));
    match encoding {
        Encoding::Text => call.answer(scope::text(&record, channel, "")?),
        _ => call.reply.add_block(&scope::binary(&record, channel, encoding, swapped)?),
    }
    Ok(())
}

/// The channel that `CHANnel<n>` names, counted from 0.
fn asked_channel(call: &mut Call<'_>) -> Result<usize, Fault> {
    let (_, number) = call.args.word(&["CHANnel"])?;
    call.args.finish()?;
    channel_index(number.unwrap_or(1))
}
