/**
 * Files of a results folder over HTTP, by byte range; whole and once where a server knows no ranges or a file is small.
 */
import type { AsyncBuffer } from 'hyparquet';
import type { Source as Files } from '../../sim/results/read.js';

const SMALL = 512 * 1024;

/**
 * @param base - address of the folder, ending in `/`
 */
export function httpFiles(base: string): Files {
  const known = new Map<string, Promise<AsyncBuffer | null>>();
  return {
    place: base,
    open(name) {
      let file = known.get(name);
      if (file === undefined) {
        file = openFile(new URL(name, new URL(base, document.baseURI)).href);
        known.set(name, file);
        file.catch(() => known.delete(name));
      }
      return file;
    },
  };
}

async function openFile(url: string): Promise<AsyncBuffer | null> {
  const head = await fetch(url, { method: 'HEAD' });
  if (head.status === 404) return null;
  if (!head.ok) throw new Error(`${url} answered ${head.status}`);
  const size = Number(head.headers.get('Content-Length') ?? NaN);
  let whole: Promise<ArrayBuffer> | null = null;
  const all = (): Promise<ArrayBuffer> => {
    whole ??= fetch(url).then((answer) => {
      if (!answer.ok) throw new Error(`${url} answered ${answer.status}`);
      return answer.arrayBuffer();
    });
    return whole;
  };
  if (!Number.isFinite(size) || size <= SMALL) {
    const bytes = await all();
    return { byteLength: bytes.byteLength, slice: (start, end) => bytes.slice(start, end) };
  }
  return {
    byteLength: size,
    async slice(start, end = size) {
      if (whole !== null) return (await whole).slice(start, end);
      const from = start < 0 ? size + start : start;
      const answer = await fetch(url, { headers: { Range: `bytes=${from}-${end - 1}` } });
      if (answer.status === 206) return answer.arrayBuffer();
      if (!answer.ok) throw new Error(`${url} answered ${answer.status}`);
      whole = answer.arrayBuffer();
      return (await whole).slice(from, end);
    },
  };
}
