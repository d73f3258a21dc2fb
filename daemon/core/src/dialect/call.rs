//! An intent with its arguments, checked against the intent's specification.

use super::{ArgKind, Args, DialectError, HIGHEST_CHANNEL, Intent, IntentKind, Value};

/// What an instrument is asked for, in the daemon's own words.
#[derive(Debug, Clone, PartialEq)]
pub struct Call {
    /// What is wanted.
    pub intent: Intent,
    /// With what values.
    pub args: Args,
}

/// The most channels in one list: more than a switch unit has, few enough for one line.
pub const MOST_CHANNELS: usize = 1_000;

impl Call {
    /// A call without arguments yet.
    #[must_use]
    pub fn new(intent: Intent) -> Self {
        Self { intent, args: Args::new() }
    }

    /// The same call with one argument more.
    #[must_use]
    pub fn with(mut self, name: impl Into<String>, value: impl Into<Value>) -> Self {
        self.args.set(name, value);
        self
    }

    /// Whether every argument that is always given is there, each of its kind and in its range, and none is left over.
    ///
    /// # Errors
    /// The first thing that is wrong.
    pub fn check(&self) -> Result<(), DialectError> {
        let spec = self.intent.spec();
        let every = || spec.args.iter().chain(spec.optional);
        if let Some((name, _)) = self.args.iter().find(|(name, _)| !every().any(|(known, _)| known == name)) {
            return Err(DialectError::UnknownArgument {
                intent: self.intent,
                name: name.clone(),
                known: every().map(|(known, _)| *known).collect::<Vec<_>>().join(", "),
            });
        }
        let given = spec.optional.iter().filter(|(name, _)| self.args.value(name).is_some());
        spec.args.iter().chain(given).try_for_each(|(name, kind)| self.check_one(name, *kind))
    }

    /// Under which name a session remembers this setting, so that a later one replaces it: the intent and its channel.
    /// All shapes of a source share one. `None` when the call is no setting.
    #[must_use]
    pub fn setting_key(&self) -> Option<String> {
        if self.intent.spec().kind != IntentKind::Setting {
            return None;
        }
        let family = match self.intent {
            Intent::SourceSquare | Intent::SourceSine | Intent::SourcePulse | Intent::SourceMultitone => "source.shape",
            other => other.name(),
        };
        // The trigger has one setting, whichever channel it watches.
        let channel = if self.intent == Intent::TriggerSet { None } else { self.args.whole("channel").ok() };
        Some(channel.map_or_else(|| family.to_owned(), |channel| format!("{family} {channel}")))
    }

    fn check_one(&self, name: &'static str, kind: ArgKind) -> Result<(), DialectError> {
        let within = |value: i64, least: i64, most: i64| {
            if (least..=most).contains(&value) {
                Ok(())
            } else {
                Err(self.out_of_range(name, value.to_string(), format!("{least} to {most}")))
            }
        };
        match kind {
            ArgKind::Channel => within(self.args.whole(name)?, 1, HIGHEST_CHANNEL),
            ArgKind::Channels => {
                let list = self.args.list(name)?;
                if list.is_empty() || list.len() > MOST_CHANNELS {
                    let found = format!("a list of {}", list.len());
                    return Err(self.out_of_range(name, found, format!("1 to {MOST_CHANNELS} channels")));
                }
                list.iter().try_for_each(|&channel| within(channel, 1, HIGHEST_CHANNEL))
            }
            ArgKind::Flag => self.args.flag(name).map(|_| ()),
            ArgKind::Keyword(words) => {
                let word = self.args.keyword(name)?;
                if words.contains(&word) {
                    Ok(())
                } else {
                    Err(self.out_of_range(name, word.to_owned(), words.join(", ")))
                }
            }
            ArgKind::Number => {
                let number = self.args.number(name)?;
                if number.is_finite() {
                    Ok(())
                } else {
                    Err(self.out_of_range(name, number.to_string(), "a finite number".to_owned()))
                }
            }
            ArgKind::Whole(least, most) => within(self.args.whole(name)?, least, most),
        }
    }

    fn out_of_range(&self, name: &str, found: String, allowed: String) -> DialectError {
        DialectError::OutOfRange { intent: self.intent, name: name.to_owned(), found, allowed }
    }
}
