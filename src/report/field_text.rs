//! A trace as plain text for a terminal: every factor with value, unit and
//! source, with so many digits that the product can be redone by pocket
//! calculator. Which factors there are is decided in `dose`.

use super::plain_text::{one_line, rounded};
use crate::dose::Trace;

/// Decimals of a factor: with six of them the printed product's last digit holds.
const FACTOR_DECIMALS: usize = 5;
const PRODUCT_DECIMALS: usize = 4;

struct Row {
    cells: [String; 5],
}

/// A trace as text: formula and its source, inputs, factors, product.
#[must_use]
pub fn trace_text(trace: &Trace) -> String {
    let inputs: Vec<Row> = trace
        .inputs
        .iter()
        .map(|input| Row {
            cells: [
                one_line(input.symbol),
                one_line(input.name),
                rounded(input.value, decimals_of(input.unit)),
                input.unit.to_owned(),
                one_line(&input.source),
            ],
        })
        .collect();
    let factors: Vec<Row> = trace
        .factors
        .iter()
        .map(|factor| Row {
            cells: [
                factor.name.symbol().to_owned(),
                factor.name.title().to_owned(),
                rounded(factor.value, FACTOR_DECIMALS),
                factor.name.unit().to_owned(),
                one_line(&factor.source),
            ],
        })
        .collect();
    let product = Row {
        cells: [
            "product".to_owned(),
            "dose per MU".to_owned(),
            rounded(trace.dose_per_mu_cgy, PRODUCT_DECIMALS),
            "cGy/MU".to_owned(),
            "of the factors above".to_owned(),
        ],
    };
    let header = Row {
        cells: ["symbol", "quantity", "value", "unit", "source"].map(str::to_owned),
    };
    let every = inputs.iter().chain(&factors).chain([&product, &header]);
    let widths = widths(every);
    let mut out = format!(
        "dose per MU = {}\n    ({})\n\n",
        one_line(&trace.formula),
        one_line(trace.formula_source)
    );
    write(&mut out, &header, widths);
    let rule = "-".repeat(widths.iter().take(4).sum::<usize>() + 8 + 6);
    for part in [&inputs, &factors] {
        if part.is_empty() {
            continue;
        }
        out.push_str(&rule);
        out.push('\n');
        for row in part {
            write(&mut out, row, widths);
        }
    }
    out.push_str(&rule);
    out.push('\n');
    write(&mut out, &product, widths);
    let numbers: Vec<&str> = factors.iter().map(|row| row.cells[2].as_str()).collect();
    if !numbers.is_empty() {
        out.push_str(&format!(
            "\n{} = {} cGy/MU\n",
            numbers.join(" * "),
            product.cells[2]
        ));
    }
    out
}

fn decimals_of(unit: &str) -> usize {
    match unit {
        "cm" => 3,
        "mm" => 2,
        _ => FACTOR_DECIMALS,
    }
}

fn widths<'a>(rows: impl Iterator<Item = &'a Row>) -> [usize; 5] {
    rows.fold([0; 5], |mut widths, row| {
        for (width, cell) in widths.iter_mut().zip(&row.cells) {
            *width = (*width).max(cell.chars().count());
        }
        widths
    })
}

fn write(out: &mut String, row: &Row, widths: [usize; 5]) {
    let [symbol, name, value, unit, source] = &row.cells;
    let [w_symbol, w_name, w_value, w_unit, _] = widths;
    let line = format!(
        "{symbol:<w_symbol$}  {name:<w_name$}  {value:>w_value$}  {unit:<w_unit$}  {source}"
    );
    out.push_str(line.trim_end());
    out.push('\n');
}
