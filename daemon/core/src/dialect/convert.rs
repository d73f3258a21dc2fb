//! Values converted by expressions on their way out and back: what the daemon counts in, and what an instrument does.

use super::expression::Expression;
use super::intent::BESIDES;
use super::value::nearest_whole;
use super::{Args, DialectError, Fields, Intent, ReplyKind};

/// What `[convert."…"]` of one intent says.
#[derive(Debug, Default)]
pub(super) struct Conversions {
    /// Numbers for its commands, made of the call's arguments.
    pub(super) args: Vec<(String, Expression)>,
    /// Fields of its reply, made of what the replies hold and of the call's arguments.
    pub(super) fields: Vec<(&'static str, ReplyKind, Expression)>,
}

impl Conversions {
    /// The call's arguments with what is made of them; a number that is made replaces an argument of its name.
    pub(super) fn outwards(&self, args: Args) -> Result<Args, DialectError> {
        if self.args.is_empty() {
            return Ok(args);
        }
        // Each is made of the arguments as they were, so their order does not matter.
        let given = numbers(&args);
        self.args.iter().try_fold(args, |mut made, (name, expression)| {
            made.set(name.clone(), expression.evaluate(&borrowed(&given))?);
            Ok(made)
        })
    }

    /// The fields that the intent has, out of what came.
    pub(super) fn inwards(&self, intent: Intent, args: &Args, came: Fields) -> Result<Fields, DialectError> {
        if self.fields.is_empty() {
            return Ok(came);
        }
        let mut known = numbers(args);
        for (name, value) in came.iter() {
            if let Some(number) = value.as_number() {
                known.retain(|(known, _)| known != name);
                known.push((name.clone(), number));
            }
        }
        let mut fields = Fields::new();
        for (name, value) in came.iter() {
            let besides = BESIDES.iter().any(|(whose, besides, _)| *whose == intent && besides == name);
            if besides || intent.spec().reply.iter().any(|(field, _)| field == name) {
                fields.set(name.clone(), value.clone());
            }
        }
        for (name, kind, expression) in &self.fields {
            let number = expression.evaluate(&borrowed(&known))?;
            if *kind == ReplyKind::Whole {
                let whole = nearest_whole(number).ok_or(DialectError::NotWhole { name, found: number })?;
                fields.set(*name, whole);
            } else {
                fields.set(*name, number);
            }
        }
        Ok(fields)
    }
}

/// Every argument that is a number.
fn numbers(args: &Args) -> Vec<(String, f64)> {
    args.iter().filter_map(|(name, value)| Some((name.clone(), value.as_number()?))).collect()
}

fn borrowed(numbers: &[(String, f64)]) -> Vec<(&str, f64)> {
    numbers.iter().map(|(name, number)| (name.as_str(), *number)).collect()
}
