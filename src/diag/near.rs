//! The name that was likely meant: nearest of a list by the number of changed letters.

/// The entry of `names` nearest to `typed`, if it is near enough to be worth naming.
pub fn nearest<'a>(typed: &str, names: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let limit = 1 + typed.chars().count() / 3;
    let typed = typed.to_lowercase();
    let scored = names.into_iter().map(|name| (changes(&typed, &name.to_lowercase()), name));
    let (changed, name) = scored.min()?;
    (changed <= limit).then_some(name)
}

/// Number of letters to insert, remove, replace or exchange with their neighbour to get from `a` to `b`.
fn changes(a: &str, b: &str) -> usize {
    let (a, b): (Vec<char>, Vec<char>) = (a.chars().collect(), b.chars().collect());
    let mut before_last = vec![0; b.len() + 1];
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i; b.len() + 1];
        for j in 1..=b.len() {
            let replaced = last[j - 1] + usize::from(a[i - 1] != b[j - 1]);
            row[j] = replaced.min(last[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                row[j] = row[j].min(before_last[j - 2] + 1);
            }
        }
        before_last = std::mem::replace(&mut last, row);
    }
    last[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn finds_typing_errors_and_nothing_else() {
        let keys = ["copper", "dielectric", "permittivity", "temperature"];
        assert_eq!(nearest("coper", keys), Some("copper"));
        assert_eq!(nearest("Dielectrics", keys), Some("dielectric"));
        assert_eq!(nearest("premittivity", keys), Some("permittivity"));
        assert_eq!(nearest("color", keys), None);
        assert_eq!(nearest("x", []), None);
        assert_eq!(changes("ab", "ba"), 1);
        assert_eq!(changes("kitten", "sitting"), 3);
    }
}
