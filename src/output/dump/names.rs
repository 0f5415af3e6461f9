//! Names of nets as a dump may have them, each unlike all others.

use std::collections::BTreeMap;
use std::fmt::Write;

use rustc_hash::FxHashSet;

/// The declarations of some nets.
pub(super) struct Declared {
    /// Scopes and variables, and comments on names that were changed.
    pub text: String,
    /// The letters that stand for each net.
    pub ids: Vec<String>,
}

/// The scope around all nets.
const TOP: &str = "circuit";
/// Longest part of a name; the standard lets a reader stop at 1,024 letters.
const LONGEST: usize = 1000;
/// Most scopes of one name.
const DEEPEST: usize = 60;

/// A name in parts.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
struct Parts {
    /// Scopes, then the name itself.
    parts: Vec<String>,
    /// The number in brackets behind it.
    bit: Option<u32>,
}

impl Parts {
    fn written(&self) -> String {
        let name = self.parts.join(".");
        self.bit.map_or(name.clone(), |bit| format!("{name}[{bit}]"))
    }
}

/// Declares nets in scopes made of their dotted names. `a.b[3]` is bit 3 of `b` in the scope `a`.
pub(super) fn declare<'a>(names: impl Iterator<Item = &'a str>) -> Declared {
    let names: Vec<&str> = names.collect();
    let mut parts: Vec<Parts> = names.iter().map(|name| safe(name)).collect();
    // names that stay as they are come first: another must not take theirs
    let same: Vec<bool> = names.iter().zip(&parts).map(|(name, parts)| parts.written() == *name).collect();
    let mut taken: FxHashSet<String> =
        parts.iter().zip(&same).filter(|(_, same)| **same).map(|(parts, _)| parts.written()).collect();
    for (parts, _) in parts.iter_mut().zip(&same).filter(|(_, same)| !**same) {
        let last = parts.parts.last().cloned().unwrap_or_default();
        let mut number = 2u64;
        while !taken.insert(parts.written()) {
            if let Some(name) = parts.parts.last_mut() {
                *name = format!("{last}_{number}");
            }
            number += 1;
        }
    }
    let ids: Vec<String> = (0..names.len()).map(id).collect();
    let mut text = String::new();
    for ((name, parts), _) in names.iter().zip(&parts).zip(&same).filter(|(_, same)| !**same) {
        let _ = writeln!(text, "$comment {TOP}.{} is the net {name} $end", parts.written());
    }
    let mut root = Scope::default();
    for (net, parts) in parts.iter().enumerate() {
        let mut scope = &mut root;
        for part in &parts.parts[..parts.parts.len() - 1] {
            let next = scope.children.len();
            let at = *scope.places.entry(part.clone()).or_insert(next);
            if at == next {
                scope.children.push((part.clone(), Scope::default()));
            }
            scope = &mut scope.children[at].1;
        }
        scope.nets.push(net);
    }
    root.write(TOP, &parts, &ids, &mut text);
    Declared { text, ids }
}

/// Nets and scopes within a scope, in the order of the nets.
#[derive(Default)]
struct Scope {
    nets: Vec<usize>,
    children: Vec<(String, Scope)>,
    places: BTreeMap<String, usize>,
}

impl Scope {
    fn write(&self, name: &str, parts: &[Parts], ids: &[String], text: &mut String) {
        let _ = writeln!(text, "$scope module {name} $end");
        for net in &self.nets {
            let (Parts { parts, bit }, id) = (&parts[*net], &ids[*net]);
            let name = &parts[parts.len() - 1];
            let bit = bit.map_or_else(String::new, |bit| format!(" [{bit}]"));
            let _ = writeln!(text, "$var wire 1 {id} {name}{bit} $end");
        }
        for (name, child) in &self.children {
            child.write(name, parts, ids, text);
        }
        text.push_str("$upscope $end\n");
    }
}

/// A name in parts, each of which is an identifier: a letter or `_`, then letters, digits, `_`. Everything else becomes `_`.
fn safe(name: &str) -> Parts {
    let (base, bit) = bit(name);
    let all: Vec<&str> = base.split('.').collect();
    // what is too deep stands in one name
    let (scopes, rest) = all.split_at(all.len().saturating_sub(1).min(DEEPEST));
    let parts = scopes.iter().map(|part| identifier(part)).chain([identifier(&rest.join("."))]);
    Parts { parts: parts.collect(), bit }
}

