//! The functions of expressions: those of ordinary mathematics by their usual names. `log` is the natural logarithm;
//! spreads of a distribution count with its middle.

/// What a call gives.
pub(super) enum Called {
    /// A value; not finite where the function has none there.
    Value(f64),
    /// It depends on voltages, currents or time, so it has no one value.
    Moving,
    /// It takes another number of arguments: so many.
    Arguments(&'static str),
    /// There is no such function.
    Unknown,
}

/// Calls the function of that name (any case).
pub(super) fn call(name: &str, arguments: &[f64]) -> Called {
    let name = name.to_ascii_lowercase();
    match arguments {
        // a voltage, a current, a derivative, an integral, a delay, a transfer function
        _ if matches!(name.as_str(), "v" | "i" | "ddt" | "idt" | "delay" | "laplace") => Called::Moving,
        _ if matches!(name.as_str(), "min" | "max") && !arguments.is_empty() => {
            Called::Value(extreme(&name, arguments))
        }
        _ if name == "table" && arguments.len() >= 3 => Called::Value(table(arguments)),
        // spreads count with their middle
        [x, ..]
            if matches!(name.as_str(), "agauss" | "gauss" | "aunif" | "unif" | "limit")
                && arguments.len() <= 3 =>
        {
            Called::Value(if name == "limit" && arguments.len() == 3 { limit(arguments) } else { *x })
        }
        [x] => one(&name, *x).map_or_else(|| wrong(&name), Called::Value),
        [x, y] => two(&name, *x, *y).map_or_else(|| wrong(&name), Called::Value),
        [c, x, y] if name == "if" => Called::Value(if *c == 0.0 { *y } else { *x }),
        _ => wrong(&name),
    }
}

fn wrong(name: &str) -> Called {
    if one(name, 1.0).is_some() {
        Called::Arguments("one argument")
    } else if two(name, 1.0, 1.0).is_some() {
        Called::Arguments("two arguments")
    } else if matches!(name, "if" | "limit") {
        Called::Arguments("three arguments")
    } else if matches!(name, "min" | "max") {
        Called::Arguments("two or more arguments")
    } else {
        Called::Unknown
    }
}

fn one(name: &str, x: f64) -> Option<f64> {
    Some(match name {
        "sin" => x.sin(),
        "cos" => x.cos(),
        "tan" => x.tan(),
        "asin" | "arcsin" => x.asin(),
        "acos" | "arccos" => x.acos(),
        "atan" | "arctan" => x.atan(),
        "sinh" => x.sinh(),
        "cosh" => x.cosh(),
        "tanh" => x.tanh(),
        "asinh" => x.asinh(),
        "acosh" => x.acosh(),
        "atanh" => x.atanh(),
        "exp" => x.exp(),
        "ln" | "log" => x.ln(),
        "log10" => x.log10(),
        "log2" => x.log2(),
        "db" => 20.0 * x.abs().log10(),
        "sqrt" => x.sqrt(),
        "cbrt" => x.cbrt(),
        "square" => x * x,
        "abs" => x.abs(),
        "int" | "trunc" => x.trunc(),
        "floor" => x.floor(),
        "ceil" => x.ceil(),
        "round" => x.round(),
        "sgn" | "sign" => {
            if x == 0.0 {
                0.0
            } else {
                x.signum()
            }
        }
        // the unit step
        "u" => f64::from(x > 0.0),
        _ => return None,
    })
}

fn two(name: &str, x: f64, y: f64) -> Option<f64> {
    Some(match name {
        "pow" => x.powf(y),
        // powers of the magnitude, without and with the sign
        "pwr" => x.abs().powf(y),
        "pwrs" => x.signum() * x.abs().powf(y),
        "atan2" => x.atan2(y),
        "hypot" => x.hypot(y),
        "sign" => y.signum() * x.abs(),
        "mod" | "fmod" => x % y,
        _ => return None,
    })
}

fn extreme(name: &str, arguments: &[f64]) -> f64 {
    let pick: fn(f64, f64) -> f64 = if name == "min" { f64::min } else { f64::max };
    arguments.iter().copied().reduce(pick).unwrap_or(0.0)
}

/// `limit(x, a, b)`: x held between a and b.
fn limit(arguments: &[f64]) -> f64 {
    let (x, a, b) = (arguments[0], arguments[1], arguments[2]);
    x.max(a.min(b)).min(a.max(b))
}

/// `table(x, x1, y1, x2, y2 …)`: straight lines between the points, level beyond them.
fn table(arguments: &[f64]) -> f64 {
    let x = arguments[0];
    let (points, _) = arguments[1..].as_chunks::<2>();
    let Some(first) = points.first() else { return f64::NAN };
    if x <= first[0] {
        return first[1];
    }
    for pair in points.windows(2) {
        let [[x1, y1], [x2, y2]] = [pair[0], pair[1]];
        if x <= x2 && x2 > x1 {
            return y1 + (y2 - y1) * (x - x1) / (x2 - x1);
        }
    }
    points.last().map_or(f64::NAN, |p| p[1])
}

/// Names of all functions, to propose the nearest.
pub(super) const FUNCTIONS: [&str; 39] = [
    "sin", "cos", "tan", "asin", "acos", "atan", "atan2", "sinh", "cosh", "tanh", "asinh", "acosh", "atanh",
    "exp", "ln", "log", "log10", "log2", "db", "sqrt", "cbrt", "square", "abs", "int", "trunc", "floor",
    "ceil", "round", "sgn", "sign", "u", "pow", "hypot", "mod", "min", "max", "limit", "if", "table",
];
