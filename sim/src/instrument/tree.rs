//! An instrument as a table: headers, and what each of them sets, answers or does.
//!
//! What an instrument can do (a [`Model`]) knows no header; a personality's table gives the headers to it.

use super::core::Core;
use crate::message::{Args, Limits, Mnemonic, Pattern, Quantity, Reply, nr3, short_form};
use crate::scenario::Setting;
use crate::status::Fault;

/// What an instrument can do, whatever the headers are called.
pub(crate) trait Model: Send + Sync + Sized + 'static {
    /// What its settings live in.
    type Settings;

    /// Runs `act` on the settings while nobody else can.
    fn with<R>(&self, act: impl FnOnce(&mut Self::Settings) -> R) -> R;

    /// Called after a setting was changed.
    fn changed(&self) {}

    /// Puts every setting to its `*RST` value and drops pending work.
    fn reset(&self);

    /// Begins whatever a reading needs that is to be fresh; true if it is worth waiting for.
    ///
    /// # Errors
    /// When it cannot begin.
    fn renew(&self) -> Result<bool, Fault> {
        Ok(false)
    }
}

/// The headers of a personality for one model. Of two headers that both match, the first counts.
pub(crate) type Table<M> = Vec<(&'static str, Action<M>)>;

/// What a header does. The settings have a query form by themselves.
pub(crate) enum Action<M: Model> {
    /// Carries something out.
    Command(fn(&M, &mut Call<'_>) -> Result<(), Fault>),
    /// A setting that is on or off.
    Flag(Place<M, bool>),
    /// A setting that is a number.
    Number(Number<M>),
    /// Answers something.
    Query(fn(&M, &mut Call<'_>) -> Result<(), Fault>),
    /// A setting that is one of some keywords.
    Word(Word<M>),
}

/// Where a setting lives: the place for a numeric suffix counted from 0, of which there are `count`.
pub(crate) struct Place<M: Model, T> {
    /// How many there are; 1 for a header without suffix.
    pub(crate) count: usize,
    /// The setting itself.
    pub(crate) of: fn(&mut M::Settings, usize) -> &mut T,
}

/// A numeric setting.
pub(crate) struct Number<M: Model> {
    /// By what name it can be clamped.
    pub(crate) clamp: Option<Setting>,
    /// Unit that may follow the number.
    pub(crate) quantity: Quantity,
    /// Limits of the header's number for each suffix; the last one holds for all that follow.
    pub(crate) limits: &'static [Limits],
    /// The header's number for a setting: 50 for a fraction of a half that is told in percent.
    pub(crate) shown: fn(f64) -> f64,
    /// The setting that the header's number means; undoes `shown`.
    pub(crate) meant: fn(f64) -> f64,
    /// Rounds the setting to what the instrument can do.
    pub(crate) snap: fn(f64) -> f64,
    /// Where it lives.
    pub(crate) place: Place<M, f64>,
}

/// A keyword setting.
pub(crate) struct Word<M: Model> {
    /// The keywords.
    pub(crate) forms: &'static [&'static str],
    /// How many suffixes there are.
    pub(crate) count: usize,
    /// Which keyword is set.
    pub(crate) read: fn(&M::Settings, usize) -> usize,
    /// Sets a keyword.
    pub(crate) write: fn(&mut M::Settings, usize, usize),
}

/// One unit on its way to its handler.
pub(crate) struct Call<'a> {
    /// The first numeric suffix, counted from 0.
    pub(crate) index: usize,
    /// The parameters.
    pub(crate) args: Args,
    /// Where answers go.
    pub(crate) reply: &'a mut Reply,
    /// Whether numbers are answered with their unit.
    pub(crate) units: bool,
    /// Status, for errors that do not stop the command.
    pub(crate) core: &'a Core,
}

impl Call<'_> {
    /// Answers with text.
    pub(crate) fn answer(&mut self, text: impl AsRef<str>) {
        self.reply.add(text.as_ref().as_bytes());
    }

    /// Answers with a number, in the form NR3 unless it is a count, and with its unit where units are told.
    pub(crate) fn answer_number(&mut self, value: f64, quantity: Quantity) {
        let number = if quantity == Quantity::Count { format!("{value:.0}") } else { nr3(value) };
        let unit = quantity.name();
        if self.units && !unit.is_empty() { self.answer(format!("{number} {unit}")) } else { self.answer(number) }
    }
}

/// A number that is set as it is told, without rounding.
pub(crate) fn number<M: Model>(
    quantity: Quantity,
    limits: &'static [Limits],
    count: usize,
    of: fn(&mut M::Settings, usize) -> &mut f64,
) -> Number<M> {
    let same: fn(f64) -> f64 = |value| value;
    Number { clamp: None, quantity, limits, shown: same, meant: same, snap: same, place: Place { count, of } }
}

/// A table ready for look-up, with the instrument it belongs to.
pub(crate) struct Bound<M: Model> {
    model: M,
    table: Vec<(Pattern, Action<M>)>,
    preset: fn(&M),
}

/// An instrument of any kind.
pub(crate) trait Instrument: Send + Sync {
    /// Carries out a unit; `None` if the instrument does not know the header.
    fn execute(&self, nodes: &[Mnemonic], query: bool, call: &mut Call<'_>) -> Option<Result<(), Fault>>;

    /// See [`Model::reset`].
    fn reset(&self);

    /// See [`Model::renew`].
    ///
    /// # Errors
    /// When it cannot begin.
    fn renew(&self) -> Result<bool, Fault>;
}

impl<M: Model> Bound<M> {
    /// Gives a model its headers.
    pub(crate) fn new(model: M, table: Table<M>) -> Self {
        Self::with_preset(model, table, |_| {})
    }

    /// The same for a personality whose settings after a reset differ from the usual ones by what `preset` does.
    pub(crate) fn with_preset(model: M, table: Table<M>, preset: fn(&M)) -> Self {
        let table = table.into_iter().map(|(header, action)| (Pattern::new(header), action)).collect();
        Self { model, table, preset }
    }

    fn act(&self, action: &Action<M>, query: bool, call: &mut Call<'_>) -> Result<(), Fault> {
        let index = call.index;
        match action {
            Action::Command(act) | Action::Query(act) => {
                act(&self.model, call)?;
                return call.args.finish();
            }
            Action::Flag(place) if query => {
                call.args.finish()?;
                let on = self.model.with(|settings| *(place.of)(settings, index));
                call.answer(if on { "1" } else { "0" });
                return Ok(());
            }
            Action::Flag(place) => {
                let on = call.args.boolean()?;
                call.args.finish()?;
                self.model.with(|settings| *(place.of)(settings, index) = on);
            }
            Action::Number(number) if query => return self.tell(number, call),
            Action::Number(number) => self.set(number, call)?,
            Action::Word(word) if query => {
                call.args.finish()?;
                let place = self.model.with(|settings| (word.read)(settings, index));
                call.answer(short_form(word.forms.get(place).copied().unwrap_or_default()));
                return Ok(());
            }
            Action::Word(word) => {
                let place = call.args.plain_word(word.forms)?;
                call.args.finish()?;
                self.model.with(|settings| (word.write)(settings, index, place));
            }
        }
        self.model.changed();
        Ok(())
    }

    fn tell(&self, number: &Number<M>, call: &mut Call<'_>) -> Result<(), Fault> {
        let limit = call.args.asked_limit(&number.limits(call.index)?)?;
        call.args.finish()?;
        let index = call.index;
        let value = limit.unwrap_or_else(|| (number.shown)(self.model.with(|all| *(number.place.of)(all, index))));
        call.answer_number(value, number.quantity);
        Ok(())
    }

    /// Sets a number. Beyond a limit the limit is set and -222 is reported.
    fn set(&self, number: &Number<M>, call: &mut Call<'_>) -> Result<(), Fault> {
        let limits = number.limits(call.index)?;
        let asked = call.args.number(&limits, number.quantity)?;
        call.args.finish()?;
        let value = asked.clamp(limits.min, limits.max);
        // The last bits of a product such as 100 x 1e-9 put nobody out of range.
        if (asked - value).abs() > 1e-12 * value.abs() {
            call.core.report(Fault::OutOfRange);
        }
        let value = (number.snap)((number.meant)(value));
        let value = number.clamp.map_or(value, |setting| call.core.faults.clamped(setting, value));
        self.model.with(|settings| *(number.place.of)(settings, call.index) = value);
        Ok(())
    }
}

impl<M: Model> Number<M> {
    fn limits(&self, index: usize) -> Result<Limits, Fault> {
        self.limits.get(index).or_else(|| self.limits.last()).copied().ok_or(Fault::System)
    }
}

impl<M: Model> Action<M> {
    /// Whether the header exists in this form.
    fn accepts(&self, query: bool) -> bool {
        match self {
            Self::Command(_) => !query,
            Self::Query(_) => query,
            Self::Flag(_) | Self::Number(_) | Self::Word(_) => true,
        }
    }

    /// How many suffixes the header's setting has; handlers check their own.
    fn count(&self) -> usize {
        match self {
            Self::Command(_) | Self::Query(_) => usize::MAX,
            Self::Flag(place) => place.count,
            Self::Number(number) => number.place.count,
            Self::Word(word) => word.count,
        }
    }
}

impl<M: Model> Instrument for Bound<M> {
    fn execute(&self, nodes: &[Mnemonic], query: bool, call: &mut Call<'_>) -> Option<Result<(), Fault>> {
        let (action, suffixes) = self.table.iter().find_map(|(pattern, action)| {
            let found = if action.accepts(query) { pattern.suffixes(nodes) } else { None };
            found.map(|suffixes| (action, suffixes))
        })?;
        let suffix = match suffixes {
            Ok(suffixes) => suffixes.first().copied().unwrap_or(1),
            Err(fault) => return Some(Err(fault)),
        };
        // A suffix of 0 wraps round to one that no setting has.
        call.index = usize::try_from(suffix.wrapping_sub(1)).unwrap_or(usize::MAX);
        if call.index >= action.count() {
            return Some(Err(Fault::HeaderSuffix));
        }
        Some(self.act(action, query, call))
    }

    fn reset(&self) {
        self.model.reset();
        (self.preset)(&self.model);
    }

    fn renew(&self) -> Result<bool, Fault> {
        self.model.renew()
    }
}
