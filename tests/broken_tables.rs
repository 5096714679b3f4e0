//! Broken tables: lists of moves and square tables, every fault named and nothing else said.

mod faults;

use faults::{AS_NUMBER, Expected, GIVE_MOVES, IN_RANGE, hold, options};
use tallystone::model::FaultKind::{
    AboveOne, AbsorbingWithMoves, BadName, DuplicateMove, DuplicateName, MissingStart, Negative, NoMoves, NotANumber,
    RowSum, Shape, UnknownState,
};
use tallystone::model::Model;

#[test]
fn broken_lists_of_moves() {
    let cells = "give every line the cells of the header";
    let ends = &["x", "y"];
    let cases: &[(&str, &str, &[&str], &[Expected<'_>])] = &[
        ("", "a", ends, &[(Shape, 0, "", "", "the table is empty", "give it a header")]),
        ("\n# only a comment\n", "a", ends, &[(Shape, 0, "", "", "the table is empty", "give it a header")]),
        ("from,to,probability\n", "a", ends, &[(NoMoves, 0, "", "", "the model has no moves", "below its header")]),
        (
            "from,to,prob\na,x,1\n",
            "a",
            ends,
            &[(Shape, 1, "", "from,to,prob", "no column `probability`", "rename `prob` to `probability`")],
        ),
        (
            "\n\nform,to,probability\na,x,1\n",
            "a",
            ends,
            &[(Shape, 3, "", "form,to,probability", "no column `from`", "rename `form` to `from`")],
        ),
        (
            "from,to,probability\na,x,0.5\na,x,0.5\n",
            "a",
            ends,
            &[(DuplicateMove, 3, "a", "x", "from `a` to `x` is listed twice (first on line 2)", "join the two")],
        ),
        // An unquoted decimal comma must not pass for a probability of zero.
        (
            "from,to,probability\r\n\r\n# note\r\na,x,0,5\r\na,y,0.5\r\nb,x\r\n",
            "a",
            ends,
            &[
                (Shape, 4, "a", "a,x,0,5", "the line has 4 cells, the header 3", cells),
                (Shape, 6, "b", "b,x", "the line has 2 cells, the header 3", cells),
            ],
        ),
        (
            "from;to;probability\na;x;0,5\na;y;0,6\n",
            "a",
            ends,
            &[(RowSum, 2, "a", "1.1", "the moves of `a` sum to 1.1", "correct one")],
        ),
        ("from,to,probability\na,x,1\n", "a", &[], &[(UnknownState, 2, "x", "", "`x` has no moves", GIVE_MOVES)]),
        (
            "from,to,probability\na,x,1\nx,x,1\n",
            "",
            &[],
            &[(MissingStart, 0, "start", "", "the model has no start", "--start STATE")],
        ),
        (
            "from,to,probability\nintake,x,1\nx,x,1\n",
            "intkae",
            &[],
            &[(UnknownState, 0, "intkae", "", "the state `intkae` has no moves", "did you mean `intake`?")],
        ),
        ("from,to,probability\na,x,1\n,x,1\n", "a", ends, &[(BadName, 3, "", "", "a name is empty", "rename it")]),
        (
            "from,to,probability\na,x,\na,y,abc\n",
            "a",
            ends,
            &[
                (NotANumber, 2, "a", "", "a value among the moves of `a` is empty", AS_NUMBER),
                (NotANumber, 3, "a", "abc", "`abc` among the moves of `a`", AS_NUMBER),
            ],
        ),
        (
            "from,to,probability\na,x,1\nx,a,1\n",
            "a",
            ends,
            &[(AbsorbingWithMoves, 3, "x", "", "`x` is declared absorbing but has moves", "take its moves away")],
        ),
        (
            "from,to,probability\na,x,\"1\na,y,0\n",
            "a",
            ends,
            &[(NotANumber, 2, "a", "1 a,y,0", "is not a number", AS_NUMBER)],
        ),
    ];
    for (text, start, absorbing, expected) in cases {
        hold(Model::from_table(text, &options(start, absorbing)), text, expected);
    }
}

#[test]
fn broken_square_tables() {
    let names_first = "begin with from,to,probability";
    let cases: &[(&str, &[Expected<'_>])] = &[
        (
            ",a,x\na,0.5,0.5\nx,0,0\n",
            &[(RowSum, 3, "x", "", "the row of `x` holds no moves", "declare it so or give it a stay of 1")],
        ),
        (",a,x\na,0.5,0.5\n", &[(UnknownState, 1, "x", "", "the state `x` has no moves", GIVE_MOVES)]),
        ("a,x,0.5\na,a,0.5\n", &[(Shape, 1, "", "a,x,0.5", "does not name the states", "from,to,probability")]),
        (",a,x\na,0.5\nx,0,1\n", &[(Shape, 2, "a", "", "the row of `a` has 2 cells, the header 3", "every row")]),
        (
            ",a,shipped\na,0.5,0.5\nshiped,0,1\nshipped,0,1\n",
            &[(UnknownState, 3, "shiped", "", "the row `shiped` has no column", "did you mean `shipped`?")],
        ),
        (
            "state,a,x,x\na,0.5,0.25,0.25\nx,0,1,0\n",
            &[(DuplicateName, 1, "", "state,a,x,x", "the header names `x` twice", "one column")],
        ),
        (
            ",a,x\na,0.5,0.5\na,1,0\nx,0,1\n",
            &[(DuplicateName, 3, "a", "", "the row of `a` is there twice (first on line 2)", "keep one")],
        ),
        (
            ",a,b,x\na,0.5,0.5,0\nb,0.3,0.2,0\nx,0.2,0.3,1\n",
            &[
                (RowSum, 0, "", "", "every column sums to 1, but not every row", "transpose the table"),
                (RowSum, 3, "b", "0.5", "the moves of `b` sum to 0.5", "correct one"),
                (RowSum, 4, "x", "1.5", "the moves of `x` sum to 1.5", "correct one"),
            ],
        ),
        (
            ",a,x\na,-0.5,1.5\nx,0,1\n",
            &[
                (Negative, 2, "a", "-0.5", "`-0.5` among the moves of `a` is negative", IN_RANGE),
                (AboveOne, 2, "a", "1.5", "`1.5` among the moves of `a` is above 1", IN_RANGE),
            ],
        ),
        (",a,x\na,0.5,abc\nx,0,1\n", &[(NotANumber, 2, "a", "abc", "`abc` among the moves of `a`", AS_NUMBER)]),
        ("0.5,0.5\n0,1\n", &[(Shape, 1, "", "0.5,0.5", "the first line does not name the states", names_first)]),
        ("hello\n", &[(Shape, 1, "", "hello", "the first line does not name the states", names_first)]),
        (
            ",,a,x\na,0,0.5,0.5\n",
            &[
                (BadName, 1, "", "", "a name is empty", "rename it"),
                (UnknownState, 1, "x", "", "the state `x` has no moves", GIVE_MOVES),
            ],
        ),
    ];
    for (text, expected) in cases {
        hold(Model::from_table(text, &options("a", &[])), text, expected);
    }
}
