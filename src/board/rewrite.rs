//! Puts other terminating parts and driver settings into the text of a board file, and leaves the rest of it alone.
//!
//! Lines that go are kept as comments, and comments stay where they are. What comes out is read again: if it does not
//! say exactly the nets that were wanted, nothing is given.

use super::{Board, Net, PathItem, Series, Shunt, read_board};
use crate::text::{Document, Key, Node, Value, farads, henries, ohms, parse_yaml, volts};

/// Marks the lines that were put in.
const PUT_IN: &str = "  # put in";
/// Marks the lines that were taken out.
const TAKEN_OUT: &str = "# taken out: ";

/// Why a board file cannot be rewritten.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("cannot put the change of net `{net}` into `{file}`: {reason}")]
pub struct RewriteError {
    /// The net.
    pub net: String,
    /// The file.
    pub file: String,
    /// Why not.
    pub reason: String,
}

/// The text of a board file with some nets changed: other series and shunt parts, another setting of the driver. The
/// remark, a line of plain text, is put on top as a comment.
///
/// # Errors
///
/// A net whose description is not in this file as a list of items, or whose change is another than that.
pub fn rewrite_board(
    text: &str,
    file: &str,
    changed: &[Net],
    remark: &str,
) -> Result<String, RewriteError> {
    let error = |net: &str, reason: &str| RewriteError {
        net: net.into(),
        file: file.into(),
        reason: reason.into(),
    };
    let first = changed.first().map_or("", |net| net.name.as_str());
    let (Ok(document), Some(board)) = (parse_yaml(text, file), read_board(text, file).board) else {
        return Err(error(first, "it cannot be read"));
    };
    let mut edits = Edits {
        text,
        document: &document,
        newline: if text.contains("\r\n") { "\r\n" } else { "\n" },
        edits: Vec::new(),
    };
    for net in changed {
        let is_net = |old: &&Net| old.name == net.name;
        let old = board
            .nets
            .iter()
            .find(is_net)
            .ok_or_else(|| error(&net.name, "it has no such net"))?;
        edits
            .net(old, net)
            .ok_or_else(|| error(&net.name, "the net is not written there as a list of items"))?;
    }
    let newline = edits.newline;
    let rewritten = format!("# {remark}{newline}{}", edits.made());
    match first_difference(&rewritten, file, &board, changed) {
        None => Ok(rewritten),
        Some(net) => Err(error(&net, "the way it is written there does not allow it")),
    }
}

/// The first net that the rewritten text does not describe as it should.
fn first_difference(text: &str, file: &str, old: &Board, changed: &[Net]) -> Option<String> {
    let new = read_board(text, file).board;
    old.nets.iter().find_map(|old| {
        let wanted = changed
            .iter()
            .find(|net| net.name == old.name)
            .unwrap_or(old);
        let is_said = new.as_ref().is_some_and(|new| new.nets.contains(wanted));
        (!is_said).then(|| old.name.clone())
    })
}

/// Changes of a text, collected before any is made.
struct Edits<'t> {
    text: &'t str,
    document: &'t Document<'t>,
    newline: &'static str,
    /// Byte ranges and what goes there.
    edits: Vec<(usize, usize, String)>,
}

/// How an item of a list stands in the text.
enum Item {
    /// Behind a dash: from the start of its first line to the end of its last one.
    Block {
        start: usize,
        end: usize,
        indent: usize,
    },
    /// Between brackets.
    Flow { start: usize, end: usize },
}

