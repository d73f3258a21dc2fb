//! Header forms, suffixes and the path rules of SCPI-99 vol. 1 chapter 6 (clauses from memory).

use super::*;

fn nodes(text: &str) -> Vec<Mnemonic> {
    text.split(':').map(Mnemonic::new).collect()
}

fn suffixes(pattern: &'static str, sent: &str) -> Option<Result<Vec<u32>, Fault>> {
    Pattern::new(pattern).suffixes(&nodes(sent))
}

const RANGE: &str = "[:SENSe#]:VOLTage[:DC]:RANGe:PTPeak";

#[test]
fn only_the_short_and_the_long_form_count() {
    // 6.2.1: "VOLT" and "VOLTAGE", nothing in between.
    for word in ["VOLT", "VOLTAGE"] {
        assert!(is_form_of(word, "VOLTage"), "{word}");
    }
    for word in ["VOL", "VOLTA", "VOLTAG", "VOLTAGES", ""] {
        assert!(!is_form_of(word, "VOLTage"), "{word}");
    }
    assert_eq!(short_form("VOLTage"), "VOLT");
}

#[test]
fn nodes_in_brackets_may_be_left_out() {
    for sent in ["VOLT:RANG:PTP", "SENS:VOLT:RANG:PTP", "VOLTAGE:DC:RANGE:PTPEAK", "SENSE1:VOLT:DC:RANG:PTP"] {
        assert_eq!(suffixes(RANGE, sent), Some(Ok(vec![1])), "{sent}");
    }
    for sent in ["VOLT:PTP", "SENS:RANG:PTP", "VOLT:RANG", "VOLT:RANG:PTP:X", "SENS:SENS:VOLT:RANG:PTP"] {
        assert_eq!(suffixes(RANGE, sent), None, "{sent}");
    }
}

#[test]
fn suffixes_are_read_where_they_are_allowed() {
    assert_eq!(suffixes(RANGE, "SENS3:VOLT:RANG:PTP"), Some(Ok(vec![3])));
    assert_eq!(suffixes(RANGE, "SENS:VOLT2:RANG:PTP"), Some(Err(Fault::HeaderSuffix)));
    assert_eq!(suffixes(RANGE, "SENS:VOLT1:RANG:PTP"), Some(Ok(vec![1])), "1 is the default everywhere");
    assert_eq!(suffixes(":A#:B#", "A4:B5"), Some(Ok(vec![4, 5])));
    assert_eq!(Mnemonic::new("OUTP99999999999").suffix, Some(u32::MAX));
}

#[test]
fn two_optional_nodes_of_the_same_name() {
    for sent in ["TRAC", "TRAC:DATA", "TRACE:DATA:DATA"] {
        assert_eq!(suffixes(":TRACe[:DATA][:DATA]", sent), Some(Ok(vec![])), "{sent}");
    }
}

#[test]
fn the_path_is_the_last_header_without_its_last_node() {
    // 6.2.4
    let mut path = Path::default();
    assert_eq!(path.resolve(false, &nodes("SWE:TINT")), nodes("SWE:TINT"));
    assert_eq!(path.resolve(false, &nodes("POIN")), nodes("SWE:POIN"));
    assert_eq!(path.resolve(false, &nodes("OREF:LOC")), nodes("SWE:OREF:LOC"));
    assert_eq!(path.resolve(false, &nodes("POIN")), nodes("SWE:OREF:POIN"));
    assert_eq!(path.resolve(true, &nodes("INIT")), nodes("INIT"));
    assert_eq!(path.resolve(false, &nodes("ABOR")), nodes("ABOR"));
}
