//! Broken model files: every fault is named with its kind, line, state, value and remedy, and nothing else is said.

mod faults;

use std::fs;

use faults::{AS_NUMBER, Expected, GIVE_MOVES, IN_RANGE, hold, options};
use tallystone::model::FaultKind::{
    AboveOne, AbsorbingWithMoves, BadName, DuplicateName, MissingStart, Negative, NoEndReachable, NoMoves, NonFinite,
    NotAClosedClass, NotANumber, OutOfRange, Rest, RowSum, Shape, Syntax, UnknownKey, UnknownName, UnknownState,
    WrongType,
};
use tallystone::model::{Model, ModelError, ReadOptions};

/// A model whose ends are `x` and `y`, with these rows from line 4 on.
fn with_rows(rows: &str) -> String {
    format!("start = \"a\"\nabsorbing = [\"x\", \"y\"]\n[moves]\n{rows}\n")
}

/// A model in which `a` leads to `x` and `y`, with these keys from line 2 on instead of its start.
fn with_keys(keys: &str) -> String {
    format!("absorbing = [\"x\", \"y\"]\n{keys}\n[moves]\na = {{ x = 0.5, y = 0.5 }}\n")
}

#[test]
fn numbers_that_are_no_probabilities() {
    let cases: &[(&str, Expected<'_>)] = &[
        ("a = { x = -0.1, y = 1 }", (Negative, 4, "a", "-0.1", "`-0.1` among the moves of `a` is negative", IN_RANGE)),
        ("a = { x = 1.5, y = 1 }", (AboveOne, 4, "a", "1.5", "`1.5` among the moves of `a` is above 1", IN_RANGE)),
        ("a = { x = nan, y = 1 }", (NonFinite, 4, "a", "nan", "is not finite", IN_RANGE)),
        ("a = { x = -inf, y = 1 }", (NonFinite, 4, "a", "-inf", "is not finite", IN_RANGE)),
        ("a = { x = \"half\", y = 0.5 }", (NotANumber, 4, "a", "half", "`half` among the moves of `a`", AS_NUMBER)),
        ("a = { x = \"50%\", y = \"rest\" }", (NotANumber, 4, "a", "50%", "is not a number", AS_NUMBER)),
        ("a = { x = \"1/0\", y = 0.5 }", (NotANumber, 4, "a", "1/0", "divides by zero", AS_NUMBER)),
        ("a = { x = \"\", y = 0.5 }", (NotANumber, 4, "a", "", "a value among the moves of `a` is empty", AS_NUMBER)),
        ("a = { x = true, y = 0.5 }", (NotANumber, 4, "a", "true", "is not a number", AS_NUMBER)),
        ("a = { x = [0.5], y = 0.5 }", (NotANumber, 4, "a", "[0.5]", "is not a number", AS_NUMBER)),
        ("a = { x = 0x1 }", (NotANumber, 4, "a", "0x1", "is not a number", AS_NUMBER)),
        ("a = { x = 1e-401, y = 1 }", (NotANumber, 4, "a", "1e-401", "more extreme than a model can hold", "")),
        ("a = { x = 1.5e-9223372036854775808 }", (NotANumber, 4, "a", "1.5e-9223372036854775808", "more extreme", "")),
    ];
    for (rows, expected) in cases {
        let text = with_rows(rows);
        hold(Model::from_toml(&text), &text, &[*expected]);
    }
    // Only the beginning of a long value is shown.
    let text = with_rows(&format!("a = {{ x = \"{}\", y = 0.5 }}", "9".repeat(2000)));
    let shown = format!("{}…", "9".repeat(60));
    hold(Model::from_toml(&text), "long", &[(NotANumber, 4, "a", &shown, "is longer", "")]);
}

#[test]
fn rows_that_do_not_add_up() {
    let cases: &[(&str, Expected<'_>)] = &[
        ("a = { x = 0.5, y = 0.4 }", (RowSum, 4, "a", "0.9", "the moves of `a` sum to 0.9, not 1", "as \"rest\"")),
        ("a = { x = 1, y = 0.00000001 }", (RowSum, 4, "a", "1.00000001", "sum to 1.00000001", "correct one")),
        ("a = { x = 0, y = 0 }", (RowSum, 4, "a", "0", "sum to 0, not 1", "correct one")),
        ("a = {}", (RowSum, 4, "a", "", "the row of `a` holds no moves", GIVE_MOVES)),
        ("a = { x = \"rest\", y = \"rest\" }", (Rest, 4, "a", "rest", "2 moves of `a` are \"rest\"", "only one")),
        (
            "a = { x = 0.7, y = 0.7, a = \"rest\" }",
            (Rest, 4, "a", "1.4", "already sum to 1.4, so nothing is left for \"rest\"", "make the others smaller"),
        ),
    ];
    for (rows, expected) in cases {
        let text = with_rows(rows);
        hold(Model::from_toml(&text), &text, &[*expected]);
    }
}

#[test]
fn states_that_are_not_what_they_should_be() {
    let cases: &[(&str, Expected<'_>)] = &[
        (
            "a = { x = 0.5, board = 0.5 }\nboards = { y = 1 }",
            (
                UnknownState,
                4,
                "board",
                "",
                "the state `board` has no moves and is not declared",
                "did you mean `boards`?",
            ),
        ),
        ("a = { x = 0.5, zz-9 = 0.5 }", (UnknownState, 4, "zz-9", "", "`zz-9` has no moves", GIVE_MOVES)),
        (
            "a = { x = 1 }\nx = { a = 1 }",
            (AbsorbingWithMoves, 5, "x", "", "`x` is declared absorbing but has moves", "take its moves away"),
        ),
        ("\"\" = { x = 1 }\na = { x = 1 }", (BadName, 4, "", "", "a name is empty", "rename it")),
        ("a = { \"b\\u0007\" = 1 }", (BadName, 4, "b\u{7}", "", "`b\\u{7}` holds control characters", "rename it")),
        ("a = { x = 0.5, x = 0.5 }", (Syntax, 4, "", "x", "at `x`: duplicate key", "write every name once")),
        ("a = { x = 1 }\na = { y = 1 }", (Syntax, 5, "", "a", "at `a`: duplicate key", "write every name once")),
        ("a = 5", (WrongType, 4, "a", "5", "`a` holds a value of type integer", "{ target = probability }")),
    ];
    for (rows, expected) in cases {
        let text = with_rows(rows);
        hold(Model::from_toml(&text), &text, &[*expected]);
    }
}

#[test]
fn starts_that_lead_nowhere() {
    let say_where = "start = \"STATE\"";
    let cases: &[(&str, Expected<'_>)] = &[
        ("", (MissingStart, 0, "start", "", "the model has no start", "--start STATE")),
        ("start = {}", (MissingStart, 0, "start", "", "the model has no start", say_where)),
        ("start = 5", (WrongType, 2, "start", "5", "`start` holds a value of type integer", say_where)),
        ("start = \"b\"", (UnknownState, 2, "b", "", "the state `b` has no moves", GIVE_MOVES)),
        (
            "start = \"x\"",
            (NoEndReachable, 2, "x", "", "the start `x` already lies in an end of 1 state", "transient state"),
        ),
        ("start = { a = 0.5 }", (RowSum, 2, "start", "0.5", "the shares of the start sum to 0.5", "correct one")),
        ("start = { a = 0.7, x = 0.7, y = \"rest\" }", (RowSum, 2, "start", "1.4", "sum to 1.4", "correct one")),
        (
            "start = { a = \"rest\", x = \"rest\" }",
            (Rest, 2, "start", "rest", "2 shares of the start are \"rest\"", "only one"),
        ),
        ("start = { a = 2, x = \"rest\" }", (AboveOne, 2, "start", "2", "`2` among the shares of the start", IN_RANGE)),
        ("start = { a = true }", (NotANumber, 2, "start", "true", "`true` among the shares of the start", AS_NUMBER)),
    ];
    for (keys, expected) in cases {
        let text = with_keys(keys);
        hold(Model::from_toml(&text), &text, &[*expected]);
    }
    let text = "start = \"a\"\n[moves]\na = { b = 1 }\nb = { a = 1 }\n";
    let expected =
        (NoEndReachable, 1, "a", "", "already lies in an end of 2 states, so nothing happens", "absorbing states");
    hold(Model::from_toml(text), text, &[expected]);
}

#[test]
fn keys_that_mean_nothing_or_hold_the_wrong_thing() {
    let names = "write a list of names in quotes";
    let cases: &[(&str, Expected<'_>)] = &[
        ("clok = \"steps\"", (UnknownKey, 3, "", "clok", "the key `clok` means nothing here", "did you mean `clock`?")),
        ("qqq = 1", (UnknownKey, 3, "", "qqq", "the key `qqq`", "the keys are title, clock")),
        ("costs = 1", (WrongType, 3, "costs", "1", "`costs` holds a value of type integer", "[costs.NAME]")),
        ("[costs.c]\nvist = 1", (UnknownKey, 4, "", "vist", "means nothing in `c`", "did you mean `visit`?")),
        ("[costs.c]\nvisit = { b = 1 }", (UnknownState, 4, "b", "", "the cost `c` lists `b`", "a state of the model")),
        (
            "[costs.c]\nvisit = { x = 1 }",
            (UnknownState, 4, "x", "", "replications finish there", "the move that leads"),
        ),
        ("[costs.c]\nvisit = { a = \"much\" }", (NotANumber, 4, "c", "much", "`much` among the amounts", "-0.25")),
        ("[costs.c]\nvisit = { a = inf }", (NonFinite, 4, "c", "inf", "`inf` among the amounts", "-0.25")),
        (
            "[costs.c]\nvisit = { a = 1e30 }",
            (OutOfRange, 3, "c", "", "no common denominator and sizes", "fewer digits"),
        ),
        (
            "[costs.c]\nmove = [{ from = \"a\", to = \"a\", cost = 1 }]",
            (UnknownState, 4, "a", "a", "a move from `a` to `a`, which the model lacks", "a move of the model"),
        ),
        (
            "[costs.c]\nmove = [{ from = \"a\", cost = 1 }]",
            (Shape, 4, "", "", "a move of the cost `c` has no `to`", "write move = ["),
        ),
        ("hits = 1", (WrongType, 3, "hits", "1", "`hits` holds a value of type integer", "[hits.NAME]")),
        ("[hits.h]\nstates = []", (Shape, 3, "h", "", "the hit `h` lists no states", "[hits.NAME]")),
        ("[hits.h]\nstates = [\"b\"]", (UnknownState, 3, "b", "", "the hit `h` lists `b`", "a state of the model")),
        (
            "compare = [\"mean_cost:x\"]",
            (UnknownName, 3, "", "mean_cost:x", "`x`, which is no cost", "name a cost below [costs]"),
        ),
        (
            "compare = [\"mean_visits:x\"]",
            (UnknownName, 3, "", "mean_visits:x", "`x`, where replications finish", "absorption_probability"),
        ),
        ("clock = \"hours\"", (WrongType, 3, "", "hours", "`hours` is no clock", "clock = \"steps\"")),
        ("title = 5", (WrongType, 3, "title", "5", "`title` holds a value of type integer", "in quotes")),
        ("moves_file = \"m.csv\"", (Shape, 3, "", "", "both [moves] and moves_file", "keep one of the two")),
        ("compare = \"law\"", (WrongType, 3, "compare", "\"law\"", "`compare` holds a value of type string", names)),
        ("compare = []", (Shape, 3, "", "", "compare lists nothing", "take the key out")),
        (
            "compare = [\"mean_tim\"]",
            (UnknownName, 3, "", "mean_tim", "`mean_tim` is no quantity", "mean `mean_time`?"),
        ),
        (
            "compare = [\"skewness_time\"]",
            (UnknownName, 3, "", "skewness_time", "not computed by this version", "mean_time"),
        ),
        ("compare = [\"time_quantile:2\"]", (UnknownName, 3, "", "time_quantile:2", "`2` is not a probability", "0.9")),
        (
            "compare = [\"mean_time_given:xx\"]",
            (UnknownName, 3, "", "mean_time_given:xx", "`xx`, which is no end and no group", "did you mean `x`?"),
        ),
        (
            "[classes]\nc = [\"a\", \"b\"]",
            (UnknownState, 4, "b", "", "the class `c` lists `b`", "a state of the model"),
        ),
        ("[classes]\nc = [\"a\"]", (NotAClosedClass, 4, "c", "", "`c` are not a closed class", "never left together")),
        ("[classes]\nx = [\"x\"]", (DuplicateName, 4, "x", "", "the name `x` is used twice", "rename one")),
        ("[groups]\na = [\"x\"]", (DuplicateName, 4, "a", "", "the name `a` is used twice", "rename one")),
        ("[groups]\ng = []", (Shape, 4, "g", "", "`g` under [groups] lists nothing", "at least one name")),
        ("[groups]\ng = \"x\"", (WrongType, 4, "g", "\"x\"", "`g` holds a value of type string", names)),
        ("[groups]\ng = [\"x\", \"a\"]", (UnknownName, 4, "a", "", "lists `a`, which is no end", "a group lists ends")),
        ("groups = 5", (WrongType, 3, "groups", "5", "`groups` holds a value of type integer", "NAME = [")),
        ("tolerance = 5", (WrongType, 3, "tolerance", "5", "`tolerance` holds a value", "NAME = VALUE")),
        ("[tolerance]\nmean_time = -1", (WrongType, 4, "mean_time", "-1", "`-1` is negative", "such as 0.005")),
        ("[tolerance]\nlaw = \"a bit\"", (WrongType, 4, "law", "a bit", "`a bit` is no tolerance", "\"1 %\"")),
        ("[tolerance]\nlaw = true", (WrongType, 4, "law", "true", "`true` is no tolerance", "\"1 %\"")),
        ("[tolerance]\nlav = 0.1", (UnknownName, 4, "", "lav", "`lav` is no quantity", "did you mean `law`?")),
        (
            "[tolerance.mean_time_given]\nz9 = 0.1",
            (UnknownName, 4, "", "mean_time_given:z9", "`z9`, which is no end", "name an end or a group"),
        ),
    ];
    for (keys, expected) in cases {
        let text = with_keys(&format!("start = \"a\"\n{keys}"));
        hold(Model::from_toml(&text), &text, &[*expected]);
    }
}

#[test]
fn files_without_moves_and_files_that_are_not_toml() {
    let list_them = "list them below [moves]";
    let cases: &[(&str, &[Expected<'_>])] = &[
        (
            "",
            &[
                (MissingStart, 0, "start", "", "no start", ""),
                (NoMoves, 0, "", "", "the model has no moves", list_them),
            ],
        ),
        ("start = \"a\"", &[(NoMoves, 0, "", "", "the model has no moves", list_them)]),
        ("start = \"a\"\nmoves = 5", &[(WrongType, 2, "moves", "5", "`moves` holds a value", "one table a state")]),
        ("start = \"a\"\nmoves_file = 5", &[(WrongType, 2, "moves_file", "5", "`moves_file` holds", "in quotes")]),
        ("start = \"a\"\n[move]\na = { x = 1 }", &[(UnknownKey, 2, "", "move", "`move`", "did you mean `moves`?")]),
    ];
    for (text, expected) in cases {
        hold(Model::from_toml(text), text, expected);
    }
    // One fault a line; what the parser says of it is its own affair.
    for (text, lines) in
        [("a b = 1", vec![1]), ("= 1\n\ntitle = \"\n", vec![1, 3]), (&with_rows("a = { x = 0,5 y = 1 }"), vec![4])]
    {
        let error = Model::from_toml(text).unwrap_err();
        let seen: Vec<_> = error.faults().iter().map(|fault| (fault.kind, fault.place.line.unwrap_or(0))).collect();
        assert_eq!(seen, lines.iter().map(|line| (Syntax, *line)).collect::<Vec<_>>(), "{error}");
        assert!(error.to_string().contains("not valid TOML") && error.to_string().contains("need quotes"), "{error}");
    }
}

#[test]
fn files_name_themselves_and_the_file_of_the_moves() {
    let directory = tempfile::tempdir().unwrap();
    let write = |name: &str, bytes: &[u8]| {
        let path = directory.path().join(name);
        fs::write(&path, bytes).unwrap();
        path
    };
    write("moves.csv", b"from,to,probability\r\nintake,test,0.5\r\nintake,shiped,0.4\r\ntest,shipped,nan\r\n");
    let model =
        write("model.toml", b"title = 1\nstart = \"intake\"\nabsorbing = [\"shipped\"]\nmoves_file = \"moves.csv\"\n");
    let read = Model::read(&model, &ReadOptions::default());
    let shown = read.as_ref().unwrap_err().to_string();
    let lines: Vec<&str> = shown.lines().collect();
    assert!(lines[0].starts_with(&format!("{}:1: `title` holds", model.display())), "{shown}");
    for (line, start) in lines[1..].iter().zip(["2: the moves of `intake`", "3: the state `shiped`", "4: `nan` among"])
    {
        let moves = directory.path().join("moves.csv");
        assert!(line.starts_with(&format!("{}:{start}", moves.display())), "{shown}");
    }
    let expected = [
        (WrongType, 1, "title", "1", "`title`", "in quotes"),
        (RowSum, 2, "intake", "0.9", "sum to 0.9", "correct one"),
        (UnknownState, 3, "shiped", "", "`shiped` has no moves", "did you mean `shipped`?"),
        (NonFinite, 4, "test", "nan", "is not finite", IN_RANGE),
    ];
    hold(read, "two files", &expected);

    // An unreadable table says nothing of the states that it might have given moves.
    write("moves.csv", b"from,to\nintake,shipped\n");
    let expected = [
        (WrongType, 1, "title", "1", "`title`", "in quotes"),
        (Shape, 1, "", "from,to", "no column `probability`", "from,to,probability"),
    ];
    hold(Model::read(&model, &ReadOptions::default()), "a header without a column", &expected);

    let latin = write("latin.csv", b"from,to,probability\na,caf\xe9,1\na,x,1\n");
    let expected = [(Syntax, 2, "", "", "the line is not UTF-8 text", "save the file as UTF-8")];
    hold(Model::read(&latin, &options("a", &["x"])), "Latin-1", &expected);
    let wide = write("wide.csv", b"\xff\xfef\0r\0o\0m\0\n\0");
    let expected = [(Syntax, 1, "", "", "the line is not UTF-8 text", "save the file as UTF-8")];
    hold(Model::read(&wide, &options("a", &["x"])), "UTF-16", &expected);
    let latin = write("latin.toml", b"title = \"bench\"\nstart = \"caf\xe9\"\n");
    let expected = [(Syntax, 2, "", "", "the file is not UTF-8 text", "save the file as UTF-8")];
    hold(Model::read(&latin, &ReadOptions::default()), "Latin-1", &expected);

    for missing in [directory.path().join("none.toml"), directory.path().to_owned()] {
        let error = Model::read(&missing, &ReadOptions::default()).unwrap_err();
        assert!(matches!(error, ModelError::Read { .. }) && error.faults().is_empty(), "{error:?}");
        assert!(error.to_string().contains("check the path and the permissions"), "{error}");
    }
    let missing = write("missing.toml", b"start = \"a\"\nmoves_file = \"none.csv\"\n");
    let error = Model::read(&missing, &ReadOptions::default()).unwrap_err();
    assert!(error.to_string().contains("none.csv"), "{error}");
}

#[test]
fn many_faults_in_one_model_are_all_named_in_the_order_of_the_lines() {
    let text = r#"title = 1
start = { intake = 0.5, tset = 0.4 }
absorbing = ["shipped", "scrapped"]
compare = ["mean_time", "mean_time_given:shiped"]
colour = "red"

[moves]
intake = { test = -0.5, shipped = "rest" }
test = { repair = 0.5, shipped = 0.6 }
repair = { scraped = "rest", test = "rest" }
scrapped = { test = 1 }

[groups]
test = ["shipped"]
lost = ["repair"]

[tolerance]
mean_time = "one"
"#;
    let expected = [
        (WrongType, 1, "title", "1", "`title`", "in quotes"),
        (UnknownState, 2, "tset", "", "`tset` has no moves", "did you mean `test`?"),
        (RowSum, 2, "start", "0.9", "the shares of the start sum to 0.9", "correct one"),
        (UnknownName, 4, "", "mean_time_given:shiped", "`shiped`, which is no end", "did you mean `shipped`?"),
        (UnknownKey, 5, "", "colour", "`colour` means nothing", "clock"),
        (Negative, 8, "intake", "-0.5", "is negative", IN_RANGE),
        (RowSum, 9, "test", "1.1", "sum to 1.1", "correct one"),
        (Rest, 10, "repair", "rest", "2 moves of `repair`", "only one"),
        (UnknownState, 10, "scraped", "", "`scraped` has no moves", "did you mean `scrapped`?"),
        (AbsorbingWithMoves, 11, "scrapped", "", "is declared absorbing", "take its moves away"),
        (DuplicateName, 14, "test", "", "the name `test` is used twice", "rename one"),
        (UnknownName, 15, "repair", "", "lists `repair`, which is no end", "a group lists ends"),
        (WrongType, 18, "mean_time", "one", "`one` is no tolerance", "such as 0.005"),
    ];
    let error = Model::from_toml(text).unwrap_err();
    let mut kinds: Vec<_> =
        error.faults().iter().map(|fault| (fault.place.line, format!("{:?}", fault.kind))).collect();
    assert!(kinds.is_sorted_by_key(|(line, _)| *line), "{error}");
    kinds.sort();
    let mut wanted: Vec<_> = expected.iter().map(|fault| (Some(fault.1), format!("{:?}", fault.0))).collect();
    wanted.sort();
    assert_eq!(kinds, wanted, "{error}");
    for (kind, line, state, value, text, remedy) in expected {
        let found = error.faults().iter().any(|fault| {
            (fault.kind, fault.place.line) == (kind, Some(line))
                && (fault.state.as_deref().unwrap_or(""), fault.value.as_deref().unwrap_or("")) == (state, value)
                && fault.text.contains(text)
                && fault.remedy.contains(remedy)
        });
        assert!(found, "{kind:?} {line} {state} {value}\n{error}");
    }
}
