//! Cells of a prompt: pieces of script run one after another that share their variables,
//! functions and imports.

use std::collections::HashSet;
use std::rc::Rc;

use rhai::{AST, Module, Scope, Stmt};

use super::kind::{kind_name, show};
use super::language::Language;
use super::trouble::Trouble;
use super::unfinished::unfinished;

/// A running conversation with the language.
pub struct Cells {
    language: Language,
    scope: Scope<'static>,
    imports: Vec<Stmt>,
    count: usize,
}

impl Cells {
    /// A conversation that starts with no variables.
    pub fn new(language: Language) -> Self {
        Self {
            language,
            scope: Scope::new(),
            imports: Vec::new(),
            count: 0,
        }
    }

    /// The language behind it.
    pub fn language(&self) -> &Language {
        &self.language
    }

    /// Runs one cell; gives its value as text, if it has one. Whatever happens, variables and
    /// functions of earlier cells stay.
    ///
    /// # Errors
    /// Whatever goes wrong in the cell.
    pub fn evaluate(&mut self, text: &str) -> Result<Option<String>, Trouble> {
        self.language.session().go_on();
        self.count += 1;
        let name = format!("cell {}", self.count);
        let ast = self.language.compile(&name, text)?;
        self.keep_functions(&name, &ast)?;
        let fresh = imports(&ast);
        let cell = self.with_imports(&name, &ast);
        let result = self.language.evaluate(&name, &cell, &mut self.scope);
        self.forget_shadowed();
        let value = result?;
        self.imports.extend(fresh);
        Ok((!value.is_unit()).then(|| show(&value)))
    }

    /// True when `text` is the beginning of a cell not yet complete.
    pub fn is_unfinished(&self, text: &str) -> bool {
        unfinished(&self.language.engine, text)
    }

    /// Names and kinds of the variables, oldest first.
    pub fn variables(&self) -> Vec<(String, &'static str)> {
        self.scope
            .iter()
            .map(|(name, _, value)| (name.to_owned(), kind_name(&value)))
            .collect()
    }

    /// Makes the cell's functions a module of their own, so that later cells can call them and
    /// errors inside name this cell. A function of the same name from an earlier cell gives way.
    fn keep_functions(&mut self, name: &str, ast: &AST) -> Result<(), Trouble> {
        if ast.iter_functions().next().is_none() {
            return Ok(());
        }
        let mut functions = ast.clone_functions_only();
        functions.set_source(name);
        let module = Module::eval_ast_as_new(Scope::new(), &functions, &self.language.engine)
            .map_err(|error| Trouble::plain(error.to_string()))?;
        self.language.engine.register_global_module(Rc::new(module));
        Ok(())
    }

    /// The cell's statements after the imports of earlier cells, without its functions (they are
    /// global by now).
    fn with_imports(&self, name: &str, ast: &AST) -> AST {
        let statements = self.imports.iter().chain(ast.statements()).cloned();
        let mut cell = AST::new(statements.collect::<Vec<_>>(), Module::new());
        cell.set_source(name);
        cell
    }

    /// A repeated `let` leaves the older value behind, out of reach but in memory: drop it.
    fn forget_shadowed(&mut self) {
        let mut seen = HashSet::new();
        // The engine lists the newest entry first.
        let kept: Vec<_> = self
            .scope
            .iter_raw()
            .filter(|(name, ..)| seen.insert((*name).to_owned()))
            .collect();
        if kept.len() == self.scope.len() {
            return;
        }
        let mut fresh = Scope::new();
        for (name, constant, value) in kept.into_iter().rev() {
            if constant {
                fresh.push_constant_dynamic(name.to_owned(), value.clone());
            } else {
                fresh.push_dynamic(name.to_owned(), value.clone());
            }
        }
        self.scope = fresh;
    }
}

fn imports(ast: &AST) -> Vec<Stmt> {
    ast.statements()
        .iter()
        .filter(|s| matches!(s, Stmt::Import(..)))
        .cloned()
        .collect()
}

