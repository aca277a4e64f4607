import { STRIP_S, type Strip, type StripLine, stretchesOf } from '../model/strip.js';
import type { Palette } from './palette.js';
import type { Surface } from './surface.js';

const LABEL_PX = 84;
const AXIS_PX = 18;
const LEAST_PX = 1.5;

/** Inputs above, outputs below; each a line that lifts while it is on. Newest at the right. */
export function drawStrip(
  surface: Surface,
  palette: Palette,
  strip: Strip,
  lines: readonly StripLine[],
  isOn: (line: StripLine) => boolean,
  nowMs: number,
): void {
  const context = surface.begin();
  const { width, height } = surface;
  const toUs = strip.edgeUs(nowMs);
  const left = LABEL_PX;
  const wide = width - left - 6;
  const rowPx = (height - AXIS_PX) / Math.max(1, lines.length);
  context.font = `12px ${palette.font}`;
  context.textBaseline = 'middle';
  drawSeconds(context, palette, left, wide, height);
  lines.forEach((line, row) => {
    const top = row * rowPx;
    const base = Math.round(top + rowPx * 0.8) + 0.5;
    context.textAlign = 'right';
    context.fillStyle = palette.soft;
    context.fillText(line.name, left - 8, top + rowPx / 2, LABEL_PX - 10);
    context.strokeStyle = palette.line;
    context.lineWidth = 1;
    context.beginPath();
    context.moveTo(left, base);
    context.lineTo(left + wide, base);
    context.stroke();
    if (toUs === undefined) return;
    const fromUs = toUs - STRIP_S * 1_000_000;
    const trace = (line.kind === 'input' ? strip.inputs : strip.outputs).get(line.line);
    context.fillStyle = colorOf(line.kind, palette);
    for (const one of stretchesOf(trace, fromUs, toUs, isOn(line))) {
      const x = left + ((one.fromUs - fromUs) / (toUs - fromUs)) * wide;
      const w = ((one.toUs - one.fromUs) / (toUs - fromUs)) * wide;
      context.fillRect(x, top + rowPx * 0.2, Math.max(LEAST_PX, w), rowPx * 0.6);
    }
  });
}

function drawSeconds(
  context: CanvasRenderingContext2D,
  palette: Palette,
  left: number,
  wide: number,
  height: number,
): void {
  context.textAlign = 'center';
  context.fillStyle = palette.soft;
  context.strokeStyle = palette.line;
  context.lineWidth = 1;
  for (let s = 0; s <= STRIP_S; s += 2) {
    const x = Math.round(left + wide * (1 - s / STRIP_S)) + 0.5;
    context.beginPath();
    context.moveTo(x, 0);
    context.lineTo(x, height - AXIS_PX);
    context.stroke();
    const words = s === 0 ? 'now' : `−${s} s`;
    context.fillText(words, Math.min(x, left + wide - 12), height - AXIS_PX / 2);
  }
}

function colorOf(kind: StripLine['kind'], palette: Palette): string {
  if (kind === 'valve') return palette.water;
  if (kind === 'stimulus') return palette.stim;
  return kind === 'mark' ? palette.soft : palette.lick;
}