impl Edits<'_> {
    /// The text with all changes made.
    fn made(mut self) -> String {
        self.edits.sort_by_key(|(start, end, _)| (*start, *end));
        let mut text = String::with_capacity(self.text.len() + 256);
        let mut done = 0;
        for (start, end, new) in &self.edits {
            text.push_str(&self.text[done.min(*start)..*start]);
            text.push_str(new);
            done = (*end).max(done);
        }
        text.push_str(&self.text[done..]);
        text
    }

    fn net(&mut self, old: &Net, new: &Net) -> Option<()> {
        let fields = net_fields(&self.document.root, &old.name)?;
        let field = |name: &str| fields.iter().find(|(key, _)| key.text == name);
        if old.path != new.path {
            let Value::List(nodes) = &field("path")?.1.value else {
                return None;
            };
            self.items(&old.path, &new.path, nodes)?;
        }
        if old.driver.setting != new.driver.setting {
            let setting = new.driver.setting.as_ref()?;
            match field("setting") {
                Some((key, _)) => self.replace_value(key, setting)?,
                None => self.add_field(&field("driver")?.0, &format!("setting: {setting}"))?,
            }
        }
        Some(())
    }

    /// Walks along both lists: what differs is a part that goes or one that comes.
    fn items(&mut self, old: &[PathItem], new: &[PathItem], nodes: &[Node]) -> Option<()> {
        let mut news = new.iter().peekable();
        for (item, node) in old.iter().zip(nodes) {
            let place = self.item(node)?;
            loop {
                match (item, news.peek()) {
                    (item, Some(new)) if item == *new => {
                        news.next();
                        break;
                    }
                    (PathItem::Branch(old), Some(PathItem::Branch(new))) => {
                        let Value::Map(entries) = &node.value else {
                            return None;
                        };
                        let Value::List(inner) = &entries.first()?.1.value else {
                            return None;
                        };
                        self.items(old, new, inner)?;
                        news.next();
                        break;
                    }
                    (PathItem::Series(_) | PathItem::Shunt(_) | PathItem::Branch(_), _) => {
                        self.take_out(&place);
                        break;
                    }
                    (_, Some(new)) => {
                        self.put_before(&place, &written(new)?);
                        news.next();
                    }
                    (_, None) => return None,
                }
            }
        }
        let last = self.item(nodes.last()?)?;
        for new in news {
            self.put_after(&last, &written(new)?);
        }
        Some(())
    }

    /// Finds an item of a list in the text: by its key, and what stands before that.
    fn item(&self, node: &Node) -> Option<Item> {
        let Value::Map(entries) = &node.value else {
            return None;
        };
        let key = self.offset(&entries.first()?.0)?;
        let before = self.text[..key].trim_end_matches(' ');
        let start = before.strip_suffix('{').map_or(key, str::len);
        let before = self.text[..start].trim_end_matches(' ');
        let line = line_start(self.text, start);
        if let Some(dash) = before.strip_suffix('-')
            && dash.len() >= line
            && self.text[line..dash.len()].trim().is_empty()
        {
            let indent = dash.len() - line;
            return Some(Item::Block {
                start: line,
                end: block_end(self.text, line, indent),
                indent,
            });
        }
        Some(Item::Flow {
            start,
            end: flow_end(self.text, start),
        })
    }

    fn put_before(&mut self, item: &Item, new: &str) {
        match item {
            Item::Block { start, indent, .. } => {
                let line = format!("{}- {new}{PUT_IN}{}", " ".repeat(*indent), self.newline);
                self.edits.push((*start, *start, line));
            }
            Item::Flow { start, .. } => {
                self.edits.push((*start, *start, format!("{{{new}}}, ")));
            }
        }
    }

    fn put_after(&mut self, item: &Item, new: &str) {
        match item {
            Item::Block { end, indent, .. } => {
                let is_open = !self.text[..*end].ends_with('\n');
                let before = if is_open { self.newline } else { "" };
                let line = format!(
                    "{before}{}- {new}{PUT_IN}{}",
                    " ".repeat(*indent),
                    self.newline
                );
                self.edits.push((*end, *end, line));
            }
            Item::Flow { end, .. } => self.edits.push((*end, *end, format!(", {{{new}}}"))),
        }
    }

    fn take_out(&mut self, item: &Item) {
        match item {
            Item::Block { start, end, indent } => {
                let mut line = *start;
                for text in self.text[*start..*end].split_inclusive('\n') {
                    let at = line + (*indent).min(text.trim_end().len());
                    if !text.trim().is_empty() {
                        self.edits.push((at, at, TAKEN_OUT.into()));
                    }
                    line += text.len();
                }
            }
            Item::Flow { start, end } => {
                let after = &self.text[*end..];
                let comma = after.trim_start().strip_prefix(',');
                let (from, to) = match comma {
                    Some(rest) => (*start, self.text.len() - rest.trim_start_matches(' ').len()),
                    // The last one takes the comma before it along.
                    None => {
                        let before = self.text[..*start].trim_end();
                        (before.strip_suffix(',').unwrap_or(before).len(), *end)
                    }
                };
                self.edits.push((from, to, String::new()));
            }
        }
    }

    /// Another value for a field that stands on one line.
    fn replace_value(&mut self, key: &Key, new: &str) -> Option<()> {
        let key = self.offset(key)?;
        let colon = key + self.text[key..].find(':')? + 1;
        let rest = &self.text[colon..];
        let length = rest.find([',', '}', '#', '\n', '\r']).unwrap_or(rest.len());
        let value = rest[..length].trim_end();
        self.edits
            .push((colon, colon + value.len(), format!(" {new}")));
        Some(())
    }

    /// A field of its own beside another one.
    fn add_field(&mut self, beside: &Key, field: &str) -> Option<()> {
        let key = self.offset(beside)?;
        let line = line_start(self.text, key);
        let lead = &self.text[line..key];
        if lead
            .trim_start_matches(' ')
            .trim_start_matches('-')
            .trim()
            .is_empty()
        {
            let end = self.text[key..]
                .find('\n')
                .map_or(self.text.len(), |at| key + at + 1);
            let is_open = !self.text[..end].ends_with('\n');
            let before = if is_open { self.newline } else { "" };
            let indent = " ".repeat(lead.len());
            let line = format!("{before}{indent}{field}{PUT_IN}{}", self.newline);
            self.edits.push((end, end, line));
        } else {
            self.edits.push((key, key, format!("{field}, ")));
        }
        Some(())
    }

    /// Where a key begins, in bytes.
    fn offset(&self, key: &Key) -> Option<usize> {
        let place = self.document.place_of(key)?;
        let line: usize = (self.text.split_inclusive('\n').take(place.line - 1))
            .map(str::len)
            .sum();
        let mut characters = self.text[line..].char_indices();
        let offset = line + characters.nth(place.column - 1)?.0;
        // Quoted keys would begin one later.
        self.text[offset..].starts_with(&key.text).then_some(offset)
    }
}

