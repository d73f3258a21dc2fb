//! Dialects that state only their differences.

use std::collections::BTreeMap;

use super::*;

/// Reads `name` out of files that stand in memory.
fn read(files: &BTreeMap<&str, &str>, name: &str) -> Result<Dialect, Vec<Mistaken>> {
    let of = |name: &str| Source { place: name.to_owned(), text: files[name].to_owned() };
    let mut find =
        |path: &str, _: &str| if files.contains_key(path) { Ok(of(path)) } else { Err("no such file".to_owned()) };
    Dialect::read_from(of(name), &mut find)
}

#[test]
fn a_variant_states_only_its_differences() {
    let dialect = dialect(
        r#"
name = "variant"
like = "scpi-99"
completion = { ask = "STAT?", set = 1, every = "10 ms" }
errors = false
intent."skew.set" = false
[skew]
step = "1 ns"
[samples]
order = "big"
[words.coupling]
ac = "ALT"
[intent."source.voltage"]
send = ["V{channel} {value}"]
"#,
    );
    assert_eq!(
        (dialect.name(), dialect.about()),
        ("variant", "Instruments that follow the instrument classes of SCPI-99")
    );
    assert_eq!(dialect.completion(), Some(&Completion::Poll { every_s: 0.01 }));
    assert!(!dialect.supports(Intent::Error) && !dialect.supports(Intent::SkewSet));
    assert!(dialect.supports(Intent::SkewGet));
    assert_eq!(dialect.skew(), Some(SkewSetting { step_s: 1e-9, range_s: 1e-7 }));
    let voltage = Call::new(Intent::SourceVoltage).with("channel", 1).with("value", 5.0);
    assert_eq!(said(&dialect, &voltage), "V1 5E0\n");
    let coupling = |word: &str| {
        let word = Value::Keyword(word.to_owned());
        said(&dialect, &Call::new(Intent::CouplingSet).with("channel", 1).with("coupling", word))
    };
    assert_eq!((coupling("ac"), coupling("dc")), ("INPut1:COUPling ALT\n".into(), "INPut1:COUPling DC\n".into()));
}

#[test]
fn files_are_like_files_and_each_mistake_is_shown_in_its_own() {
    let files = BTreeMap::from([
        ("a.toml", "name = \"a\"\nlike = \"b.toml\"\n[line]\nending = \"cr\"\n"),
        ("b.toml", "like = \"scpi-99\"\n\n[line]\npause = \"1 h\"\ngreeting = true\n"),
        ("good.toml", "like = \"scpi-99\"\n[line]\npause = \"1 ms\"\n"),
        ("better.toml", "name = \"better\"\nlike = \"good.toml\"\n[line]\ngreeting = true\n"),
    ]);
    let found = read(&files, "a.toml").unwrap_err();
    let shown: Vec<(&str, &str)> = found
        .iter()
        .flat_map(|mistaken| {
            mistaken
                .mistakes
                .iter()
                .map(|mistake| (mistaken.source.place.as_str(), &mistaken.source.text[mistake.span.clone()]))
        })
        .collect();
    assert_eq!(shown, [("a.toml", "\"cr\""), ("b.toml", "\"1 h\"")]);
    let better = read(&files, "better.toml").unwrap();
    assert!(better.greeting());
    assert_eq!(better.plan(&Call::new(Intent::Clear)).unwrap()[0].pause_after_s, 0.001);
}

#[test]
fn an_intent_that_is_replaced_does_not_inherit_its_conversion() {
    let base = "name = \"base\"\n[convert.\"source.voltage\"]\nhalf = \"value / 2.0\"\n\
                [intent.\"source.voltage\"]\nsend = [\"V{channel} {half}\"]\n";
    let own = "like = \"base.toml\"\n[intent.\"source.voltage\"]\nsend = [\"U{channel} {value}\"]\n";
    let gone = "like = \"base.toml\"\nintent.\"source.voltage\" = false\n";
    let other = "like = \"base.toml\"\n[convert.\"source.voltage\"]\nhalf = \"value * 0.25\"\n";
    let files = BTreeMap::from([("base.toml", base), ("own.toml", own), ("gone.toml", gone), ("other.toml", other)]);
    let call = Call::new(Intent::SourceVoltage).with("channel", 1).with("value", 4.0);
    let said = |name: &str| said(&read(&files, name).unwrap(), &call);
    assert_eq!((said("base.toml"), said("own.toml")), ("V1 2E0\n".into(), "U1 4E0\n".into()));
    assert_eq!(said("other.toml"), "V1 1E0\n");
    assert!(!read(&files, "gone.toml").unwrap().supports(Intent::SourceVoltage));
}

#[test]
fn circles_chains_and_unknown_names_are_refused_where_they_stand() {
    let refused = |files: &BTreeMap<&str, &str>, name: &str| {
        let found = read(files, name).unwrap_err().remove(0);
        let mistake = found.mistakes.into_iter().next().unwrap();
        (found.source.place.clone(), found.source.text[mistake.span].to_owned(), mistake.help)
    };
    let circle = BTreeMap::from([("a.toml", "like = \"b.toml\"\n"), ("b.toml", "like = \"a.toml\"\n")]);
    let (place, shown, help) = refused(&circle, "a.toml");
    assert_eq!((place.as_str(), shown.as_str()), ("b.toml", "\"a.toml\""));
    assert!(help.contains("would be like itself"), "{help}");
    let texts: Vec<(String, String)> =
        (0..12).map(|n| (format!("{n}.toml"), format!("name = \"n\"\nlike = \"{}.toml\"\n", n + 1))).collect();
    let chain: BTreeMap<&str, &str> = texts.iter().map(|(name, text)| (name.as_str(), text.as_str())).collect();
    let (place, _, help) = refused(&chain, "0.toml");
    assert_eq!(place, "7.toml");
    assert!(help.contains("8 dialects in a row"), "{help}");
    let unknown = BTreeMap::from([("a.toml", "like = \"scpi-98\"\n"), ("b.toml", "like = \"c.toml\"\n")]);
    assert!(refused(&unknown, "a.toml").2.contains("known: scpi-99"));
    assert_eq!(refused(&unknown, "b.toml").2, "no such file");
    // A text by itself has no files beside it; and what is wrong further below is marked where it says `like`.
    let alone = Dialect::read("name = \"x\"\nlike = \"y.toml\"\n").unwrap_err();
    assert!(alone[0].help.contains("no files can be looked for here"));
    let text = "name = \"x\"\nlike = \"scpi-99\"\nsamples = false\n";
    let below = Dialect::read(text).unwrap_err();
    assert!(below.iter().all(|mistake| mistake.span.end <= text.len()), "{below:#?}");
}
