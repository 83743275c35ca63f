/**
 * The one canvas behind both fields: one pixi application, two scissored renders a frame.
 *
 * Draws only when asked; survives the loss of its context by drawing again. Knows where the two fields lie on the
 * canvas and nothing of households.
 */
import 'pixi.js/unsafe-eval';
import { Application, type WebGLRenderer } from 'pixi.js';
import type { Camera } from './camera.js';
import type { FieldMarks } from './marks.js';

/** Where a field lies on the canvas, in CSS pixels. */
export interface Box {
  readonly x: number;
  readonly y: number;
  readonly width: number;
  readonly height: number;
}

/** One field of a frame. */
export interface FieldFrame {
  readonly marks: FieldMarks;
  readonly box: Box;
}

/** What holds for both fields of a frame. */
export interface FrameLook {
  readonly camera: Camera;
  /** Share of the glide done, 0 … 1, eased. */
  readonly glide: number;
  /** Radius of a plain mark, CSS pixels. */
  readonly size: number;
  /** Strength of halos, 0 … 1. */
  readonly halo: number;
  /** Share of the households drawn, 0 … 1: a fair sample while the camera moves. */
  readonly share: number;
  /** Ties drawn in each field at most. */
  readonly ties: number;
  readonly ink: Float32Array;
  readonly paper: Float32Array;
}

/** The browser cannot draw the fields. */
export class NoWebGL2 extends Error {
  override readonly name = 'NoWebGL2';
}

export class FieldCanvas {
  #app: Application;
  #gl: WebGL2RenderingContext;

  constructor(app: Application, gl: WebGL2RenderingContext) {
    this.#app = app;
    this.#gl = gl;
  }

  /** Called after a lost context came back; the owner draws again. */
  onRestored: () => void = () => {};

  /**
   * @throws {NoWebGL2} when the browser has no WebGL 2
   */
  static async open(canvas: HTMLCanvasElement): Promise<FieldCanvas> {
    const probe = document.createElement('canvas').getContext('webgl2');
    if (probe === null) throw new NoWebGL2('This browser has no WebGL 2.');
    probe.getExtension('WEBGL_lose_context')?.loseContext();
    const app = new Application();
    await app.init({
      canvas,
      preference: 'webgl',
      backgroundAlpha: 0,
      antialias: false,
      autoStart: false,
      sharedTicker: false,
      autoDensity: true,
      resolution: window.devicePixelRatio || 1,
      eventMode: 'none',
      width: 16,
      height: 16,
    });
    app.ticker.stop();
    const renderer = app.renderer as WebGLRenderer;
    const gl = renderer.gl as WebGL2RenderingContext;
    if (!(gl instanceof WebGL2RenderingContext)) throw new NoWebGL2('This browser has no WebGL 2.');
    const self = new FieldCanvas(app, gl);
    canvas.addEventListener('webglcontextrestored', () => {
      // the renderer's own handler has run first: it registered first
      self.onRestored();
    });
    return self;
  }

  get resolution(): number {
    return this.#app.renderer.resolution;
  }

  get lost(): boolean {
    return this.#gl.isContextLost();
  }

  /** @param resolution - device pixels a CSS pixel; the screen's own when left out */
  resize(width: number, height: number, resolution = window.devicePixelRatio || 1): void {
    this.#app.renderer.resize(width, height, resolution);
  }

  /** Draws a frame. Every field is cut to its box. */
  draw(fields: readonly FieldFrame[], look: FrameLook): void {
    const gl = this.#gl;
    if (gl.isContextLost()) return;
    const renderer = this.#app.renderer;
    const { width, height } = renderer.screen;
    const r = renderer.resolution;
    gl.disable(gl.SCISSOR_TEST);
    let clear = true;
    for (const { marks, box } of fields) {
      marks.prepare(
        {
          view: Float32Array.of(width, height),
          camera: Float32Array.of(look.camera.zoom, look.camera.x, look.camera.y),
          origin: Float32Array.of(box.x, box.y),
          glide: look.glide,
        },
        look.size,
        r,
        look.halo,
        look.share,
        look.ties,
        look.ink,
        look.paper,
      );
      if (clear) {
        renderer.clear({ target: renderer.view.renderTarget, clearColor: [0, 0, 0, 0] });
        clear = false;
      }
      gl.enable(gl.SCISSOR_TEST);
      gl.scissor(
        Math.round(box.x * r),
        Math.round((height - box.y - box.height) * r),
        Math.round(box.width * r),
        Math.round(box.height * r),
      );
      renderer.render({ container: marks.container, clear: false });
    }
    gl.disable(gl.SCISSOR_TEST);
  }

  /** Waits until the card has drawn what was asked: for measuring only. */
  settle(): void {
    const pixel = new Uint8Array(4);
    this.#gl.readPixels(0, 0, 1, 1, this.#gl.RGBA, this.#gl.UNSIGNED_BYTE, pixel);
  }
}