/// The fields of a net.
fn net_fields<'d>(root: &'d Node, name: &str) -> Option<&'d [(Key, Node)]> {
    let Value::Map(entries) = &root.value else {
        return None;
    };
    let Value::List(nets) = &entries.iter().find(|(key, _)| key.text == "nets")?.1.value else {
        return None;
    };
    nets.iter().find_map(|net| match &net.value {
        Value::Map(fields) => {
            let is_it = |(key, node): &(Key, Node)| {
                key.text == "name" && node.scalar().as_deref() == Some(name)
            };
            fields.iter().any(is_it).then_some(fields.as_slice())
        }
        _ => None,
    })
}

fn line_start(text: &str, offset: usize) -> usize {
    text[..offset].rfind('\n').map_or(0, |end| end + 1)
}

/// Where the last line ends that belongs to the item behind the dash at `indent` on the line at `start`.
fn block_end(text: &str, start: usize, indent: usize) -> usize {
    let mut lines = text[start..].split_inclusive('\n');
    let mut end = start + lines.next().map_or(0, str::len);
    let mut at = end;
    for line in lines {
        at += line.len();
        let content = line.trim();
        if content.is_empty() || content.starts_with('#') {
            continue;
        }
        if line.len() - line.trim_start_matches(' ').len() <= indent {
            break;
        }
        end = at;
    }
    end
}

/// Where the item that starts here ends, before the comma or bracket after it.
fn flow_end(text: &str, start: usize) -> usize {
    let (mut depth, mut quote) = (0, None);
    for (offset, c) in text[start..].char_indices() {
        match (quote, c) {
            (Some(open), c) if c == open => quote = None,
            (Some(_), _) => {}
            (None, '"' | '\'') => quote = Some(c),
            (None, '{' | '[') => depth += 1,
            (None, ',' | '}' | ']') if depth == 0 => {
                return start + text[start..start + offset].trim_end().len();
            }
            (None, '}' | ']') => depth -= 1,
            _ => {}
        }
    }
    text.len()
}

/// A terminating part as it is written in a path.
fn written(item: &PathItem) -> Option<String> {
    match item {
        PathItem::Series(Series {
            resistance_ohm,
            inductance_h,
        }) if *inductance_h > 0.0 => Some(format!(
            "series: {{resistance: {}, inductance: {}}}",
            ohms(*resistance_ohm),
            henries(*inductance_h)
        )),
        PathItem::Series(part) => Some(format!("series: {}", ohms(part.resistance_ohm))),
        PathItem::Shunt(Shunt {
            resistance_ohm,
            capacitance_f,
            inductance_h,
            to_v,
        }) => {
            let mut fields = vec![format!("resistance: {}", ohms(*resistance_ohm))];
            fields.extend(capacitance_f.map(|farad| format!("capacitance: {}", farads(farad))));
            if *inductance_h > 0.0 {
                fields.push(format!("inductance: {}", henries(*inductance_h)));
            }
            if *to_v != 0.0 {
                fields.push(format!("to: {}", volts(*to_v)));
            }
            Some(format!("shunt: {{{}}}", fields.join(", ")))
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests;
