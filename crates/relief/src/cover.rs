//! What part of the ground a layer covers: the rings around its valid cells, and their union over several layers.

use crate::clip::{Ring, ring_area};
use geo::{BooleanOps, Contains, Coord, LineString, MultiPolygon, Point, Polygon};

/// Longest piece of a ring's edge, in cells: straight lines of one grid are curved in another.
const LONGEST_EDGE_CELLS: usize = 16;

/// The rings around the valid cells of a grid, in (column, row) post coordinates: outer rings of positive area, holes negative.
pub(crate) fn trace_rings(
    rows: usize,
    cols: usize,
    valid: impl Fn(usize, usize) -> bool,
) -> Vec<Ring> {
    let inside = |r: i64, c: i64| {
        r >= 0
            && c >= 0
            && (r as usize) < rows
            && (c as usize) < cols
            && valid(r as usize, c as usize)
    };
    // directed unit edges, the valid cell on the same side of all: (start, direction)
    let mut edges: Vec<((i64, i64), u8)> = Vec::new();
    for r in 0..rows as i64 {
        for c in 0..cols as i64 {
            if !inside(r, c) {
                continue;
            }
            if !inside(r - 1, c) {
                edges.push(((c, r), 0));
            }
            if !inside(r, c + 1) {
                edges.push(((c + 1, r), 1));
            }
            if !inside(r + 1, c) {
                edges.push(((c + 1, r + 1), 2));
            }
            if !inside(r, c - 1) {
                edges.push(((c, r + 1), 3));
            }
        }
    }
    edges.sort_unstable();
    let mut used = vec![false; edges.len()];
    let mut rings = Vec::new();
    for first in 0..edges.len() {
        if used[first] {
            continue;
        }
        let mut ring = Ring::new();
        let (mut k, mut run, mut last) = (first, 0, u8::MAX);
        loop {
            used[k] = true;
            let ((x, y), direction) = edges[k];
            if direction != last || run >= LONGEST_EDGE_CELLS {
                ring.push([x as f64, y as f64]);
                run = 0;
            }
            run += 1;
            last = direction;
            let next = match direction {
                0 => (x + 1, y),
                1 => (x, y + 1),
                2 => (x - 1, y),
                _ => (x, y - 1),
            };
            let start = edges.partition_point(|e| e.0 < next);
            match (start..edges.len())
                .take_while(|&i| edges[i].0 == next)
                .find(|&i| !used[i])
            {
                Some(i) => k = i,
                None => break,
            }
        }
        rings.push(ring);
    }
    rings
}

/// The rings of the hull of a grid without voids.
pub(crate) fn hull_ring(cells_down: usize, cells_across: usize) -> Ring {
    let (w, h) = (cells_across, cells_down);
    let steps = |n: usize| (0..n).step_by(LONGEST_EDGE_CELLS);
    let mut ring = Ring::new();
    ring.extend(steps(w).map(|x| [x as f64, 0.0]));
    ring.extend(steps(h).map(|y| [w as f64, y as f64]));
    ring.extend(steps(w).map(|x| [(w - x) as f64, h as f64]));
    ring.extend(steps(h).map(|y| [0.0, (h - y) as f64]));
    ring
}

/// Union of regions, each a set of rings with holes of negative area.
pub(crate) fn union(regions: Vec<Vec<Ring>>) -> Vec<Ring> {
    let mut regions = regions.into_iter().filter(|r| !r.is_empty());
    let Some(first) = regions.next() else {
        return Vec::new();
    };
    let mut rest = regions.peekable();
    if rest.peek().is_none() {
        return first;
    }
    let mut sum = to_polygons(first);
    for region in rest {
        sum = sum.union(&to_polygons(region));
    }
    let mut rings = Vec::new();
    for polygon in sum {
        let (outer, holes) = polygon.into_inner();
        rings.push(oriented(&outer, 1.0));
        rings.extend(holes.iter().map(|h| oriented(h, -1.0)));
    }
    rings
}

fn oriented(line: &LineString<f64>, sign: f64) -> Ring {
    let mut ring: Ring = line.0.iter().map(|c| [c.x, c.y]).collect();
    if ring.len() > 1 && ring.first() == ring.last() {
        ring.pop();
    }
    if ring_area(&ring) * sign < 0.0 {
        ring.reverse();
    }
    ring
}

fn to_polygons(rings: Vec<Ring>) -> MultiPolygon<f64> {
    let line = |r: &Ring| LineString(r.iter().map(|p| Coord { x: p[0], y: p[1] }).collect());
    let (outer, holes): (Vec<Ring>, Vec<Ring>) =
        rings.into_iter().partition(|r| ring_area(r) > 0.0);
    let mut polygons: Vec<Polygon<f64>> = outer
        .iter()
        .map(|r| Polygon::new(line(r), vec![]))
        .collect();
    for hole in &holes {
        // the smallest outer ring around the hole's first edge is its own
        let p = Point::new(
            0.5 * (hole[0][0] + hole[1][0]),
            0.5 * (hole[0][1] + hole[1][1]),
        );
        let own = (0..polygons.len())
            .filter(|&k| Polygon::new(polygons[k].exterior().clone(), vec![]).contains(&p))
            .min_by(|&a, &b| ring_area(&outer[a]).total_cmp(&ring_area(&outer[b])));
        if let Some(k) = own {
            polygons[k].interiors_push(line(hole));
        }
    }
    MultiPolygon(polygons)
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    fn area(rings: &[Ring]) -> f64 {
        rings.iter().map(|r| ring_area(r)).sum()
    }

    #[test]
    fn rings_hold_the_valid_cells() {
        // a hole, a corner cut away, and two cells that touch in a point
        let valid = |r: usize, c: usize| {
            let hole = r == 20 && (30..35).contains(&c);
            let corner = r < 3 && c < 4;
            let touching = (r, c) == (40, 10) || (r, c) == (41, 11);
            !(hole || corner || touching)
        };
        let rings = trace_rings(50, 70, valid);
        assert_relative_eq!(area(&rings), 50.0 * 70.0 - 5.0 - 12.0 - 2.0);
        assert_relative_eq!(
            area(&trace_rings(50, 70, |_, _| true)),
            area(&[hull_ring(50, 70)])
        );
    }

    #[test]
    fn union_counts_overlap_once() {
        let a = trace_rings(10, 10, |r, c| !(r == 5 && c == 5));
        let mut b = trace_rings(10, 10, |_, _| true);
        for p in b.iter_mut().flatten() {
            p[0] += 5.0;
        }
        // the hole at (5, 5) lies in b as well
        assert_relative_eq!(area(&union(vec![a, b])), 150.0, max_relative = 1e-9);
    }
}
