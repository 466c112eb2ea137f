//! Numbers for the eye: sensible digits, signs, units, plain ASCII.

/// Most decimals that [`against`] spends on telling a demand from its limit.
const MOST_DECIMALS: usize = 9;

/// Slopes smaller than this are rounding, in any unit that is shown.
const NOTHING: f64 = 1e-8;

/// `value` with `decimals` places, never "-0".
pub fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(rest) if rest.chars().all(|digit| digit == '0' || digit == '.') => rest.to_owned(),
        _ => text,
    }
}

/// As [`fixed`], with a plus sign in front of what grows.
pub fn signed(value: f64, decimals: usize) -> String {
    let text = fixed(value, decimals);
    let zero = text.chars().all(|digit| digit == '0' || digit == '.');
    if zero || text.starts_with('-') {
        text
    } else {
        format!("+{text}")
    }
}

/// A volume or an area, to about three digits.
pub fn amount(value: f64) -> String {
    fixed(value, amount_decimals(value))
}

/// As [`amount`], with a sign.
pub fn signed_amount(value: f64) -> String {
    signed(value, amount_decimals(value))
}

fn amount_decimals(value: f64) -> usize {
    match value.abs() {
        large if large >= 100.0 => 0,
        middle if middle >= 1.0 => 1,
        _ => 2,
    }
}

/// A small number with its sign, to `digits` significant digits.
pub fn signed_significant(value: f64, digits: usize) -> String {
    if value.abs() < NOTHING {
        return "0".to_owned();
    }
    let magnitude = value.abs().log10().floor();
    let decimals = (digits as f64 - 1.0 - magnitude).clamp(0.0, 12.0) as usize;
    signed(value, decimals)
}

/// A length in m as millimetres, "550" or "37.5".
pub fn millimetres(length: f64) -> String {
    let whole = length * 1e3;
    let decimals = usize::from((whole - whole.round()).abs() > 1e-3);
    fixed(whole, decimals)
}

/// A whole number with its thousands set apart: "1 532".
pub fn thousands(value: f64) -> String {
    if value.abs() >= 1e12 {
        return format!("{value:.1e}");
    }
    let digits = fixed(value, 0);
    let mut text = String::new();
    for (position, digit) in digits.chars().enumerate() {
        if position > 0 && (digits.len() - position).is_multiple_of(3) {
            text.push(' ');
        }
        text.push(digit);
    }
    text
}

/// A demand and its limit in `unit`, with as many digits as it takes to see on
/// which side of the limit the demand lies. Slopes ("rad") are written "1/642".
pub fn against(demand: f64, limit: f64, unit: &str) -> (String, String) {
    let start = match unit {
        "rad" => 0,
        "mm" => 0,
        _ => 3,
    };
    let write = |value: f64, decimals: usize| match unit {
        "rad" if value == 0.0 => "0".to_owned(),
        "rad" => format!("1/{}", fixed(1.0 / value, decimals)),
        _ => fixed(value, decimals),
    };
    for decimals in start..=MOST_DECIMALS {
        let texts = (write(demand, decimals), write(limit, decimals));
        if texts.0 != texts.1 || demand == limit {
            return (texts.0, trimmed(&texts.1));
        }
    }
    (
        write(demand, MOST_DECIMALS),
        trimmed(&write(limit, MOST_DECIMALS)),
    )
}

/// A utilisation, with enough digits to see whether it exceeds one.
pub fn utilisation(value: f64) -> String {
    for decimals in 2..=MOST_DECIMALS {
        let text = fixed(value, decimals);
        if text != fixed(1.0, decimals) || value == 1.0 {
            return text;
        }
    }
    fixed(value, MOST_DECIMALS)
}

/// The unit beside a number written by [`against`].
pub fn unit_beside(unit: &str) -> &str {
    match unit {
        "rad" | "-" => "",
        other => other,
    }
}

fn trimmed(text: &str) -> String {
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text.to_owned()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_reads_as_minus_zero() {
        assert_eq!(fixed(-0.0004, 2), "0.00");
        assert_eq!(signed(-0.0004, 2), "0.00");
        assert_eq!(signed(0.5, 1), "+0.5");
        assert_eq!(signed_amount(-250.4), "-250");
        assert_eq!(signed_significant(-0.000_123_4, 2), "-0.00012");
    }

    #[test]
    fn a_demand_just_over_its_limit_is_seen_to_be_over() {
        let (demand, limit) = against(0.900_04, 0.9, "-");
        assert_eq!((demand.as_str(), limit.as_str()), ("0.90004", "0.9"));
        assert_eq!(against(1.0 / 642.0, 0.002, "rad").0, "1/642");
        assert_eq!(utilisation(1.000_3), "1.0003");
        assert_eq!(utilisation(1.0), "1.00");
        assert_eq!(utilisation(0.5), "0.50");
    }

    #[test]
    fn whole_numbers_are_set_in_threes() {
        assert_eq!(thousands(1532.0), "1 532");
        assert_eq!(thousands(999.0), "999");
        assert_eq!(thousands(1_000_000.0), "1 000 000");
        assert_eq!(millimetres(0.55), "550");
        assert_eq!(millimetres(0.0375), "37.5");
    }
}
