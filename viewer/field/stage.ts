/**
 * The stage: two fields and the pyramid between them, seen through one camera, gliding together.
 *
 * Owns the canvas, the animation and the pointer; what to show comes as a `Scene`, what the reader does leaves
 * through `StageEvents`. Between generations and arrangements marks glide unless the reader prefers reduced motion.
 */
import KDBush from 'kdbush';
import { html, nothing, render, svg, type TemplateResult } from 'lit-html';
import { drawPyramid, type PyramidFrame } from '../pyramid/pyramid.js';
import { rgb, type Tokens } from '../screen/tokens.js';
import { amount } from '../screen/words.js';
import { type Area, type Axis, heightOf, onLadder, onMap, rungs } from './arrangement.js';
import { between, type Camera, frame, pan, REST, zoomAt } from './camera.js';
import type { Box, FieldCanvas } from './canvas.js';
import { dress } from './colouring.js';
import { FieldMarks } from './marks.js';
import { type ArmScene, looksUpTo, type Scene } from './scene.js';
import { type Sleeve, sleeve } from './sleeve.js';

export interface StageEvents {
  /** A household was picked (index in the cast) in a field, or the ground (−1). */
  select(household: number, field: 0 | 1): void;
}

interface Field {
  readonly ground: HTMLElement;
  marks: FieldMarks | null;
  box: Box;
  /** Positions at the two ends of the glide, field pixels. */
  from: Float32Array;
  to: Float32Array;
  index: KDBush | null;
  tiesDrawn: object | null;
  sleeves: (Sleeve & { id: number })[];
  /** Share of households whose status changed. */
  changed: number;
}

const GLIDE = 620;
const MOVE = 420;
/** Milliseconds after its arrival in which a halo grows quiet. */
const FADE = 1400;
/** Ties drawn at rest, as a multiple of those drawn while something moves: one slower frame, not a stall. */
const REST_TIES = 8;
/** Milliseconds without a movement after which the fields are at rest. */
const SETTLE = 260;
/** Households a field from which halos are quiet at once: every further frame would keep the reader waiting. */
const MANY = 20000;
/** Households drawn in each field while the camera moves, at the start and at least. */
const CROWD = 12000;
const FEWEST = 6000;
/** Milliseconds between two frames above which fewer households are drawn while the camera moves, and below which more. */
const SLOW = 60;
const QUICK = 19;
/** Milliseconds a frame may take while something moves, before fewer ties are drawn. */
const BUDGET = 26;

const ease = (t: number): number => (t < 0.5 ? 4 * t * t * t : 1 - (-2 * t + 2) ** 3 / 2);

export class Stage {
  readonly root: HTMLElement;
  #canvas: FieldCanvas;
  #fields: readonly [Field, Field];
  #wealth: HTMLElement;
  #under: SVGSVGElement;
  #tints: SVGSVGElement;
  #over: SVGSVGElement;
  #pyramid: SVGSVGElement;
  #events: StageEvents;
  #tokens: Tokens;
  #scene: Scene | null = null;
  #axisFrom: Axis = { low: 0, high: 1 };
  #camera: Camera = REST;
  #cameraFrom: Camera = REST;
  #cameraTo: Camera = REST;
  #cameraStart = -1;
  #glide = 1;
  #glideStart = -1;
  #pyramidFrom: PyramidFrame | null = null;
  #pyramidTo: PyramidFrame | null = null;
  #hover = -1;
  #hoverField = 0;
  #moving = 0;
  #settling = 0;
  #sample = 6000;
  #crowd = CROWD;
  #raf = 0;
  #rem = 13;

