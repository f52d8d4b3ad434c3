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
