//! The rows of a capture: itself, its conditions, figures with their terms, and limits.

use evenpair_api::{Capture, Condition, CorrelatedTerm, Coverage, Figure, LeakBound, LimitVerdict, UncertaintyTerm};
use rusqlite::{Connection, Row, named_params, params};
use uuid::Uuid;

use super::convert::{
    all, change, first, from_id, from_integer, from_json, from_time, from_word, integer, json, number, numbers,
    quantity, time, word,
};
use super::error::Fault;

/// Inserts every row of a capture; `bytes` is its file's length. Runs within the caller's transaction.
pub(super) fn insert_capture(connection: &Connection, capture: &Capture, bytes: u64) -> Result<(), Fault> {
    insert_head(connection, capture, bytes)?;
    let (run, number) = (capture.run.to_string(), capture.number);
    for (place, condition) in (0_u32..).zip(&capture.conditions) {
        let sql = "insert into conditions (run, capture, place, setting, value, u, unit) \
                   values (?1, ?2, ?3, ?4, ?5, ?6, ?7)";
        let value = &condition.value;
        change(connection, sql, params![run, number, place, condition.setting, value.value, value.u, value.unit])?;
    }
    for (place, figure) in (0_u32..).zip(&capture.figures) {
        insert_figure(connection, &run, number, place, figure)?;
    }
    for (place, limit) in (0_u32..).zip(&capture.limits) {
        let sql = "insert into limits (run, capture, place, figure, min, max, passed, uncertain) \
                   values (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8)";
        let params = params![run, number, place, limit.figure, limit.min, limit.max, limit.passed, limit.uncertain];
        change(connection, sql, params)?;
    }
    Ok(())
}

/// Reads a capture from its rows. The caller's transaction makes them belong together.
pub(super) fn read_capture(connection: &Connection, run: Uuid, number: u32) -> Result<Option<Capture>, Fault> {
    let key = run.to_string();
    let sql = "select * from captures where run = ?1 and number = ?2";
    let Some(capture) = first(connection, sql, params![key, number], read_head)? else { return Ok(None) };
    let sql = "select * from conditions where run = ?1 and capture = ?2 order by place";
    let conditions = all(connection, sql, params![key, number], |row| {
        let unit: String = row.get("unit")?;
        Ok(Condition { setting: row.get("setting")?, value: quantity(row, "value", "u", &unit)? })
    })?;
    let sql = "select * from limits where run = ?1 and capture = ?2 order by place";
    let limits = all(connection, sql, params![key, number], |row| {
        Ok(LimitVerdict {
            figure: row.get("figure")?,
            min: row.get("min")?,
            max: row.get("max")?,
            passed: row.get("passed")?,
            uncertain: row.get("uncertain")?,
        })
    })?;
    Ok(Some(Capture { conditions, figures: read_figures(connection, &key, number)?, limits, ..capture }))
}

/// Inserts the row of `captures`.
fn insert_head(connection: &Connection, capture: &Capture, bytes: u64) -> Result<(), Fault> {
    let leak = &capture.leak;
    let (leak_rms_v, leak_rms_u) = numbers("the leak bound", &leak.rms, "V")?;
    let (leak_peak_v, leak_peak_u) = numbers("the leak bound", &leak.peak, "V")?;
    let (common_rms_v, common_rms_u) = numbers("the common mode", &leak.common_rms, "V")?;
    let (common_swing_v, common_swing_u) = numbers("the common mode", &leak.common_swing, "V")?;
    let (interval_s, interval_u) = numbers("the sample interval", &capture.sample_interval, "s")?;
    let sql = "insert into captures (run, number, pair, made_at, correction, correction_state, leak_rms_v, leak_rms_u, \
               leak_peak_v, leak_peak_u, common_rms_v, common_rms_u, common_swing_v, common_swing_u, warnings_json, \
               points, interval_s, interval_u, file, file_bytes) values (:run, :number, :pair, :made_at, :correction, \
               :correction_state, :leak_rms_v, :leak_rms_u, :leak_peak_v, :leak_peak_u, :common_rms_v, :common_rms_u, \
               :common_swing_v, :common_swing_u, :warnings, :points, :interval_s, :interval_u, :file, :file_bytes)";
    let params = named_params! {
        ":run": capture.run.to_string(),
        ":number": capture.number,
        ":pair": capture.pair,
        ":made_at": time(capture.made_at),
        ":correction": capture.correction.map(|id| id.to_string()),
        ":correction_state": capture.correction_state.as_ref().map(word).transpose()?,
        ":leak_rms_v": leak_rms_v,
        ":leak_rms_u": leak_rms_u,
        ":leak_peak_v": leak_peak_v,
        ":leak_peak_u": leak_peak_u,
        ":common_rms_v": common_rms_v,
        ":common_rms_u": common_rms_u,
        ":common_swing_v": common_swing_v,
        ":common_swing_u": common_swing_u,
        ":warnings": json(&capture.warnings)?,
        ":points": integer(capture.points),
        ":interval_s": interval_s,
        ":interval_u": interval_u,
        ":file": capture.file,
        ":file_bytes": integer(bytes),
    };
    change(connection, sql, params)?;
    Ok(())
}

