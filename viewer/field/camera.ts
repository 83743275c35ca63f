/**
 * The camera both fields share: a zoom and a shift of field pixels. Pure arithmetic, no drawing.
 */

/** A point p of the field is drawn at p × zoom + (x, y). */
export interface Camera {
  readonly zoom: number;
  readonly x: number;
  readonly y: number;
}

export const REST: Camera = { zoom: 1, x: 0, y: 0 };
const LARGEST = 60;

/** Zooms by a factor about a point of the screen that stays where it is; never out beyond the whole field. */
export function zoomAt(camera: Camera, factor: number, px: number, py: number, width: number, height: number): Camera {
  const zoom = Math.min(LARGEST, Math.max(1, camera.zoom * factor));
  const f = zoom / camera.zoom;
  return held({ zoom, x: px - (px - camera.x) * f, y: py - (py - camera.y) * f }, width, height);
}

export function pan(camera: Camera, dx: number, dy: number, width: number, height: number): Camera {
  return held({ zoom: camera.zoom, x: camera.x + dx, y: camera.y + dy }, width, height);
}

/** Frames a box of field pixels with some room around it. */
export function frame(box: readonly [number, number, number, number], width: number, height: number): Camera {
  const [x0, y0, x1, y1] = box;
  const room = 0.62;
  const zoom = Math.max(
    1,
    Math.min(12, (width * room) / Math.max(x1 - x0, width / 40), (height * room) / Math.max(y1 - y0, height / 40)),
  );
  return held({ zoom, x: width / 2 - ((x0 + x1) / 2) * zoom, y: height / 2 - ((y0 + y1) / 2) * zoom }, width, height);
}

/** Part of the way from one camera to another, zoom on a geometric scale. */
export function between(a: Camera, b: Camera, share: number): Camera {
  const zoom = a.zoom * (b.zoom / a.zoom) ** share;
  const s = Math.abs(b.zoom - a.zoom) < 1e-9 ? share : (zoom - a.zoom) / (b.zoom - a.zoom);
  return { zoom, x: a.x + (b.x - a.x) * s, y: a.y + (b.y - a.y) * s };
}

/** Keeps the field covering its frame. */
function held(camera: Camera, width: number, height: number): Camera {
  const { zoom } = camera;
  return {
    zoom,
    x: Math.min(0, Math.max(width * (1 - zoom), camera.x)),
    y: Math.min(0, Math.max(height * (1 - zoom), camera.y)),
  };
}
