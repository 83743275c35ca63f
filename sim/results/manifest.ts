/**
 * `manifest.json`: what a results folder is of, whether it is whole, and the size and hash of each file.
 *
 * Two runs of the same study by the same version give manifests that differ in `started`, `seconds` and
 * `peak_memory_bytes` alone.
 */

/** What is known when a run starts. */
export interface ManifestHead {
  /** Version of the program. */
  readonly version: string;
  /** Title of the study. */
  readonly study: string;
  /** SHA-256 of the canonical study (studyHash). */
  readonly studyHash: string;
  readonly seed: string;
  /** Names of the arms, in order. */
  readonly arms: readonly string[];
  readonly replicates: number;
  readonly generations: number;
  readonly households: number;
  /** Time of the start, ISO 8601. */
  readonly started: string;
}

export interface ManifestFile {
  readonly name: string;
  readonly bytes: number;
  /** SHA-256, hexadecimal. */
  readonly sha256: string;
}

/** The file as it reads. */
export interface Manifest {
  readonly program: 'rungsight';
  readonly version: string;
  readonly study: string;
  readonly study_hash: string;
  readonly seed: string;
  readonly arms: readonly string[];
  readonly replicates: number;
  readonly generations: number;
  readonly households: number;
  readonly state: 'partial' | 'complete';
  readonly started: string;
  readonly seconds: number | null;
  readonly peak_memory_bytes: number | null;
  /** Anything else a run wants on record, such as what its networks reached. */
  readonly notes?: Readonly<Record<string, unknown>>;
  readonly files: readonly ManifestFile[];
}

/** What is known when a run ends. */
export interface ManifestEnd {
  readonly seconds: number;
  /** Bytes. */
  readonly peakMemory: number;
  readonly notes?: Readonly<Record<string, unknown>>;
}

export function partialManifest(head: ManifestHead): Manifest {
  return {
    program: 'rungsight',
    version: head.version,
    study: head.study,
    study_hash: head.studyHash,
    seed: head.seed,
    arms: head.arms,
    replicates: head.replicates,
    generations: head.generations,
    households: head.households,
    state: 'partial',
    started: head.started,
    seconds: null,
    peak_memory_bytes: null,
    files: [],
  };
}

/** The manifest of a whole folder. */
export function completeManifest(partial: Manifest, end: ManifestEnd, files: readonly ManifestFile[]): Manifest {
  const { files: _none, ...head } = partial;
  return {
    ...head,
    state: 'complete',
    seconds: end.seconds,
    peak_memory_bytes: end.peakMemory,
    ...(end.notes === undefined ? {} : { notes: end.notes }),
    files: [...files].sort((a, b) => (a.name < b.name ? -1 : 1)),
  };
}

export function manifestText(manifest: Manifest): string {
  return `${JSON.stringify(manifest, null, 2)}\n`;
}

/** Parses a manifest, or gives null when the text is not one. */
export function parseManifest(text: string): Manifest | null {
  try {
    const value = JSON.parse(text) as Manifest | null;
    return value !== null && typeof value === 'object' && value.program === 'rungsight' && Array.isArray(value.files)
      ? value
      : null;
  } catch {
    return null;
  }
}
