//! Lists and text: what the engine brings along, and what a table of results needs besides.

use rhai::{Array, Dynamic, Map};

use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::kind::show;
use super::core::numbers;

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
    room.method::<Array>("sum")
        .about("The sum of a list of numbers; 0 for an empty list.")
        .words("total add")
        .unit("that of the numbers")
        .errors("an item is not a number")
        .example("[1, 2, 3.5].sum()", "6.5")
        .does(|list: &Array| numbers(list).map(|x| x.iter().sum::<f64>()));
    room.method::<Array>("mean")
        .about("The mean of a list of numbers.")
        .words("average")
        .unit("that of the numbers")
        .errors("the list is empty or an item is not a number")
        .example("[1, 2, 6].mean()", "3")
        .does(|list: &Array| {
            let x = some_numbers(list)?;
            Ok::<_, Fault>(x.iter().sum::<f64>() / x.len() as f64)
        });
    room.method::<Array>("min")
        .about("The smallest number of a list.")
        .words("least smallest")
        .unit("that of the numbers")
        .errors("the list is empty or an item is not a number")
        .example("[3, 1, 2].min()", "1")
        .does(|list: &Array| {
            some_numbers(list).map(|x| x.into_iter().fold(f64::INFINITY, f64::min))
        });
    room.method::<Array>("max")
        .about("The largest number of a list.")
        .words("greatest largest")
        .unit("that of the numbers")
        .errors("the list is empty or an item is not a number")
        .example("[3, 1, 2].max()", "3")
        .does(|list: &Array| {
            some_numbers(list).map(|x| x.into_iter().fold(f64::NEG_INFINITY, f64::max))
        });
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

fn some_numbers(list: &Array) -> Result<Vec<f64>, Fault> {
    match numbers(list)? {
        x if x.is_empty() => Err(Fault::new("the list is empty")),
        x => Ok(x),
    }
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