/// Inserts a figure and its terms.
fn insert_figure(connection: &Connection, run: &str, capture: u32, place: u32, figure: &Figure) -> Result<(), Fault> {
    let sql = "insert into figures (run, capture, place, name, value, u, unit, low, high, basis, plain, grade, valid, why) values \
               (:run, :capture, :place, :name, :value, :u, :unit, :low, :high, :basis, :plain, :grade, :valid, :why)";
    let params = named_params! {
        ":run": run,
        ":capture": capture,
        ":place": place,
        ":name": figure.name,
        ":value": figure.quantity.value,
        ":u": figure.quantity.u,
        ":unit": figure.quantity.unit,
        ":low": figure.coverage.as_ref().map(|c| c.low),
        ":high": figure.coverage.as_ref().map(|c| c.high),
        ":basis": figure.coverage.as_ref().map(|c| word(&c.basis)).transpose()?,
        ":plain": figure.plain,
        ":grade": word(&figure.grade)?,
        ":valid": figure.valid,
        ":why": figure.why,
    };
    change(connection, sql, params)?;
    for (term_place, term) in (0_u32..).zip(&figure.budget) {
        let sql = "insert into terms (run, capture, figure, place, name, u, kind, share, sensitivity, \
                   distribution, correlated_with, correlation, freedom) \
                   values (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10, ?11, ?12, ?13)";
        let UncertaintyTerm { name, u, sensitivity, distribution, correlated, kind, freedom, share } = term;
        let (with, coefficient) = (correlated.as_ref().map(|c| &c.with), correlated.as_ref().map(|c| c.coefficient));
        let params = params![
            run,
            capture,
            place,
            term_place,
            name,
            u,
            kind,
            share,
            sensitivity,
            distribution,
            with,
            coefficient,
            freedom
        ];
        change(connection, sql, params)?;
    }
    Ok(())
}

/// A row of `captures`; what stands in other tables stays empty.
fn read_head(row: &Row<'_>) -> Result<Capture, Fault> {
    let correction = row.get::<_, Option<String>>("correction")?;
    let state = row.get::<_, Option<String>>("correction_state")?;
    Ok(Capture {
        run: from_id("a capture's run", &row.get::<_, String>("run")?)?,
        number: row.get("number")?,
        pair: row.get("pair")?,
        made_at: from_time("a capture's time", &row.get::<_, String>("made_at")?)?,
        conditions: Vec::new(),
        correction: correction.map(|id| from_id("a capture's correction", &id)).transpose()?,
        correction_state: state.map(|word| from_word("a correction's state", word)).transpose()?,
        figures: Vec::new(),
        leak: LeakBound {
            rms: quantity(row, "leak_rms_v", "leak_rms_u", "V")?,
            peak: quantity(row, "leak_peak_v", "leak_peak_u", "V")?,
            common_rms: quantity(row, "common_rms_v", "common_rms_u", "V")?,
            common_swing: quantity(row, "common_swing_v", "common_swing_u", "V")?,
        },
        limits: Vec::new(),
        warnings: from_json("a capture's warnings", &row.get::<_, String>("warnings_json")?)?,
        points: from_integer("a capture's points", row.get("points")?)?,
        sample_interval: quantity(row, "interval_s", "interval_u", "s")?,
        file: row.get("file")?,
    })
}

/// A figure's interval, where it has one.
fn read_coverage(row: &Row<'_>) -> Result<Option<Coverage>, Fault> {
    let basis = row.get::<_, Option<String>>("basis")?;
    let whole = |word| -> Result<Coverage, Fault> {
        let basis = from_word("a figure's interval", word)?;
        Ok(Coverage { low: number(row, "low")?, high: number(row, "high")?, basis })
    };
    basis.map(whole).transpose()
}

/// A capture's figures with their terms.
fn read_figures(connection: &Connection, run: &str, capture: u32) -> Result<Vec<Figure>, Fault> {
    let sql = "select * from figures where run = ?1 and capture = ?2 order by place";
    let mut figures = all(connection, sql, params![run, capture], |row| {
        let unit: String = row.get("unit")?;
        Ok(Figure {
            name: row.get("name")?,
            quantity: quantity(row, "value", "u", &unit)?,
            coverage: read_coverage(row)?,
            plain: row.get("plain")?,
            grade: from_word("a figure's grade", row.get("grade")?)?,
            valid: row.get("valid")?,
            why: row.get("why")?,
            budget: Vec::new(),
        })
    })?;
    let sql = "select * from terms where run = ?1 and capture = ?2 order by figure, place";
    let terms = all(connection, sql, params![run, capture], |row| {
        let term = UncertaintyTerm {
            name: row.get("name")?,
            u: number(row, "u")?,
            sensitivity: row.get("sensitivity")?,
            distribution: row.get("distribution")?,
            correlated: match row.get::<_, Option<String>>("correlated_with")? {
                Some(with) => Some(CorrelatedTerm { with, coefficient: number(row, "correlation")? }),
                None => None,
            },
            kind: row.get("kind")?,
            freedom: row.get("freedom")?,
            share: number(row, "share")?,
        };
        Ok((row.get::<_, u32>("figure")?, term))
    })?;
    for (place, term) in terms {
        // The places of a capture's figures run from 0 without gaps, so the place is the index.
        if let Some(figure) = figures.get_mut(place as usize) {
            figure.budget.push(term);
        }
    }
    Ok(figures)
}
