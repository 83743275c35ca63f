/**
 * The codebook of a results folder, for programs (`codebook.json`) and for people (`codebook.md`).
 *
 * The JSON is a Data Package whose resources carry a Table Schema (Frictionless standards), with `unit` and `formula`
 * added to each field. Both come from the same tables the files are written from, so they cannot disagree with them.
 */
import type { Field } from './field.js';
import type { Table } from './tables.js';

export interface CodebookOptions {
  /** Title of the study. */
  readonly title: string;
  /** Version of the program. */
  readonly version: string;
  readonly tables: readonly Table[];
  /** Names of the files in the folder; a table without a file is left out. */
  readonly files: readonly string[];
}

/** One field in the manner of Table Schema. */
interface SchemaField {
  readonly name: string;
  readonly type: 'integer' | 'number' | 'string';
  readonly title: string;
  readonly description: string;
  readonly unit: string;
  readonly formula: string;
  readonly constraints: { readonly required: boolean; readonly minimum?: number; readonly enum?: readonly number[] };
}

/** A table with its file, as `codebook.json` has it. */
export interface Resource {
  readonly name: string;
  readonly path: string;
  /** The same rows in another format. */
  readonly alsoAs?: readonly string[];
  readonly format: 'csv' | 'parquet';
  readonly mediatype: string;
  readonly encoding: 'utf-8';
  readonly title: string;
  readonly description: string;
  readonly schema: {
    readonly fields: readonly SchemaField[];
    readonly primaryKey: readonly string[];
    readonly missingValues: readonly [''];
  };
}

/** `codebook.json` as it reads. */
export interface Codebook {
  readonly name: string;
  readonly title: string;
  readonly description: string;
  readonly version: string;
  readonly conventions: readonly { readonly title: string; readonly text: string }[];
  readonly resources: readonly Resource[];
}

/** What holds for all tables. */
export const CONVENTIONS: Codebook['conventions'] = [
  {
    title: 'Empty cells',
    text: 'A value that does not exist is null in Parquet and nothing between the commas in CSV; it is never 0 or a code.',
  },
  {
    title: 'Numbers',
    text: 'Numbers are IEEE doubles. CSV writes the fewest digits that read back to the same double; infinities are INF and -INF. Parquet and CSV hold the same doubles.',
  },
  { title: 'Flags', text: '1 = yes, 0 = no.' },
  {
    title: 'Numbers of households, places, replicates, generations',
    text: 'Count from 0 and never change: household 17 of replicate 3 is the same dynasty in every arm and generation.',
  },
  {
    title: 'Shared luck',
    text: 'All arms of a replicate have the same households, initial wealth and shocks, so arms are compared pair by pair.',
  },
  {
    title: 'Ties',
    text: 'Means over ties, Moran’s I, join counts, assortativities and economic connectedness count every tie the same; weights of ties enter reference groups only. A household without ties has no such mean.',
  },
  {
    title: 'Ranks and fifths',
    text: 'Equal wealth shares the average rank. Rank 0 is the poorest, 1 the richest; fifth 1 is the poorest.',
  },
  {
    title: 'Thinned panels',
    text: 'keep.panel keeps the first replicates, every k-th generation from 0, and households spread evenly over their numbers; all other tables use everyone.',
  },
  {
    title: 'Growth',
    text: 'Growth is a gross factor per generation: 1.25 is 25 % more. The yearly rate is growth^(1/years_per_generation) − 1.',
  },
  {
    title: 'Regressions',
    text: 'Classical errors: RSS/(n − k). HC1: n/(n − k). HC3: e²/(1 − h)². k counts absorbed effects (levels less connected components). Clustered: G/(G − 1)·(n − 1)/(n − k), effects nested in a cluster not counted, t with G − 1 degrees of freedom; two-way by inclusion and exclusion with the smaller G in one factor, negative eigenvalues set to zero and said so. Effects are absorbed by alternating projections to 1e−10 after rows alone in their group are dropped; columns collinear with those before them at 1e−9 are dropped and named. Logit: normal tests unless clustered; marginal effects are averages, every term taken as continuous. Instruments: two-stage least squares with RSS/(n − k); Wu–Hausman in its regression form, Sargan n·R², Hansen J at the two-step estimate; effective F after Montiel Olea and Pflueger.',
  },
];

