import { BINS, type Profile } from '../model/profile.js';
import { LEFT_PX, RIGHT_PX, tickStep } from './axis.js';
import type { Palette } from './palette.js';
import type { Surface } from './surface.js';

const early = new Float64Array(BINS);
const recent = new Float64Array(BINS);

/** Speed by position: the first laps dashed, the last ones solid. */
export function drawProfile(surface: Surface, palette: Palette, profile: Profile): void {
  const ctx = surface.begin();
  profile.speedInto(early, 'early');
  profile.speedInto(recent, 'recent');
  const frame = drawScale(ctx, surface, palette, 10);
  drawLine(ctx, palette, frame, early, true);
  if (profile.comparable) drawLine(ctx, palette, frame, recent, false);
}

/** Licks a lap by position: the first laps as a dashed outline, the last ones as bars under it. */
export function drawLicking(surface: Surface, palette: Palette, profile: Profile): void {
  const ctx = surface.begin();
  profile.licksInto(early, 'early');
  profile.licksInto(recent, 'recent');
  const frame = drawScale(ctx, surface, palette, 1);
  const { comparable } = profile;
  drawBars(ctx, palette, frame, comparable ? recent : early);
  if (comparable) drawSteps(ctx, palette, frame, early);
}

interface Frame {
  readonly base: number;
  readonly high: number;
  readonly wide: number;
  readonly most: number;
}

/** Lines and figures up to the highest of both; `least` is how far they go at least. */
function drawScale(
  ctx: CanvasRenderingContext2D,
  { width, height }: Surface,
  palette: Palette,
  least: number,
): Frame {
  let most = least;
  for (let bin = 0; bin < BINS; bin++) {
    if (early[bin]! > most) most = early[bin]!;
    if (recent[bin]! > most) most = recent[bin]!;
  }
  const step = tickStep(most, 3);
  most = Math.ceil(most / step) * step;
  const frame = { base: height - 4, high: height - 14, wide: width - LEFT_PX - RIGHT_PX, most };
  ctx.font = `11px ${palette.font}`;
  ctx.textAlign = 'right';
  ctx.textBaseline = 'middle';
  for (let value = 0; value <= most + step / 2; value += step) {
    const y = frame.base - (value / most) * frame.high;
    ctx.fillStyle = palette.line;
    ctx.fillRect(LEFT_PX, y - 0.5, frame.wide, 1);
    ctx.fillStyle = palette.soft;
    ctx.fillText(String(Number(value.toPrecision(3))), LEFT_PX - 9, Math.min(y, height - 7));
  }
  return frame;
}

function strokeAs(ctx: CanvasRenderingContext2D, palette: Palette, dashed: boolean): void {
  ctx.strokeStyle = dashed ? palette.soft : palette.accent;
  ctx.lineWidth = dashed ? 1.5 : 2;
  ctx.setLineDash(dashed ? [4, 4] : []);
}

function drawLine(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  { base, high, wide, most }: Frame,
  values: Float64Array,
  dashed: boolean,
): void {
  strokeAs(ctx, palette, dashed);
  ctx.beginPath();
  let down = false;
  for (let bin = 0; bin < BINS; bin++) {
    if (Number.isNaN(values[bin]!)) {
      down = false;
      continue;
    }
    const x = LEFT_PX + ((bin + 0.5) / BINS) * wide;
    const y = base - (Math.max(0, values[bin]!) / most) * high;
    if (down) ctx.lineTo(x, y);
    else ctx.moveTo(x, y);
    down = true;
  }
  ctx.stroke();
  ctx.setLineDash([]);
}

function drawBars(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  { base, high, wide, most }: Frame,
  licks: Float64Array,
): void {
  ctx.fillStyle = palette.lick;
  ctx.globalAlpha = 0.55;
  for (let bin = 0; bin < BINS; bin++) {
    const tall = (licks[bin]! / most) * high;
    ctx.fillRect(LEFT_PX + (bin / BINS) * wide + 1, base - tall, wide / BINS - 2, tall);
  }
  ctx.globalAlpha = 1;
}

function drawSteps(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  { base, high, wide, most }: Frame,
  licks: Float64Array,
): void {
  strokeAs(ctx, palette, true);
  ctx.beginPath();
  ctx.moveTo(LEFT_PX, base);
  for (let bin = 0; bin < BINS; bin++) {
    const y = base - (licks[bin]! / most) * high;
    ctx.lineTo(LEFT_PX + (bin / BINS) * wide, y);
    ctx.lineTo(LEFT_PX + ((bin + 1) / BINS) * wide, y);
  }
  ctx.stroke();
  ctx.setLineDash([]);
}
