//! The values that go into a call and come out of a reply, without any instrument's spelling.

use std::collections::BTreeMap;
use std::collections::btree_map;

use super::DialectError;

/// One value.
#[derive(Debug, Clone, PartialEq)]
pub enum Value {
    /// On or off.
    Flag(bool),
    /// A word out of a closed list.
    Keyword(String),
    /// Whole numbers, such as the channels of a switch unit.
    List(Vec<i64>),
    /// A number in the unit that its name's suffix says.
    Number(f64),
    /// Any text.
    Text(String),
    /// A whole number.
    Whole(i64),
}

impl Value {
    /// What sort of value it is, in words.
    #[must_use]
    pub fn kind(&self) -> &'static str {
        match self {
            Self::Flag(_) => "a flag",
            Self::Keyword(_) => "a keyword",
            Self::List(_) => "a list of whole numbers",
            Self::Number(_) => "a number",
            Self::Text(_) => "a text",
            Self::Whole(_) => "a whole number",
        }
    }

    pub(super) fn as_number(&self) -> Option<f64> {
        match *self {
            Self::Number(number) => Some(number),
            // Exact up to 2^53, far above any setting.
            Self::Whole(whole) => Some(whole as f64),
            _ => None,
        }
    }

    fn as_whole(&self) -> Option<i64> {
        match *self {
            Self::Whole(whole) => Some(whole),
            // Only numbers that a double holds exactly count as whole.
            Self::Number(number) if number.trunc().to_bits() == number.to_bits() && number.abs() <= EXACT => {
                Some(number as i64)
            }
            _ => None,
        }
    }
}

/// 2^53: every whole number up to here is a double of its own.
pub(super) const EXACT: f64 = 9_007_199_254_740_992.0;

/// The whole number that a number out of an expression stands for: rounding leaves a few parts in 2^52 of its terms.
pub(super) fn nearest_whole(number: f64) -> Option<i64> {
    let whole = number.round();
    let near = (number - whole).abs() <= 1e-6 * number.abs().max(1.0);
    (near && whole.abs() <= EXACT).then_some(whole as i64)
}

impl From<f64> for Value {
    fn from(number: f64) -> Self {
        Self::Number(number)
    }
}

impl From<i64> for Value {
    fn from(whole: i64) -> Self {
        Self::Whole(whole)
    }
}

impl From<bool> for Value {
    fn from(flag: bool) -> Self {
        Self::Flag(flag)
    }
}

impl From<Vec<i64>> for Value {
    fn from(list: Vec<i64>) -> Self {
        Self::List(list)
    }
}

/// Makes a newtype of named values with typed access; `Args` and `Fields` differ only in what they are for.
macro_rules! named_values {
    ($(#[$doc:meta])* $name:ident) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Default, PartialEq)]
        pub struct $name(BTreeMap<String, Value>);

        impl $name {
            /// None yet.
            #[must_use]
            pub fn new() -> Self {
                Self::default()
            }

            /// Adds or replaces one.
            pub fn set(&mut self, name: impl Into<String>, value: impl Into<Value>) {
                self.0.insert(name.into(), value.into());
            }

            /// Takes one out.
            pub fn take(&mut self, name: &str) -> Option<Value> {
                self.0.remove(name)
            }

            /// The value of this name, if there is one.
            #[must_use]
            pub fn value(&self, name: &str) -> Option<&Value> {
                self.0.get(name)
            }

            /// Every name and value, by name.
            pub fn iter(&self) -> btree_map::Iter<'_, String, Value> {
                self.0.iter()
            }

            /// Whether there are none.
            #[must_use]
            pub fn is_empty(&self) -> bool {
                self.0.is_empty()
            }

            /// A number; a whole number counts as one.
            ///
            /// # Errors
            /// When it is missing or no number.
            pub fn number(&self, name: &str) -> Result<f64, DialectError> {
                self.typed(name, "a number", Value::as_number)
            }

            /// A whole number; a number without a fraction counts as one.
            ///
            /// # Errors
            /// When it is missing or not whole.
            pub fn whole(&self, name: &str) -> Result<i64, DialectError> {
                self.typed(name, "a whole number", Value::as_whole)
            }

            /// A flag.
            ///
            /// # Errors
            /// When it is missing or no flag.
            pub fn flag(&self, name: &str) -> Result<bool, DialectError> {
                self.typed(name, "a flag", |value| match value {
                    Value::Flag(flag) => Some(*flag),
                    _ => None,
                })
            }

            /// A keyword.
            ///
            /// # Errors
            /// When it is missing or no keyword.
            pub fn keyword(&self, name: &str) -> Result<&str, DialectError> {
                self.typed(name, "a keyword", |value| match value {
                    Value::Keyword(word) => Some(word.as_str()),
                    _ => None,
                })
            }

            /// A text; a keyword counts as one.
            ///
            /// # Errors
            /// When it is missing or no text.
            pub fn text(&self, name: &str) -> Result<&str, DialectError> {
                self.typed(name, "a text", |value| match value {
                    Value::Text(text) | Value::Keyword(text) => Some(text.as_str()),
                    _ => None,
                })
            }

            /// A list of whole numbers.
            ///
            /// # Errors
            /// When it is missing or no list.
            pub fn list(&self, name: &str) -> Result<&[i64], DialectError> {
                self.typed(name, "a list of whole numbers", |value| match value {
                    Value::List(list) => Some(list.as_slice()),
                    _ => None,
                })
            }

            fn typed<'v, T>(
                &'v self,
                name: &str,
                wanted: &'static str,
                read: impl Fn(&'v Value) -> Option<T>,
            ) -> Result<T, DialectError> {
                let value = self.0.get(name).ok_or_else(|| DialectError::Missing { name: name.to_owned() })?;
                read(value).ok_or_else(|| DialectError::WrongKind {
                    name: name.to_owned(),
                    wanted,
                    found: value.kind(),
                })
            }
        }
    };
}

named_values! {
    /// The arguments of a call, by name.
    Args
}
named_values! {
    /// The fields of a reply, by name.
    Fields
}
