//! Steps: a database brought up step by step equals a fresh one; newer and foreign ones are refused.
#![allow(clippy::unwrap_used)]

use tempfile::TempDir;

use super::*;

fn look(connection: &Connection) -> (i64, Vec<(String, String)>) {
    let version = connection.query_row("pragma user_version", [], |row| row.get(0)).unwrap();
    let sql = "select name, sql from sqlite_schema where sql is not null order by name";
    let mut statement = connection.prepare(sql).unwrap();
    let rows = statement.query_map([], |row| Ok((row.get(0)?, row.get(1)?))).unwrap();
    (version, rows.collect::<Result<_, _>>().unwrap())
}

#[test]
fn an_upgraded_database_equals_a_fresh_one() {
    let later =
        [STEPS, &["create table extra (id integer) strict;", "alter table extra add column more text;"]].concat();
    let path = Path::new("memory");
    let mut fresh = Connection::open_in_memory().unwrap();
    upgrade(&mut fresh, path, &later).unwrap();
    for stop in 0..=later.len() {
        let mut upgraded = Connection::open_in_memory().unwrap();
        upgrade(&mut upgraded, path, &later[..stop]).unwrap();
        upgrade(&mut upgraded, path, &later).unwrap();
        assert_eq!(look(&upgraded), look(&fresh), "by way of step {stop}");
    }
    assert_eq!(look(&fresh).0, i64::try_from(later.len()).unwrap());
    assert_eq!(look(&fresh).1.last().map(|(name, _)| name.as_str()), Some("transfers"));
}

#[test]
fn a_step_that_fails_leaves_the_one_before_it() {
    let path = Path::new("memory");
    let mut connection = Connection::open_in_memory().unwrap();
    let steps = [STEPS, &["create table half (id integer); create table half (id integer);"]].concat();
    let failed = upgrade(&mut connection, path, &steps).unwrap_err();
    assert!(matches!(failed, StoreError::Database { .. }), "{failed}");
    let mut whole = Connection::open_in_memory().unwrap();
    upgrade(&mut whole, path, STEPS).unwrap();
    assert_eq!(look(&connection), look(&whole));
}

#[test]
fn a_newer_database_is_refused_and_not_touched() {
    let folder = TempDir::new().unwrap();
    drop(crate::store::Store::open(folder.path()).unwrap());
    let path = folder.path().join("evenpair.sqlite");
    let newer = i64::try_from(STEPS.len()).unwrap() + 1;
    Connection::open(&path).unwrap().pragma_update(None, "user_version", newer).unwrap();
    let refused = crate::store::Store::open(folder.path()).err().unwrap();
    assert!(
        matches!(refused, StoreError::Newer { found, known, .. } if found == newer && known == newer - 1),
        "{refused}"
    );
    assert!(refused.to_string().contains("run the newer daemon"), "{refused}");
    assert_eq!(look(&Connection::open(&path).unwrap()).0, newer);
}

#[test]
fn a_database_of_another_program_is_refused() {
    let mut connection = Connection::open_in_memory().unwrap();
    connection.execute_batch("create table seedlings (id integer)").unwrap();
    let refused = upgrade(&mut connection, Path::new("memory"), STEPS).unwrap_err();
    assert!(matches!(refused, StoreError::Foreign { .. }), "{refused}");
}

#[test]
fn every_column_has_its_comment() {
    for step in STEPS {
        for line in step.lines().filter(|line| line.starts_with("    ")) {
            let of_table = ["primary key", "foreign key"].iter().any(|start| line.trim_start().starts_with(start));
            assert!(of_table || line.contains(" -- "), "no comment: {line}");
        }
    }
}
