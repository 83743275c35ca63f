/**
 * A picture of the fields to save: both fields and the pyramid as they stand, under a title, over a legend and a caption.
 *
 * The caption names study, arms, generation, seed and version, and carries the caution every picture needs.
 */

import { wrapped } from '../../sim/results/figures/figure.js';
import type { Palette } from '../../sim/results/figures/palette.js';
import type { LegendItem } from './colouring.js';

export interface PictureTexts {
  readonly title: string;
  readonly summary: string;
  readonly names: readonly [string, string];
  readonly notes: readonly [string, string];
  readonly feet: readonly [string, string];
  readonly caption: string;
  readonly legend: readonly LegendItem[];
}

/** The caution carried by every saved picture. */
export const CAUTION =
  'A simulation explores mechanisms: it predicts no family’s future and is no basis for deciding about one.';

/** Styles of an element copied into a stand-alone SVG, since a picture has no page around it. */
const COPIED = [
  'fill',
  'fill-opacity',
  'stroke',
  'stroke-width',
  'stroke-opacity',
  'stroke-dasharray',
  'stroke-linecap',
  'stroke-linejoin',
  'paint-order',
  'font-size',
  'font-weight',
  'opacity',
];

function frozen(source: SVGSVGElement, width: number, height: number): string {
  const copy = source.cloneNode(true) as SVGSVGElement;
  copy.setAttribute('xmlns', 'http://www.w3.org/2000/svg');
  copy.setAttribute('width', String(width));
  copy.setAttribute('height', String(height));
  const from = source.querySelectorAll('*');
  copy.querySelectorAll('*').forEach((element, k) => {
    const style = getComputedStyle(from[k]);
    for (const name of COPIED) {
      const value = style.getPropertyValue(name);
      if (value !== '') element.setAttribute(name, value);
    }
  });
  // an image has none of the page's fonts: texts are written on the picture afterwards
  for (const text of copy.querySelectorAll('text')) text.remove();
  return new XMLSerializer().serializeToString(copy);
}

/** Writes the texts of a figure of the page where they stand. */
function written(draw: CanvasRenderingContext2D, source: SVGSVGElement, origin: DOMRect, family: string): void {
  for (const text of source.querySelectorAll('text')) {
    const style = getComputedStyle(text);
    const at = text.getBBox();
    const to = text.getScreenCTM();
    if (to === null) continue;
    const x = Number(text.getAttribute('x') ?? at.x);
    const y = Number(text.getAttribute('y') ?? at.y);
    draw.font = `${style.fontWeight} ${style.fontSize} ${family}`;
    const anchor = text.getAttribute('text-anchor') ?? 'start';
    draw.textAlign = anchor === 'middle' ? 'center' : anchor === 'end' ? 'right' : 'left';
    const [px, py] = [to.a * x + to.e - origin.left, to.d * y + to.f - origin.top];
    const said = text.textContent ?? '';
    if (style.paintOrder.startsWith('stroke') && style.stroke !== 'none') {
      draw.strokeStyle = style.stroke;
      draw.lineWidth = Number.parseFloat(style.strokeWidth);
      draw.lineJoin = 'round';
      draw.strokeText(said, px, py);
    }
    draw.fillStyle = style.fill;
    draw.fillText(said, px, py);
  }
  draw.textAlign = 'left';
}

async function image(svg: string): Promise<HTMLImageElement> {
  const found = new Image();
  found.src = `data:image/svg+xml;charset=utf-8,${encodeURIComponent(svg)}`;
  await found.decode();
  return found;
}

/**
 * @param stage - the stage element, freshly drawn
 * @param scale - device pixels a CSS pixel
 */
