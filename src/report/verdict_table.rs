//! Terminal tables of the verdicts: which methods are honest, and what they cost.

use super::table::Look;
use super::text::{bold, clean, paragraph, wrap};
use super::text_table::{Align, Cell, Column, TextTable};
use super::{Scored, VerdictLine, number};

/// Widest line of a truth's name in a heading.
const HEADING_WIDTH: usize = 14;

/// Lines that a truth's name may take in a heading.
const HEADING_LINES: usize = 4;

/// Per estimand: a method × truth matrix of words, and a sentence that names the cheapest honest
/// method. Empty when there are no verdicts.
#[must_use]
pub fn verdict_tables(scored: &Scored, look: Look) -> String {
    let mut blocks = Vec::new();
    for (estimand, name) in scored.estimands.iter().enumerate() {
        let lines: Vec<&VerdictLine> = scored
            .verdicts
            .iter()
            .filter(|line| line.estimand == estimand)
            .collect();
        if lines.is_empty() {
            continue;
        }
        let mut text = String::new();
        for line in paragraph(&format!("Verdicts. Estimand: {name}."), look.width).lines() {
            text.push_str(&bold(line, look.ansi));
            text.push('\n');
        }
        let meaning = format!(
            "Honest: coverage is at least {} (level {} less tolerance {}), beyond Monte Carlo doubt, \
             in every truth of the scenario. All verdicts of the scenario hold together with \
             confidence {} (exact binomial tests, adjusted by Holm's method).",
            number::per_cent(scored.level - scored.tolerance),
            number::per_cent(scored.level),
            number::per_cent(scored.tolerance),
            number::per_cent(scored.confidence),
        );
        text.push_str(&paragraph(&meaning, look.width));
        text.push('\n');
        text.push_str(&matrix(scored, &lines).render(look.width, look.ansi));
        text.push('\n');
        text.push_str(&paragraph(&conclusion(scored, name, &lines), look.width));
        blocks.push(text);
    }
    blocks.join("\n")
}

fn matrix(scored: &Scored, lines: &[&VerdictLine]) -> TextTable {
    let column = |heading: &str, align| Column {
        heading: heading.to_owned(),
        align,
    };
    let mut columns = vec![
        column("overall", Align::Left),
        column("price", Align::Right),
    ];
    for truth in &scored.truths {
        let heading = wrap(&clean(truth), HEADING_WIDTH, HEADING_LINES).join("\n");
        columns.push(column(&heading, Align::Left));
    }
    let mut table = TextTable::new("method", columns);
    for line in lines {
        let price = line
            .price
            .map_or("-".to_owned(), |price| number::fixed(price, 2));
        let mut cells = vec![Cell::plain(line.overall), Cell::plain(price)];
        cells.extend(line.per_truth.iter().map(|word| Cell::plain(*word)));
        table.push(scored.methods[line.method].as_str(), cells);
    }
    table
}

/// The sentence below a matrix.
fn conclusion(scored: &Scored, estimand: &str, lines: &[&VerdictLine]) -> String {
    let reference = &scored.methods[scored.reference];
    if let Some(best) = lines.iter().find(|line| line.cheapest) {
        let method = &scored.methods[best.method];
        return match best.price {
            Some(_) if best.method == scored.reference => format!(
                "Cheapest honest method for {estimand}: {method}, itself the reference of price 1."
            ),
            Some(price) => format!(
                "Cheapest honest method for {estimand}: {method}; its intervals are {} times as \
                 wide as those of {reference}.",
                number::fixed(price, 2)
            ),
            None => format!("Cheapest honest method for {estimand}: {method}."),
        };
    }
    if lines.iter().any(|line| line.overall == "undecided") {
        format!(
            "No method is shown to be honest for {estimand} at this number of trials; more trials \
             can settle what is undecided."
        )
    } else {
        format!("No method is honest for {estimand} in every truth of this scenario.")
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::fixtures;

    #[test]
    fn the_sentence_names_the_cheapest_honest_method_and_its_price() {
        let text = verdict_tables(
            &fixtures::scored(3),
            Look {
                width: 200,
                ansi: false,
            },
        );
        assert!(
            text.contains(
                "Cheapest honest method for elevation effect: batch-combined; its intervals are \
                 1.21 times as wide as those of least-squares."
            ),
            "{text}"
        );
        assert!(text.contains("not honest"), "{text}");
        assert!(text.contains("undecided"), "{text}");
    }

    #[test]
    fn without_an_honest_method_the_sentence_says_so() {
        let mut scored = fixtures::scored(2);
        for line in &mut scored.verdicts {
            line.cheapest = false;
            line.overall = "not honest";
        }
        let text = verdict_tables(&scored, Look::default());
        assert!(text.contains("No method is honest"), "{text}");
        scored.verdicts[0].overall = "undecided";
        let text = verdict_tables(&scored, Look::default());
        assert!(text.contains("more trials"), "{text}");
        scored.verdicts.clear();
        assert!(verdict_tables(&scored, Look::default()).is_empty());
    }
}
