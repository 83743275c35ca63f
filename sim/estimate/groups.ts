/**
 * Groupings of rows (places, generations, clusters): compact codes, singletons, nesting and rank.
 */

/** Rows 0 … n−1 sorted into `count` groups. */
export interface Groups {
  readonly name: string;
  /** Group of every row, 0 … count−1, every code used. */
  readonly codes: Int32Array;
  readonly count: number;
}

/** Recodes values so that every code 0 … count−1 is used, in order of first appearance. Cost O(n). */
export function groupsOf(name: string, values: Int32Array | Float64Array, rows?: Int32Array): Groups {
  const n = rows ? rows.length : values.length;
  const codes = new Int32Array(n);
  // one pass for the range: whole numbers in a narrow range are recoded by table, far quicker than by hash
  let low = Infinity;
  let high = -Infinity;
  let whole = true;
  for (let r = 0; r < n; r++) {
    const v = values[rows ? rows[r] : r];
    if (v < low) low = v;
    if (v > high) high = v;
    if (v !== Math.floor(v)) whole = false;
  }
  let count = 0;
  if (whole && high - low < 4 * n + 1024) {
    const table = new Int32Array(n > 0 ? high - low + 1 : 0).fill(-1);
    for (let r = 0; r < n; r++) {
      const v = values[rows ? rows[r] : r] - low;
      if (table[v] < 0) table[v] = count++;
      codes[r] = table[v];
    }
  } else {
    const seen = new Map<number, number>();
    for (let r = 0; r < n; r++) {
      const v = values[rows ? rows[r] : r];
      let code = seen.get(v);
      if (code === undefined) {
        code = count++;
        seen.set(v, code);
      }
      codes[r] = code;
    }
  }
  return { name, codes, count };
}

/** The groups of a subset of rows, recoded. */
export function selectGroups(groups: Groups, rows: Int32Array): Groups {
  return groupsOf(groups.name, groups.codes, rows);
}

/** Cells of two groupings: rows that agree in both. Codes up to a product of 2^53. */
export function cells(a: Groups, b: Groups): Groups {
  const n = a.codes.length;
  const joint = new Float64Array(n);
  for (let i = 0; i < n; i++) joint[i] = a.codes[i] * b.count + b.codes[i];
  return groupsOf(`${a.name} × ${b.name}`, joint);
}

/**
 * Rows left once groups of a single row are dropped, again and again until none is left: such a row is fitted
 * exactly by its own effect and only flatters the degrees of freedom (Correia 2015).
 *
 * @returns the rows kept, ascending, or undefined when every row stays
 */
export function withoutSingletons(effects: readonly Groups[], n: number): Int32Array | undefined {
  const alive = new Uint8Array(n).fill(1);
  let left = n;
  for (let again = effects.length > 0; again; ) {
    again = false;
    for (const effect of effects) {
      const size = new Int32Array(effect.count);
      for (let i = 0; i < n; i++) if (alive[i]) size[effect.codes[i]]++;
      for (let i = 0; i < n; i++) {
        if (alive[i] && size[effect.codes[i]] === 1) {
          alive[i] = 0;
          left--;
          again = effects.length > 1;
        }
      }
    }
  }
  if (left === n) return undefined;
  const rows = new Int32Array(left);
  for (let i = 0, r = 0; i < n; i++) if (alive[i]) rows[r++] = i;
  return rows;
}

/** Whether every group of `inner` lies within one group of `outer`. */
export function nestedIn(inner: Groups, outer: Groups): boolean {
  const home = new Int32Array(inner.count).fill(-1);
  for (let i = 0; i < inner.codes.length; i++) {
    const g = inner.codes[i];
    if (home[g] < 0) home[g] = outer.codes[i];
    else if (home[g] !== outer.codes[i]) return false;
  }
  return true;
}

/**
 * Rank of the dummies of several groupings, a constant being in their span: exact for one or two (levels minus the
 * connected components that a second grouping forms with the first; Abowd, Creecy and Kramarz 2002), and for three
 * or more an upper bound that takes off, for each, the most components it forms with any one before it.
 */
export function effectsRank(effects: readonly Groups[]): number {
  let rank = 0;
  effects.forEach((effect, e) => {
    let redundant = 0;
    for (let before = 0; before < e; before++) redundant = Math.max(redundant, components(effects[before], effect));
    rank += effect.count - redundant;
  });
  return rank;
}

/** Connected components of the bipartite graph of two groupings. */
function components(a: Groups, b: Groups): number {
  const parent = new Int32Array(a.count + b.count);
  for (let i = 0; i < parent.length; i++) parent[i] = i;
  const find = (x: number): number => {
    let at = x;
    while (parent[at] !== at) {
      parent[at] = parent[parent[at]];
      at = parent[at];
    }
    return at;
  };
  let count = parent.length;
  for (let i = 0; i < a.codes.length; i++) {
    const p = find(a.codes[i]);
    const q = find(a.count + b.codes[i]);
    if (p !== q) {
      parent[p] = q;
      count--;
    }
  }
  return count;
}