export async function picture(stage: HTMLElement, texts: PictureTexts, palette: Palette, scale: number): Promise<Blob> {
  // the canvas is read first: it keeps its drawing only until the browser has shown it
  const marks = await createImageBitmap(stage.querySelector('canvas.marks') as HTMLCanvasElement);
  const box = stage.getBoundingClientRect();
  const rem = Number.parseFloat(getComputedStyle(document.documentElement).fontSize);
  const room = 1.6 * rem;
  const top = room + 4.1 * rem;
  const width = box.width + 2 * room;
  const out = document.createElement('canvas');
  const draw = out.getContext('2d') as CanvasRenderingContext2D;
  const family = getComputedStyle(document.body).fontFamily;
  const lines = [...wrapped(texts.caption, Math.floor((width - 2 * room) / (0.5 * rem))), CAUTION];
  const height = top + box.height + 2.6 * rem + lines.length * 1.45 * rem + room * 0.6;
  out.width = Math.round(width * scale);
  out.height = Math.round(height * scale);
  draw.scale(scale, scale);
  draw.fillStyle = palette.paper;
  draw.fillRect(0, 0, width, height);
  const say = (text: string, x: number, y: number, size: number, weight: number, colour: string): void => {
    draw.font = `${weight} ${size}px ${family}`;
    draw.fillStyle = colour;
    draw.fillText(text, x, y);
  };
  say(texts.title, room, room + 1.1 * rem, 1.46 * rem, 700, palette.ink);
  say(texts.summary, room, room + 2.9 * rem, 1.06 * rem, 400, palette.ink);
  draw.save();
  draw.translate(room, top);
  const fields = [...stage.querySelectorAll<HTMLElement>('.field')];
  for (const field of fields) {
    const r = field.getBoundingClientRect();
    draw.beginPath();
    draw.roundRect(r.left - box.left + 0.5, r.top - box.top + 0.5, r.width - 1, r.height - 1, 0.6 * rem);
    draw.fillStyle = palette.panel;
    draw.fill();
    draw.strokeStyle = palette.line;
    draw.lineWidth = 1;
    draw.stroke();
  }
  const layer = async (selector: string): Promise<void> => {
    const svg = stage.querySelector(selector) as SVGSVGElement;
    const r = svg.getBoundingClientRect();
    const drawn = await image(frozen(svg, r.width, r.height));
    draw.drawImage(drawn, r.left - box.left, r.top - box.top, r.width, r.height);
    written(draw, svg, box, family);
  };
  await layer('svg.under');
  await layer('svg.tints');
  draw.drawImage(marks, 0, 0, box.width, box.height);
  await layer('svg.pyramid');
  if (!stage.querySelector('svg.over')?.hasAttribute('hidden')) await layer('svg.over');
  fields.forEach((field, k) => {
    const r = field.getBoundingClientRect();
    const x = r.left - box.left + 0.9 * rem;
    say(texts.names[k], x, 1.62 * rem, 1.16 * rem, 700, palette.ink);
    const wide = draw.measureText(texts.names[k]).width;
    say(texts.notes[k], x + wide + rem, 1.62 * rem, rem, 400, palette.soft);
    say(texts.feet[k], x, box.height - 0.8 * rem, rem, 400, palette.soft);
  });
  draw.restore();
  let x = room + 0.4 * rem;
  const y = top + box.height + 1.5 * rem;
  for (const item of texts.legend) {
    if (item.kind === 'ramp') {
      say(item.from, x, y, rem, 400, palette.ink);
      x += draw.measureText(item.from).width + 0.6 * rem;
      const fill = draw.createLinearGradient(x, 0, x + 6 * rem, 0);
      item.colours.forEach((c, k) => {
        fill.addColorStop(k / (item.colours.length - 1), c);
      });
      draw.fillStyle = fill;
      draw.fillRect(x, y - 0.7 * rem, 6 * rem, 0.8 * rem);
      x += 6.6 * rem;
      say(item.to, x, y, rem, 400, palette.ink);
      x += draw.measureText(item.to).width + 1.6 * rem;
      continue;
    }
    draw.beginPath();
    if (item.kind === 'tint') {
      draw.globalAlpha = 0.24;
      draw.roundRect(x - 0.5 * rem, y - 0.8 * rem, 1.2 * rem, rem, 0.4 * rem);
    } else draw.arc(x, y - 0.32 * rem, 0.34 * rem, 0, 2 * Math.PI);
    if (item.kind === 'ring') {
      draw.strokeStyle = item.colour;
      draw.lineWidth = 0.2 * rem;
      draw.stroke();
    } else {
      draw.fillStyle = item.colour;
      draw.fill();
    }
    draw.globalAlpha = 1;
    x += 1.1 * rem;
    say(item.says, x, y, rem, 400, palette.ink);
    x += draw.measureText(item.says).width + 1.8 * rem;
  }
  lines.forEach((line, k) => {
    say(line, room, y + (1.75 + 1.45 * k) * rem, 0.96 * rem, 400, palette.soft);
  });
  return new Promise((done, failed) => {
    out.toBlob(
      (blob) => (blob === null ? failed(new Error('the picture could not be made')) : done(blob)),
      'image/png',
    );
  });
}
