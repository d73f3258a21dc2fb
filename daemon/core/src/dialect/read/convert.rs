//! How a dialect file converts settings, on their way out and back.

use std::collections::BTreeMap;
use std::ops::Range;

use crate::dialect::convert::Conversions;
use crate::dialect::expression::Expression;
use crate::dialect::reply::{is_name, kind_of, no_field};
use crate::dialect::step::Step;
use crate::dialect::{ArgKind, Intent, ReplyKind};
use crate::document::{Item, Table};

/// What `[convert."…"]` of one intent says, before its replies are known.
#[derive(Debug, Default)]
pub(super) struct Draft {
    /// Where the table's name stands.
    span: Range<usize>,
    /// Those whose expression is a mistake are kept by name, so that their use is none.
    args: Vec<(Item<String>, Option<Expression>)>,
    fields: Vec<(&'static str, ReplyKind, Item<String>)>,
}

impl Draft {
    /// The names of the numbers that it makes for commands.
    pub(super) fn derived(&self) -> Vec<&str> {
        self.args.iter().map(|(name, _)| name.value.as_str()).collect()
    }

    /// Whether it makes fields out of a reply's own names.
    pub(super) fn reads_replies(&self) -> bool {
        !self.fields.is_empty()
    }

    /// Whether it makes something of this argument.
    pub(super) fn uses(&self, argument: &str) -> bool {
        self.args.iter().filter_map(|(_, expression)| expression.as_ref()).any(|expression| expression.uses(argument))
    }

    /// Whether it gives this field of the reply.
    pub(super) fn gives(&self, field: &str) -> bool {
        self.fields.iter().any(|(name, ..)| *name == field)
    }
}

/// The arguments that a call of this intent has, with those that only some dialects want.
pub(super) fn arguments(intent: Intent, windowed: bool) -> Vec<(&'static str, ArgKind)> {
    let spec = intent.spec();
    let optional = if windowed { spec.optional } else { &[] };
    spec.args.iter().chain(optional).copied().collect()
}

fn numbers(intent: Intent, windowed: bool) -> Vec<&'static str> {
    let number = |kind: &ArgKind| matches!(kind, ArgKind::Channel | ArgKind::Number | ArgKind::Whole(..));
    arguments(intent, windowed).into_iter().filter(|(_, kind)| number(kind)).map(|(name, _)| name).collect()
}

/// Every conversion that the file holds.
pub(super) fn drafts(top: &mut Table<'_>, windowed: bool) -> BTreeMap<Intent, Draft> {
    let mut drafts = BTreeMap::new();
    for (name, table) in top.named_tables("convert") {
        match Intent::parse(&name.value) {
            Some(intent) if !matches!(intent, Intent::Error | Intent::Complete) => {
                drafts.insert(intent, draft(table, intent, windowed, name.span));
            }
            _ => {
                let help = "name an intent that has words under `[intent]`, such as `[convert.\"vertical.set\"]`";
                table.mistakes().add(name.span, format!("`{}` cannot be converted", name.value), help);
            }
        }
    }
    drafts
}

fn draft(mut table: Table<'_>, intent: Intent, windowed: bool, span: Range<usize>) -> Draft {
    let mut draft = Draft { span, ..Draft::default() };
    let known = numbers(intent, windowed);
    for key in table.keys() {
        let Some(text) = table.text(&key.value) else { continue };
        let complain = |what: String, help: &str| table.mistakes().add(key.span.clone(), what, help);
        let field = intent.spec().reply.iter().find(|(name, _)| *name == key.value);
        match field {
            Some(_) if intent == Intent::RecordPreamble => {
                complain(format!("`{}` is a field of the preamble", key.value), "put its expression under `[record]`");
            }
            Some((name, kind @ (ReplyKind::Number | ReplyKind::Whole))) => draft.fields.push((name, *kind, text)),
            Some(_) => {
                let help = "words are mapped under `[words]`, and named in the reply: `field:MAP`";
                complain(format!("`{}` of `{intent}` is no number", key.value), help);
            }
            None if !is_name(&key.value) => {
                complain(format!("`{}` cannot name a number", key.value), "use small letters, digits and `_`");
            }
            None if arguments(intent, windowed).iter().any(|(name, _)| *name == key.value && !known.contains(name)) => {
                complain(format!("`{}` of `{intent}` is no number", key.value), "words are mapped under `[words]`");
            }
            None => {
                let place = format!("convert.\"{intent}\".{}", key.value);
                match Expression::compile(&place, &text.value, &known, &format!("no argument of `{intent}`")) {
                    Ok(expression) => draft.args.push((key, Some(expression))),
                    Err(why) => {
                        let help = format!("names here: {}", known.join(", "));
                        table.mistakes().add(text.span, format!("`{}`: {why}", key.value), help);
                        draft.args.push((key, None));
                    }
                }
            }
        }
    }
    draft
}

/// The conversions of an intent whose steps are known.
pub(super) fn finish(table: &Table<'_>, intent: Intent, draft: Draft, steps: &[Step], windowed: bool) -> Conversions {
    for (name, _) in &draft.args {
        if !steps.iter().any(|step| step.template.uses().any(|used| used == name.value)) {
            let help = format!("write `{{{}}}` into a command of `{intent}`, or leave it out", name.value);
            table.mistakes().add(name.span.clone(), format!("`{}` is used in no command", name.value), help);
        }
    }
    let came: Vec<&str> = steps.iter().flat_map(|step| step.wanted.names()).collect();
    let known: Vec<&str> = came.iter().copied().chain(numbers(intent, windowed)).collect();
    let mut fields = Vec::new();
    for (name, kind, text) in draft.fields {
        let place = format!("convert.\"{intent}\".{name}");
        match Expression::compile(&place, &text.value, &known, &format!("no reply of `{intent}`")) {
            Ok(expression) => fields.push((name, kind, expression)),
            Err(why) => {
                table.mistakes().add(
                    text.span,
                    format!("`{name}`: {why}"),
                    format!("names here: {}", known.join(", ")),
                );
            }
        }
    }
    // A misspelt field would be read and never missed.
    let used = |name: &str| fields.iter().any(|(.., expression)| expression.uses(name));
    for name in came.iter().filter(|name| kind_of(intent, name).is_none()) {
        if !fields.is_empty() && !used(name) {
            let (what, help) = no_field(intent, name);
            table.mistakes().add(table.span(), format!("{what}, and no expression uses it"), help);
        }
    }
    let args = draft.args.into_iter().filter_map(|(name, expression)| Some((name.value, expression?))).collect();
    Conversions { args, fields }
}

/// Makes mistakes of conversions of intents that the file has no words for.
pub(super) fn refuse_left(top: &Table<'_>, left: BTreeMap<Intent, Draft>) {
    for (intent, draft) in left {
        let help = format!("write `[intent.\"{intent}\"]`, or leave the conversion out");
        top.mistakes().add(draft.span, format!("there are no words for `{intent}` to convert for"), help);
    }
}