  constructor(root: HTMLElement, canvas: FieldCanvas, events: StageEvents, tokens: Tokens) {
    this.root = root;
    this.#canvas = canvas;
    this.#events = events;
    this.#tokens = tokens;
    const part = <E extends Element>(selector: string): E => root.querySelector(selector) as E;
    const field = (selector: string): Field => ({
      ground: part<HTMLElement>(selector),
      marks: null,
      box: { x: 0, y: 0, width: 1, height: 1 },
      from: new Float32Array(),
      to: new Float32Array(),
      index: null,
      tiesDrawn: null,
      sleeves: [],
      changed: 0,
    });
    this.#fields = [field('.field-left'), field('.field-right')];
    this.#wealth = part('.wealth');
    this.#under = part('svg.under');
    this.#tints = part('svg.tints');
    this.#over = part('svg.over');
    this.#pyramid = part('svg.pyramid');
    canvas.onRestored = () => {
      for (const f of this.#fields) f.marks?.renew();
      this.#ask();
    };
    this.#listen();
    new ResizeObserver(() => this.resize()).observe(root);
    this.resize();
  }

  get camera(): Camera {
    return this.#camera;
  }

  /** Share of the glide done; 1 at rest. */
  get glide(): number {
    return this.#glide;
  }

  set tokens(tokens: Tokens) {
    this.#tokens = tokens;
    if (this.#scene !== null) this.#dressAll(null);
    this.#ask();
  }

  /** True while marks or the camera are on their way. */
  get busy(): boolean {
    return this.#glideStart >= 0 || this.#cameraStart >= 0;
  }

  /**
   * Shows a scene. Marks glide when only the generation or the arrangement changed.
   *
   * @param still - no glide, whatever changed
   */
  show(scene: Scene, still = false): void {
    const last = this.#scene;
    this.#scene = scene;
    const same =
      last !== null && scene.arms.every((a, k) => a.cast === last.arms[k].cast && a.name === last.arms[k].name);
    const moved =
      last === null ||
      !same ||
      last.arrangement !== scene.arrangement ||
      scene.arms.some(
        (a, k) => a.now !== last.arms[k].now || a.map !== last.arms[k].map || a.sideways !== last.arms[k].sideways,
      ) ||
      last.axis.low !== scene.axis.low ||
      last.axis.high !== scene.axis.high;
    const glides = same && moved && !still && !reducedMotion();
    if (moved) {
      this.#axisFrom = glides ? this.#axisNow(last) : scene.axis;
      this.#pyramidFrom = glides ? this.#pyramidTo : null;
      this.#pyramidTo = {
        left: scene.arms[0].now,
        right: scene.arms[1].now,
        axis: scene.axis,
      };
      scene.arms.forEach((arm, k) => {
        const field = this.#fields[k];
        const to = this.#positions(arm, scene, k);
        field.from = glides && field.to.length === to.length ? this.#positionsNow(field) : to;
        field.to = to;
        field.index = null;
        if (field.marks === null || field.marks.n !== arm.cast.n) {
          field.marks?.destroy();
          field.marks = new FieldMarks(arm.cast.n);
          field.tiesDrawn = null;
        }
        field.marks.place(field.from, field.to);
      });
      if (last !== null && last.arrangement !== scene.arrangement) this.#look(REST);
      this.#glide = glides ? 0 : 1;
      this.#glideStart = glides ? performance.now() : -1;
      this.#pulse = last !== null && last.generation !== scene.generation;
    }
    scene.arms.forEach((arm, k) => {
      const field = this.#fields[k];
      if (field.tiesDrawn !== arm.ties) {
        field.marks?.tie(arm.ties);
        field.tiesDrawn = arm.ties;
      }
      field.sleeves = sleevesOf(arm, field);
    });
    if (moved || last === null || last.colouring !== scene.colouring) this.#dressAll(glides ? last : null);
    this.#ask();
  }

  /** Brings households into view, in both fields. */
  frameOn(households: readonly number[], field: 0 | 1): void {
    const { to, box } = this.#fields[field];
    if (households.length === 0 || to.length === 0) return;
    let x0 = Infinity;
    let y0 = Infinity;
    let x1 = -Infinity;
    let y1 = -Infinity;
    for (const i of households) {
      x0 = Math.min(x0, to[2 * i]);
      x1 = Math.max(x1, to[2 * i]);
      y0 = Math.min(y0, to[2 * i + 1]);
      y1 = Math.max(y1, to[2 * i + 1]);
    }
    this.#look(frame([x0, y0, x1, y1], box.width, box.height));
  }

  wholeField(): void {
    this.#look(REST);
  }

  zoom(factor: number): void {
    const { width, height } = this.#fields[0].box;
    this.#look(
      zoomAt(this.#cameraStart >= 0 ? this.#cameraTo : this.#camera, factor, width / 2, height / 2, width, height),
    );
  }

  shift(dx: number, dy: number): void {
    const { width, height } = this.#fields[0].box;
    this.#look(pan(this.#cameraStart >= 0 ? this.#cameraTo : this.#camera, dx * width, dy * height, width, height));
  }

  resize(): void {
    const stage = this.root.getBoundingClientRect();
    if (stage.width < 10 || stage.height < 10) return;
    this.#rem = Number.parseFloat(getComputedStyle(document.documentElement).fontSize) || 13;
    this.#canvas.resize(stage.width, stage.height);
    for (const svgLayer of [this.#under, this.#tints, this.#over]) {
      svgLayer.setAttribute('viewBox', `0 0 ${stage.width} ${stage.height}`);
    }
    for (const f of this.#fields) {
      const r = f.ground.getBoundingClientRect();
      f.box = { x: r.left - stage.left, y: r.top - stage.top, width: r.width, height: r.height };
    }
    const scene = this.#scene;
    this.#camera = REST;
    this.#cameraStart = -1;
    this.#tintKey = '';
    if (scene !== null) {
      this.#glide = 1;
      this.#glideStart = -1;
      this.#axisFrom = scene.axis;
      scene.arms.forEach((arm, k) => {
        const f = this.#fields[k];
        f.to = this.#positions(arm, scene, k);
        f.from = f.to;
        f.index = null;
        f.marks?.place(f.from, f.to);
        f.sleeves = sleevesOf(arm, f);
      });
    }
    this.drawNow();
  }

  /** Draws at once: for measuring. */
  drawNow(): void {
    this.#draw(this.busy || performance.now() < this.#moving);
  }

  /**
   * Draws the scene at rest, finer than the screen, and calls `take` before the browser may clear it.
   *
   * @param resolution - device pixels a CSS pixel
   */
  async still<T>(resolution: number, take: () => Promise<T>): Promise<T> {
    const { width, height } = this.root.getBoundingClientRect();
    this.#glide = 1;
    this.#glideStart = -1;
    this.#arrived = -1;
    if (this.#cameraStart >= 0) this.#camera = this.#cameraTo;
    this.#cameraStart = -1;
    this.#canvas.resize(width, height, resolution);
    this.#draw(false);
    try {
      return await take();
    } finally {
      this.#canvas.resize(width, height);
      this.#draw(false);
    }
  }

  /** Ties drawn in each field at most while something moves: for measuring. */
  get tiesWhileMoving(): number {
    return this.#sample;
  }

  /** Waits for the card: for measuring. */
  settle(): void {
    this.#canvas.settle();
  }

  get canvasElement(): HTMLCanvasElement {
    return this.root.querySelector('canvas') as HTMLCanvasElement;
  }

  /** Screen position of a household in a field, CSS pixels from the stage's corner: for tests and pictures. */
  positionOf(household: number, field: 0 | 1): { x: number; y: number } {
    const f = this.#fields[field];
    const p = this.#at(f, household);
    return { x: f.box.x + p[0], y: f.box.y + p[1] };
  }

  #area(k: number): Area {
    const { width, height } = this.#fields[k].box;
    const rem = this.#rem;
    return { width, height, top: 2.9 * rem, bottom: 2.5 * rem, side: 1.3 * rem };
  }

  #positions(arm: ArmScene, scene: Scene, k: number): Float32Array {
    const area = this.#area(k);
    if (scene.arrangement === 'map' && arm.map !== null) return onMap(arm.map, area);
    return onLadder(arm.sideways, arm.now.wealth, scene.axis, area);
  }

  #positionsNow(field: Field): Float32Array {
    const g = ease(this.#glide);
    if (this.#glide >= 1) return field.to;
    const out = new Float32Array(field.to.length);
    for (let k = 0; k < out.length; k++) out[k] = field.from[k] + (field.to[k] - field.from[k]) * g;
    return out;
  }

  #axisNow(scene: Scene | null): Axis {
    if (scene === null) return this.#axisFrom;
    const g = ease(this.#glide);
    return {
      low: this.#axisFrom.low + (scene.axis.low - this.#axisFrom.low) * g,
      high: this.#axisFrom.high + (scene.axis.high - this.#axisFrom.high) * g,
    };
  }

  #dressAll(last: Scene | null): void {
    const scene = this.#scene;
    if (scene === null) return;
    scene.arms.forEach((arm, k) => {
      const look = dress(arm.now, last === null ? null : last.arms[k].now, arm.earlier, scene.colouring, {
        cast: arm.cast,
        groupNames: scene.groupNames,
        tokens: this.#tokens,
      });
      this.#fields[k].marks?.dress(look);
      this.#fields[k].changed = look.changed;
    });
  }

  #look(camera: Camera): void {
    if (reducedMotion()) {
      this.#camera = camera;
      this.#cameraStart = -1;
    } else {
      this.#cameraFrom = this.#camera;
      this.#cameraTo = camera;
      this.#cameraStart = performance.now();
    }
    this.#ask();
  }

