use super::*;

#[test]
fn a_leak_is_weighed_against_uncertainty_and_size() {
    assert_eq!(grade(12.0, 0.1, 0.05), Grade::Clean);
    assert_eq!(grade(12.0, 0.1, 0.1), Grade::Shaded);
    assert_eq!(grade(-12.0, 0.1, 11.9), Grade::Shaded);
    assert_eq!(grade(-12.0, 0.1, 12.0), Grade::Swamped);
    assert_eq!(grade(0.0, 0.1, 0.05), Grade::Clean);
    assert_eq!(grade(0.0, 0.0, 0.0), Grade::Clean);
    assert_eq!(grade(12.0, 0.1, f64::NAN), Grade::Swamped);
    assert_eq!(Grade::Shaded.name(), "shaded");
}
