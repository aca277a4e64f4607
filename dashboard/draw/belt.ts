import type { Snapshot } from '../../server/loop/protocol.js';
import { tickStep, xOf } from './axis.js';
import type { Palette } from './palette.js';
import type { Surface } from './surface.js';

type Places = Snapshot['places'];

/** The belt rolled out, seam to seam, with its places; the animal is drawn over it. */
export function drawBelt(
  surface: Surface,
  palette: Palette,
  lengthCm: number,
  places: Places,
): void {
  const ctx = surface.begin();
  const { width, height } = surface;
  const at = (cm: number) => xOf(cm, lengthCm, width);
  const top = height - 46;
  const band = 22;
  ctx.font = `12px ${palette.font}`;
  ctx.textBaseline = 'alphabetic';

  ctx.fillStyle = palette.raised;
  ctx.fillRect(at(0), top, at(lengthCm) - at(0), band);
  ctx.strokeStyle = palette.line;
  ctx.lineWidth = 1;
  ctx.strokeRect(at(0) + 0.5, top + 0.5, at(lengthCm) - at(0) - 1, band - 1);
  drawSpans(ctx, palette, lengthCm, places, at, top, band);
  drawSeam(ctx, palette, at(0), top, band);
  drawSeam(ctx, palette, at(lengthCm), top, band);

  ctx.fillStyle = palette.soft;
  ctx.textAlign = 'center';
  const step = tickStep(lengthCm, width < 560 ? 6 : 10);
  for (let cm = 0; cm <= lengthCm + 1e-6; cm += step) {
    ctx.fillRect(Math.round(at(cm)) - 0.5, top + band, 1, 5);
    ctx.fillText(String(cm), at(cm), top + band + 18);
  }
  ctx.textAlign = 'left';
  ctx.fillText('cm', 10, top + band + 18);
  drawLabels(ctx, palette, lengthCm, places, at, top);
}

function drawSpans(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  lengthCm: number,
  places: Places,
  at: (cm: number) => number,
  top: number,
  band: number,
): void {
  for (const place of places) {
    if (place.fromCm === place.toCm) continue;
    ctx.fillStyle = palette.accent;
    for (const [from, to] of pieces(place.fromCm, place.toCm, lengthCm)) {
      ctx.globalAlpha = 0.28;
      ctx.fillRect(at(from), top, at(to) - at(from), band);
      ctx.globalAlpha = 1;
      ctx.fillRect(at(from), top + band - 3, at(to) - at(from), 3);
    }
  }
  for (const place of places) {
    if (place.fromCm !== place.toCm) continue;
    ctx.fillStyle = palette.ink;
    ctx.fillRect(at(place.fromCm) - 1, top - 5, 2, band + 8);
  }
}

/** A span may run over the seam: then it is two pieces. */
export function pieces(from: number, to: number, lengthCm: number): [number, number][] {
  if (from <= to) return [[from, to]];
  return [
    [from, lengthCm],
    [0, to],
  ];
}

/** The seam, drawn as stitches. */
function drawSeam(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  x: number,
  top: number,
  band: number,
): void {
  ctx.fillStyle = palette.soft;
  for (let y = top + 1; y < top + band - 3; y += 5) ctx.fillRect(x - 4, y, 8, 2);
}

/** Names above the belt, on a second line where they would run into each other. */
function drawLabels(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  lengthCm: number,
  places: Places,
  at: (cm: number) => number,
  top: number,
): void {
  const lineEnds = [-1e9, -1e9];
  const sorted = places
    .map((place) => ({ place, middle: middleOf(place.fromCm, place.toCm, lengthCm) }))
    .sort((a, b) => a.middle - b.middle);
  ctx.fillStyle = palette.ink;
  ctx.textAlign = 'left';
  for (const { place, middle } of sorted) {
    const text = place.name;
    const wide = ctx.measureText(text).width;
    const left = Math.max(2, Math.min(at(middle) - wide / 2, at(lengthCm) - wide + 10));
    const line = lineEnds.findIndex((end) => left > end + 8);
    if (line < 0) continue;
    lineEnds[line] = left + wide;
    ctx.fillText(text, left, top - 10 - line * 15);
  }
}

function middleOf(from: number, to: number, lengthCm: number): number {
  if (from <= to) return (from + to) / 2;
  return ((from + to + lengthCm) / 2) % lengthCm;
}

/** The animal: an arrowhead the way it runs, its wake as long as the last half second's way. */
export function drawAnimal(
  surface: Surface,
  palette: Palette,
  lengthCm: number,
  animal: { positionCm: number | null; speedCmPerS: number; trusted: boolean; lickOn: boolean },
): void {
  const ctx = surface.begin();
  const { width, height } = surface;
  const top = height - 46;
  const middle = top + 11;
  if (animal.positionCm === null) {
    ctx.font = `12px ${palette.font}`;
    ctx.fillStyle = palette.ink;
    ctx.textAlign = 'center';
    ctx.fillText('position unknown until the seam mark is met', width / 2, middle + 4);
    return;
  }
  const x = xOf(animal.positionCm, lengthCm, width);
  const ahead = animal.speedCmPerS < -0.5 ? -1 : 1;
  const wake = Math.min(Math.abs(animal.speedCmPerS) * 0.5, 25);
  const start = Math.max(
    xOf(0, lengthCm, width),
    x - ahead * (xOf(wake, lengthCm, width) - xOf(0, lengthCm, width)),
  );
  const fade = ctx.createLinearGradient(start, 0, x, 0);
  fade.addColorStop(0, 'transparent');
  fade.addColorStop(1, palette.accent);
  ctx.globalAlpha = 0.75;
  ctx.fillStyle = fade;
  ctx.fillRect(Math.min(start, x), middle - 4, Math.abs(x - start), 8);
  ctx.globalAlpha = 1;
  ctx.beginPath();
  ctx.moveTo(x + ahead * 2, middle);
  ctx.lineTo(x - ahead * 19, middle - 15);
  ctx.lineTo(x - ahead * 12, middle);
  ctx.lineTo(x - ahead * 19, middle + 15);
  ctx.closePath();
  ctx.lineWidth = 2;
  ctx.strokeStyle = animal.trusted ? palette.ground : palette.warn;
  ctx.fillStyle = animal.trusted ? palette.ink : palette.ground;
  ctx.fill();
  ctx.stroke();
  if (animal.lickOn) {
    ctx.fillStyle = palette.lick;
    ctx.beginPath();
    ctx.arc(x, top - 4, 4, 0, Math.PI * 2);
    ctx.fill();
  }
}
