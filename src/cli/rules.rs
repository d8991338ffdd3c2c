//! `crenate rules [NAME]`

use clap::Args;

use super::{Status, output};
use crate::report::rule_page;

#[derive(Debug, Args)]
pub struct Arguments {
    /// The rule to explain; without one, all are listed.
    name: Option<String>,
}

/// Lists the rules or explains one.
pub fn run(arguments: &Arguments) -> Status {
    let Some(name) = &arguments.name else {
        return output::written(output::result(&rule_page::list()), Status::Clean);
    };
    match rule_page::text(name) {
        Some(text) => output::written(output::result(&text), Status::Clean),
        None => {
            let hint = rule_page::nearest(name).map(|near| format!("; did you mean `{near}`?"));
            output::message(&format!(
                "there is no rule `{name}`{}",
                hint.unwrap_or_default()
            ));
            Status::Failed
        }
    }
}
