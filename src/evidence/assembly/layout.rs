//! Blocks of lines and the segments they form with the readings.

use super::Stock;

/// One line, or a chain of lines of several members closer than the merge width.
#[derive(Debug, Clone)]
pub(super) enum Block {
    Single {
        member: usize,
        line: usize,
        /// (pair, local reading)
        pairs: Vec<(usize, usize)>,
    },
    Chain {
        /// (member, line)
        parts: Vec<(usize, usize)>,
        /// Local readings within reach.
        reach: Vec<usize>,
        width_nm: f64,
    },
}

/// Blocks and readings that are connected.
#[derive(Debug, Clone)]
pub struct Segment {
    pub(super) blocks: Vec<Block>,
    /// Global indices, ascending.
    pub readings: Vec<usize>,
    /// Members (positions in the composition) with a line here, ascending.
    pub members: Vec<usize>,
    /// (member, emitter) with a line here.
    pub emitters: Vec<(usize, usize)>,
}

/// Single lines and chains, in ascending wavelength; single lines that reach no reading are left
/// out (their missing factors are counted elsewhere).
pub(super) fn blocks(stock: &Stock, members: &[usize]) -> Vec<Block> {
    let mut all: Vec<(f64, usize, usize)> = members
        .iter()
        .enumerate()
        .flat_map(|(m, candidate)| {
            let lines = &stock.prepared[*candidate].lines;
            lines
                .iter()
                .enumerate()
                .map(move |(i, line)| (line.wavelength_nm, m, i))
        })
        .collect();
    all.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let mut blocks = Vec::new();
    let mut start = 0;
    while start < all.len() {
        let mut end = start + 1;
        let width = |x: f64| stock.scene.merge_width(x);
        while end < all.len()
            && all[end].0 - all[end - 1].0 < width(0.5 * (all[end].0 + all[end - 1].0))
        {
            end += 1;
        }
        let chain = &all[start..end];
        if chain.iter().any(|c| c.1 != chain[0].1) {
            blocks.push(Block::Chain {
                parts: chain.iter().map(|(_, m, i)| (*m, *i)).collect(),
                reach: Vec::new(),
                width_nm: width(0.5 * (chain[0].0 + chain[chain.len() - 1].0)),
            });
        } else {
            for (_, member, line) in chain {
                let pairs: Vec<(usize, usize)> = pairs_of(stock, members, *member, *line).collect();
                if !pairs.is_empty() {
                    blocks.push(Block::Single {
                        member: *member,
                        line: *line,
                        pairs,
                    });
                }
            }
        }
        start = end;
    }
    blocks
}

/// (pair, global reading) of one line; pairs are sorted by line.
fn pairs_of<'s>(
    stock: &'s Stock,
    members: &[usize],
    member: usize,
    line: usize,
) -> impl Iterator<Item = (usize, usize)> + 's {
    let pairs = &stock.prepared[members[member]].pairs;
    let first = pairs.partition_point(|p| p.line < line);
    pairs[first..]
        .iter()
        .take_while(move |p| p.line == line)
        .enumerate()
        .map(move |(i, p)| (first + i, p.reading))
}

/// Groups blocks that share readings, directly or through others.
pub(super) fn segments(stock: &Stock, members: &[usize], blocks: Vec<Block>) -> Vec<Segment> {
    let reach_of = |block: &Block| -> Vec<usize> {
        match block {
            Block::Single { pairs, .. } => pairs.iter().map(|(_, reading)| *reading).collect(),
            Block::Chain { parts, .. } => {
                let mut all: Vec<usize> = parts
                    .iter()
                    .flat_map(|(m, line)| {
                        pairs_of(stock, members, *m, *line).map(|(_, reading)| reading)
                    })
                    .collect();
                all.sort_unstable();
                all.dedup();
                all
            }
        }
    };
    let reaches: Vec<Vec<usize>> = blocks.iter().map(reach_of).collect();
    let group = group_by_readings(&reaches, stock.scene.observations.len());
    let mut parts: Vec<Vec<(Block, Vec<usize>)>> = Vec::new();
    let mut place: std::collections::BTreeMap<usize, usize> = Default::default();
    for ((block, reach), key) in blocks.into_iter().zip(reaches).zip(group) {
        let at = *place.entry(key).or_insert_with(|| {
            parts.push(Vec::new());
            parts.len() - 1
        });
        parts[at].push((block, reach));
    }
    parts
        .into_iter()
        .map(|p| segment(stock, members, p))
        .collect()
}

/// A key per block; blocks with the same key belong together. Blocks without readings stand alone.
fn group_by_readings(reaches: &[Vec<usize>], readings: usize) -> Vec<usize> {
    let mut root: Vec<usize> = (0..readings + reaches.len()).collect();
    fn find(root: &mut [usize], mut x: usize) -> usize {
        while root[x] != x {
            root[x] = root[root[x]];
            x = root[x];
        }
        x
    }
    for (b, reach) in reaches.iter().enumerate() {
        for j in reach {
            let (p, q) = (find(&mut root, readings + b), find(&mut root, *j));
            root[p.max(q)] = p.min(q);
        }
    }
    (0..reaches.len())
        .map(|b| find(&mut root, readings + b))
        .collect()
}

fn segment(stock: &Stock, members: &[usize], parts: Vec<(Block, Vec<usize>)>) -> Segment {
    let mut readings: Vec<usize> = parts
        .iter()
        .flat_map(|(_, reach)| reach.iter().copied())
        .collect();
    readings.sort_unstable();
    readings.dedup();
    let local = |global: usize| readings.binary_search(&global).unwrap_or(0);
    let mut blocks = Vec::with_capacity(parts.len());
    let mut owners: Vec<(usize, usize)> = Vec::new();
    for (block, reach) in parts {
        let emitter = |m: usize, line: usize| stock.prepared[members[m]].lines[line].emitter;
        blocks.push(match block {
            Block::Single {
                member,
                line,
                pairs,
            } => {
                owners.push((member, emitter(member, line)));
                let pairs = pairs
                    .into_iter()
                    .map(|(pair, j)| (pair, local(j)))
                    .collect();
                Block::Single {
                    member,
                    line,
                    pairs,
                }
            }
            Block::Chain {
                parts, width_nm, ..
            } => {
                owners.extend(parts.iter().map(|(m, line)| (*m, emitter(*m, *line))));
                Block::Chain {
                    parts,
                    reach: reach.into_iter().map(local).collect(),
                    width_nm,
                }
            }
        });
    }
    owners.sort_unstable();
    owners.dedup();
    let mut present: Vec<usize> = owners.iter().map(|(m, _)| *m).collect();
    present.dedup();
    Segment {
        blocks,
        readings,
        members: present,
        emitters: owners,
    }
}
