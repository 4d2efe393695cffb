//! What belongs to no room: help, settings, printing.

use rhai::{Dynamic, FnPtr};

use super::super::call::Call;
use super::super::draft::Room;
use super::super::fault::Fault;
use super::super::help::{Help, help_for, kind_page, overview};
use super::super::kind::{Subject, kind_name, show, with_article};
use super::super::registry::Registry;

/// Writes the records.
pub(super) fn records(room: &mut Room) {
    room.kind::<Help>();
    room.kind::<Fault>();
    room.property::<Fault>("message")
        .about("What went wrong, in one sentence.")
        .words("error text catch")
        .example(
            "try { sqrt(-1) } catch (e) { print(e.message) }",
            "sqrt(-1) is not a real number",
        )
        .does(|fault: &Fault| fault.message().to_owned());
    room.property::<Fault>("hint")
        .about("What would be right; empty where nothing is known.")
        .words("error advice catch")
        .example(
            "try { measured(1, -1) } catch (e) { print(e.hint) }",
            "write () where it is not known",
        )
        .does(|fault: &Fault| fault.hint_text().unwrap_or_default().to_owned());
    room.plain_kind::<bool>("true or false.");

    room.function("help")
        .about("Tells what a built-in does, what can be done with a value, or what is found by a word.")
        .words("documentation manual how search")
        .input(
            "about",
            "",
            "a name, a built-in, a value, or words to search; left out, everything is listed",
        )
        .example(
            "help(\"setting\").text.contains(\"--set\")",
            "true",
        )
        .does(|about: Option<Dynamic>, call: Call| help(about, &call));

    room.property::<Help>("text")
        .about("The page as text.")
        .words("string")
        .example("help(\"sqrt\").text.len() > 100", "true")
        .does(|help: &Help| help.0.clone());

    room.function("setting")
        .about(
            "A value that can be given from outside: `kolk run FILE --set name=value`. Without \
             one it is the default, whose kind says what may be given.",
        )
        .words("parameter argument option command line")
        .input("name", "", "name of the setting")
        .input(
            "default",
            "",
            "its value when none is given: a number, text, or true/false",
        )
        .input(
            "meaning",
            "",
            "what it is for, shown by `kolk run FILE --help`",
        )
        .errors("the value given is not of the default's kind")
        .example(
            "setting(\"pairs\", 12, \"how many pairs to analyse\")",
            "12",
        )
        .does(
            |name: String, default: Dynamic, _meaning: Option<String>, call: Call| {
                call.session()
                    .settings()
                    .value(&name, &default)
                    .map_err(Fault::from)
            },
        );

    room.function("kind_of")
        .about("What kind of value this is, in words.")
        .words("type class")
        .input("value", "", "any value")
        .example("kind_of(measured(11.8, 0.4, \"mm\"))", "\"measured value\"")
        .example("kind_of(2)", "\"number\"")
        .does(|value: Dynamic| kind_name(&value));

    room.function("print")
        .about("Prints a value on a line of its own, as a short readable summary.")
        .words("output show write say")
        .input(
            "value",
            "anything",
            "what to print; left out, an empty line",
        )
        .example(
            "print(\"circulation\"); print(0.1 + 0.2)",
            "circulation\n0.3",
        )
        .of_the_engine("nothing");

    room.function("wait")
        .about("Does nothing for a while; an interrupt ends it.")
        .words("pause sleep delay")
        .input("duration_s", "s", "how long")
        .errors("the duration is negative or not finite")
        .example("wait(0.01)", "")
        .does(|duration_s: f64, call: Call| wait(duration_s, &call));

    room.function("assert")
        .about("Ends the script with this message unless the condition holds.")
        .words("check require test")
        .input("condition", "", "what must hold")
        .input("message", "", "what to say when it does not")
        .errors("the condition is false")
        .example("assert(1 < 2, \"order\")", "")
        .does(|condition: bool, message: String| {
            if condition {
                Ok(())
            } else {
                Err(Fault::new(message))
            }
        });

    room.function("assert_close")
        .about("Ends the script unless two numbers agree within a tolerance.")
        .words("check require test equal approximately")
        .input("value", "any, all three the same", "what was found")
        .input("expected", "any, all three the same", "what it should be")
        .input(
            "tolerance",
            "any, all three the same",
            "by how much it may differ",
        )
        .errors("they differ by more")
        .example("assert_close(0.1 + 0.2, 0.3, 1e-12)", "")
        .does(|value: f64, expected: f64, tolerance: f64| {
            if (value - expected).abs() <= tolerance {
                return Ok(());
            }
            let text = |x: f64| show(&Dynamic::from_float(x));
            Err(Fault::new(format!(
                "{} is not within {} of {}",
                text(value),
                text(tolerance),
                text(expected)
            )))
        });
}

fn help(about: Option<Dynamic>, call: &Call) -> Help {
    let registry: &Registry = call.registry();
    let Some(about) = about else {
        return overview(registry);
    };
    if let Some(function) = about.read_lock::<FnPtr>() {
        return help_for(registry, function.fn_name());
    }
    if about.is_string() {
        return help_for(registry, &about.to_string());
    }
    match registry.kind(kind_name(&about)) {
        Some(kind) => kind_page(registry, kind),
        None => Help(format!(
            "This is {}; nothing more is written about it.",
            with_article(kind_name(&about))
        )),
    }
}

/// Sleeps in short steps, so that an interrupt is noticed.
fn wait(duration_s: f64, call: &Call) -> Result<(), Fault> {
    let duration = std::time::Duration::try_from_secs_f64(duration_s)
        .map_err(|_| Fault::new("a duration is a number of seconds from 0 up"))?;
    let end = std::time::Instant::now().checked_add(duration);
    let task = call.task();
    while let Some(left) = end.map(|end| end.saturating_duration_since(std::time::Instant::now())) {
        if left.is_zero() {
            return Ok(());
        }
        task.check()?;
        std::thread::sleep(left.min(std::time::Duration::from_millis(20)));
    }
    Err(Fault::new("that is longer than anyone can wait"))
}

impl Subject for bool {
    const NAME: &'static str = "true/false";

    fn types() -> Vec<std::any::TypeId> {
        vec![std::any::TypeId::of::<bool>()]
    }

    fn lend<R>(value: &Dynamic, f: impl FnOnce(&Self) -> R) -> Option<R> {
        value.as_bool().ok().map(|b| f(&b))
    }
}