#[cfg(test)]
mod tests {
    use std::path::Path;

    use super::*;
    use crate::script::{Sandbox, Session};

    fn cells(folder: &Path) -> Cells {
        let sandbox = Sandbox::new(folder, &[], Path::new("out")).unwrap();
        Cells::new(Language::new(Session::new(sandbox, |_| ())))
    }

    #[test]
    fn variables_functions_and_imports_stay_from_cell_to_cell() {
        let folder = tempfile::tempdir().unwrap();
        std::fs::write(folder.path().join("m.rhai"), "fn half(x) { x / 2 }").unwrap();
        let mut cells = cells(folder.path());
        let mut value = |text: &str| cells.evaluate(text).map_err(|t| t.message);
        assert_eq!(value("let x = 3;"), Ok(None));
        assert_eq!(value("fn twice(n) { n * 2 }"), Ok(None));
        assert_eq!(value("import \"m\" as m;"), Ok(None));
        assert_eq!(value("twice(x)"), Ok(Some("6".to_owned())));
        assert_eq!(value("m::half(x)"), Ok(Some("1.5".to_owned())));
        assert_eq!(value("fn twice(n) { n * 20 }"), Ok(None));
        assert_eq!(value("twice(x)"), Ok(Some("60".to_owned())));
        assert_eq!(value("\"text\""), Ok(Some("\"text\"".to_owned())));
    }

    #[test]
    fn a_cell_that_fails_leaves_what_was_there() {
        let folder = tempfile::tempdir().unwrap();
        let mut cells = cells(folder.path());
        cells.evaluate("let x = 3;").unwrap();
        assert!(cells.evaluate("x = 4; nowhere").is_err());
        assert!(cells.evaluate("let y = ;").is_err());
        cells
            .language()
            .session()
            .cancel_flag()
            .store(true, std::sync::atomic::Ordering::Relaxed);
        assert_eq!(cells.evaluate("x").unwrap(), Some("4".to_owned()));
    }

    #[test]
    fn a_repeated_let_keeps_the_newest_value_alone() {
        let folder = tempfile::tempdir().unwrap();
        let mut cells = cells(folder.path());
        for text in [
            "let a = 1;",
            "let b = 2;",
            "let a = \"new\";",
            "const c = 3;",
        ] {
            cells.evaluate(text).unwrap();
        }
        let variables = cells.variables();
        let names: Vec<_> = variables
            .iter()
            .map(|(name, kind)| (&**name, *kind))
            .collect();
        assert_eq!(names, [("b", "number"), ("a", "text"), ("c", "number")]);
        assert_eq!(cells.evaluate("a").unwrap(), Some("\"new\"".to_owned()));
        assert!(cells.evaluate("c = 4").is_err());
    }

    #[test]
    fn an_error_names_the_cell_its_function_was_written_in() {
        let folder = tempfile::tempdir().unwrap();
        let mut cells = cells(folder.path());
        cells.evaluate("fn wide(x) {\n  x.width\n}").unwrap();
        let trouble = cells.evaluate("wide(3)").unwrap_err();
        let place = trouble.place.unwrap();
        assert_eq!((&*place.source, place.line), ("cell 1", 2));
        assert_eq!(trouble.calls, ["wide, called at cell 2:1:1"]);
    }

    #[test]
    fn a_panic_inside_is_an_error_like_others() {
        let folder = tempfile::tempdir().unwrap();
        let mut cells = cells(folder.path());
        cells
            .language
            .engine
            .register_fn("fall", || -> i64 { panic!("on purpose") });
        cells.evaluate("let x = 3;").unwrap();
        let trouble = cells.evaluate("fall()").unwrap_err();
        assert!(
            trouble.message.contains("on purpose"),
            "{}",
            trouble.message
        );
        assert_eq!(cells.evaluate("x").unwrap(), Some("3".to_owned()));
    }
}
