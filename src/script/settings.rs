//! Values a script can be given from outside: `setting("name", default)` and `--set name=value`.

use std::collections::BTreeMap;

use rhai::{AST, ASTNode, Dynamic, Expr, FnCallExpr, Stmt};

use super::kind::show;
use super::wording::nearest;

/// Values given from outside, as text; the default in the script says what kind each is.
#[derive(Clone, Debug, Default)]
pub struct Settings(BTreeMap<String, String>);

/// A setting a script declares.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DeclaredSetting {
    /// Its name.
    pub name: String,
    /// Its default, as written.
    pub default: String,
    /// What it means; empty when the script does not say.
    pub meaning: String,
}

/// Why a value from outside cannot be taken.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum SettingError {
    /// Not of the form `name=value`.
    #[error("`{0}` is not of the form name=value")]
    Form(String),
    /// A name the script does not declare.
    #[error("the script has no setting `{name}`{hint}")]
    Unknown {
        /// The name given.
        name: String,
        /// What it may have meant, in a form that follows the message.
        hint: String,
    },
    /// A text that is not of the default's kind.
    #[error("the setting `{name}` takes {wanted} (its default is {default}), not `{given}`")]
    Kind {
        /// The setting.
        name: String,
        /// What it takes.
        wanted: &'static str,
        /// Its default.
        default: String,
        /// What was given.
        given: String,
    },
}

impl Settings {
    /// Reads `name=value` texts.
    ///
    /// # Errors
    /// A text without a name or without `=`.
    pub fn parse(texts: &[String]) -> Result<Self, SettingError> {
        texts
            .iter()
            .map(|text| match text.split_once('=') {
                Some((name, value)) if !name.trim().is_empty() => {
                    Ok((name.trim().to_owned(), value.trim().to_owned()))
                }
                _ => Err(SettingError::Form(text.clone())),
            })
            .collect::<Result<_, _>>()
            .map(Self)
    }

    /// Refuses names that `declared` does not hold.
    ///
    /// # Errors
    /// The first such name.
    pub fn check(&self, declared: &[DeclaredSetting]) -> Result<(), SettingError> {
        let names = || declared.iter().map(|d| d.name.as_str());
        match self
            .0
            .keys()
            .find(|given| !names().any(|n| n == given.as_str()))
        {
            None => Ok(()),
            Some(given) => {
                let list = names().collect::<Vec<_>>().join(", ");
                let hint = match nearest(given, names()) {
                    Some(name) => format!("; did you mean `{name}`?"),
                    None if list.is_empty() => "; it declares none".to_owned(),
                    None => format!("; it has: {list}"),
                };
                Err(SettingError::Unknown {
                    name: given.clone(),
                    hint,
                })
            }
        }
    }

    /// The value given for `name`, of the same kind as `default`; the default when none was.
    ///
    /// # Errors
    /// A text that is not of that kind.
    pub(super) fn value(&self, name: &str, default: &Dynamic) -> Result<Dynamic, SettingError> {
        let Some(given) = self.0.get(name) else {
            return Ok(default.clone());
        };
        let (wanted, value) = if default.is_bool() {
            let value = match given.as_str() {
                "true" => Some(true),
                "false" => Some(false),
                _ => None,
            };
            ("true or false", value.map(Dynamic::from_bool))
        } else if default.is_int() {
            ("a whole number", given.parse().ok().map(Dynamic::from_int))
        } else if default.is_float() {
            let number = given.parse::<f64>().ok().filter(|x| x.is_finite());
            ("a number", number.map(Dynamic::from_float))
        } else if default.is_string() {
            ("text", Some(Dynamic::from(given.clone())))
        } else {
            ("a number, text, or true or false", None)
        };
        value.ok_or_else(|| SettingError::Kind {
            name: name.to_owned(),
            wanted,
            default: show(default),
            given: given.clone(),
        })
    }
}

/// The settings a script declares with a name written out, in the order they stand, each once.
pub(super) fn declared(ast: &AST) -> Vec<DeclaredSetting> {
    let mut found: Vec<DeclaredSetting> = Vec::new();
    ast.walk(&mut |path| {
        let call = match path.last() {
            Some(ASTNode::Expr(Expr::FnCall(call, _))) => Some(&**call),
            Some(ASTNode::Stmt(Stmt::FnCall(call, _))) => Some(&**call),
            _ => None,
        };
        if let Some(setting) = call.and_then(setting_of)
            && !found.iter().any(|f| f.name == setting.name)
        {
            found.push(setting);
        }
        true
    });
    found
}

fn setting_of(call: &FnCallExpr) -> Option<DeclaredSetting> {
    if call.name != "setting" {
        return None;
    }
    let literal = |i: usize| call.args.get(i)?.get_literal_value(None);
    let text = |i: usize| literal(i)?.into_string().ok();
    Some(DeclaredSetting {
        name: text(0)?,
        default: literal(1).map_or_else(|| "computed".to_owned(), |value| show(&value)),
        meaning: text(2).unwrap_or_default(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn settings(texts: &[&str]) -> Settings {
        Settings::parse(&texts.iter().map(|t| (*t).to_owned()).collect::<Vec<_>>()).unwrap()
    }

    #[test]
    fn a_value_is_read_as_its_default_is_written() {
        let given = settings(&["n=3", "x=3", "name = a=b", "on=true"]);
        let value = |name: &str, default: Dynamic| given.value(name, &default).unwrap();
        assert_eq!(value("n", 1_i64.into()).as_int(), Ok(3));
        assert_eq!(value("x", 1.5.into()).as_float(), Ok(3.0));
        assert_eq!(value("name", "z".into()).into_string().unwrap(), "a=b");
        assert_eq!(value("on", false.into()).as_bool(), Ok(true));
        assert_eq!(value("absent", 7_i64.into()).as_int(), Ok(7));
    }

    #[test]
    fn a_value_of_another_kind_names_the_setting() {
        let given = settings(&["n=3.5", "x=fast", "on=yes"]);
        let message =
            |name: &str, default: Dynamic| given.value(name, &default).unwrap_err().to_string();
        assert_eq!(
            message("n", 1_i64.into()),
            "the setting `n` takes a whole number (its default is 1), not `3.5`"
        );
        assert!(message("x", 1.0.into()).contains("takes a number"));
        assert!(message("on", true.into()).contains("true or false"));
        let bad = Settings::parse(&["overlap".to_owned()]).unwrap_err();
        assert_eq!(bad.to_string(), "`overlap` is not of the form name=value");
    }

    #[test]
    fn the_settings_of_a_script_are_known_before_it_runs() {
        let ast = rhai::Engine::new()
            .compile(
                r#"let n = setting("pairs", 12, "how many pairs"); fn f() { setting("overlap", 0.75) }"#,
            )
            .unwrap();
        let declared = declared(&ast);
        let names: Vec<_> = declared.iter().map(|d| (&*d.name, &*d.default)).collect();
        assert_eq!(names, [("pairs", "12"), ("overlap", "0.75")]);
        assert_eq!(declared[0].meaning, "how many pairs");
        assert!(settings(&["pairs=3"]).check(&declared).is_ok());
        assert_eq!(
            settings(&["pair=3"])
                .check(&declared)
                .unwrap_err()
                .to_string(),
            "the script has no setting `pair`; did you mean `pairs`?"
        );
    }
}
