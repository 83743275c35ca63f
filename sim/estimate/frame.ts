/**
 * Columns of rows as regressions read them: numbers with NaN for missing, text as codes with −1 for missing; and where
 * they come from.
 */

export interface NumberColumn {
  readonly kind: 'number';
  readonly values: Float64Array;
}

export interface TextColumn {
  readonly kind: 'text';
  readonly codes: Int32Array;
  readonly levels: readonly string[];
}

export type Column = NumberColumn | TextColumn;

/** Rows with some of their columns. */
export interface Frame {
  readonly rows: number;
  readonly columns: ReadonlyMap<string, Column>;
}

/** Where rows come from: a results folder, a table, memory. */
export interface FrameSource {
  /** For messages. */
  readonly place: string;
  /** Every column there is, with its kind. */
  readonly kinds: ReadonlyMap<string, Column['kind']>;
  /** Arms in order; null when there is no such column. */
  readonly arms: readonly string[] | null;
  /** Replicates in order; null when there is no such column. */
  readonly replicates: readonly number[] | null;
  /** Seed of the study, for survey draws. */
  readonly seed: string;
  /** Rows of some arms (null: all) in one replicate (null: all), with the columns named. */
  read(names: readonly string[], arms: readonly string[] | null, replicate: number | null): Promise<Frame>;
}

/** Missing where `values` are NaN. */
export function numberColumn(values: Float64Array): NumberColumn {
  return { kind: 'number', values };
}

/** Codes of texts, in order of first appearance; null is missing. */
export function textColumn(texts: readonly (string | null)[]): TextColumn {
  const known = new Map<string, number>();
  const codes = new Int32Array(texts.length);
  texts.forEach((text, i) => {
    if (text === null) {
      codes[i] = -1;
      return;
    }
    let code = known.get(text);
    if (code === undefined) known.set(text, (code = known.size));
    codes[i] = code;
  });
  return { kind: 'text', codes, levels: [...known.keys()] };
}

/** Rows of a column by index; −1 gives missing. */
export function pick(column: Column, rows: Int32Array): Column {
  if (column.kind === 'number') {
    const values = new Float64Array(rows.length);
    for (let r = 0; r < rows.length; r++) values[r] = rows[r] < 0 ? NaN : column.values[rows[r]];
    return { kind: 'number', values };
  }
  const codes = new Int32Array(rows.length);
  for (let r = 0; r < rows.length; r++) codes[r] = rows[r] < 0 ? -1 : column.codes[rows[r]];
  return { kind: 'text', codes, levels: column.levels };
}

/** A source over rows already in memory; `arm` (text) and `replicate` (number) columns, if any, split it. */
export function frameSource(frame: Frame, place: string, seed = 'table'): FrameSource {
  const arm = frame.columns.get('arm');
  const replicate = frame.columns.get('replicate');
  const arms = arm?.kind === 'text' ? arm : null;
  const replicates = replicate?.kind === 'number' ? replicate : null;
  return {
    place,
    seed,
    kinds: new Map([...frame.columns].map(([name, column]) => [name, column.kind])),
    arms: arms ? arms.levels : null,
    replicates: replicates
      ? [...new Set(replicates.values)].filter((v) => !Number.isNaN(v)).sort((a, b) => a - b)
      : null,
    async read(names, wantedArms, wantedReplicate) {
      const codes = wantedArms && arms ? new Set(wantedArms.map((name) => arms.levels.indexOf(name))) : null;
      const whole = codes === null && (wantedReplicate === null || replicates === null);
      if (whole) {
        return { rows: frame.rows, columns: new Map(names.map((name) => [name, frame.columns.get(name) as Column])) };
      }
      const kept: number[] = [];
      for (let i = 0; i < frame.rows; i++) {
        if (codes && arms && !codes.has(arms.codes[i])) continue;
        if (wantedReplicate !== null && replicates && replicates.values[i] !== wantedReplicate) continue;
        kept.push(i);
      }
      const rows = Int32Array.from(kept);
      return {
        rows: rows.length,
        columns: new Map(names.map((name) => [name, pick(frame.columns.get(name) as Column, rows)])),
      };
    },
  };
}
