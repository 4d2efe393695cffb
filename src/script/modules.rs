//! `import "./mine" as mine;`: scripts that scripts use.

use std::cell::RefCell;
use std::collections::HashMap;
use std::path::{Path, PathBuf};
use std::rc::Rc;

use rhai::{Engine, EvalAltResult, Module, ModuleResolver, Position, Scope};

use super::fault::Fault;
use super::sandbox::SandboxError;
use super::session::Session;

type SharedModule = Rc<Module>;
type Failure = Box<EvalAltResult>;

/// Finds modules beside the script that imports them, inside the folders the run may read.
///
/// A module is compiled and run once. One that imports itself, by whatever way round, is an
/// error that shows the way.
pub(super) struct Modules {
    session: Rc<Session>,
    loaded: RefCell<HashMap<PathBuf, SharedModule>>,
    loading: RefCell<Vec<PathBuf>>,
}

impl Modules {
    pub(super) fn new(session: Rc<Session>) -> Self {
        Self {
            session,
            loaded: RefCell::default(),
            loading: RefCell::default(),
        }
    }

    /// The file behind `path` as `source` imports it.
    fn file(&self, source: Option<&str>, path: &str) -> Result<PathBuf, Fault> {
        if path.starts_with("kolk/") {
            return Err(Fault::new(format!("there is no module `{path}` in kolk")));
        }
        let mut name = path.to_owned();
        if !name.ends_with(".rhai") {
            name.push_str(".rhai");
        }
        let start = self.session.sandbox().start();
        let folder = source
            .filter(|s| self.session.sources.text(s).is_some())
            .and_then(|s| Path::new(s).parent())
            .map_or_else(|| start.to_owned(), |folder| start.join(folder));
        let sandbox = self.session.sandbox();
        let file = sandbox
            .readable(&folder.join(&name))
            .map_err(|_| SandboxError::Read(name))?;
        if file.is_file() {
            Ok(file)
        } else {
            Err(Fault::new(format!("there is no module `{path}`"))
                .hint(format!("looked for {}", file.display())))
        }
    }

    fn load(&self, engine: &Engine, file: &Path) -> Result<SharedModule, Failure> {
        let name = self.short_name(file);
        let text = std::fs::read_to_string(file)
            .map_err(|e| Fault::new(format!("cannot read the module {name}: {e}")).into_error())?;
        self.session.sources.keep(&name, &text);
        let inside = |error: Failure| -> Failure {
            EvalAltResult::ErrorInModule(name.clone(), error, Position::NONE).into()
        };
        let mut ast = engine.compile(&text).map_err(|e| inside(e.into()))?;
        ast.set_source(name.as_str());
        Module::eval_ast_as_new(Scope::new(), &ast, engine)
            .map(Rc::new)
            .map_err(inside)
    }

    /// The path from the start folder where the file lies below it, the whole path elsewhere.
    fn short_name(&self, file: &Path) -> String {
        let start = self.session.sandbox().start();
        file.strip_prefix(start)
            .unwrap_or(file)
            .display()
            .to_string()
    }

    fn cycle(&self, file: &Path) -> Option<String> {
        let loading = self.loading.borrow();
        let from = loading.iter().position(|f| f == file)?;
        let way = loading[from..].iter().chain([&loading[from]]);
        Some(
            way.map(|f| self.short_name(f))
                .collect::<Vec<_>>()
                .join(" -> "),
        )
    }
}

impl ModuleResolver for Modules {
    fn resolve(
        &self,
        engine: &Engine,
        source: Option<&str>,
        path: &str,
        position: Position,
    ) -> Result<SharedModule, Failure> {
        let place = |mut error: Failure| {
            if error.position().is_none() {
                error.set_position(position);
            }
            error
        };
        let file = self
            .file(source, path)
            .map_err(|fault| place(fault.into_error()))?;
        if let Some(module) = self.loaded.borrow().get(&file) {
            return Ok(Rc::clone(module));
        }
        if let Some(way) = self.cycle(&file) {
            let fault = Fault::new(format!("these modules import one another: {way}"));
            return Err(place(fault.into_error()));
        }
        self.loading.borrow_mut().push(file.clone());
        let module = self.load(engine, &file);
        self.loading.borrow_mut().pop();
        let module = module.map_err(place)?;
        self.loaded.borrow_mut().insert(file, Rc::clone(&module));
        Ok(module)
    }
}
