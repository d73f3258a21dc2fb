//! Dialects that state only their differences from another one.

use super::{Dialect, bundled, read};
use crate::document::{self, Mistake, Rules, line_and_column};

/// How a dialect is laid over the one that it is like: intents and their conversions are replaced as a whole, and so is
/// the completion, whose keys exclude one another.
const RULES: Rules =
    Rules { whole: |path| matches!(path, ["intent" | "convert", _] | ["completion"]), together: ("intent", "convert") };

/// The most texts in a row that are each like the next: more are no longer understood by a person.
const MOST_LAYERS: usize = 8;

/// The text of a dialect, and where it comes from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Source {
    /// A path, or the name of a dialect that comes with the program.
    pub place: String,
    /// What stands there.
    pub text: String,
}

/// The mistakes in one text.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Mistaken {
    /// The text.
    pub source: Source,
    /// What is wrong in it.
    pub mistakes: Vec<Mistake>,
}

/// Reads a dialect with everything that it is like.
pub(super) fn read(
    source: Source,
    find: &mut dyn FnMut(&str, &str) -> Result<Source, String>,
) -> Result<Dialect, Vec<Mistaken>> {
    let mut sources = vec![source];
    while let Some(last) = sources.last() {
        let Some(like) = document::peek(&last.text, "like") else { break };
        let found = if sources.len() == MOST_LAYERS {
            Err(format!("{MOST_LAYERS} dialects in a row are each like another; state more in one of them"))
        } else if is_path(&like.value) {
            find(&like.value, &last.place)
        } else {
            let known = || super::bundled_names().collect::<Vec<_>>().join(", ");
            bundled(&like.value)
                .map(|text| Source { place: like.value.clone(), text: text.to_owned() })
                .ok_or_else(|| format!("known: {}; a file is named by its path, which ends in `.toml`", known()))
        };
        let found = found.and_then(|found| match sources.iter().any(|known| known.place == found.place) {
            true => Err(format!("`{}` would be like itself; leave `like` out of one of them", found.place)),
            false => Ok(found),
        });
        match found {
            Ok(found) => sources.push(found),
            Err(help) => {
                let mistake = Mistake { span: like.span, what: format!("it cannot be like `{}`", like.value), help };
                return Err(vec![Mistaken { source: last.clone(), mistakes: vec![mistake] }]);
            }
        }
    }
    let texts: Vec<&str> = sources.iter().map(|source| source.text.as_str()).collect();
    document::read_layers(&texts, &RULES, read::dialect).map_err(|found| {
        let mut mistaken: Vec<Mistaken> =
            sources.iter().map(|source| Mistaken { source: source.clone(), mistakes: Vec::new() }).collect();
        for (layer, mistake) in found {
            if let Some(mistaken) = mistaken.get_mut(layer) {
                mistaken.mistakes.push(mistake);
            }
        }
        mistaken.retain(|mistaken| !mistaken.mistakes.is_empty());
        mistaken
    })
}

/// Reads a dialect out of its text alone; mistakes that show in what it is like are marked where it says so.
pub(super) fn read_alone(text: &str) -> Result<Dialect, Vec<Mistake>> {
    let own = "this text";
    let source = Source { place: own.to_owned(), text: text.to_owned() };
    let mut find = |path: &str, _: &str| Err(format!("`{path}` is a file, and no files can be looked for here"));
    let like = || document::peek(text, "like").map_or(0..0, |like| like.span);
    read(source, &mut find).map_err(|found| {
        let of = |Mistaken { source, mistakes }: Mistaken| {
            let place = move |mistake: Mistake| {
                if source.place == own {
                    return mistake;
                }
                let (line, _) = line_and_column(&source.text, mistake.span.start);
                Mistake {
                    span: like(),
                    what: format!("in `{}`, line {line}: {}", source.place, mistake.what),
                    ..mistake
                }
            };
            mistakes.into_iter().map(place).collect::<Vec<_>>()
        };
        found.into_iter().flat_map(of).collect()
    })
}

/// Whether this names a file, rather than a dialect that comes with the program.
pub(super) fn is_path(name: &str) -> bool {
    std::path::Path::new(name).extension().is_some_and(|ending| ending.eq_ignore_ascii_case("toml"))
}