  #ask(): void {
    if (this.#raf !== 0) return;
    this.#raf = requestAnimationFrame((now) => {
      this.#raf = 0;
      this.#advance(now);
    });
  }

  #advance(now: number): void {
    if (this.#glideStart >= 0) {
      this.#glide = Math.min(1, Math.max(0, (now - this.#glideStart) / GLIDE));
      if (this.#glide >= 1) {
        this.#glideStart = -1;
        this.#arrived = (this.#fields[0].marks?.n ?? 0) < MANY ? now : -1;
      }
    }
    if (this.#cameraStart >= 0) {
      const s = Math.min(1, Math.max(0, (now - this.#cameraStart) / MOVE));
      this.#camera = between(this.#cameraFrom, this.#cameraTo, ease(s));
      if (s >= 1) {
        // exactly where it was to go, whatever rounding made of the way
        this.#camera = this.#cameraTo;
        this.#cameraStart = -1;
      }
    }
    const before = performance.now();
    const moving = this.busy || now < this.#moving;
    this.#draw(moving);
    if (this.busy && this.#lastFrame > 0) {
      // a frame's cost arrives with the next frame: steer by the time between two of them
      const frameTime = Math.max(performance.now() - before, Math.min(200, now - this.#lastFrame));
      if (this.#scene?.tiesShown === true) {
        if (frameTime > BUDGET) this.#sample = Math.max(400, this.#sample * Math.max(0.5, BUDGET / frameTime));
        else if (frameTime < 18) this.#sample = Math.min(200000, this.#sample * 1.15);
      }
      // between slow and quick nothing changes: a crowd that comes and goes would look like news
      const n = this.#fields[0].marks?.n ?? 0;
      if (frameTime < QUICK) this.#crowd = Math.max(CROWD, Math.min(n, this.#crowd * 1.1));
      else if (frameTime > SLOW && this.#glideStart < 0) {
        this.#crowd = Math.max(FEWEST, this.#crowd * Math.max(0.7, SLOW / frameTime));
      }
    }
    this.#lastFrame = this.busy ? now : 0;
    // under the reader's hand the next movement asks for the next frame: frames in between would only queue before it
    if (this.busy) this.#ask();
    else if (this.#arrived >= 0) {
      if (now - this.#arrived >= FADE) {
        this.#arrived = -1;
        this.#ask();
      } else if (this.#fade === 0) {
        // a halo grows quiet in steps: nothing moves, so few frames do
        this.#fade = window.setTimeout(() => {
          this.#fade = 0;
          this.#ask();
        }, 110);
      }
    }
  }

  #lastFrame = 0;
  /** When the last glide ended; −1 before any. */
  #arrived = -1;
  #fade = 0;
  /** True when the last glide led to another generation: only then have statuses changed. */
  #pulse = false;
  #frame = 0;
  #gridKey = '';
  #tintKey = '';
  #tinted: readonly [unknown, unknown] = [null, null];

  /** @param moving - draw no more than a sample that keeps pace; at rest all marks are drawn */
  #draw(moving: boolean): void {
    const scene = this.#scene;
    if (scene === null) return;
    const [left, right] = this.#fields;
    if (left.marks === null || right.marks === null) return;
    const g = ease(this.#glide);
    const n = left.marks.n;
    const size =
      Math.max(1.15, Math.min(3.4 * (this.#rem / 13), 0.228 * Math.sqrt((left.box.width * left.box.height) / n))) *
      Math.min(3, this.#camera.zoom ** (n < MANY ? 0.5 : 0.3));
    // a glide carries every mark to its place; a camera on its way takes a fair sample along, each a little larger
    const share = moving && this.#glideStart < 0 ? Math.min(1, this.#crowd / n) : 1;
    const most = Math.max(left.marks.ties, right.marks.ties);
    const ties = scene.tiesShown
      ? Math.min(most, moving ? Math.round(this.#sample) : Math.round(REST_TIES * this.#sample))
      : 0;
    const [r, gr, b] = rgb(this.#tokens.ink);
    // the fewer lines, the stronger each: the tone of the whole stays
    const strength =
      Math.min(0.15, Math.max(0.014, 110 / Math.max(1, ties) + 0.007)) * Math.min(2.2, this.#camera.zoom ** 0.5);
    const [pr, pg, pb] = rgb(this.#tokens.panel);
    this.#canvas.draw(
      [
        { marks: left.marks, box: inset(left.box) },
        { marks: right.marks, box: inset(right.box) },
      ],
      {
        camera: this.#camera,
        glide: g,
        size: size * Math.min(1.6, share ** -0.5),
        share,
        halo: this.#haloNow(g),
        ties,
        ink: Float32Array.of(r / 255, gr / 255, b / 255, strength),
        paper: Float32Array.of(pr / 255, pg / 255, pb / 255, 1),
      },
    );
    this.#grid(scene);
    this.#tint(scene, moving);
    this.#overlay(scene);
    // a third of the frames do for bars: painting them costs as much as the marks
    this.#frame++;
    if (this.#glide >= 1 || this.#frame % 3 === 0) this.#drawPyramid(scene, g);
  }

  /** Halos are strong while marks arrive and quiet afterwards. */
  #haloNow(g: number): number {
    // where most have changed, a circle round each would say nothing: let them go
    const many = Math.max(this.#fields[0].changed, this.#fields[1].changed);
    const [loud, quiet] = many < 0.12 ? [0.75, 0.3] : many < 0.3 ? [0.5, 0.12] : [0.25, 0];
    if (this.#glideStart >= 0) return this.#pulse ? loud * g : quiet;
    const age = this.#arrived < 0 || !this.#pulse ? 1 : Math.min(1, (performance.now() - this.#arrived) / FADE);
    return loud + (quiet - loud) * age;
  }

  #drawPyramid(scene: Scene, g: number): void {
    if (this.#pyramidTo === null) return;
    const w = this.#wealth.getBoundingClientRect();
    const area = this.#area(0);
    drawPyramid(this.#pyramid, {
      from: this.#pyramidFrom,
      to: this.#pyramidTo,
      share: this.#glide >= 1 ? 1 : g,
      axis: this.#axisNow(scene),
      width: w.width,
      height: w.height,
      rem: this.#rem,
      y: (wealth) => {
        const y = heightOf(wealth, this.#axisNow(scene), area);
        return scene.arrangement === 'ladder' ? y * this.#camera.zoom + this.#camera.y : y;
      },
      rungs: rungs(this.#axisNow(scene), Math.max(3, Math.floor(area.height / (5.2 * this.#rem)))),
    });
  }

  /** Where a household is now, CSS pixels of its field after the camera. */
  #at(field: Field, i: number): readonly [number, number] {
    const g = ease(this.#glide);
    const { zoom, x, y } = this.#camera;
    const px = field.from[2 * i] + (field.to[2 * i] - field.from[2 * i]) * g;
    const py = field.from[2 * i + 1] + (field.to[2 * i + 1] - field.from[2 * i + 1]) * g;
    return [px * zoom + x, py * zoom + y];
  }

  /** Lines at round wealths; redrawn only when the axis or the camera moved. */
  #grid(scene: Scene): void {
    const axis = this.#axisNow(scene);
    const { zoom, y } = this.#camera;
    const key = `${scene.arrangement}/${axis.low}/${axis.high}/${zoom}/${y}/${this.#fields[0].box.width}/${this.#fields[0].box.height}`;
    if (key === this.#gridKey) return;
    this.#gridKey = key;
    render(
      svg`${this.#fields.map((f, k) => {
        const area = this.#area(k);
        const lines =
          scene.arrangement === 'ladder'
            ? rungs(axis, Math.max(3, Math.floor(area.height / (5.2 * this.#rem)))).map((w) => {
                const py = heightOf(w, axis, area) * zoom + y;
                return svg`<line class="rung" x1="0.5" x2=${area.width - 1} y1=${py} y2=${py}></line>`;
              })
            : nothing;
        return svg`<svg x=${f.box.x} y=${f.box.y} width=${f.box.width} height=${f.box.height}>${lines}</svg>`;
      })}`,
      this.#under as unknown as HTMLElement,
    );
  }

  /**
   * Pockets' tints: gone while marks glide, since they belong to where the marks arrive, and while the camera moves over a
   * large study, whose thousands of members would be painted anew at every size.
   */
  #tint(scene: Scene, moving: boolean): void {
    const away = this.#glideStart >= 0 || (moving && (this.#fields[0].marks?.n ?? 0) >= MANY);
    this.#tints.classList.toggle('away', away);
    if (away) return;
    const { zoom, x, y } = this.#camera;
    const key = `${zoom}/${x}/${y}/${scene.pocket.join()}`;
    if (key === this.#tintKey && this.#fields.every((f, k) => f.sleeves === this.#tinted[k])) return;
    this.#tintKey = key;
    this.#tinted = [this.#fields[0].sleeves, this.#fields[1].sleeves];
    const width = Math.max(0.9 * this.#rem, 1.15 * this.#rem * Math.min(2.4, zoom ** 0.7));
    render(
      svg`${this.#fields.map(
        (f, k) => svg`<svg x=${f.box.x} y=${f.box.y} width=${f.box.width} height=${f.box.height}>
          <g transform="translate(${x} ${y}) scale(${zoom})">
          ${f.sleeves.map((s) => {
            const name = `sleeve${scene.pocket[k] === s.id ? ' chosen' : ''}`;
            const strength = (scene.pocket[k] === s.id ? 2 : 1) * 0.17;
            return svg`<g opacity=${strength}><path class=${name} d=${s.body} stroke-width=${width / zoom}></path>
              <path class=${name} d=${s.links} stroke-width=${(0.16 * width) / zoom}></path></g>`;
          })}
          </g></svg>`,
      )}`,
      this.#tints as unknown as HTMLElement,
    );
  }

  /** What lies over the marks. Without anything to show the layer is gone, and costs nothing. */
  #overlay(scene: Scene): void {
    const shown = scene.selected >= 0 || (this.#hover >= 0 && !this.busy);
    this.#over.toggleAttribute('hidden', !shown);
    if (!shown) return;
    render(
      svg`${this.#fields.map(
        (f, k) => svg`<svg x=${f.box.x} y=${f.box.y} width=${f.box.width} height=${f.box.height}>
        ${this.#selection(scene, f, k)}${this.#hovered(scene, f, k)}</svg>`,
      )}`,
      this.#over as unknown as HTMLElement,
    );
  }

  /** The selected household: whom it looks up to, its aspiration as a bar at that height, the way there dashed. */
  #selection(scene: Scene, f: Field, k: number): unknown {
    const i = scene.selected;
    if (i < 0) return nothing;
    const arm = scene.arms[k];
    const { up, other } = looksUpTo(arm.ties, arm.now.wealth, i);
    const [x, y] = this.#at(f, i);
    const rem = this.#rem;
    const line = (j: number, name: string): unknown => {
      const [a, b] = this.#at(f, j);
      return svg`<line class=${name} x1=${x} y1=${y} x2=${a} y2=${b}></line>`;
    };
    const dot = (j: number): unknown => {
      const [a, b] = this.#at(f, j);
      const met = arm.now.decided && arm.now.met[j] === 0;
      return svg`<circle class=${met ? 'seen ring' : 'seen disc'} cx=${a} cy=${b} r=${0.3 * rem}></circle>`;
    };
    const frustrated = arm.now.decided && arm.now.met[i] === 0;
    let reach: unknown = nothing;
    if (scene.arrangement === 'ladder' && arm.now.decided && this.#glide >= 1) {
      const a = arm.now.aspirations[0][i];
      const ya = heightOf(a, scene.axis, this.#area(k)) * this.#camera.zoom + this.#camera.y;
      const half = 1.15 * rem;
      const says = `aspiration ${amount(a)}`;
      const room = f.box.width - x - half;
      const toRight = room > says.length * 0.56 * rem + 6;
      reach = svg`<line class="reach" x1=${x} y1=${y} x2=${x} y2=${ya}></line>
        <line class="bar" x1=${x - half} x2=${x + half} y1=${ya} y2=${ya}></line>
        <text class="mark-text" x=${toRight ? x + half + 0.4 * rem : x - half - 0.4 * rem} y=${Math.max(3.6 * rem, ya + 0.33 * rem)}
          text-anchor=${toRight ? 'start' : 'end'}>${says}</text>`;
    }
    return svg`${other.map((j) => line(j, 'tie-other'))}${up.map((j) => line(j, 'tie-up'))}
      ${other.map(dot)}${up.map(dot)}${reach}
      <circle class="self-ground" cx=${x} cy=${y} r=${0.56 * rem}></circle>
      <circle class=${`self ${arm.now.decided ? (frustrated ? 'ring' : 'disc') : 'plain'}`} cx=${x} cy=${y} r=${0.42 * rem}></circle>`;
  }

  /** The household under the pointer, in both fields, with its numbers in the field pointed at. */
  #hovered(scene: Scene, f: Field, k: number): unknown {
    const i = this.#hover;
    if (i < 0 || i === scene.selected || this.busy) return nothing;
    const arm = scene.arms[k];
    const [x, y] = this.#at(f, i);
    const rem = this.#rem;
    const circle = svg`<circle class="hover" cx=${x} cy=${y} r=${0.6 * rem}></circle>`;
    const now = arm.now;
    const name = arm.cast.names?.[i] ?? arm.cast.id[i];
    const says = now.decided
      ? `household ${name}: has ${amount(now.wealth[i])}, aspires to ${amount(now.aspirations[0][i])}`
      : `household ${name}: has ${amount(now.wealth[i])}`;
    const wide = says.length * 0.52 * rem;
    const at = Math.max(wide / 2 + 6, Math.min(f.box.width - wide / 2 - 6, x));
    const above = y > 4.6 * rem;
    return svg`${circle}<text class="mark-text" x=${at} y=${above ? y - 1.1 * rem : y + 1.9 * rem} text-anchor="middle">${says}</text>`;
  }

  #pick(k: number, px: number, py: number): number {
    const scene = this.#scene;
    if (scene === null || this.busy) return -1;
    const f = this.#fields[k];
    const n = f.to.length / 2;
    if (f.index === null) {
      const index = new KDBush(n, 64, Float32Array);
      for (let i = 0; i < n; i++) index.add(f.to[2 * i], f.to[2 * i + 1]);
      f.index = index.finish();
    }
    const { zoom, x, y } = this.#camera;
    const fx = (px - x) / zoom;
    const fy = (py - y) / zoom;
    let best = -1;
    let nearest = Infinity;
    for (const i of f.index.within(fx, fy, (0.95 * this.#rem) / zoom)) {
      const d = (f.to[2 * i] - fx) ** 2 + (f.to[2 * i + 1] - fy) ** 2;
      if (d < nearest) {
        nearest = d;
        best = i;
      }
    }
    return best;
  }

  #listen(): void {
    this.#fields.forEach((f, k) => {
      let down: { x: number; y: number; moved: boolean } | null = null;
      const local = (e: MouseEvent): [number, number] => {
        const r = f.ground.getBoundingClientRect();
        return [e.clientX - r.left, e.clientY - r.top];
      };
      f.ground.addEventListener('pointerdown', (e) => {
        if (e.button !== 0 || (e.target as Element).closest('button, select, a, input') !== null) return;
        down = { x: e.clientX, y: e.clientY, moved: false };
        f.ground.setPointerCapture(e.pointerId);
      });
      f.ground.addEventListener('pointermove', (e) => {
        const [px, py] = local(e);
        if (down !== null) {
          const dx = e.clientX - down.x;
          const dy = e.clientY - down.y;
          if (!down.moved && Math.hypot(dx, dy) < 4) return;
          down = { x: e.clientX, y: e.clientY, moved: true };
          this.#camera = pan(this.#camera, dx, dy, f.box.width, f.box.height);
          this.#cameraStart = -1;
          this.#hover = -1;
          this.#keepMoving();
          return;
        }
        const found = this.#pick(k, px, py);
        if (found !== this.#hover || this.#hoverField !== k) {
          this.#hover = found;
          this.#hoverField = k;
          f.ground.classList.toggle('on-mark', found >= 0);
          this.#hoverOnly();
        }
      });
      const up = (e: PointerEvent): void => {
        if (down !== null && !down.moved && e.type === 'pointerup') {
          const [px, py] = local(e);
          this.#events.select(this.#pick(k, px, py), k === 0 ? 0 : 1);
        }
        down = null;
      };
      f.ground.addEventListener('pointerup', up);
      f.ground.addEventListener('pointercancel', up);
      f.ground.addEventListener('pointerleave', () => {
        if (this.#hover >= 0) {
          this.#hover = -1;
          this.#hoverOnly();
        }
      });
      f.ground.addEventListener('dblclick', () => this.wholeField());
      f.ground.addEventListener(
        'wheel',
        (e) => {
          e.preventDefault();
          const [px, py] = local(e);
          const factor = Math.exp(-e.deltaY * (e.deltaMode === 1 ? 0.05 : 0.0022));
          this.#camera = zoomAt(this.#camera, factor, px, py, f.box.width, f.box.height);
          this.#cameraStart = -1;
          this.#keepMoving();
        },
        { passive: false },
      );
    });
  }

  #keepMoving(): void {
    this.#moving = performance.now() + SETTLE;
    window.clearTimeout(this.#settling);
    this.#settling = window.setTimeout(() => {
      this.#moving = 0;
      this.#ask();
    }, SETTLE);
    this.#ask();
  }

  /** Redraws only what lies over the marks: hovering never touches the card. */
  #hoverOnly(): void {
    if (this.#scene !== null) this.#overlay(this.#scene);
  }
}

function sleevesOf(arm: ArmScene, field: Field): (Sleeve & { id: number })[] {
  const long = 0.11 * Math.min(field.box.width, field.box.height * 1.6);
  return arm.pockets.map((p) => ({ id: p.id, ...sleeve(p.members, arm.ties, field.to, long) }));
}

function inset(box: Box): Box {
  return { x: box.x + 1, y: box.y + 1, width: box.width - 2, height: box.height - 2 };
}

export function reducedMotion(): boolean {
  return matchMedia('(prefers-reduced-motion: reduce)').matches;
}

/** The stage's elements; heads and captions are filled by the screen. */
export function stageTemplate(
  headLeft: unknown,
  headRight: unknown,
  footLeft: unknown,
  footRight: unknown,
): TemplateResult {
  return html`
    <div class="field field-left">
      <div class="field-head">${headLeft}</div>
      <div class="field-foot">${footLeft}</div>
    </div>
    <div class="wealth"><svg class="pyramid" role="img"></svg></div>
    <div class="field field-right">
      <div class="field-head">${headRight}</div>
      <div class="field-foot">${footRight}</div>
    </div>
    <svg class="under" aria-hidden="true"></svg>
    <svg class="tints" aria-hidden="true"></svg>
    <canvas class="marks" aria-hidden="true"></canvas>
    <svg class="over" aria-hidden="true"></svg>
  `;
}
