import type { Snapshot } from '../../server/loop/protocol.js';
import { LAPS_KEPT, type LapStore, MARK, type Mark } from '../model/laps.js';
import { LEFT_PX, RIGHT_PX, xOf } from './axis.js';
import { pieces } from './belt.js';
import { drawMark } from './marks.js';
import type { Palette } from './palette.js';
import type { Surface } from './surface.js';

/** Rows laid out for so many laps: a young session fills the space with fewer, higher ones. */
const LAYOUTS = [10, 20, 30, LAPS_KEPT];

/** Height of one lap's row; the running lap, on top, is twice as high. */
export function rowHeight(height: number, newestLap: number): number {
  const rows = LAYOUTS.find((most) => newestLap < most) ?? LAPS_KEPT;
  return Math.max(5, (height - 6) / (rows + 1));
}

/** Middle of the row of a lap that is `back` laps before the running one. */
function rowMiddle(back: number, row: number): number {
  return back === 0 ? 3 + row : 3 + row * 2 + (back - 0.5) * row;
}

/** Laps downwards from the running one, place along the belt: licks under, firings over them. */
export function drawRaster(
  surface: Surface,
  palette: Palette,
  lengthCm: number,
  laps: LapStore,
  places: Snapshot['places'],
): void {
  const ctx = surface.begin();
  const { width, height } = surface;
  const row = rowHeight(height, laps.newest);
  drawPlaces(ctx, palette, lengthCm, places, width, height);
  ctx.font = `11px ${palette.font}`;
  ctx.textAlign = 'right';
  ctx.textBaseline = 'middle';
  const rows = Math.min(LAPS_KEPT, Math.max(0, laps.newest + 1));
  const every = row >= 22 ? 1 : row >= 12 ? 2 : 5;
  for (let back = 0; back < rows; back++) {
    const lap = laps.newest - back;
    const y = rowMiddle(back, row);
    if (back === 0 || (lap % every === 0 && (back > 1 || every === 1))) {
      ctx.fillStyle = back === 0 ? palette.ink : palette.soft;
      ctx.fillText(String(lap), LEFT_PX - 9, y);
    }
    ctx.fillStyle = palette.line;
    ctx.globalAlpha = 0.55;
    ctx.fillRect(LEFT_PX, y + (back === 0 ? row : row / 2) - 0.5, width - LEFT_PX - RIGHT_PX, 0.5);
    ctx.globalAlpha = 1;
  }
  drawLaps(ctx, palette, lengthCm, laps, rows, row, width);
}

function drawPlaces(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  lengthCm: number,
  places: Snapshot['places'],
  width: number,
  height: number,
): void {
  const at = (cm: number) => xOf(cm, lengthCm, width);
  for (const place of places) {
    if (place.fromCm === place.toCm) {
      ctx.globalAlpha = 0.45;
      ctx.fillStyle = palette.soft;
      ctx.fillRect(at(place.fromCm) - 0.5, 0, 1, height);
    } else {
      ctx.globalAlpha = 0.1;
      ctx.fillStyle = palette.accent;
      for (const [from, to] of pieces(place.fromCm, place.toCm, lengthCm)) {
        ctx.fillRect(at(from), 0, at(to) - at(from), height);
      }
    }
  }
  ctx.globalAlpha = 1;
}

function drawLaps(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  lengthCm: number,
  laps: LapStore,
  rows: number,
  row: number,
  width: number,
): void {
  for (const over of [false, true]) {
    for (let back = 0; back < rows; back++) {
      const marks = laps.get(laps.newest - back);
      if (!marks) continue;
      const y = rowMiddle(back, row);
      const high = back === 0 ? row * 1.7 : row;
      for (let n = 0; n < marks.count; n++) {
        const kind = marks.kind[n] as Mark;
        if (kind > MARK.artefact !== over) continue;
        drawMark(ctx, kind, xOf(marks.positionCm[n]!, lengthCm, width), y, high, palette);
      }
    }
  }
}

/** The running lap so far, and a thread from the animal down through the laps before. */
export function drawRunning(
  surface: Surface,
  palette: Palette,
  lengthCm: number,
  positionCm: number | null,
  newestLap: number,
): void {
  const ctx = surface.begin();
  if (positionCm === null || newestLap < 0) return;
  const { width, height } = surface;
  const row = rowHeight(height, newestLap);
  const x = xOf(positionCm, lengthCm, width);
  ctx.fillStyle = palette.accent;
  ctx.globalAlpha = 0.13;
  ctx.fillRect(LEFT_PX, 3, x - LEFT_PX, row * 2);
  ctx.globalAlpha = 0.7;
  ctx.fillRect(x - 0.75, 0, 1.5, height);
  ctx.globalAlpha = 1;
}