function schemaField(field: Field): SchemaField {
  const constraints = {
    required: field.missing === null,
    ...(field.type === 'integer' ? { minimum: 0 } : {}),
    ...(field.type === 'flag' ? { enum: [0, 1] } : {}),
  };
  return {
    name: field.name,
    type: field.type === 'text' ? 'string' : field.type === 'number' ? 'number' : 'integer',
    title: words(field.name),
    description: field.missing === null ? field.meaning : `${field.meaning} Empty: ${field.missing}.`,
    unit: field.unit,
    formula: field.formula,
    constraints,
  };
}

/** A column name in words: `aspiration_1` → `Aspiration 1`. */
function words(name: string): string {
  const text = name.replaceAll('_', ' ');
  return text.charAt(0).toUpperCase() + text.slice(1);
}

const MEDIA_TYPE = { csv: 'text/csv', parquet: 'application/vnd.apache.parquet' } as const;

function resource(table: Table, files: ReadonlySet<string>): Resource | null {
  const formats = (['csv', 'parquet'] as const).filter((format) => files.has(`${table.name}.${format}`));
  const [format, ...others] = formats;
  if (format === undefined) return null;
  return {
    name: table.name,
    path: `${table.name}.${format}`,
    ...(others.length > 0 ? { alsoAs: others.map((other) => `${table.name}.${other}`) } : {}),
    format,
    mediatype: MEDIA_TYPE[format],
    encoding: 'utf-8',
    title: table.title,
    description: `One row per ${table.rowPer}.`,
    schema: { fields: table.fields.map(schemaField), primaryKey: table.key, missingValues: [''] },
  };
}

/** A Data Package name: lower case letters, digits and dashes. */
function packageName(title: string): string {
  const name = title
    .normalize('NFKD')
    .toLowerCase()
    .replace(/[^a-z0-9]+/g, '-')
    .replace(/^-+|-+$/g, '');
  return name === '' ? 'study' : name;
}

/** Both codebooks as text. */
export function codebook(options: CodebookOptions): { json: string; markdown: string } {
  const files = new Set(options.files);
  const resources = options.tables.map((table) => resource(table, files)).filter((found) => found !== null);
  const book: Codebook = {
    name: packageName(options.title),
    title: options.title,
    description: 'Tables of a simulated study: what each column says, its unit and how it is computed.',
    version: options.version,
    conventions: CONVENTIONS,
    resources,
  };
  return { json: `${JSON.stringify(book, null, 2)}\n`, markdown: markdown(book) };
}

function cell(text: string): string {
  return text.replaceAll('|', '\\|').replaceAll('\n', ' ');
}

function markdown(book: Codebook): string {
  const lines = [`# Codebook: ${book.title}`, '', book.description, '', '## Conventions', ''];
  for (const { title, text } of book.conventions) lines.push(`- **${title}.** ${text}`);
  for (const table of book.resources) {
    const paths = [table.path, ...(table.alsoAs ?? [])].map((path) => `\`${path}\``).join(', ');
    lines.push('', `## ${table.title}`, '', `${paths}. ${table.description}`, '');
    lines.push('| column | type | unit | meaning | formula |', '|---|---|---|---|---|');
    for (const field of table.schema.fields) {
      const type = field.constraints.enum === undefined ? field.type : '0/1';
      lines.push(
        `| \`${field.name}\` | ${type} | ${cell(field.unit)} | ${cell(field.description)} | ${cell(field.formula)} |`,
      );
    }
  }
  return `${lines.join('\n')}\n`;
}
