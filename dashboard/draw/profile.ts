import { BINS, type Profile } from '../model/profile.js';
import { LEFT_PX, RIGHT_PX, tickStep } from './axis.js';
import type { Palette } from './palette.js';
import type { Surface } from './surface.js';

const early = new Float64Array(BINS);
const recent = new Float64Array(BINS);

/** Speed by position as lines (first laps dashed, last laps solid), licks per lap as bars below. */
export function drawProfile(surface: Surface, palette: Palette, profile: Profile): void {
  const ctx = surface.begin();
  const { width, height } = surface;
  const wide = width - LEFT_PX - RIGHT_PX;
  const base = height - 4;
  const high = height - 14;
  profile.licksInto(early, 'early');
  profile.licksInto(recent, 'recent');
  drawLicks(ctx, palette, profile.comparable ? recent : early, base, high * 0.45, wide);

  profile.speedInto(early, 'early');
  profile.speedInto(recent, 'recent');
  let most = 10;
  for (let bin = 0; bin < BINS; bin++) {
    if (early[bin]! > most) most = early[bin]!;
    if (recent[bin]! > most) most = recent[bin]!;
  }
  const step = tickStep(most, 3);
  most = Math.ceil(most / step) * step;
  ctx.font = `11px ${palette.font}`;
  ctx.textAlign = 'right';
  ctx.textBaseline = 'middle';
  for (let speed = 0; speed <= most; speed += step) {
    const y = base - (speed / most) * high;
    ctx.fillStyle = palette.line;
    ctx.fillRect(LEFT_PX, y - 0.5, wide, 1);
    ctx.fillStyle = palette.soft;
    ctx.fillText(String(speed), LEFT_PX - 9, Math.min(y, height - 7));
  }
  const line = (values: Float64Array, dashed: boolean) => {
    ctx.strokeStyle = dashed ? palette.soft : palette.accent;
    ctx.lineWidth = dashed ? 1.5 : 2;
    ctx.setLineDash(dashed ? [4, 4] : []);
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
  };
  line(early, true);
  if (profile.comparable) line(recent, false);
}

function drawLicks(
  ctx: CanvasRenderingContext2D,
  palette: Palette,
  licks: Float64Array,
  base: number,
  high: number,
  wide: number,
): void {
  let most = 1;
  for (let bin = 0; bin < BINS; bin++) if (licks[bin]! > most) most = licks[bin]!;
  ctx.fillStyle = palette.lick;
  ctx.globalAlpha = 0.4;
  for (let bin = 0; bin < BINS; bin++) {
    const tall = (licks[bin]! / most) * high;
    ctx.fillRect(LEFT_PX + (bin / BINS) * wide + 1, base - tall, wide / BINS - 2, tall);
  }
  ctx.globalAlpha = 1;
}
