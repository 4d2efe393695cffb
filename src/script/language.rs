//! The engine, set up as the language of this project, and how a script is run in it.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::Path;
use std::rc::Rc;

use rhai::packages::{
    BasicArrayPackage, BasicMapPackage, BasicMathPackage, CorePackage, LogicPackage,
    MoreStringPackage, Package,
};
use rhai::{AST, Dynamic, Engine, EvalAltResult, FnPtr, Module, Scope};

use super::arithmetic;
use super::kind::{show_list, show_map};
use super::modules::Modules;
use super::number::number_text;
use super::record::Form;
use super::registry::Registry;
use super::session::Session;
use super::settings::{DeclaredSetting, declared};
use super::signs;
use super::trouble::Trouble;

/// Functions may call one another this deep; the stack of [`on_a_big_stack`] holds that.
const CALL_DEPTH: usize = 400;
/// Expressions may nest this deep.
const EXPRESSION_DEPTH: usize = 256;
/// Bytes of the stack.
const STACK: usize = 1 << 30;
/// Characters in a text, items in a list, keys in a map. (The engine walks a list after each
/// change to it, so that very long lists are slow to build item by item in any case.)
const LARGEST: (usize, usize, usize) = (64_000_000, 4_000_000, 100_000);

/// The language for one run: an engine that knows every built-in.
pub struct Language {
    pub(super) engine: Engine,
    session: Rc<Session>,
    registry: Rc<Registry>,
}

impl Language {
    /// The language for this session.
    pub fn new(session: Session) -> Self {
        let session = Rc::new(session);
        let registry = Rc::new(Registry::new());
        let mut engine = bare_engine();
        Registry::register(&registry, &mut engine, &session);
        engine.register_global_module(Rc::new(named_values(&registry)));
        engine.set_module_resolver(Modules::new(Rc::clone(&session)));
        let watched = Rc::clone(&session);
        engine.on_progress(move |_| watched.is_cancelled().then_some(Dynamic::UNIT));
        let printing = Rc::clone(&session);
        engine.on_print(move |text| printing.print(text));
        let printing = Rc::clone(&session);
        engine.on_debug(move |text, _, _| printing.print(text));
        Self {
            engine,
            session,
            registry,
        }
    }

    /// The run this language serves.
    pub fn session(&self) -> &Session {
        &self.session
    }

    /// Every built-in.
    pub fn registry(&self) -> &Registry {
        &self.registry
    }

    /// Reads and runs a script file.
    ///
    /// # Errors
    /// A file that cannot be read; whatever goes wrong in the script.
    pub fn run_file(&self, path: &Path) -> Result<(), Trouble> {
        let text = read_script(path)?;
        self.run(&path.display().to_string(), &text).map(|_| ())
    }

    /// Runs a script; gives its last value as the prompt would show it, if it has one.
    ///
    /// # Errors
    /// Whatever goes wrong in the script.
    pub fn run(&self, name: &str, text: &str) -> Result<Option<String>, Trouble> {
        let ast = self.compile(name, text)?;
        let mut scope = Scope::new();
        let value = self.evaluate(name, &ast, &mut scope)?;
        Ok((!value.is_unit()).then(|| super::kind::show(&value)))
    }

    /// The settings a script declares.
    ///
    /// # Errors
    /// A script that does not parse.
    pub fn settings_of(&self, name: &str, text: &str) -> Result<Vec<DeclaredSetting>, Trouble> {
        Ok(declared(&self.compile(name, text)?))
    }

    /// Reads `text` as a script called `name`.
    pub(super) fn compile(&self, name: &str, text: &str) -> Result<AST, Trouble> {
        self.session.sources.keep(name, text);
        let mut ast = self
            .engine
            .compile(text)
            .map_err(|error| self.trouble(&error.into(), name, &[]))?;
        ast.set_source(name);
        Ok(ast)
    }

    /// Runs what was compiled, whatever it does: a panic inside a kernel is an error like others.
    pub(super) fn evaluate(
        &self,
        name: &str,
        ast: &AST,
        scope: &mut Scope<'static>,
    ) -> Result<Dynamic, Trouble> {
        let result = catch_unwind(AssertUnwindSafe(|| {
            self.engine.eval_ast_with_scope::<Dynamic>(scope, ast)
        }));
        match result {
            Ok(Ok(value)) => Ok(value),
            Ok(Err(error)) => match *error {
                EvalAltResult::Exit(value, _) => Ok(value),
                error => {
                    let names: Vec<String> =
                        scope.iter().map(|(name, ..)| name.to_owned()).collect();
                    Err(self.trouble(&error, name, &names))
                }
            },
            Err(panic) => {
                let reason = panic
                    .downcast_ref::<String>()
                    .cloned()
                    .or_else(|| panic.downcast_ref::<&str>().map(|s| (*s).to_owned()))
                    .unwrap_or_default();
                Err(Trouble::plain(format!(
                    "kolk itself failed, not the script: {reason}"
                )))
            }
        }
    }

