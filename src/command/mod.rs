//! What the commands do; `main` only reads arguments and wires.

pub mod check;
pub mod outlook;
pub mod serve;

use rainward::service::problem::Problem;

/// Prints what is wrong with the arguments, as options.
pub fn print_problem(problem: Problem) {
    match problem {
        Problem::BadQuery(errors) => {
            for error in errors {
                eprintln!("rainward: --{}: {}", error.field.replace('_', "-"), error.detail);
            }
        }
        other => eprintln!("rainward: {other:?}"),
    }
}

/// Prints a line to standard output; when nobody reads on, as in `rainward … | head`, the rest is left out.
pub fn emit(line: std::fmt::Arguments<'_>) {
    use std::io::Write;
    let mut out = std::io::stdout().lock();
    if let Err(error) = writeln!(out, "{line}").and_then(|()| out.flush())
        && error.kind() != std::io::ErrorKind::BrokenPipe
    {
        eprintln!("rainward: cannot print: {error}");
    }
}

/// Prints a value as one line of JSON.
pub fn say_json(value: &impl serde::Serialize) {
    match serde_json::to_string(value) {
        Ok(text) => emit(format_args!("{text}")),
        Err(error) => eprintln!("rainward: cannot print: {error}"),
    }
}

/// `println!` that survives a closed pipe.
macro_rules! say {
    ($($words:tt)*) => { $crate::command::emit(format_args!($($words)*)) };
}
pub(crate) use say;
