//! Paths that name one value of a scenario, as `batch.2.size` or
//! `population.covariates.soil.count`.

use super::schema::{Key, SCENARIO, Shape, find};
use super::source::Place;
use super::tree::{Content, Entry, Node};

/// Why a path leads nowhere.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct PathMistake {
    pub(crate) message: String,
    pub(crate) help: String,
}

/// The value at a path, made if the file leaves it at its default.
pub(crate) fn reach<'t>(
    root: &'t mut Node,
    path: &str,
) -> Result<(&'t mut Node, &'static Shape), PathMistake> {
    let segments = split(path)?;
    descend(root, &SCENARIO, &segments, path, super::structure::ROOT)
}

/// The value at a path as the file has it.
pub(crate) fn get(root: &Node, path: &str) -> Option<Node> {
    let mut copy = root.clone();
    let (node, _) = reach(&mut copy, path).ok()?;
    (node.content != Content::Unusable).then(|| node.clone())
}

/// Segments of a dotted path; a segment in double quotes may hold dots.
fn split(path: &str) -> Result<Vec<String>, PathMistake> {
    let malformed = |message: &str| PathMistake {
        message: format!("the path `{path}` {message}"),
        help: "write names separated by dots; put a name that holds a dot in double quotes"
            .to_owned(),
    };
    let mut segments = Vec::new();
    let mut rest = path;
    loop {
        let (segment, after) = if let Some(quoted) = rest.strip_prefix('"') {
            quoted
                .split_once('"')
                .ok_or_else(|| malformed("holds a quote that is not closed"))?
        } else {
            let end = rest.find('.').unwrap_or(rest.len());
            (rest[..end].trim(), &rest[end..])
        };
        if segment.is_empty() {
            return Err(malformed("holds an empty name"));
        }
        segments.push(segment.to_owned());
        if after.is_empty() {
            return Ok(segments);
        }
        rest = after
            .strip_prefix('.')
            .ok_or_else(|| malformed("has text after a closing quote"))?;
    }
}

fn descend<'t>(
    node: &'t mut Node,
    shape: &'static Shape,
    segments: &[String],
    path: &str,
    here: &str,
) -> Result<(&'t mut Node, &'static Shape), PathMistake> {
    let Some((segment, rest)) = segments.split_first() else {
        return Ok((node, shape));
    };
    let place = node.place.clone();
    let (entries, shape) = match (&mut node.content, settle(shape, segments)) {
        (Content::List(nodes), Shape::List(member)) => {
            let index = member_index(nodes, segment, path, here)?;
            return descend(
                &mut nodes[index],
                member,
                rest,
                path,
                &format!("`{segment}`"),
            );
        }
        (Content::Table(entries), Shape::Table(keys)) => {
            let key = find(keys, segment).ok_or_else(|| no_key(keys, segment, path, here))?;
            (entries, &key.shape)
        }
        (Content::Table(entries), Shape::Map(member)) => (entries, *member),
        _ => {
            return Err(PathMistake {
                message: format!("the path `{path}` leads nowhere: {here} holds no names"),
                help: format!("end the path at {here}"),
            });
        }
    };
    let index = if let Some(index) = entries.iter().position(|entry| entry.key == *segment) {
        index
    } else {
        entries.push(absent(segment, shape, rest, &place, path, here)?);
        entries.len() - 1
    };
    descend(
        &mut entries[index].node,
        shape,
        rest,
        path,
        &format!("`{segment}`"),
    )
}

/// Of several shapes, the one that a longer path goes through.
fn settle(shape: &'static Shape, segments: &[String]) -> &'static Shape {
    let Shape::Either(shapes) = shape else {
        return shape;
    };
    let numbered = segments[0].parse::<usize>().is_ok();
    shapes
        .iter()
        .find(|shape| match shape {
            Shape::Table(_) | Shape::Map(_) => !numbered,
            Shape::List(_) => numbered,
            _ => false,
        })
        .unwrap_or(shape)
}

/// An entry for a key that the file leaves at its default.
fn absent(
    segment: &str,
    shape: &'static Shape,
    rest: &[String],
    place: &Place,
    path: &str,
    here: &str,
) -> Result<Entry, PathMistake> {
    let content = match shape {
        _ if rest.is_empty() => Content::Unusable,
        Shape::Table(_) | Shape::Map(_) => Content::Table(Vec::new()),
        Shape::Either(_) if matches!(settle(shape, rest), Shape::Table(_)) => {
            Content::Table(Vec::new())
        }
        _ => {
            return Err(PathMistake {
                message: format!("the path `{path}` leads nowhere: {here} has no `{segment}`"),
                help: format!("give `{segment}` in the file first"),
            });
        }
    };
    let mut place = place.clone();
    place.set_by = Some(path.into());
    Ok(Entry {
        key: segment.to_owned(),
        key_place: place.clone(),
        node: Node { place, content },
    })
}

fn no_key(keys: &'static [Key], segment: &str, path: &str, here: &str) -> PathMistake {
    let names: Vec<&str> = keys.iter().map(|key| key.name).collect();
    PathMistake {
        message: format!("the path `{path}` leads nowhere: {here} has no `{segment}`"),
        help: offer(segment, &names),
    }
}

/// Name of a list member, by which a path can address it.
fn member_name(node: &Node) -> Option<&str> {
    ["name", "label"]
        .into_iter()
        .find_map(|key| node.entry(key)?.node.as_text())
}

fn member_index(
    nodes: &[Node],
    segment: &str,
    path: &str,
    here: &str,
) -> Result<usize, PathMistake> {
    let named = nodes
        .iter()
        .position(|node| member_name(node) == Some(segment));
    let numbered = || {
        let number = segment.parse::<usize>().ok()?;
        (1..=nodes.len()).contains(&number).then(|| number - 1)
    };
    named.or_else(numbered).ok_or_else(|| {
        let names: Vec<&str> = nodes.iter().filter_map(member_name).collect();
        let help = if names.is_empty() {
            format!("use a number from 1 to {}", nodes.len())
        } else {
            offer(segment, &names)
        };
        PathMistake {
            message: format!("the path `{path}` leads nowhere: {here} has no member `{segment}`"),
            help,
        }
    })
}

fn offer(word: &str, names: &[&str]) -> String {
    match super::sink::nearest(word, names.iter().copied()) {
        Some(name) => format!("did you mean `{name}`?"),
        None => format!("known here: {}", names.join(", ")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn paths_split_at_dots_outside_quotes() {
        let path = "truth.worthwhile effect.\"a.b\".x";
        assert_eq!(
            split(path).unwrap(),
            ["truth", "worthwhile effect", "a.b", "x"]
        );
        for wrong in ["", "a..b", "a.", "\"a", "\"a\"b", ".a"] {
            assert!(split(wrong).is_err(), "{wrong}");
        }
    }
}
