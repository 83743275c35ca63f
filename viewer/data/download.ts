/**
 * Hands a file to the reader's browser to save.
 */

const TYPES: Readonly<Record<string, string>> = {
  csv: 'text/csv',
  parquet: 'application/vnd.apache.parquet',
  zip: 'application/zip',
  png: 'image/png',
  svg: 'image/svg+xml',
  yaml: 'text/yaml',
};

export function download(name: string, content: Uint8Array | string | Blob): void {
  const type = TYPES[name.split('.').at(-1) ?? ''] ?? 'application/octet-stream';
  const blob = content instanceof Blob ? content : new Blob([content as Uint8Array<ArrayBuffer> | string], { type });
  const link = document.createElement('a');
  const url = URL.createObjectURL(blob);
  link.href = url;
  link.download = name;
  link.click();
  // the browser has taken the blob once the click has been handled
  setTimeout(() => URL.revokeObjectURL(url), 20000);
}

/** A title as part of a file name. */
export function fileName(title: string): string {
  return (
    title
      .toLowerCase()
      .normalize('NFKD')
      .replace(/[^a-z0-9]+/g, '-')
      .replace(/^-|-$/g, '') || 'study'
  );
}
