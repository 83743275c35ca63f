/**
 * The marks of one field on the graphics card: a point a household, a line a tie, on one position buffer.
 *
 * Positions are refilled when a generation or an arrangement changes and move in the shader in between. Knows
 * nothing of what colours mean.
 */
import { Buffer, BufferUsage, Container, Geometry, GlProgram, Mesh, Shader, State, UniformGroup } from 'pixi.js';
import type { Ties } from '../../network/graph.js';
import { fairStep } from './sample.js';
import { lineFragment, lineVertex, pointFragment, pointVertex } from './shaders.js';

/** Appearance of every household before and after a glide. */
export interface Look {
  /** RGBA, 4 n bytes each. */
  readonly colourFrom: Uint8Array;
  readonly colourTo: Uint8Array;
  /** 4 n bytes: hole before, hole after (255 = ring), size (51 = plain), halo. */
  readonly shape: Uint8Array;
  /** Indices of the households drawn as discs, in an order such that any first part is a fair sample of them. */
  readonly discs: Uint32Array;
  /** The others, open rings drawn on top, in such an order too. */
  readonly rings: Uint32Array;
  /** Share of households that carry a halo. */
  readonly changed: number;
}

/** Uniforms both programs of both fields read; one object each, written before a render. */
export interface Uniforms {
  view: Float32Array;
  camera: Float32Array;
  origin: Float32Array;
  glide: number;
}

const RGBA = 'unorm8x4';

function uniforms(extra: Record<string, { value: number | Float32Array; type: 'f32' | 'vec4<f32>' }>): UniformGroup {
  return new UniformGroup({
    uView: { value: new Float32Array(2), type: 'vec2<f32>' },
    uCamera: { value: new Float32Array(3), type: 'vec3<f32>' },
    uOrigin: { value: new Float32Array(2), type: 'vec2<f32>' },
    uGlide: { value: 1, type: 'f32' },
    ...extra,
  });
}

/** Marks of one shape: an index buffer on the households' attributes. */
interface Layer {
  readonly index: Buffer;
  readonly geometry: Geometry;
  readonly mesh: Mesh<Geometry, Shader>;
  count: number;
}

function blended(): State {
  const state = State.for2d();
  state.depthTest = false;
  state.culling = false;
  return state;
}

export class FieldMarks {
  readonly container = new Container();
  readonly n: number;
  #positions: Buffer;
  #colourFrom: Buffer;
  #colourTo: Buffer;
  #shape: Buffer;
  #layers: readonly Layer[];
  #points: UniformGroup;
  #lines: UniformGroup;
  #lineMesh: Mesh<Geometry, Shader> | null = null;
  #lineGeometry: Geometry | null = null;
  #ties = 0;

