/**
 * Lays out a map in a worker: from ties alone, never from labels; and measures what the drawing shows of groups.
 */
import seedrandom from 'seedrandom';
import { drawnSameGroupShare, tiedSameGroupShare } from '../../network/arrange/drawn-share.js';
import { map } from '../../network/arrange/map.js';
import type { Ties } from '../../network/graph.js';

export interface MapRequest {
  readonly key: string;
  readonly ties: Ties;
  /** Labels whose segregation the small print is about: groups, or places where there is one group. */
  readonly labels: Uint32Array;
  readonly seed: string;
}

export interface MapReply {
  readonly key: string;
  readonly positions: Float32Array<ArrayBuffer>;
  /** Share of the same label among the nearest in the drawing, and among ties. */
  readonly drawn: number;
  readonly tied: number;
}

const scope = self as unknown as {
  onmessage: ((event: MessageEvent<MapRequest>) => void) | null;
  postMessage(message: MapReply, transfer: Transferable[]): void;
};

scope.onmessage = (event) => {
  const { key, ties, labels, seed } = event.data;
  const positions = map(ties, seedrandom(seed));
  const drawn = drawnSameGroupShare(positions, labels);
  const tied = tiedSameGroupShare(ties, labels);
  scope.postMessage({ key, positions, drawn, tied }, [positions.buffer]);
};