fn identifier(part: &str) -> String {
    let kept = |c: char| if c.is_ascii_alphanumeric() || c == '_' { c } else { '_' };
    let mut name: String = part.chars().take(LONGEST).map(kept).collect();
    if name.chars().next().is_none_or(|first| first.is_ascii_digit()) {
        name.insert(0, '_');
    }
    name
}

/// `d[3]` as `d` and 3.
fn bit(name: &str) -> (&str, Option<u32>) {
    let inner = name.strip_suffix(']').and_then(|rest| rest.rsplit_once('['));
    let number = inner.and_then(|(base, digits)| {
        let number: u32 = digits.parse().ok().filter(|number| *number <= i32::MAX as u32)?;
        // `d[03]` would come back as another name
        (!base.is_empty() && number.to_string() == digits).then_some((base, number))
    });
    number.map_or((name, None), |(base, number)| (base, Some(number)))
}

/// Printable letters without `$` and `#`, so that no reader takes letters for a keyword or a time.
fn id(mut number: usize) -> String {
    let letters: Vec<char> = ('!'..='~').filter(|letter| !matches!(letter, '$' | '#')).collect();
    let mut id = String::new();
    loop {
        id.push(letters[number % letters.len()]);
        number /= letters.len();
        if number == 0 {
            return id;
        }
        number -= 1;
    }
}

/// A text within a comment: without what could end it, and without line breaks.
pub(super) fn comment(text: &str) -> String {
    text.chars()
        .map(|c| {
            if c == '$' {
                '_'
            } else if c.is_control() {
                ' '
            } else {
                c
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn letters_are_unique() {
        let all: FxHashSet<String> = (0..20_000).map(id).collect();
        assert_eq!(all.len(), 20_000);
        assert!(all.iter().all(|id| !id.is_empty() && id.bytes().all(|b| (b'!'..=b'~').contains(&b))));
        assert_eq!((id(0).as_str(), id(91).as_str(), id(92).as_str()), ("!", "~", "!!"));
    }

    #[test]
    fn names_that_a_dump_cannot_have_are_changed_and_told() {
        let nets = ["a", "lock.upper.open", "d[3]", "d[03]", "d_03_", "q]", "q_", "größe", "a..b", "x[1][2]", "lock.b"];
        let Declared { text, ids } = declare(nets.into_iter());
        let expected = "\
$comment circuit.d_03__2 is the net d[03] $end
$comment circuit.q__2 is the net q] $end
$comment circuit.gr__e is the net größe $end
$comment circuit.a._.b is the net a..b $end
$comment circuit.x_1_[2] is the net x[1][2] $end
$scope module circuit $end
$var wire 1 ! a $end
$var wire 1 % d [3] $end
$var wire 1 & d_03__2 $end
$var wire 1 ' d_03_ $end
$var wire 1 ( q__2 $end
$var wire 1 ) q_ $end
$var wire 1 * gr__e $end
$var wire 1 , x_1_ [2] $end
$scope module lock $end
$var wire 1 - b $end
$scope module upper $end
$var wire 1 \" open $end
$upscope $end
$upscope $end
$scope module a $end
$scope module _ $end
$var wire 1 + b $end
$upscope $end
$upscope $end
$upscope $end
";
        assert_eq!(text, expected);
        assert_eq!(ids.len(), nets.len());
    }

    #[test]
    fn deep_and_long_names_stay_within_bounds() {
        let (deep, long) = (format!("a{}", ".b".repeat(5000)), "c".repeat(5000));
        let Declared { text, .. } = declare([deep.as_str(), long.as_str(), &long[..4999]].into_iter());
        let scopes = text.lines().filter(|line| line.starts_with("$scope")).count();
        assert_eq!(scopes, DEEPEST + 1);
        assert!(text.lines().filter(|line| line.starts_with("$var")).all(|line| line.len() < 1024));
        assert!(text.contains(&format!("{}_2 $end", "c".repeat(LONGEST))), "cut names differ all the same");
    }
}
