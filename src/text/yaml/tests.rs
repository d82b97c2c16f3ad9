use super::*;
use std::time::{Duration, Instant};

fn error(text: &str) -> Diagnostic {
    *parse_yaml(text, "x.yaml").unwrap_err()
}

fn line_and_column(diagnostic: &Diagnostic) -> (usize, usize) {
    let position = diagnostic.place.as_ref().unwrap().position.unwrap();
    (position.line, position.column)
}

#[test]
fn every_part_is_found_again() {
    let text = "a: &x [1, {b: two}]\nc: *x\nd:\n  - 3.5\n";
    let document = parse_yaml(text, "x.yaml").unwrap();
    let find = |what: &dyn Fn(&Document) -> Diagnostic| line_and_column(&what(&document));
    let Value::Map(entries) = &document.root.value else {
        panic!("a map")
    };
    let warn = |what: &Node| document.diagnostic(Severity::Warning, what, "");
    assert_eq!(find(&|_| warn(&document.root)), (1, 1));
    let (a, list) = &entries[0];
    assert_eq!(find(&|d| d.diagnostic(Severity::Warning, a, "")), (1, 1));
    assert_eq!(find(&|_| warn(list)), (1, 4));
    let Value::List(items) = &list.value else {
        panic!("a list")
    };
    assert_eq!(find(&|_| warn(&items[1])), (1, 11));
    let Value::Map(inner) = &items[1].value else {
        panic!("a map")
    };
    assert_eq!(find(&|_| warn(&inner[0].1)), (1, 15));
    let Value::List(items) = &entries[2].1.value else {
        panic!("a list")
    };
    assert_eq!(find(&|_| warn(&items[0])), (4, 5));
    assert_eq!(items[0].value, Value::Float(3.5));
}

#[test]
fn scalars_keep_their_kind() {
    let document = parse_yaml("[~, true, 5, 0.5, .nan, 10-90, '5', 1_0, 007]", "x").unwrap();
    let Value::List(items) = document.root.value else {
        panic!("a list")
    };
    assert_eq!(items[0].value, Value::Null);
    assert_eq!(items[1].value, Value::Bool(true));
    assert_eq!(items[2].value, Value::Integer(5));
    assert_eq!(items[3].value, Value::Float(0.5));
    assert!(matches!(items[4].value, Value::Float(nan) if nan.is_nan()));
    for (item, text) in items[5..].iter().zip(["10-90", "5", "1_0", "007"]) {
        assert_eq!(item.value, Value::Text(text.into()));
    }
}

#[test]
fn what_would_never_end_is_refused_at_once() {
    let start = Instant::now();
    let brackets = "[".repeat(40_000);
    assert_eq!(error(&brackets).message, "brackets are nested too deeply");
    let brackets = "[ # ]\n".repeat(40_000);
    assert_eq!(error(&brackets).message, "brackets are nested too deeply");
    let brackets = "[']',".repeat(40_000);
    assert_eq!(error(&brackets).message, "brackets are nested too deeply");
    const TOO_MUCH: &str = "the file has too many parts, or its aliases expand to too much";
    let deep = "nested too deeply, or an alias that contains itself";
    assert_eq!(error(&"- ".repeat(40_000)).message, deep);
    assert_eq!(error("a: &a [*a]").message, deep);
    let mut laughs = String::from("a0: &a0 [x, x, x, x, x, x, x, x, x, x]\n");
    for level in 1..10 {
        let aliases = vec![format!("*a{}", level - 1); 10].join(", ");
        laughs += &format!("a{level}: &a{level} [{aliases}]\n");
    }
    assert_eq!(error(&laughs).message, TOO_MUCH);
    let aliases = format!(
        "a: &a [{}]\nb: [{}]",
        "x,".repeat(1 << 20),
        "*a,".repeat(1 << 20)
    );
    assert_eq!(error(&aliases).message, TOO_MUCH);
    assert_eq!(
        error(&"x".repeat(50 << 20)).message,
        "the file is too large: 50 MB"
    );
    assert!(
        start.elapsed() < Duration::from_secs(20),
        "{:?}",
        start.elapsed()
    );
}

#[test]
fn brackets_in_quotes_and_comments_do_not_count() {
    let text = format!(
        "a: '{0}' # {0}\nb: \"\\\"{0}\"\nc: don't\n",
        "[".repeat(100)
    );
    assert!(parse_yaml(&text, "x").is_ok());
}

#[test]
fn places_are_given_up_when_they_cost_too_much() {
    let text = format!("a: [{}]", "x,".repeat(2 << 20));
    let document = parse_yaml(&text, "x.yaml");
    assert!(document.is_err(), "more parts than are read");
    let text = format!("a: '{}'", "x".repeat(15 << 20));
    let document = parse_yaml(&text, "x.yaml").unwrap();
    let warn = || document.diagnostic(Severity::Warning, &document.root, "");
    let found = [warn(), warn(), warn()].map(|found| found.place.unwrap().position.is_some());
    assert_eq!(found, [true, true, false]);
}

#[test]
fn what_is_no_yaml_is_said_plainly() {
    assert_eq!(error("").message, "the file is empty");
    assert_eq!(error("# nothing yet\n").message, "the file is empty");
    assert_eq!(
        error("a: 1\n---\nb: 2").message,
        "the file holds more than one YAML document"
    );
    assert_eq!(
        error("a: !tag x").message,
        "YAML tags (`!name`) have no meaning here"
    );
    let tab = error("a:\n\tb: 1\n");
    assert!(tab.expected.unwrap().contains("no tabs"));
    assert_eq!(error("? [a]\n").message, "a key is itself a list or a map");
    assert_eq!(
        error("a: *b").message,
        "an alias (`*name`) without its anchor (`&name`)"
    );
    let open = error("a: [1, 2\nb: 3\n");
    assert!(
        open.message.starts_with("this is not YAML: "),
        "{}",
        open.message
    );
    assert!(open.place.unwrap().position.is_some());
}
