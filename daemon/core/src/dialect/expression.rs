//! Expressions over the numbers of a call or a reply, in the Common Expression Language (CEL).
//!
//! Every number is a double there, and CEL mixes no kinds: a constant is written `2.0`, not `2`.

use cel::{Context, Program, Value};

use super::DialectError;

/// The longest expression: a line of text. Scaling a sample needs a few names and operators.
const LONGEST: usize = 400;

/// A compiled expression with its text.
#[derive(Debug)]
pub(super) struct Expression {
    name: String,
    text: String,
    program: Program,
    /// The names that it uses.
    uses: Vec<String>,
}

impl Expression {
    /// Compiles `text`, which stands at the key `name` and may use `known` names; a name that is none of them is
    /// refused as what `nobody` gives.
    pub(super) fn compile(name: &str, text: &str, known: &[&str], nobody: &str) -> Result<Self, String> {
        if text.len() > LONGEST {
            return Err(format!("it has more than {LONGEST} characters"));
        }
        let program = Program::compile(text).map_err(|error| one_line(&error.to_string()))?;
        let mut uses: Vec<String> = program.references().variables().into_iter().map(str::to_owned).collect();
        uses.sort_unstable();
        let unknown: Vec<&str> = uses.iter().map(String::as_str).filter(|used| !known.contains(used)).collect();
        if !unknown.is_empty() {
            return Err(format!("it uses {}, which {nobody} gives", unknown.join(", ")));
        }
        let expression = Self { name: name.to_owned(), text: text.to_owned(), program, uses };
        // Mixed kinds show only when it is evaluated; ones are as good as any numbers for that.
        let ones: Vec<(&str, f64)> = known.iter().map(|name| (*name, 1.0)).collect();
        match expression.run(&ones) {
            Ok(_) => Ok(expression),
            Err(reason) => Err(format!("{reason}; every name is a double, so write constants as `2.0`")),
        }
    }

    /// Whether it uses this name.
    pub(super) fn uses(&self, name: &str) -> bool {
        self.uses.iter().any(|used| used == name)
    }

    /// Its value for these numbers.
    pub(super) fn evaluate(&self, numbers: &[(&str, f64)]) -> Result<f64, DialectError> {
        self.run(numbers)
            .and_then(|value| if value.is_finite() { Ok(value) } else { Err(format!("the result is {value}")) })
            .map_err(|reason| self.error(reason))
    }

    /// The slope and the value at 0 of an expression that is a straight line in `variable`.
    ///
    /// The slope is taken over a distance of 2^20, so that a large start does not eat the digits of a small slope.
    pub(super) fn line(&self, variable: &str, numbers: &[(&str, f64)]) -> Result<(f64, f64), DialectError> {
        const FAR: f64 = 1_048_576.0;
        let at = |x: f64| {
            let mut all = numbers.to_vec();
            all.push((variable, x));
            self.evaluate(&all)
        };
        let (zero, one, far) = (at(0.0)?, at(1.0)?, at(FAR)?);
        let slope = (far - zero) / FAR;
        // Rounding leaves a few parts in 2^52 of the largest of the numbers; a real bend leaves far more.
        let allowed = 1e-12 * (zero.abs() + far.abs());
        if (one - zero - slope).abs() > allowed {
            return Err(self.error(format!("it is no straight line in `{variable}`")));
        }
        Ok((slope, zero))
    }

    fn run(&self, numbers: &[(&str, f64)]) -> Result<f64, String> {
        let mut context = Context::default();
        for (name, value) in numbers {
            context.add_variable_from_value(*name, *value);
        }
        match self.program.execute(&context) {
            Ok(Value::Float(value)) => Ok(value),
            Ok(Value::Int(value)) => Ok(value as f64),
            Ok(Value::UInt(value)) => Ok(value as f64),
            Ok(other) => Err(format!("the result is {other:?}, which is no number")),
            Err(error) => Err(one_line(&error.to_string())),
        }
    }

    fn error(&self, reason: String) -> DialectError {
        DialectError::Expression { name: self.name.clone(), text: self.text.clone(), reason }
    }
}

/// A parser's picture of several lines as one.
fn one_line(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}