  constructor(n: number) {
    this.n = n;
    const vertex = BufferUsage.VERTEX | BufferUsage.COPY_DST;
    this.#positions = new Buffer({ data: new Float32Array(4 * n), usage: vertex });
    this.#colourFrom = new Buffer({ data: new Uint8Array(4 * n), usage: vertex });
    this.#colourTo = new Buffer({ data: new Uint8Array(4 * n), usage: vertex });
    this.#shape = new Buffer({ data: new Uint8Array(4 * n), usage: vertex });
    this.#points = uniforms({
      uSize: { value: 3, type: 'f32' },
      uDensity: { value: 1, type: 'f32' },
      uHalo: { value: 0, type: 'f32' },
      uPaper: { value: new Float32Array(4), type: 'vec4<f32>' },
    });
    this.#lines = uniforms({ uInk: { value: new Float32Array(4), type: 'vec4<f32>' } });
    const shader = new Shader({
      glProgram: GlProgram.from({ vertex: pointVertex, fragment: pointFragment, name: 'households' }),
      resources: { marks: this.#points },
    });
    // discs below, open rings on top
    this.#layers = [0, 1].map(() => this.#layer(shader));
  }

  #layer(shader: Shader): Layer {
    const index = new Buffer({ data: new Uint32Array(this.n), usage: BufferUsage.INDEX | BufferUsage.COPY_DST });
    const geometry = new Geometry({
      topology: 'point-list',
      attributes: {
        aFrom: { buffer: this.#positions, format: 'float32x2', stride: 16, offset: 0 },
        aTo: { buffer: this.#positions, format: 'float32x2', stride: 16, offset: 8 },
        aColourFrom: { buffer: this.#colourFrom, format: RGBA, stride: 4, offset: 0 },
        aColourTo: { buffer: this.#colourTo, format: RGBA, stride: 4, offset: 0 },
        aShape: { buffer: this.#shape, format: RGBA, stride: 4, offset: 0 },
      },
      indexBuffer: index,
    });
    const mesh = new Mesh<Geometry, Shader>({ geometry, shader, state: blended() });
    this.container.addChild(mesh);
    return { index, geometry, mesh, count: 0 };
  }

  /** Number of ties drawn when all are drawn. */
  get ties(): number {
    return this.#ties;
  }

  /**
   * Refills positions in field pixels.
   *
   * @param from - x, y of each household before the glide, length 2 n
   * @param to - and after
   */
  place(from: Float32Array, to: Float32Array): void {
    const data = this.#positions.data as Float32Array;
    for (let i = 0; i < this.n; i++) {
      data[4 * i] = from[2 * i];
      data[4 * i + 1] = from[2 * i + 1];
      data[4 * i + 2] = to[2 * i];
      data[4 * i + 3] = to[2 * i + 1];
    }
    this.#positions.update();
  }

  dress(look: Look): void {
    (this.#colourFrom.data as Uint8Array).set(look.colourFrom);
    (this.#colourTo.data as Uint8Array).set(look.colourTo);
    (this.#shape.data as Uint8Array).set(look.shape);
    this.#layers.forEach((layer, k) => {
      const listed = k === 0 ? look.discs : look.rings;
      (layer.index.data as Uint32Array).set(listed);
      layer.index.update();
      layer.count = listed.length;
    });
    this.#colourFrom.update();
    this.#colourTo.update();
    this.#shape.update();
  }

  /**
   * Takes the ties to draw, each once, in an order such that any first part of the list is a fair sample.
   *
   * The order is a fixed permutation (a multiplicative step through the list), so the same sample returns.
   */
  tie(ties: Ties): void {
    const m = ties.target.length / 2;
    const listed = new Uint32Array(2 * m);
    let at = 0;
    for (let i = 0; i < ties.n; i++) {
      for (let e = ties.start[i]; e < ties.start[i + 1]; e++) {
        if (ties.target[e] <= i) continue;
        listed[at++] = i;
        listed[at++] = ties.target[e];
      }
    }
    const index = new Uint32Array(2 * m);
    const step = fairStep(m);
    for (let k = 0, from = 0; k < m; k++, from = (from + step) % m) {
      index[2 * k] = listed[2 * from];
      index[2 * k + 1] = listed[2 * from + 1];
    }
    this.#ties = m;
    if (this.#lineMesh !== null) {
      this.container.removeChild(this.#lineMesh);
      this.#lineMesh.destroy();
      this.#lineGeometry?.destroy(false);
      this.#lineMesh = null;
    }
    if (m === 0) return;
    this.#lineGeometry = new Geometry({
      topology: 'line-list',
      attributes: {
        aFrom: { buffer: this.#positions, format: 'float32x2', stride: 16, offset: 0 },
        aTo: { buffer: this.#positions, format: 'float32x2', stride: 16, offset: 8 },
      },
      indexBuffer: new Buffer({ data: index, usage: BufferUsage.INDEX | BufferUsage.COPY_DST }),
    });
    this.#lineMesh = new Mesh<Geometry, Shader>({
      geometry: this.#lineGeometry,
      shader: new Shader({
        glProgram: GlProgram.from({ vertex: lineVertex, fragment: lineFragment, name: 'ties' }),
        resources: { marks: this.#lines },
      }),
      state: blended(),
    });
    this.container.addChildAt(this.#lineMesh, 0);
  }

  /**
   * Sets what a render needs.
   *
   * @param share - share of the households drawn, a fair sample of discs and of rings; above 0, at most 1
   * @param drawnTies - how many ties to draw; 0 draws none
   * @param ink - RGBA of ties, 0 … 1
   * @param paper - RGB of the field's ground, in the holes of rings
   */
  prepare(
    shared: Uniforms,
    size: number,
    resolution: number,
    halo: number,
    share: number,
    drawnTies: number,
    ink: Float32Array,
    paper: Float32Array,
  ): void {
    for (const group of [this.#points, this.#lines]) {
      const u = group.uniforms as Record<string, number | Float32Array>;
      (u.uView as Float32Array).set(shared.view);
      (u.uCamera as Float32Array).set(shared.camera);
      (u.uOrigin as Float32Array).set(shared.origin);
      u.uGlide = shared.glide;
    }
    const p = this.#points.uniforms as Record<string, number | Float32Array>;
    p.uSize = size;
    p.uDensity = resolution;
    p.uHalo = halo;
    (p.uPaper as Float32Array).set(paper);
    ((this.#lines.uniforms as Record<string, number | Float32Array>).uInk as Float32Array).set(ink);
    this.#points.update();
    this.#lines.update();
    for (const { geometry, mesh, count } of this.#layers) {
      // a count of 0 would draw the whole buffer
      mesh.visible = count > 0;
      geometry.indexCount = Math.ceil(count * Math.min(1, share));
    }
    if (this.#lineMesh !== null && this.#lineGeometry !== null) {
      this.#lineMesh.visible = drawnTies > 0;
      this.#lineGeometry.indexCount = 2 * Math.min(this.#ties, drawnTies);
    }
  }

  /** Uploads every buffer anew, after the context was lost. */
  renew(): void {
    for (const b of [this.#positions, this.#colourFrom, this.#colourTo, this.#shape]) b.update();
    for (const { index } of this.#layers) index.update();
  }

  destroy(): void {
    this.container.destroy({ children: true });
  }
}
