//! Shaped and moving fields against the world outside: a published pencil
//! kernel integrated exactly, equivalent squares of the literature, closed forms.

mod field;
mod kernel_model;
mod kernel_sweep;
mod published_squares;
mod random;
mod reference;
mod steps;
mod swept_kernel;
mod wedged;
mod wedged_fluence;

/// Median, 99th percentile and maximum of the sizes of relative differences, per cent.
#[derive(Clone, Copy, Debug)]
struct Quantiles {
    count: usize,
    mean: f64,
    median: f64,
    p99: f64,
    maximum: f64,
}

fn quantiles(deviations_percent: &[f64]) -> Quantiles {
    let mut sizes: Vec<f64> = deviations_percent.iter().map(|value| value.abs()).collect();
    sizes.sort_by(f64::total_cmp);
    let at = |share: f64| sizes[((sizes.len() - 1) as f64 * share).round() as usize];
    Quantiles {
        count: sizes.len(),
        mean: deviations_percent.iter().sum::<f64>() / sizes.len() as f64,
        median: at(0.5),
        p99: at(0.99),
        maximum: at(1.0),
    }
}
