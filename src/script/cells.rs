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
        let entries: Vec<_> = self
            .scope
            .iter_raw()
            .map(|(name, constant, value)| (name.to_owned(), constant, value.clone()))
            .collect();
        let mut kept: Vec<_> = entries
            .into_iter()
            .rev()
            .filter(|(name, ..)| seen.insert(name.clone()))
            .collect();
        kept.reverse();
        self.scope.clear();
        for (name, constant, value) in kept {
            if constant {
                self.scope.push_constant_dynamic(name, value);
            } else {
                self.scope.push_dynamic(name, value);
            }
        }
    }
}

fn imports(ast: &AST) -> Vec<Stmt> {
    ast.statements()
        .iter()
        .filter(|s| matches!(s, Stmt::Import(..)))
        .cloned()
        .collect()
}
