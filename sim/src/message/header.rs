//! Headers: what was sent, the tree position it is relative to, and the patterns that instruments know.

use crate::status::Fault;

/// One node of a header: `SENSE2` is the name `SENSE` with the suffix 2.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Mnemonic {
    /// Letters, in upper case.
    pub(crate) name: String,
    /// Digits at the end; a number too large for 32 bits stays out of every range.
    pub(crate) suffix: Option<u32>,
}

impl Mnemonic {
    /// Splits the digits off the end of an upper-case word.
    pub(crate) fn new(word: &str) -> Self {
        let name = word.trim_end_matches(|letter: char| letter.is_ascii_digit());
        let digits = word.get(name.len()..).unwrap_or_default();
        let suffix = if digits.is_empty() { None } else { Some(digits.parse().unwrap_or(u32::MAX)) };
        Self { name: name.to_owned(), suffix }
    }
}

/// A header as it was sent.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum Header {
    /// `*IDN`, without its asterisk.
    Common(String),
    /// Nodes of an instrument command.
    Tree {
        /// Whether a colon stood in front.
        from_root: bool,
        /// At least one node.
        nodes: Vec<Mnemonic>,
    },
}

/// The position in the tree that the next header of the same message is relative to (SCPI-99 vol. 1, 6.2.4: the last
/// header without its last node). Common commands do not move it; a new message starts at the root.
#[derive(Debug, Clone, Default)]
pub(crate) struct Path {
    nodes: Vec<Mnemonic>,
}

impl Path {
    /// The whole way to a header, and from now on the position behind it.
    pub(crate) fn resolve(&mut self, from_root: bool, nodes: &[Mnemonic]) -> Vec<Mnemonic> {
        let mut whole = if from_root { Vec::new() } else { std::mem::take(&mut self.nodes) };
        whole.extend_from_slice(nodes);
        self.nodes = whole.clone();
        self.nodes.pop();
        whole
    }
}

/// A header that an instrument knows, written as SCPI writes it: `[:SENSe#]:VOLTage[:DC]:RANGe`. Capitals are the short
/// form, brackets mark nodes that may be left out, `#` marks a node with a numeric suffix (1 if left out).
#[derive(Debug, Clone)]
pub(crate) struct Pattern {
    nodes: Vec<Node>,
}

#[derive(Debug, Clone)]
struct Node {
    form: &'static str,
    optional: bool,
    numbered: bool,
}

impl Pattern {
    /// Reads a pattern; what is no part of the notation is ignored.
    pub(crate) fn new(text: &'static str) -> Self {
        let nodes = text.split(':').skip(1).zip(text.split(':')).map(|(part, before)| Node {
            form: part.split(['[', ']', '#']).next().unwrap_or_default(),
            optional: before.ends_with('['),
            numbered: part.contains('#'),
        });
        Self { nodes: nodes.collect() }
    }

    /// Whether `sent` is this header; if so, the suffixes of the numbered nodes from left to right.
    ///
    /// # Errors
    /// -114 if the names match but a node without `#` was given a suffix other than 1 (SCPI-99 vol. 1, 6.2.5.2).
    pub(crate) fn suffixes(&self, sent: &[Mnemonic]) -> Option<Result<Vec<u32>, Fault>> {
        let mut suffixes = Vec::new();
        let mut fault = None;
        if !walk(&self.nodes, sent, &mut suffixes, &mut fault) {
            return None;
        }
        // `walk` pushes them on its way back, the last node first.
        suffixes.reverse();
        Some(fault.map_or(Ok(suffixes), Err))
    }
}

/// Matches nodes against a pattern, trying both ways at an optional node. The suffixes are pushed on the way back, so
/// only the successful way leaves any.
fn walk(pattern: &[Node], sent: &[Mnemonic], suffixes: &mut Vec<u32>, fault: &mut Option<Fault>) -> bool {
    let Some((node, later)) = pattern.split_first() else {
        return sent.is_empty();
    };
    if let Some((mnemonic, rest)) = sent.split_first()
        && is_form_of(&mnemonic.name, node.form)
        && walk(later, rest, suffixes, fault)
    {
        match (node.numbered, mnemonic.suffix) {
            (true, suffix) => suffixes.push(suffix.unwrap_or(1)),
            (false, None | Some(1)) => {}
            (false, Some(_)) => *fault = Some(Fault::HeaderSuffix),
        }
        return true;
    }
    if node.optional && walk(later, sent, suffixes, fault) {
        if node.numbered {
            suffixes.push(1);
        }
        return true;
    }
    false
}

/// Whether an upper-case word is the short or the long form of a keyword written `VOLTage`; nothing in between counts
/// (SCPI-99 vol. 1, 6.2.1).
pub(crate) fn is_form_of(word: &str, form: &str) -> bool {
    word.eq_ignore_ascii_case(form) || word.bytes().eq(form.bytes().filter(|letter| !letter.is_ascii_lowercase()))
}

/// The short form of a keyword: replies use it (SCPI-99 vol. 1, 6.2.1).
pub(crate) fn short_form(form: &str) -> String {
    form.chars().filter(|letter| !letter.is_ascii_lowercase()).collect()
}

#[cfg(test)]
mod tests;
