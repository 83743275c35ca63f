/// <reference types="vite/client" />
/**
 * The built-in studies, and the data files they name, as text in the build.
 */

/** A built-in study. */
export interface BuiltIn {
  readonly name: string;
  readonly title: string;
  /** What it shows, from the first comment of its file. */
  readonly shows: string;
  readonly text: string;
}

const texts = import.meta.glob<string>('../../presets/*.yaml', { query: '?raw', import: 'default', eager: true });
const data = import.meta.glob<string>('../../presets/*.{csv,graphml}', { query: '?raw', import: 'default' });

/** Name of the study shown when nothing else is asked for. */
export const DEFAULT_STUDY = 'villages-apart';

function fileName(path: string): string {
  return path.slice(path.lastIndexOf('/') + 1);
}

/** Every built-in study, the default first. */
export const BUILT_IN: readonly BuiltIn[] = Object.entries(texts)
  .map(([path, text]) => ({
    name: fileName(path).replace(/\.yaml$/, ''),
    title:
      /^study:\s*(?:"([^"]*)"|'([^']*)'|(.*?))\s*(?:#.*)?$/m
        .exec(text)
        ?.slice(1)
        .find((part) => part !== undefined) ?? '',
    shows: /^# ?(.*)$/m.exec(text)?.[1] ?? '',
    text,
  }))
  .sort(
    (a, b) => Number(b.name === DEFAULT_STUDY) - Number(a.name === DEFAULT_STUDY) || a.name.localeCompare(b.name, 'en'),
  );

/** The data files of the built-in studies that a study's text names, by name. */
export async function builtInFiles(text: string): Promise<Map<string, string>> {
  const files = new Map<string, string>();
  for (const [path, load] of Object.entries(data)) {
    const name = fileName(path);
    if (text.includes(name)) files.set(name, await load());
  }
  return files;
}
