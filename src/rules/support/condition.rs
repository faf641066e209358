//! Names of conditions as people write them: `VIN=9`, `vin=9.0`, `temp=-40,VIN=9` for `VIN=9,temp=-40`.

use crate::syntax::number;

/// Whether what a note writes names this condition: case, order of the parts and spelling of numbers do not matter.
pub fn same_condition(written: &str, name: &str) -> bool {
    let (mut left, mut right) = (parts(written), parts(name));
    left.len() == right.len() && {
        left.sort_by_key(|p| p.0.to_lowercase());
        right.sort_by_key(|p| p.0.to_lowercase());
        left.iter().zip(&right).all(|(a, b)| a.0.to_lowercase() == b.0.to_lowercase() && same_value(a.1, b.1))
    }
}

fn parts(name: &str) -> Vec<(&str, &str)> {
    name.split(',').map(|part| part.split_once('=').unwrap_or((part, ""))).collect()
}

fn same_value(a: &str, b: &str) -> bool {
    if a.eq_ignore_ascii_case(b) {
        return true;
    }
    match (number(a.as_bytes()), number(b.as_bytes())) {
        (Some(a), Some(b)) => (a.value - b.value).abs() <= 1e-9 * a.value.abs().max(b.value.abs()),
        _ => false,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn spelling_does_not_matter_and_values_do() {
        assert!(same_condition("vin=9.0", "VIN=9"));
        assert!(same_condition("temp=-40,VIN=9", "VIN=9,temp=-40"));
        assert!(same_condition("Nominal", "nominal"));
        assert!(same_condition("V1=MAX", "V1=max"));
        assert!(!same_condition("VIN=9", "VIN=16"));
        assert!(!same_condition("VIN=9", "VIN=9,temp=-40"));
    }
}
