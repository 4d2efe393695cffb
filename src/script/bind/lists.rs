//! Lists and text: what the engine brings along, and what a table of results needs besides.

use std::cmp::Ordering;

use rhai::{Array, Dynamic, Map};

use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::show;
use super::values::Values;

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.plain_kind::<Array>(
        "Values in order, written [a, b, c]; the first is number 0, the last also -1.",
    );
    room.plain_kind::<Map>(
        "Values by name, written #{ name: value }; a name it does not have is an error.",
    );
    room.plain_kind::<String>("Text, written \"so\" or, with values in it, `x is ${x}`.");
    of_the_engine(room);
    of_lists(room);
}

fn of_lists(room: &mut Room) {
    let units = "the units measure different things, or an item is neither";
    room.method::<Array>("sum")
        .about("The sum of a list of numbers or of measured values; 0 for an empty list.")
        .words("total add")
        .unit("that of the items")
        .errors(units)
        .source("JCGM 100:2008 (GUM), 5.2.2, for measured values")
        .example("[1, 2, 3.5].sum()", "6.5")
        .example(
            "[measured(3, 0.3, \"mm\"), measured(4, 0.4, \"mm\")].sum()",
            "7.0 ± 0.5 mm",
        )
        .does(|list: &Array| Values::of(list)?.sum());
    room.method::<Array>("mean")
        .about(
            "The mean of a list of numbers or of measured values. The uncertainty of a mean is \
             what the values' own say, missing where one of theirs is; how far they scatter is \
             `spread`.",
        )
        .words("average")
        .unit("that of the items")
        .errors("the list is empty, the units measure different things, or an item is neither")
        .source("JCGM 100:2008 (GUM), 5.2.2, for measured values")
        .example("[1, 2, 6].mean()", "3")
        .example(
            "[measured(3, 0.3, \"mm\"), measured(4, 0.4, \"mm\")].mean()",
            "3.50 ± 0.25 mm",
        )
        .does(|list: &Array| Values::some_of(list)?.mean());
    room.method::<Array>("spread")
        .about(
            "The sample standard deviation of a list of numbers or of measured values: the root \
             of the squared deviations from the mean over the count less one. It says how far \
             the values scatter; how well it does so itself is not worked out.",
        )
        .words("standard deviation scatter variance")
        .unit("that of the items")
        .errors("there are fewer than two items, the units measure different things, or an item is neither")
        .source("JCGM 100:2008 (GUM), 4.2.2")
        .example("[2, 4, 9].spread() ** 2", "13")
        .example("[exact(1, \"mm\"), exact(3, \"mm\")].spread()", "1.414 ± ? mm")
        .does(|list: &Array| Values::of(list)?.spread());
    room.method::<Array>("min")
        .about("The smallest of a list of numbers or of measured values.")
        .words("least smallest")
        .unit("that of the items")
        .errors("the list is empty, the units measure different things, or an item is neither")
        .example("[3, 1, 2].min()", "1")
        .does(|list: &Array| Values::some_of(list)?.extreme(Ordering::Less));
    room.method::<Array>("max")
        .about("The greatest of a list of numbers or of measured values.")
        .words("greatest largest")
        .unit("that of the items")
        .errors("the list is empty, the units measure different things, or an item is neither")
        .example("[3, 1, 2].max()", "3")
        .does(|list: &Array| Values::some_of(list)?.extreme(Ordering::Greater));
    room.method::<Array>("join")
        .about("The items as one text, with a separator between them.")
        .words("concatenate text list print")
        .input("separator", "", "what stands between two items")
        .example("[1, \"a\", 2.5].join(\", \")", "\"1, a, 2.5\"")
        .does(|list: &Array, separator: String| {
            let text = |item: &Dynamic| item.clone().into_string().unwrap_or_else(|_| show(item));
            list.iter().map(text).collect::<Vec<_>>().join(&separator)
        });
    room.function("steps")
        .about("So many numbers evenly spread from one to another, both included.")
        .words("evenly spaced sequence range")
        .input("from", "any", "the first number")
        .input("to", "any", "the last number")
        .input("count", "count", "how many, from 2 up")
        .unit("that of the ends")
        .errors("the count is below 2 or above a million")
        .example("steps(0, 1, 5)", "[0, 0.25, 0.5, 0.75, 1]")
        .does(|from: f64, to: f64, count: usize| {
            if !(2..=1_000_000).contains(&count) {
                return Err(Fault::new(format!(
                    "`count` is a whole number from 2 to 1000000, not {count}"
                )));
            }
            let last = (count - 1) as f64;
            let at = |i: usize| from + (to - from) * (i as f64 / last);
            Ok((0..count).map(at).collect::<Vec<f64>>())
        });
}

/// Records of what the engine brings along.
fn of_the_engine(room: &mut Room) {
    room.method::<Array>("len")
        .about("How many items the list has.")
        .words("length count size number")
        .unit("count")
        .example("[3, 1, 2].len()", "3")
        .of_the_engine("whole number");
    room.method::<Array>("push")
        .about("Adds an item at the end.")
        .words("append add")
        .input("item", "anything", "the new last item")
        .example("let l = [1]; l.push(2); l", "[1, 2]")
        .of_the_engine("nothing");
    room.method::<Array>("map")
        .about("The list of what a function makes of each item.")
        .words("apply each transform")
        .input(
            "function",
            "function",
            "what is applied, such as |x| x * 2, or a name such as sqrt",
        )
        .example("[1, 4, 9].map(sqrt)", "[1, 2, 3]")
        .of_the_engine("list");
    room.method::<Array>("filter")
        .about("The list of the items for which a condition holds.")
        .words("select where choose")
        .input(
            "condition",
            "function",
            "a function that gives true or false, such as |x| x > 0",
        )
        .example("[1, -2, 3].filter(|x| x > 0)", "[1, 3]")
        .of_the_engine("list");
    room.method::<Array>("contains")
        .about("True when the list holds this value; `value in list` says the same.")
        .words("in member has")
        .input("value", "anything", "what is looked for")
        .example("[1, 2].contains(2)", "true")
        .of_the_engine("true/false");
    room.method::<Array>("sort")
        .about("Puts a list of numbers or of texts in rising order; |a, b| a.x < b.x may say which comes first.")
        .words("order arrange")
        .example("let l = [3, 1, 2]; l.sort(); l", "[1, 2, 3]")
        .of_the_engine("nothing");
    room.method::<Map>("keys")
        .about("The names in the map, as a list of texts.")
        .words("names entries")
        .example("#{ b: 1, a: 2 }.keys()", "[\"a\", \"b\"]")
        .of_the_engine("list of texts");
    room.method::<String>("len")
        .about("How many characters the text has.")
        .words("length count size")
        .unit("count")
        .example("\"eddy\".len()", "4")
        .of_the_engine("whole number");
    room.method::<String>("split")
        .about("The parts of the text between separators, as a list.")
        .words("separate parse")
        .input("separator", "text", "what stands between two parts")
        .example("\"a,b\".split(\",\")", "[\"a\", \"b\"]")
        .of_the_engine("list of texts");
    room.method::<String>("contains")
        .about("True when the text holds this text.")
        .words("in find search")
        .input("part", "text", "what is looked for")
        .example("\"eddies\".contains(\"dd\")", "true")
        .of_the_engine("true/false");
}