    fn trouble(&self, error: &EvalAltResult, name: &str, names: &[String]) -> Trouble {
        Trouble::of(error, name, &self.session, &self.registry, names)
    }
}

/// The text of a script file.
pub(crate) fn read_script(path: &Path) -> Result<String, Trouble> {
    let shown = path.display();
    let bytes = std::fs::read(path).map_err(|error| match error.kind() {
        std::io::ErrorKind::NotFound => Trouble::plain(format!("there is no script {shown}")),
        _ => Trouble::plain(format!("cannot read the script {shown}: {error}")),
    })?;
    String::from_utf8(bytes)
        .map_err(|_| Trouble::plain(format!("{shown} is not a script: it holds no UTF-8 text")))
}

/// The engine with our arithmetic, limits and names, but without built-ins: enough to parse.
pub(super) fn bare_engine() -> Engine {
    let mut engine = Engine::new_raw();
    CorePackage::new().register_into_engine(&mut engine);
    LogicPackage::new().register_into_engine(&mut engine);
    BasicMathPackage::new().register_into_engine(&mut engine);
    BasicArrayPackage::new().register_into_engine(&mut engine);
    BasicMapPackage::new().register_into_engine(&mut engine);
    MoreStringPackage::new().register_into_engine(&mut engine);
    // Text that was not written by the person who runs the script is not run.
    engine.disable_symbol("eval");
    engine.set_max_call_levels(CALL_DEPTH);
    engine.set_max_expr_depths(EXPRESSION_DEPTH, EXPRESSION_DEPTH);
    engine.set_max_string_size(LARGEST.0);
    engine.set_max_array_size(LARGEST.1);
    engine.set_max_map_size(LARGEST.2);
    engine.set_optimization_level(rhai::OptimizationLevel::None);
    arithmetic::register(&mut engine);
    signs::register(&mut engine);
    print_plain_values(&mut engine);
    name_plain_kinds(&mut engine);
    engine.set_fail_on_invalid_map_property(true);
    engine
}

fn print_plain_values(engine: &mut Engine) {
    for name in ["print", "to_string", "to_debug", "debug"] {
        engine.register_fn(name, |x: f64| number_text(x));
        engine.register_fn(name, |list: &mut rhai::Array| show_list(list));
        engine.register_fn(name, |map: &mut rhai::Map| show_map(map));
    }
    engine.register_fn("+", |text: &str, x: f64| {
        format!("{text}{}", number_text(x))
    });
    engine.register_fn("+", |x: f64, text: &str| {
        format!("{}{text}", number_text(x))
    });
}

fn name_plain_kinds(engine: &mut Engine) {
    engine.register_type_with_name::<i64>("number");
    engine.register_type_with_name::<f64>("number");
    engine.register_type_with_name::<bool>("true/false");
    engine.register_type_with_name::<char>("character");
    engine.register_type_with_name::<rhai::ImmutableString>("text");
    engine.register_type_with_name::<rhai::Array>("list");
    engine.register_type_with_name::<rhai::Map>("map");
    engine.register_type_with_name::<FnPtr>("function");
    engine.register_type_with_name::<()>("nothing");
}

/// Constants, and every function by its name, so that `list.map(sqrt)` works.
fn named_values(registry: &Registry) -> Module {
    let mut module = Module::new();
    for (name, value) in registry.constants() {
        module.set_var(name, value);
    }
    for record in registry
        .records()
        .iter()
        .filter(|r| r.form == Form::Function)
    {
        if let Ok(function) = FnPtr::new(record.name) {
            module.set_var(record.name, function);
        }
    }
    module
}

/// Runs `work` on a thread whose stack holds the deepest script the limits allow.
///
/// # Errors
/// The system's reason when it gives no thread; "the work ended early" when the work panicked.
pub fn on_a_big_stack<R: Send + 'static>(
    work: impl FnOnce() -> R + Send + 'static,
) -> Result<R, String> {
    std::thread::Builder::new()
        .name("script".to_owned())
        .stack_size(STACK)
        .spawn(work)
        .map_err(|error| error.to_string())?
        .join()
        .map_err(|_| "the work ended early".to_owned())
}
