//! Limits on figures, and the verdict on each.

use evenpair_api::{Figure, LimitVerdict};
use evenpair_core::sequence::Limit;
use evenpair_core::units::{Unit, show};

/// The verdict on each limit. A figure that is not there or not valid keeps no limit.
pub(crate) fn judge(limits: &[Limit], figures: &[Figure]) -> Vec<LimitVerdict> {
    limits.iter().map(|limit| judge_one(limit, figures.iter().find(|figure| figure.name == limit.figure))).collect()
}

fn judge_one(limit: &Limit, figure: Option<&Figure>) -> LimitVerdict {
    let valid = figure.filter(|figure| figure.valid && figure.quantity.value.is_finite());
    // Where the limit lies within the figure's interval of 95 %, the verdict could be either.
    let (passed, uncertain) = valid.map_or((false, false), |figure| {
        let value = figure.quantity.value;
        let reach = 2.0 * figure.quantity.u.unwrap_or(0.0);
        let (low, high) = figure.coverage.as_ref().map_or((value - reach, value + reach), |c| (c.low, c.high));
        let within = limit.min.is_none_or(|min| value >= min) && limit.max.is_none_or(|max| value <= max);
        let near = |bound: Option<f64>| bound.is_some_and(|bound| low < bound && bound < high);
        (within, near(limit.min) || near(limit.max))
    });
    LimitVerdict { figure: limit.figure.clone(), min: limit.min, max: limit.max, passed, uncertain }
}

/// What was found and what was allowed, in words.
pub(crate) fn in_words(verdict: &LimitVerdict, figures: &[Figure]) -> String {
    let Some(figure) = figures.iter().find(|figure| figure.name == verdict.figure) else {
        return format!("{} was not found", verdict.figure);
    };
    let unit = Unit::from_symbol(&figure.quantity.unit).unwrap_or(Unit::One);
    if !figure.valid {
        return format!("{} is not valid: {}", figure.name, figure.why.as_deref().unwrap_or("no reason was given"));
    }
    let bound = |value: Option<f64>| value.map_or_else(|| "any".to_owned(), |value| show(value, unit, 4));
    format!(
        "{} is {}, allowed is {} to {}",
        figure.name,
        show(figure.quantity.value, unit, 4),
        bound(verdict.min),
        bound(verdict.max)
    )
}

#[cfg(test)]
mod tests {
    use evenpair_api::{Coverage, CoverageBasis, Grade, Quantity};

    use super::*;

    fn figure(value: f64, u: f64, valid: bool) -> Figure {
        let quantity = Quantity::new(value, u, "V");
        Figure {
            name: "mean".into(),
            quantity,
            coverage: None,
            plain: None,
            grade: Grade::Clean,
            valid,
            why: None,
            budget: vec![],
        }
    }

    fn limit(min: Option<f64>, max: Option<f64>) -> Limit {
        Limit { figure: "mean".into(), unit: Unit::Volt, min, max }
    }

    #[test]
    fn a_limit_is_kept_exceeded_or_uncertain() {
        let verdict = |value, u| {
            let verdict = judge(&[limit(Some(1.0), Some(2.0))], &[figure(value, u, true)]).remove(0);
            (verdict.passed, verdict.uncertain)
        };
        assert_eq!(verdict(1.5, 0.1), (true, false));
        assert_eq!(verdict(1.9, 0.1), (true, true));
        assert_eq!(verdict(2.1, 0.1), (false, true));
        assert_eq!(verdict(2.5, 0.1), (false, false));
    }

    #[test]
    fn the_interval_decides_what_is_uncertain_where_there_is_one() {
        let mut found = figure(1.5, 1.0, true);
        found.coverage = Some(Coverage { low: 0.9, high: 1.6, basis: CoverageBasis::CommonMode });
        let verdict = |min, max| judge(&[limit(min, max)], std::slice::from_ref(&found)).remove(0).uncertain;
        assert!(verdict(Some(1.0), None));
        assert!(!verdict(None, Some(1.7)) && !verdict(Some(0.8), None));
    }

    #[test]
    fn what_is_not_valid_or_not_there_keeps_no_limit() {
        assert!(!judge(&[limit(None, Some(2.0))], &[figure(1.0, 0.0, false)])[0].passed);
        assert!(!judge(&[limit(None, Some(2.0))], &[figure(f64::NAN, 0.0, true)])[0].passed);
        let verdicts = judge(&[limit(None, Some(2.0))], &[]);
        assert!(!verdicts[0].passed);
        assert_eq!(in_words(&verdicts[0], &[]), "mean was not found");
    }
}
