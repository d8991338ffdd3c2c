//! The functions that expressions may call.

use super::Scalar;

/// What a function asks of its arguments' dimensions.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ArgumentRule {
    /// One number, giving a number.
    Number,
    /// One argument of any dimension, giving its square root's.
    Root,
    /// One argument of any dimension, giving the same.
    Same,
    /// Any number of arguments of one dimension, giving the same.
    Alike,
}

/// A function.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Function {
    /// Its name.
    pub name: &'static str,
    /// What it asks of its arguments.
    pub rule: ArgumentRule,
    /// What it gives, in a few words.
    pub about: &'static str,
}

const fn number(name: &'static str, about: &'static str) -> Function {
    Function {
        name,
        rule: ArgumentRule::Number,
        about,
    }
}

/// Every function.
pub const FUNCTIONS: [Function; 20] = [
    Function {
        name: "sqrt",
        rule: ArgumentRule::Root,
        about: "square root",
    },
    number("exp", "exponential"),
    number("log", "natural logarithm"),
    number("log10", "logarithm to base ten"),
    number("sin", "sine of an angle"),
    number("cos", "cosine of an angle"),
    number("tan", "tangent of an angle"),
    number("asin", "angle of a sine"),
    number("acos", "angle of a cosine"),
    number("atan", "angle of a tangent"),
    number("sinh", "hyperbolic sine"),
    number("cosh", "hyperbolic cosine"),
    number("tanh", "hyperbolic tangent"),
    number("sech", "hyperbolic secant, 1/cosh"),
    Function {
        name: "abs",
        rule: ArgumentRule::Same,
        about: "magnitude",
    },
    Function {
        name: "min",
        rule: ArgumentRule::Alike,
        about: "the least of its arguments",
    },
    Function {
        name: "max",
        rule: ArgumentRule::Alike,
        about: "the greatest of its arguments",
    },
    number("floor", "next whole number below"),
    number("ceil", "next whole number above"),
    number("round", "nearest whole number"),
];

/// The function of that name.
#[must_use]
pub fn function(name: &str) -> Option<&'static Function> {
    FUNCTIONS.iter().find(|function| function.name == name)
}

/// The value of a function with its exact derivative; not a number for a name or a count of arguments that is none.
#[must_use]
pub fn apply<S: Scalar>(name: &str, arguments: &[S]) -> S {
    let Some(first) = arguments.first() else {
        return S::number(f64::NAN);
    };
    match name {
        "min" => extreme(first, arguments, |candidate, best| candidate < best),
        "max" => extreme(first, arguments, |candidate, best| candidate > best),
        _ => unary(name, first),
    }
}

fn extreme<S: Scalar>(first: &S, arguments: &[S], better: fn(f64, f64) -> bool) -> S {
    let mut best = first;
    for candidate in arguments {
        let wins = better(candidate.value(), best.value());
        if wins || candidate.value().is_nan() {
            best = candidate;
        }
    }
    best.clone()
}

fn unary<S: Scalar>(name: &str, argument: &S) -> S {
    let u = argument.value();
    match name {
        "sqrt" => argument.chain(u.sqrt(), || 0.5 / u.sqrt()),
        "exp" => argument.chain(u.exp(), || u.exp()),
        "log" => argument.chain(u.ln(), || 1.0 / u),
        "log10" => argument.chain(u.log10(), || 1.0 / (u * std::f64::consts::LN_10)),
        "sin" => argument.chain(u.sin(), || u.cos()),
        "cos" => argument.chain(u.cos(), || -u.sin()),
        "tan" => argument.chain(u.tan(), || 1.0 + u.tan().powi(2)),
        "asin" => argument.chain(u.asin(), || 1.0 / ((1.0 - u) * (1.0 + u)).sqrt()),
        "acos" => argument.chain(u.acos(), || -1.0 / ((1.0 - u) * (1.0 + u)).sqrt()),
        "atan" => argument.chain(u.atan(), || 1.0 / (1.0 + u * u)),
        "sinh" => argument.chain(u.sinh(), || u.cosh()),
        "cosh" => argument.chain(u.cosh(), || u.sinh()),
        "tanh" => argument.chain(u.tanh(), || sech(u).powi(2)),
        "sech" => argument.chain(sech(u), || -sech(u) * u.tanh()),
        "abs" => argument.chain(u.abs(), || if u == 0.0 { 0.0 } else { u.signum() }),
        "floor" => argument.chain(u.floor(), || 0.0),
        "ceil" => argument.chain(u.ceil(), || 0.0),
        "round" => argument.chain(u.round(), || 0.0),
        _ => S::number(f64::NAN),
    }
}

/// 1/cosh, without overflow.
fn sech(u: f64) -> f64 {
    let small = (-u.abs()).exp();
    2.0 * small / (1.0 + small * small)
}
