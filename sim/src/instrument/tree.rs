//! An instrument as a table: headers, and what each of them sets, answers or does.

use super::core::Core;
use crate::message::{Args, Limits, Mnemonic, Pattern, Quantity, Reply, nr3, short_form};
use crate::status::Fault;

/// An instrument behind a table of commands.
pub(crate) trait Model: Send + Sync + Sized + 'static {
    /// What its settings live in.
    type Settings;

    /// Runs `act` on the settings while nobody else can.
    fn with<R>(&self, act: impl FnOnce(&mut Self::Settings) -> R) -> R;

    /// Called after a setting was changed.
    fn changed(&self) {}

    /// Puts every setting to its `*RST` value and drops pending work.
    fn reset(&self);

    /// The table. Of two headers that both match, the first counts.
    fn commands() -> Vec<(&'static str, Action<Self>)>;
}

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
    /// Unit that may follow the number.
    pub(crate) quantity: Quantity,
    /// Limits for each suffix; the last one holds for all that follow.
    pub(crate) limits: &'static [Limits],
    /// How many of the header's units make one of the setting's: 100 for a fraction told in percent.
    pub(crate) scale: f64,
    /// Rounds to what the instrument can do.
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
    /// Status, for errors that do not stop the command.
    pub(crate) core: &'a Core,
}

impl Call<'_> {
    /// Answers with text.
    pub(crate) fn answer(&mut self, text: impl AsRef<str>) {
        self.reply.add(text.as_ref().as_bytes());
    }
}

/// A number without limits worth naming, rounding or scale.
pub(crate) fn number<M: Model>(
    quantity: Quantity,
    limits: &'static [Limits],
    count: usize,
    of: fn(&mut M::Settings, usize) -> &mut f64,
) -> Number<M> {
    Number { quantity, limits, scale: 1.0, snap: |value| value, place: Place { count, of } }
}

/// A table ready for look-up, with the instrument it belongs to.
pub(crate) struct Bound<M: Model> {
    model: M,
    table: Vec<(Pattern, Action<M>)>,
}

/// An instrument of any kind.
pub(crate) trait Instrument: Send + Sync {
    /// Carries out a unit; `None` if the instrument does not know the header.
    fn execute(&self, nodes: &[Mnemonic], query: bool, call: &mut Call<'_>) -> Option<Result<(), Fault>>;

    /// See [`Model::reset`].
    fn reset(&self);
}

impl<M: Model> Bound<M> {
    /// Reads the model's table.
    pub(crate) fn new(model: M) -> Self {
        let table = M::commands().into_iter().map(|(header, action)| (Pattern::new(header), action)).collect();
        Self { model, table }
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
        let value = limit.unwrap_or_else(|| self.model.with(|all| *(number.place.of)(all, index) * number.scale));
        call.answer(if number.quantity == Quantity::Count { format!("{value:.0}") } else { nr3(value) });
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
        let value = (number.snap)(value) / number.scale;
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
    }
}
